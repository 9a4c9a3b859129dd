"""Daily precipitation of GHCN-Daily stations: what values and flags mean, and their place in a block."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems, ReadError
from basinrain.rainfall import Status
from basinrain.reading.blocks import Block
from basinrain.reading.stamps import StampRules, read_stamps

__all__ = ["ELEMENTS", "MISSING", "YEARS", "DayCells", "LineFault", "block_of_days", "is_element", "report_lines"]

ELEMENTS: Final = ("PRCP", "MDPR", "DAPR")
"""What is read: the depth of a day, the depth of several days, and how many these are."""

MISSING: Final = -9999
YEARS: Final = (1700, 2199)
"""The first and the last year that are taken for one."""

_PRCP, _MDPR, _DAPR = range(len(ELEMENTS))
_BLANK: Final = ord(" ")
_DRY: Final = {ord("T"): Status.TRACE, ord("P"): Status.PRESUMED_ZERO}
_MEASURED: Final = "BDPT"
_FAILED: Final = "DGIKLMNORSTWXZ"
_LOST_SIGN: Final = (9999, 99999)
_LONGEST: Final = 366
_LONGEST_ASSUMED: Final = 31
_FREE: Final = (int(Status.MISSING), int(Status.REJECTED))

_RULE: Final = 0.8
_FEW: Final = 3

Ints = npt.NDArray[np.int64]


class LineFault(NamedTuple):
    """What is wrong with a line, in the words of a problem."""

    line: int
    found: str
    expected: str
    remedy: str


def report_lines(item: str, faults: Sequence[LineFault], n_lines: int, problems: Problems) -> None:
    """Report lines that are not of the format, in one problem where most of the ``n_lines`` of the file are not.

    Examples
    --------
    >>> problems = Problems()
    >>> report_lines("a line", [LineFault(k, "'x'", "a line", "") for k in range(1, 9)], 9, problems)
    >>> problems.raise_as(ReadError)
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: line 1: a line: found 'x', and 7 more lines like it; expected a line
    """
    most = len(faults) > max(_FEW, _RULE * n_lines)
    for fault in faults[: 1 if most else None]:
        more = f", and {len(faults) - 1} more lines like it" if most else ""
        problems.add(item=item, found=fault.found + more, expected=fault.expected, remedy=fault.remedy, line=fault.line)


@cache
def is_element(text: bytes) -> bool:
    """Return whether a text can be the name of an element.

    Examples
    --------
    >>> is_element(b"WT01"), is_element(b"PRC "), is_element(b"prcp")
    (True, False, False)
    """
    return re.fullmatch(rb"[A-Z0-9]{4}", text) is not None


@dataclass(frozen=True, eq=False)
class DayCells:
    """The cells of a file, one a station, day and element; all arrays have shape (n_cells,).

    Parameters
    ----------
    gauges
        Ids of the stations.
    gauge
        Position in ``gauges``.
    day
        Days since 1970-01-01.
    element
        Position in :data:`ELEMENTS`.
    value
        As in the file: tenths of mm, or days; :data:`MISSING` where there is none.
    mflag, qflag
        Measurement and quality flag, the code of the character; blank is 32.
    line
        Line of the file, from 1.
    observed
        Seconds after midnight at which the value was read, -1 where the file does not say; None where it never does.
    """

    gauges: tuple[str, ...]
    gauge: Ints
    day: Ints
    element: npt.NDArray[np.uint8]
    value: Ints
    mflag: npt.NDArray[np.uint8]
    qflag: npt.NDArray[np.uint8]
    line: Ints
    observed: Ints | None = None


def block_of_days(cells: DayCells, *, file: str, stamps: StampRules, problems: Problems) -> Block:
    """Return the block of a file's cells: every day from the first with a value to the last.

    Parameters
    ----------
    cells
        Each station, day and element once.
    file
        The file.
    stamps
        What a date names.
    problems
        Takes cells that cannot be, flags that are not known, and totals of several days that contradict daily values.

    Raises
    ------
    ReadError
        There are problems, those of earlier steps included.

    Examples
    --------
    45.0 mm over the 3 days to 6 May, with 2.0 mm on the day before them:

    >>> from basinrain.intervals import DAY, Interval
    >>> day = np.datetime64("2031-05-03").astype(int) + np.array([0, 3, 3])
    >>> element, value = np.array([0, 1, 2], dtype=np.uint8), np.array([20, 450, 3])
    >>> blank = np.full(3, 32, dtype=np.uint8)
    >>> cells = DayCells(("ORX00000001",), np.zeros(3, int), day, element, value, blank, blank, np.array([1, 2, 3]))
    >>> rules = StampRules(interval=Interval("1d", DAY))
    >>> block = block_of_days(cells, file="orx.dly", stamps=rules, problems=Problems())
    >>> block.depth[:, 0], list(block.spans.values())
    (array([ 2., nan, nan, 45.]), [3])
    """
    _check(cells, problems)
    rain = np.flatnonzero(cells.element != _DAPR)
    if not len(rain) and not len(problems):
        problems.add(item="the file", found="no PRCP and no MDPR", expected="daily precipitation")
    problems.raise_as(ReadError)
    used = np.unique(cells.gauge[rain])
    column = np.searchsorted(used, cells.gauge)
    totals = _valued(cells, _MDPR)
    totals = totals[np.lexsort((cells.day[totals], column[totals]))]
    lengths = _lengths(cells, totals)
    first, last = _reach(cells, rain, totals, lengths)
    grid = _Grid(tuple(cells.gauges[g] for g in used.tolist()), first, last - first + 1)
    prcp = _valued(cells, _PRCP)
    at = (cells.day[prcp] - first, column[prcp])
    grid.depth[at], grid.status[at] = _judged(cells, prcp)
    periods = _place_totals(grid, cells, totals, lengths, column[totals], problems=problems)
    problems.raise_as(ReadError)

    dates = np.arange(first, last + 1).astype("datetime64[D]").astype("datetime64[s]")
    # No date stands in a clock that changes, so that all ends are as far from their dates as the first one.
    ends = dates + (read_stamps([str(dates[0])[:10]], stamps).ends[0] - dates[0])
    inside = rain[(cells.day[rain] >= first) & (cells.day[rain] <= last)]
    lines = np.zeros(len(dates), dtype=np.int64)
    lines[cells.day[inside[::-1]] - first] = cells.line[inside[::-1]]
    return Block(
        file,
        grid.gauges,
        ends,
        lines,
        grid.depth,
        grid.status,
        _present(cells.day[inside] - first, column[inside], grid.depth.shape),
        {(grid.gauges[g], ends[t]): n for (t, g), n in periods.items()},
    )


class _Grid:
    """Depth and status of every day and gauge, from day ``first``; all missing to begin with."""

    def __init__(self, gauges: tuple[str, ...], first: int, n: int) -> None:
        self.gauges = gauges
        self.first = first
        self.depth = np.full((n, len(gauges)), np.nan)
        self.status = np.full((n, len(gauges)), Status.MISSING, dtype=np.uint8)


def _valued(cells: DayCells, element: int) -> Ints:
    return np.flatnonzero((cells.element == element) & (cells.value != MISSING))


def _check(cells: DayCells, problems: Problems) -> None:
    """Report flags that are not known, and values that cannot be; those that failed a check may be anything."""

    def report(wrong: npt.NDArray[np.bool_], found: Callable[[int], str], expected: str, remedy: str) -> None:
        for row in np.flatnonzero(wrong).tolist():
            _report(cells, row, problems, found=found(row), expected=expected, remedy=remedy)

    def value(row: int) -> str:
        return f"'{cells.value[row]}'"

    report(
        ~np.isin(cells.mflag, [_BLANK, *_MEASURED.encode()]),
        lambda row: f"measurement flag '{chr(cells.mflag[row])}'",
        f"a blank or one of: {', '.join(_MEASURED)}",
        "correct the flag",
    )
    report(
        ~np.isin(cells.qflag, [_BLANK, *_FAILED.encode()]),
        lambda row: f"quality flag '{chr(cells.qflag[row])}'",
        f"a blank or one of: {', '.join(_FAILED)}",
        "correct the flag",
    )
    sound = (cells.value != MISSING) & (cells.qflag == _BLANK)
    rain = sound & (cells.element != _DAPR)
    report(rain & (cells.value < 0), value, "tenths of mm, 0 or more", f"correct it, or write {MISSING} for missing")
    report(
        rain & np.isin(cells.value, _LOST_SIGN),
        value,
        "tenths of mm; it looks like a missing code",
        f"if it is one, write {MISSING}",
    )
    report(
        rain & np.isin(cells.mflag, list(_DRY)) & (cells.value > 0),
        lambda row: f"'{cells.value[row]}' with measurement flag '{chr(cells.mflag[row])}'",
        "0",
        "correct the value or its flag",
    )
    report(
        sound & (cells.element == _DAPR) & ((cells.value < 1) | (cells.value > _LONGEST)),
        value,
        f"a number of days, 1 to {_LONGEST}",
        "",
    )


def _report(cells: DayCells, row: int, problems: Problems, *, found: str, expected: str, remedy: str) -> None:
    gauge, date = cells.gauges[cells.gauge[row]], _date(int(cells.day[row]))
    problems.add(
        item=f"gauge {gauge}: {ELEMENTS[cells.element[row]]} of {date}",
        found=found,
        expected=expected,
        remedy=remedy,
        line=int(cells.line[row]),
        gauge=gauge,
        time=date,
    )


def _date(day: int) -> str:
    return str(np.datetime64(day, "D"))


def _judged(cells: DayCells, rows: Ints) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
    """Return depth and status of cells that hold the value of one day."""
    status = np.where(cells.value[rows] == 0, Status.ZERO, Status.OBSERVED).astype(np.uint8)
    for flag, meaning in _DRY.items():
        status[cells.mflag[rows] == flag] = meaning
    failed = cells.qflag[rows] != _BLANK
    status[failed] = Status.REJECTED
    return np.where(failed, np.nan, cells.value[rows] / 10), status


def _lengths(cells: DayCells, totals: Ints) -> Ints:
    """Return the days of every total; 0 where the file does not say, -1 where it failed a check, or its length did."""
    counts = _valued(cells, _DAPR)
    key = cells.day * len(cells.gauges) + cells.gauge
    counts = counts[np.argsort(key[counts])]
    lengths = np.zeros(len(totals), dtype=np.int64)
    if len(counts):
        place = np.minimum(np.searchsorted(key[counts], key[totals]), len(counts) - 1)
        match = counts[place]
        days = np.where(cells.qflag[match] == _BLANK, cells.value[match], -1)
        lengths = np.where(key[match] == key[totals], days, 0)
    return np.where(cells.qflag[totals] == _BLANK, lengths, -1)


def _reach(cells: DayCells, rain: Ints, totals: Ints, lengths: Ints) -> tuple[int, int]:
    """Return the first and the last day with a value, or of all cells where none has one."""
    valued = rain[cells.value[rain] != MISSING]
    days = cells.day[valued if len(valued) else rain]
    begins = cells.day[totals] - np.maximum(lengths, 1) + 1
    return int(min(days.min(), begins.min(initial=days.min()))), int(days.max())


def _place_totals(
    grid: _Grid, cells: DayCells, totals: Ints, lengths: Ints, columns: Ints, *, problems: Problems
) -> dict[tuple[int, int], int]:
    """Put the totals, by gauge in order of time, into the grid; return how many days those over several have."""
    depth, status = grid.depth, grid.status
    depths, kinds = _judged(cells, totals)
    listed = (array.tolist() for array in (totals, lengths, columns, depths, kinds))
    periods = {}
    for row, length, g, mm, kind in zip(*listed, strict=True):
        t = int(cells.day[row]) - grid.first
        n = length or _assumed(status[:, g], t)
        begin = t - max(n, 1) + 1
        own = np.flatnonzero(~np.isin(status[begin : t + 1, g], _FREE))
        if len(own) and length >= 0:
            days = f" of {n} days" if n > 1 else ""
            _report(
                cells,
                row,
                problems,
                found=f"a total{days} beside the value of {_date(grid.first + begin + int(own[0]))}",
                expected="no other value in the days of a total",
                remedy=f"correct the file, or write {MISSING} for one of the two",
            )
        elif n > 0:
            depth[begin:t, g], status[begin:t, g] = np.nan, Status.MISSING
            depth[t, g], status[t, g] = mm, kind if n == 1 else Status.ACCUMULATED
            if n > 1:
                periods[t, g] = n
        elif not len(own):
            status[t, g] = Status.REJECTED
    return periods


def _assumed(status: npt.NDArray[np.uint8], t: int) -> int:
    """Return the days of a total whose length the file does not say: back to a known value; -1 where there is none."""
    begin = t
    while begin > 0 and status[begin - 1] == Status.MISSING and t - begin < _LONGEST_ASSUMED:
        begin -= 1
    days = t - begin + 1
    return days if begin > 0 and 2 <= days <= _LONGEST_ASSUMED else -1


def _present(rows: Ints, columns: Ints, shape: tuple[int, ...]) -> npt.NDArray[np.bool_]:
    """Return which days lie between the first and the last of a gauge in the file."""
    n, n_gauges = shape
    begin, stop = np.full(n_gauges, n), np.zeros(n_gauges, dtype=np.int64)
    np.minimum.at(begin, columns, rows)
    np.maximum.at(stop, columns, rows + 1)
    day = np.arange(n)[:, None]
    return np.asarray((begin <= day) & (day < stop))

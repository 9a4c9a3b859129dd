"""Joins the files of a source on one regular time axis."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems, ReadError
from basinrain.intervals import DAY, Interval
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.reading.blocks import Block
from basinrain.reading.spacing import check_spacing

__all__ = [
    "absent_steps",
    "check_length",
    "check_phase",
    "interval_end",
    "join_blocks",
    "join_cells",
    "positions",
    "unit_of",
]

_LISTED: Final = 3
_MOST_STEPS: Final = 20_000_000


def join_blocks(
    blocks: Sequence[Block], interval: Interval, *, zone: str, gaps: Literal["refuse", "missing"]
) -> RainRecord:
    """Return the record that the files of a source make together.

    Parameters
    ----------
    blocks
        One a file, in one clock; they may follow each other in time, hold different gauges, or both.
    interval
        The step; every end must be a whole number of steps from the others.
    zone
        The clock's name.
    gaps
        Whether times that are absent between a gauge's first and last are refused or become missing values. Before its
        first and after its last time a gauge is missing in any case.

    Returns
    -------
    RainRecord
        Accumulated values are in ``totals``.

    Raises
    ------
    ReadError
        Rows whose spacing is not the interval, times off the axis, a gauge and time in two files, undeclared gaps,
        accumulations that do not fit; all of a kind together.

    Examples
    --------
    >>> ends = np.array(["2031-05-04", "2031-05-06"], dtype="datetime64[s]")
    >>> cells = np.array([[1.0], [2.0]]), np.zeros((2, 1), dtype=np.uint8)
    >>> block = Block("rain.csv", ("W01",), ends, np.array([2, 3]), *cells, None, {})
    >>> join_blocks([block], Interval("1d", DAY), zone="", gaps="missing").depth[:, 0]
    array([ 1., nan,  2.])
    """
    problems = Problems()
    steps = [positions(block.ends, interval) for block in blocks]
    # A file of another interval would be off the axis line by line, or full of gaps.
    fitting = [block for block in blocks if check_spacing(block, interval, problems)]
    check_phase(fitting, interval, problems)
    problems.raise_as(ReadError)
    times = np.unique(np.concatenate(steps))
    gauges = tuple(dict.fromkeys(gauge for block in blocks for gauge in block.gauges))
    column = {gauge: g for g, gauge in enumerate(gauges)}
    if len(blocks) == 1:
        depth, status, present = blocks[0].depth, blocks[0].status, blocks[0].present
    else:
        depth, status, present = join_cells(blocks, steps, times, column, interval=interval, problems=problems)
    if gaps == "refuse":
        _check_gaps(times, present, gauges, blocks=blocks, interval=interval, problems=problems)
    n = check_length(int(times[0]), int(times[-1]), interval, problems)
    problems.raise_as(ReadError)
    if n > len(times):
        place = (times - times[0]) // unit_of(interval)
        sparse_depth, sparse_status = depth, status
        depth, status = np.full((n, len(gauges)), np.nan), np.full((n, len(gauges)), Status.MISSING, dtype=np.uint8)
        depth[place], status[place] = sparse_depth, sparse_status
    axis = times[0] + np.arange(n) * unit_of(interval)
    ends = interval_end(axis, interval)
    starts = interval_end(axis - unit_of(interval), interval)
    spans = {key: span for block in blocks for key, span in block.spans.items()}
    totals = _accumulations(depth, status, starts, ends, gauges, spans=spans, problems=problems, file=_files(blocks))
    problems.raise_as(ReadError)
    return RainRecord(
        gauges,
        starts,
        ends,
        depth,
        status,
        step=interval.label,
        zone=zone,
        totals=totals,
        day_phase=int(ends[0].astype(np.int64) % DAY) if interval.whole_days else 0,
    )


def check_length(first: int, last: int, interval: Interval, problems: Problems) -> int:
    """Return the number of steps of an axis; a problem where it is too long to be meant.

    Parameters
    ----------
    first, last
        Ends of its first and last step: seconds since 1970, or months since then where the interval is a month.
    interval
        The step.
    problems
        Takes the problem.

    Examples
    --------
    >>> problems = Problems()
    >>> check_length(3600, 7200, Interval("1h", 3600), problems), len(problems)
    (2, 0)
    """
    n = (last - first) // unit_of(interval) + 1
    if n > _MOST_STEPS:
        bounds = interval_end(np.array([first, last]), interval)
        problems.add(
            item="time axis",
            found=f"{n} steps of {interval.label} from {bounds[0]} to {bounds[1]}",
            expected=f"at most {_MOST_STEPS}",
            remedy="correct the first or last time",
        )
    return n


def unit_of(interval: Interval) -> int:
    """Return how far apart the positions of two steps are: seconds, or 1 for months."""
    return interval.seconds or 1


def positions(ends: npt.NDArray[np.datetime64], interval: Interval) -> npt.NDArray[np.int64]:
    """Return seconds since 1970, or months since then for monthly values."""
    return ends.astype("datetime64[M]" if interval.seconds is None else "datetime64[s]").astype(np.int64)


def interval_end(position: npt.NDArray[np.int64], interval: Interval) -> npt.NDArray[np.datetime64]:
    """Return the time of positions; the reverse of :func:`positions`."""
    kind = "datetime64[M]" if interval.seconds is None else "datetime64[s]"
    return np.asarray(position).astype(kind).astype("datetime64[s]")


def _files(blocks: Sequence[Block]) -> str:
    return blocks[0].file if len(blocks) == 1 else ""


def check_phase(blocks: Sequence[Block], interval: Interval, problems: Problems) -> None:
    """Report rows whose interval ends off the axis on which most of them do."""
    if interval.seconds is None or not blocks:
        return  # months begin where the calendar says
    phases = [block.ends.astype(np.int64) % interval.seconds for block in blocks]
    values, counts = np.unique(np.concatenate(phases), return_counts=True)
    if len(values) == 1:
        return
    usual = values[counts.argmax()]
    example = next(b.ends[p == usual][0] for b, p in zip(blocks, phases, strict=True) if (p == usual).any())
    for block, phase in zip(blocks, phases, strict=True):
        for row in np.flatnonzero(phase != usual):
            problems.add(
                item="time",
                found=f"an interval that ends at {block.ends[row]}",
                expected=f"a whole number of steps of {interval.label} from {example}",
                remedy="correct the stamp, or the interval",
                file=block.file,
                line=int(block.lines[row]) or None,
                time=str(block.ends[row]),
            )


def join_cells(
    blocks: Sequence[Block],
    steps: Sequence[npt.NDArray[np.int64]],
    times: npt.NDArray[np.int64],
    column: dict[str, int],
    *,
    interval: Interval,
    problems: Problems,
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8], npt.NDArray[np.bool_]]:
    """Return depth, status and presence of all files on one axis; a gauge and time in two files is a problem.

    Parameters
    ----------
    blocks, steps
        The files, and the positions of their rows: seconds since 1970, or months.
    times
        The positions of the axis.
    column
        The column of each gauge.
    interval
        The step, for messages.
    problems
        Takes the problems, each with file and line.
    """
    shape = (len(times), len(column))
    depth, status = np.full(shape, np.nan), np.full(shape, Status.MISSING, dtype=np.uint8)
    present = np.zeros(shape, dtype=bool)
    owner = np.zeros(shape, dtype=np.int16)
    for number, (block, mine) in enumerate(zip(blocks, steps, strict=True)):
        at = np.ix_(np.searchsorted(times, mine), np.array([column[gauge] for gauge in block.gauges]))
        here = np.ones(block.depth.shape, dtype=bool) if block.present is None else block.present
        both = np.argwhere(present[at] & here)
        for row, g in both if len(both) <= _LISTED else both[:1]:
            gauge, end = block.gauges[g], block.ends[row]
            first = blocks[owner[np.searchsorted(times, mine[row]), column[gauge]]].file
            more = f", and {len(both) - 1} more values like it" if len(both) > _LISTED else ""
            problems.add(
                item=f"gauge {gauge}",
                found=f"the {interval.label} that ends at {end}, which {first} has too{more}",
                expected="a gauge and time in one file only",
                remedy="remove it from one of the files",
                file=block.file,
                line=int(block.lines[row]) or None,
                gauge=gauge,
                time=str(end),
            )
        depth[at] = np.where(here, block.depth, depth[at])
        status[at] = np.where(here, block.status, status[at])
        owner[at] = np.where(here, number, owner[at])
        present[at] |= here
    return depth, status, present


def _check_gaps(
    times: npt.NDArray[np.int64],
    present: npt.NDArray[np.bool_] | None,
    gauges: tuple[str, ...],
    *,
    blocks: Sequence[Block],
    interval: Interval,
    problems: Problems,
) -> None:
    unit = unit_of(interval)
    remedy = "complete the file, or declare gaps = 'missing'"
    before = np.flatnonzero(np.diff(times) > unit)
    if present is not None:
        first, last = present.argmax(axis=0), len(times) - 1 - present[::-1].argmax(axis=0)
        # A gap between two files that share no gauge is nobody's gap.
        before = before[((first <= before[:, None]) & (last > before[:, None])).any(axis=1)]
    if len(before):
        absent = [
            int(times[k]) + unit * j
            for k in before[:_LISTED]
            for j in range(1, 1 + _LISTED)
            if times[k] + unit * j < times[k + 1]
        ]
        count = int((np.diff(times)[before] // unit - 1).sum())
        lines = dict(zip(times.tolist(), blocks[0].lines.tolist(), strict=True)) if len(blocks) == 1 else {}
        problems.add(
            item="time axis",
            found=absent_steps(np.array(absent), count, interval),
            expected="every step once",
            remedy=remedy,
            file=_files(blocks),
            line=lines.get(int(times[before[0] + 1])) or None,
        )
    if present is None:
        return
    rows = np.arange(len(times))
    inside = (rows[:, None] >= first) & (rows[:, None] <= last)
    lacking = inside & ~present
    for g in np.flatnonzero(lacking.any(axis=0)):
        where = times[lacking[:, g]]
        problems.add(
            item=f"gauge {gauges[g]}",
            found=absent_steps(where, len(where), interval),
            expected="every step once between its first and last",
            remedy=remedy,
            file=_files(blocks),
            gauge=gauges[g],
        )


def absent_steps(positions: npt.NDArray[np.int64], count: int, interval: Interval) -> str:
    """Return in words which steps have no row: their ``count``, and the first few of their ``positions``."""
    listed = ", ".join(str(end) for end in interval_end(positions[:_LISTED], interval))
    more = ", ..." if count > min(_LISTED, len(positions)) else ""
    return f"no {'row' if count == 1 else 'rows'} for {count} of the {interval.label} steps, ending at {listed}{more}"


def _accumulations(
    depth: npt.NDArray[np.float64],
    status: npt.NDArray[np.uint8],
    starts: npt.NDArray[np.datetime64],
    ends: npt.NDArray[np.datetime64],
    gauges: tuple[str, ...],
    *,
    spans: dict[tuple[str, np.datetime64], int],
    problems: Problems,
    file: str,
) -> tuple[KnownTotal, ...]:
    """Turn accumulated values, in place, into totals over their steps."""
    totals: list[KnownTotal] = []
    cells = [(int(t), int(g), 0) for t, g in np.argwhere((status == Status.ACCUMULATED) & ~np.isnan(depth))]
    column = {gauge: g for g, gauge in enumerate(gauges)}
    spanned = {(int(np.searchsorted(ends, end)), column[gauge]): span for (gauge, end), span in spans.items()}
    cells = [cell for cell in cells if cell[:2] not in spanned]
    cells += [(t, g, span) for (t, g), span in spanned.items()]
    for t, g, span in sorted(cells, key=lambda cell: (cell[1], cell[0])):
        if np.isnan(depth[t, g]):
            continue  # rejected or missing: nothing is known of any of its steps
        first = t - span + 1
        if not span:
            first = t
            while first > 0 and status[first - 1, g] == Status.MISSING:
                first -= 1
            if first == 0 and t > 0:
                _misfit(problems, gauges[g], ends[t], file, "no value before the missing steps it accumulates")
                continue
        elif (status[first:t, g] != Status.MISSING).any():
            _misfit(problems, gauges[g], ends[t], file, f"a value of their own in the {span} steps it accumulates")
            continue
        if first < t:
            totals.append(KnownTotal(gauges[g], starts[first], ends[t], float(depth[t, g])))
            depth[first : t + 1, g], status[first : t + 1, g] = np.nan, Status.ACCUMULATED
        else:
            status[t, g] = Status.ZERO if depth[t, g] == 0 else Status.OBSERVED
    return tuple(totals)


def _misfit(problems: Problems, gauge: str, end: np.datetime64, file: str, found: str) -> None:
    problems.add(
        item=f"gauge {gauge}: accumulated value of the step that ends at {end}",
        found=found,
        expected="missing steps directly before it, back to a known value",
        remedy="give the number of steps in a steps column, or correct the cells",
        file=file,
        gauge=gauge,
        time=str(end),
    )

"""Long rainfall files: a row for every value, with its gauge and time."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problems
from basinrain.intervals import Interval
from basinrain.rainfall import Status
from basinrain.reading.blocks import DEPTH_NAMES, FLAG_NAMES, GAUGE_NAMES, STEPS_NAMES, TIME_NAMES, Block
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthCells, DepthRules
from basinrain.reading.stamps import StampRules, read_stamps

__all__ = ["depth_column", "read_long", "report_blank", "required_columns"]

_LONGEST_SPAN = 366


def read_long(
    table: DelimitedTable,
    depths: DepthRules,
    stamps: StampRules,
    *,
    columns: Mapping[str, str],
    zone: str | None,
    problems: Problems,
) -> tuple[Block | None, str | None]:
    """Read a table with the columns gauge, time and depth, and optionally flag and steps.

    Rows may stand in any order. ``steps`` is the number of steps over which a value accumulates, itself included; the
    steps before it need no rows of their own.

    Parameters
    ----------
    table
        The file's cells.
    depths, stamps
        How to understand them. Marks stand in the flag column where there is one, else behind the number.
    columns
        Which column is ``gauge``, ``time``, ``depth``, ``flag``, ``steps``; else they are found by their names.
    zone
        The clock settled by earlier files; None when this is the first.
    problems
        Takes what is wrong with the file.

    Returns
    -------
    block, zone
        None where the file cannot be used at all.

    Examples
    --------
    >>> from basinrain.reading.depths import depth_rules
    >>> from basinrain.intervals import parse_interval
    >>> day = parse_interval("1d")
    >>> rules = depth_rules(unit="mm", interval=day, missing=[], trace=["T"], flags={}, accumulated=None)
    >>> frame = pd.DataFrame({"gauge": ["W02", "W01"], "date": ["2031-05-04"] * 2, "depth": ["1.5", "T"]})
    >>> table = DelimitedTable("rain.csv", ("gauge", "date", "depth"), frame, np.array([2, 3]), ".")
    >>> block, zone = read_long(table, rules, StampRules(interval=day), columns={}, zone=None, problems=Problems())
    >>> block.gauges, block.depth
    (('W02', 'W01'), array([[1.5, 0. ]]))
    """
    needed = required_columns(
        table, {"gauge": GAUGE_NAMES, "time": TIME_NAMES, "depth": DEPTH_NAMES}, columns, problems
    )
    optional = {
        key: find_column(table.columns, names, mapped=columns.get(key), key=key, problems=problems)
        for key, names in (("flag", FLAG_NAMES), ("steps", STEPS_NAMES))
    }
    if needed is None:
        return None, zone
    before = len(problems)
    time_codes, times = pd.factorize(table.frame[needed["time"]])
    texts = [str(text) for text in times]
    ends, zone, faults = read_stamps(texts, stamps, zone=zone)
    firsts = _first_rows(time_codes, len(texts))
    for fault in faults:
        problems.add(
            item=f"column {needed['time']}",
            found=fault.found,
            expected=fault.expected,
            remedy=fault.remedy,
            line=int(table.lines[firsts[fault.row]]),
            time=texts[fault.row],
        )
    gauge_codes, names = pd.factorize(table.frame[needed["gauge"]])
    gauges = tuple(str(name) for name in names)
    report_blank(table, needed["gauge"], "gauge", problems)
    depth, status = depth_column(table, depths, needed, optional["flag"], problems)
    steps = _steps(table, optional["steps"], problems)
    if len(problems) > before:
        return None, zone
    # Two texts may name one time: 08:00 and 08:00:00.
    axis, place = np.unique(ends, return_inverse=True)
    rows = place[time_codes]
    key = rows * len(gauges) + gauge_codes
    _check_twice(key, texts, time_codes, gauges=gauges, gauge_codes=gauge_codes, table=table, problems=problems)
    if len(problems) > before:
        return None, zone
    spans = {
        (gauges[gauge_codes[row]], axis[rows[row]]): int(steps[row])
        for row in np.flatnonzero(steps > 1)
    }  # fmt: skip
    full, covered = _with_covered(axis, spans, stamps.interval)
    place = np.searchsorted(full, axis)
    shape = (len(full), len(gauges))
    block_depth, block_status = np.full(shape, np.nan), np.full(shape, Status.MISSING, dtype=np.uint8)
    present = np.zeros(shape, dtype=bool)
    at = (place[rows], gauge_codes)
    block_depth[at], block_status[at], present[at] = depth, status, True
    for gauge, end in covered:
        present[np.searchsorted(full, end), gauges.index(gauge)] = True
    lines = np.zeros(len(full), dtype=np.int64)
    lines[place] = table.lines[_first_rows(rows, len(axis))]
    return Block(table.file, gauges, full, lines, block_depth, block_status, present, spans), zone


def required_columns(
    table: DelimitedTable, names: Mapping[str, tuple[str, ...]], columns: Mapping[str, str], problems: Problems
) -> dict[str, str] | None:
    """Return the columns that must be there, by their key; None where one is not, which is a problem."""
    found = {}
    for key, known in names.items():
        column = find_column(table.columns, known, mapped=columns.get(key), key=key, problems=problems)
        if column is not None:
            found[key] = column
        elif key not in columns:
            problems.add(
                item="the header",
                found=f"no column for the {key} among: {', '.join(table.columns)}",
                expected="one of: " + ", ".join(known),
                remedy=f"name it in columns.{key}",
            )
    return found if len(found) == len(names) else None


def report_blank(table: DelimitedTable, column: str, what: str, problems: Problems) -> None:
    """Report the rows whose ``column``, which names the ``what``, is blank."""
    for row in np.flatnonzero((table.frame[column] == "").to_numpy()):
        problems.add(item=f"column {column}", found="a blank cell", expected=f"the {what}", line=int(table.lines[row]))


def depth_column(
    table: DelimitedTable, rules: DepthRules, needed: Mapping[str, str], flag: str | None, problems: Problems
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
    """Return depth and status of every row, its faulty cells reported with gauge and line."""
    depth, status, wrong = DepthCells(table, rules).column(needed["depth"], flag=flag)
    for row, cell in wrong:
        gauge = str(table.frame[needed["gauge"]].iloc[row])
        problems.add(
            item=f"gauge {gauge}",
            found=cell.found,
            expected=cell.expected,
            remedy=cell.remedy,
            line=int(table.lines[row]),
            column=needed["depth"],
            gauge=gauge,
        )
    return depth, status


def _first_rows(codes: npt.NDArray[np.int64], n: int) -> npt.NDArray[np.int64]:
    first = np.zeros(n, dtype=np.int64)
    first[codes[::-1]] = np.arange(len(codes))[::-1]
    return first


def _steps(table: DelimitedTable, column: str | None, problems: Problems) -> npt.NDArray[np.int64]:
    if column is None:
        return np.ones(len(table.frame), dtype=np.int64)
    values, bad = numbers(table, column)
    values = np.where(np.isnan(values) & ~bad, 1.0, values)
    wrong = bad | ~((values >= 1) & (values <= _LONGEST_SPAN) & (values % 1 == 0))
    for row in np.flatnonzero(wrong):
        problems.add(
            item=f"column {column}",
            found=f"'{table.frame[column].iloc[row]}'",
            expected=f"a whole number of steps, 1 to {_LONGEST_SPAN}",
            line=int(table.lines[row]),
        )
    return np.where(wrong, 1, values).astype(np.int64)


def _check_twice(
    key: npt.NDArray[np.int64],
    texts: list[str],
    time_codes: npt.NDArray[np.int64],
    *,
    gauges: tuple[str, ...],
    gauge_codes: npt.NDArray[np.int64],
    table: DelimitedTable,
    problems: Problems,
) -> None:
    twice = pd.Series(key).duplicated().to_numpy()
    if not twice.any():
        return
    first = {int(k): int(row) for row, k in reversed(list(enumerate(key.tolist())))}
    for row in np.flatnonzero(twice):
        problems.add(
            item=f"gauge {gauges[gauge_codes[row]]}",
            found=f"'{texts[time_codes[row]]}', as in line {table.lines[first[int(key[row])]]}",
            expected="each time once for a gauge",
            remedy="remove one of the rows",
            line=int(table.lines[row]),
            gauge=gauges[gauge_codes[row]],
            time=texts[time_codes[row]],
        )


def _with_covered(
    axis: npt.NDArray[np.datetime64], spans: Mapping[tuple[str, np.datetime64], int], interval: Interval
) -> tuple[npt.NDArray[np.datetime64], list[tuple[str, np.datetime64]]]:
    """Return the axis with the ends of steps that a span covers, and these ends by gauge."""
    covered: list[tuple[str, np.datetime64]] = []
    for (gauge, end), steps in spans.items():
        for back in range(1, steps):
            if interval.seconds is None:
                earlier = (end.astype("datetime64[M]") - back).astype("datetime64[s]")
            else:
                earlier = end - np.timedelta64(back * interval.seconds, "s")
            covered.append((gauge, earlier))
    if not covered:
        return axis, covered
    return np.union1d(axis, np.array([end for _, end in covered], dtype="datetime64[s]")), covered

"""Rows of tipping-bucket logs: which gauge, when, how much; in order, and each once."""

from __future__ import annotations

import itertools
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problems
from basinrain.intervals import Interval
from basinrain.reading.blocks import DEPTH_NAMES, GAUGE_NAMES, TIME_NAMES
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthCells, DepthRules
from basinrain.reading.long import report_blank, required_columns
from basinrain.reading.stamps import StampRules, read_stamps

__all__ = ["TipLog", "join_logs", "moment", "read_logs"]

_FRACTION: Final = re.compile(r"(:[0-9]{2})[.,]([0-9]+)")
_FEWEST_TWICE: Final = 3
"""With so many times, each of them twice, rows were doubled; a bucket that tips twice in a second does not always."""


@dataclass(frozen=True, eq=False)
class TipLog:
    """Rows of one gauge, in order of time.

    Parameters
    ----------
    file
        The file that they are from; ``""`` for several.
    seconds : array of int, shape (n_rows,)
        Seconds since 1970 in the source's clock, rounded up. Bounds of steps are whole minutes, so that a fraction of a
        second and the next whole second are in one step.
    depth : array of float, shape (n_rows,)
        mm; NaN where recording stops.
    lines : array of int, shape (n_rows,)
        Lines of the file.
    joints : array of int, shape (n_files - 1,)
        The first row of every file but the first.
    """

    file: str
    seconds: npt.NDArray[np.int64]
    depth: npt.NDArray[np.float64]
    lines: npt.NDArray[np.int64]
    joints: npt.NDArray[np.int64] = field(default_factory=lambda: np.zeros(0, dtype=np.int64))


def read_logs(
    table: DelimitedTable,
    depths: DepthRules,
    stamps: StampRules,
    *,
    tip: float | None,
    columns: Mapping[str, str],
    zone: str | None,
    problems: Problems,
) -> tuple[dict[str, TipLog], str | None]:
    """Read the rows of a file, by gauge.

    Parameters
    ----------
    table
        The file's cells.
    depths, stamps
        How to understand them.
    tip
        mm of one tip; None where a depth column says so.
    columns
        Which column is ``gauge``, ``time``, ``depth``; else they are found by their names. Without a gauge column the
        gauge is the one that the file is named for.
    zone
        The clock settled by earlier files; None when this is the first.
    problems
        Takes what is wrong with the file.

    Returns
    -------
    logs, zone
        Not to be used where there are problems.
    """
    needed = required_columns(table, {"time": TIME_NAMES}, columns, problems)
    gauge, depth = (
        find_column(table.columns, names, mapped=columns.get(key), key=key, problems=problems)
        for key, names in (("gauge", GAUGE_NAMES), ("depth", DEPTH_NAMES))
    )
    _check_depth_column(table, depth, tip, columns, problems)
    if needed is None or len(problems):
        return {}, zone
    time = needed["time"]
    seconds, zone = _seconds(table, time, stamps, zone, problems)
    if gauge is None:
        names: Sequence[str] = (Path(table.file).stem,)
        codes = np.zeros(len(table.frame), dtype=np.int64)
    else:
        report_blank(table, gauge, "gauge", problems)
        codes, texts = pd.factorize(table.frame[gauge])
        names = [str(text) for text in texts]
    if depth is None:
        fell = np.full(len(table.frame), tip, dtype=float)
    else:
        fell, _, wrong = DepthCells(table, depths).column(depth)
        for row, cell in wrong:
            problems.add(
                item=f"gauge {names[codes[row]]}",
                found=cell.found,
                expected=cell.expected,
                remedy=cell.remedy,
                line=int(table.lines[row]),
                column=depth,
                gauge=names[codes[row]],
            )
    if len(problems):
        return {}, zone
    logs = {}
    order = np.argsort(codes, kind="stable")
    for code, rows in enumerate(np.split(order, np.flatnonzero(np.diff(codes[order])) + 1)):
        log = TipLog(table.file, seconds[rows], fell[rows], table.lines[rows])
        if _is_orderly(names[code], log, table.frame[time], rows, problems):
            logs[names[code]] = log
    return logs, zone


def _check_depth_column(
    table: DelimitedTable, depth: str | None, tip: float | None, columns: Mapping[str, str], problems: Problems
) -> None:
    if tip is not None and depth is not None:
        problems.add(
            item="tip",
            found=f"it beside the depth column '{depth}'",
            expected="one of the two",
            remedy="leave out tip, since the file says what every row is",
        )
    elif tip is None and depth is None and "depth" not in columns:
        problems.add(
            item="the header",
            found=f"no column for the depth among: {', '.join(table.columns)}",
            expected="tip, the depth of one tip, or a column of depths",
            remedy="declare tip, or name the column in columns.depth",
        )


def _seconds(
    table: DelimitedTable, time: str, stamps: StampRules, zone: str | None, problems: Problems
) -> tuple[npt.NDArray[np.int64], str]:
    """Return every row's time in whole seconds since 1970, rounded up, and the clock."""
    texts = table.frame[time].tolist()
    cells = texts
    part = np.zeros(len(cells), dtype=bool)
    if stamps.time_format is None:
        found = {row: match for row, cell in enumerate(cells) if (match := _FRACTION.search(cell))}
        if found:
            cells = [
                cell[: match.end(1)] + cell[match.end() :] if (match := found.get(row)) else cell
                for row, cell in enumerate(cells)
            ]
            part[[row for row, match in found.items() if match[2].strip("0")]] = True
    # The kind of the stamps is that of a step shorter than a day, whatever the step is.
    ends, clock, faults = read_stamps(cells, replace(stamps, interval=Interval("1min", 60)), zone=zone)
    if stamps.time_format is not None and "%f" in stamps.time_format:
        moments = pd.to_datetime(pd.Series(texts, dtype=str), format=stamps.time_format, errors="coerce")
        part = (moments.dt.microsecond > 0).to_numpy()
    for fault in faults:
        bare = fault.remedy == "correct interval"
        problems.add(
            item=f"column {time}",
            found=fault.found.replace(f"'{cells[fault.row]}'", f"'{texts[fault.row]}'"),
            expected="a date with a time of day" if bare else fault.expected,
            remedy="give the time of every tip" if bare else fault.remedy,
            line=int(table.lines[fault.row]),
            time=texts[fault.row],
        )
    return ends.astype(np.int64) + part, clock


def _is_orderly(
    gauge: str, log: TipLog, times: pd.Series[str], rows: npt.NDArray[np.int64], problems: Problems
) -> bool:
    """Report, in one line for the gauge, rows out of order or all rows twice."""
    latest = np.maximum.accumulate(log.seconds)
    back = np.flatnonzero(log.seconds < latest)
    if len(back):
        place = int(back[0])
        more = f", and {len(back) - 1} more like it" if len(back) > 1 else ""
        problems.add(
            item=f"gauge {gauge}",
            found=f"'{times.iloc[rows[place]]}' after a later time{more}",
            expected="tips in order of time",
            remedy="sort the rows by time; rows of the same time are tips of their own, and stay",
            line=int(log.lines[place]),
            gauge=gauge,
            time=str(times.iloc[rows[place]]),
        )
        return False
    _, counts = np.unique(log.seconds, return_counts=True)
    if len(counts) >= _FEWEST_TWICE and counts.min() > 1:
        problems.add(
            item=f"gauge {gauge}",
            found="every time at least twice",
            expected="a row for every tip",
            remedy="remove the rows that stand twice",
            line=int(log.lines[1]),
            gauge=gauge,
        )
        return False
    return True


def join_logs(gauge: str, logs: list[TipLog], problems: Problems) -> TipLog:
    """Return the rows of a gauge in all files, in order; files that overlap are problems.

    Examples
    --------
    >>> one = TipLog("may.csv", np.array([60, 90]), np.array([0.2, 0.2]), np.array([2, 3]))
    >>> two = TipLog("june.csv", np.array([150]), np.array([0.2]), np.array([2]))
    >>> log = join_logs("R07", [two, one], Problems())
    >>> log.seconds, log.joints
    (array([ 60,  90, 150]), array([2]))
    """
    ordered = sorted(logs, key=lambda log: (int(log.seconds[0]), int(log.seconds[-1])))
    for earlier, later in itertools.pairwise(ordered):
        if later.seconds[0] <= earlier.seconds[-1]:
            problems.add(
                item=f"gauge {gauge}",
                found=f"rows from {moment(later.seconds[0])}, and in {earlier.file} until "
                f"{moment(earlier.seconds[-1])}",
                expected="files of a gauge that follow on each other",
                remedy="remove what both files have from one of them",
                file=later.file,
                line=int(later.lines[0]),
                gauge=gauge,
                time=moment(later.seconds[0]),
            )
    if len(ordered) == 1:
        return ordered[0]
    return TipLog(
        "",
        np.concatenate([log.seconds for log in ordered]),
        np.concatenate([log.depth for log in ordered]),
        np.concatenate([log.lines for log in ordered]),
        np.cumsum([len(log.seconds) for log in ordered[:-1]]),
    )


def moment(seconds: int) -> str:
    """Return a time in ISO 8601.

    Examples
    --------
    >>> moment(90)
    '1970-01-01T00:01:30'
    """
    return str(np.datetime64(int(seconds), "s"))

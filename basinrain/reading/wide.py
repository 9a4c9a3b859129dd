"""Wide rainfall files: a row for every time, a column for every gauge."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.reading.blocks import TIME_NAMES, Block
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthCells, DepthRules, Judged
from basinrain.reading.order import check_order
from basinrain.reading.stamps import StampRules, read_stamps

__all__ = ["read_wide", "wide_cells"]


def read_wide(
    table: DelimitedTable,
    depths: DepthRules,
    stamps: StampRules,
    *,
    columns: Mapping[str, str],
    zone: str | None,
    problems: Problems,
) -> tuple[Block | None, str | None]:
    """Read a table with the times in one column and a column for every gauge.

    Parameters
    ----------
    table
        The file's cells.
    depths, stamps
        How to understand them. A mark may follow the number in its cell.
    columns
        ``time``: the column of times; else the first one named like a time, else the first one.
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
    >>> import pandas as pd
    >>> from basinrain.reading.depths import depth_rules
    >>> from basinrain.intervals import parse_interval
    >>> day = parse_interval("1d")
    >>> rules = depth_rules(unit="mm", interval=day, missing=[], trace=["T"], flags={}, accumulated=None)
    >>> frame = pd.DataFrame({"date": ["2031-05-04"], "W01": ["1.5"], "W02": ["T"]})
    >>> table = DelimitedTable("rain.csv", ("date", "W01", "W02"), frame, np.array([2]), ".")
    >>> block, zone = read_wide(table, rules, StampRules(interval=day), columns={}, zone=None, problems=Problems())
    >>> block.gauges, block.depth, str(block.ends[0])
    (('W01', 'W02'), array([[1.5, 0. ]]), '2031-05-05T00:00:00')
    """
    mapped = columns.get("time")
    time = find_column(table.columns, TIME_NAMES, mapped=mapped, key="time", problems=problems)
    if time is None:
        if mapped is not None:
            return None, zone
        time = table.columns[0]
    gauges = tuple(column for column in table.columns if column != time)
    if not gauges:
        problems.add(item="the header", found=f"only the column '{time}'", expected="a column for every gauge")
        return None, zone
    cells = table.frame[time].tolist()
    ends, zone, faults = read_stamps(cells, stamps, zone=zone)
    for fault in faults:
        problems.add(
            item=f"column {time}",
            found=fault.found,
            expected=fault.expected,
            remedy=fault.remedy,
            line=int(table.lines[fault.row]),
            time=cells[fault.row],
        )
    check_order(ends, cells.__getitem__, table.lines, item=f"column {time}", problems=problems)
    depth, status = wide_cells(table, gauges, time, depths, problems)
    if faults:
        return None, zone
    block = Block(table.file, gauges, ends, table.lines, depth, status, None, {})
    return block, zone


def wide_cells(
    table: DelimitedTable,
    gauges: Sequence[str],
    time: str,
    rules: DepthRules,
    problems: Problems,
    *,
    judged: Judged | None = None,
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
    """Return depth and status of the gauges' columns, their faulty cells reported by gauge, line and time.

    ``judged`` takes and gives what is known of the texts of other rows of the file.
    """
    depth = np.empty((len(table.lines), len(gauges)))
    status = np.empty((len(table.lines), len(gauges)), dtype=np.uint8)
    reader = DepthCells(table, rules, judged=judged)
    for place, gauge in enumerate(gauges):
        depth[:, place], status[:, place], wrong = reader.column(gauge)
        for row, cell in wrong:
            problems.add(
                item=f"gauge {gauge}",
                found=cell.found,
                expected=cell.expected,
                remedy=cell.remedy,
                line=int(table.lines[row]),
                column=gauge,
                gauge=gauge,
                time=str(table.frame[time].iloc[row]),
            )
    return depth, status

"""Files of storm totals without times: gauge, depth and the storm's name."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd

from basinrain.errors import Problems, ReadError
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.blocks import DEPTH_NAMES, FLAG_NAMES, GAUGE_NAMES, STORM_NAMES, problems_of
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthRules
from basinrain.reading.long import depth_column, report_blank, required_columns

__all__ = ["read_totals"]

_ONLY = "storm"


def read_totals(
    tables: Sequence[DelimitedTable], depths: DepthRules, *, columns: Mapping[str, str], problems: Problems
) -> RainRecord:
    """Read tables with the columns gauge and depth, and optionally storm and flag.

    Parameters
    ----------
    tables
        The files' cells; a storm and gauge may stand once in all of them.
    depths
        How to understand the depths.
    columns
        Which column is ``gauge``, ``depth``, ``storm``, ``flag``; else they are found by their names.
    problems
        Takes what is wrong; all of it is raised at the end.

    Returns
    -------
    RainRecord
        A step for every storm, in the order of their first rows, without times; a storm in which a gauge has no row is
        missing there. Without a storm column the only storm is named ``"storm"``.

    Examples
    --------
    >>> from basinrain.reading.depths import depth_rules
    >>> rules = depth_rules(unit="in", interval=None, missing=[], trace=["T"], flags={}, accumulated=None)
    >>> frame = pd.DataFrame({"gauge": ["W01", "W02"], "depth": ["1", "0.5"]})
    >>> table = DelimitedTable("totals.csv", ("gauge", "depth"), frame, np.array([2, 3]), ".")
    >>> record = read_totals([table], rules, columns={}, problems=Problems())
    >>> record.labels, record.depth
    (('storm',), array([[25.4, 12.7]]))
    """
    rows: list[pd.DataFrame] = []
    for table in tables:
        with problems_of(table.file, problems) as here:
            needed = required_columns(table, {"gauge": GAUGE_NAMES, "depth": DEPTH_NAMES}, columns, here)
            storm, flag = (
                find_column(table.columns, names, mapped=columns.get(key), key=key, problems=here)
                for key, names in (("storm", STORM_NAMES), ("flag", FLAG_NAMES))
            )
            if needed is None:
                continue
            report_blank(table, needed["gauge"], "gauge", here)
            if storm is not None:
                report_blank(table, storm, "storm", here)
            depth, status = depth_column(table, depths, needed, flag, here)
            rows.append(
                pd.DataFrame(
                    {
                        "gauge": table.frame[needed["gauge"]],
                        "storm": _ONLY if storm is None else table.frame[storm],
                        "depth": depth,
                        "status": status,
                        "file": table.file,
                        "line": table.lines,
                    }
                )
            )
    problems.raise_as(ReadError)
    every = pd.concat(rows, ignore_index=True)
    accumulated = (every["status"] == int(Status.ACCUMULATED)).to_numpy()
    status = np.where(accumulated, np.where(every["depth"] == 0, Status.ZERO, Status.OBSERVED), every["status"])
    for row in np.flatnonzero(every.duplicated(["gauge", "storm"]).to_numpy()):
        gauge, storm_name = every["gauge"].iloc[row], every["storm"].iloc[row]
        problems.add(
            item=f"gauge {gauge}",
            found=f"a second total of storm '{storm_name}'",
            expected="one total for a gauge and storm",
            remedy="remove one of the rows",
            file=every["file"].iloc[row],
            line=int(every["line"].iloc[row]),
            gauge=gauge,
        )
    problems.raise_as(ReadError)
    storm_codes, storms = pd.factorize(every["storm"])
    gauge_codes, gauges = pd.factorize(every["gauge"])
    shape = (len(storms), len(gauges))
    all_depth, all_status = np.full(shape, np.nan), np.full(shape, Status.MISSING, dtype=np.uint8)
    all_depth[storm_codes, gauge_codes], all_status[storm_codes, gauge_codes] = every["depth"], status
    never = np.full(len(storms), "NaT", dtype="datetime64[s]")
    return RainRecord(
        tuple(map(str, gauges)),
        never,
        never.copy(),
        all_depth,
        all_status,
        step="storm",
        labels=tuple(map(str, storms)),
        recorders=frozenset(),
    )

"""Where the values of a table of depths by duration and frequency stand: long, or wide for one point."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
import pandas as pd

from basinrain.errors import Problems
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.long import report_blank, required_columns

__all__ = ["AEP", "PERCENT", "PROBABILITIES", "YEARS", "DesignCells", "long_cells", "wide_cells"]

AEP: Final = "aep"
"""Annual exceedance probabilities as fractions."""

PERCENT: Final = "aep-percent"
"""Annual exceedance probabilities as percent."""

YEARS: Final = "return-period"
"""Return periods in years."""

PROBABILITIES: Final = (AEP, PERCENT, YEARS)
"""How a table may state its frequencies."""

# Common practice in such tables.
# fmt: off
_POINTS: Final = ("point", "point_id", "point_name", "id", "name", "site", "site_id", "station", "station_id", "gauge",
                  "gauge_id")
_DURATIONS: Final = ("duration", "dur", "storm_duration")
_FREQUENCIES: Final = MappingProxyType({
    AEP: ("aep", "probability", "annual_exceedance_probability", "exceedance_probability"),
    PERCENT: ("aep_percent", "aep_%", "aep_pct", "aep(%)", "aep_(%)", "aep", "percent", "probability_percent",
              "probability"),
    YEARS: ("return_period", "return_period_years", "return_period_yr", "return_period_y", "rp", "t", "ari",
            "recurrence_interval", "average_recurrence_interval", "years"),
})
# fmt: on
_DEPTHS: Final = ("depth", "rain", "rainfall", "precipitation", "amount")
_INTENSITIES: Final = ("intensity", "rate")


@dataclass(frozen=True, eq=False, kw_only=True)
class DesignCells:
    """A row for every value, and the columns where its parts stand.

    Parameters
    ----------
    table : DelimitedTable
        The rows, with the line of the file on which each stands.
    duration, probability, depth : str
        Columns of the table.
    point : str or None
        Column of the points' ids; None where all values are of one point.
    wide : bool
        Whether the probabilities are headings of the file.
    """

    table: DelimitedTable
    duration: str
    probability: str
    depth: str
    point: str | None = None
    wide: bool = False


def long_cells(
    table: DelimitedTable,
    *,
    unit: str,
    probability: str,
    duration_unit: str | None,
    columns: Mapping[str, str],
    problems: Problems,
) -> DesignCells | None:
    """Return the cells of a table with a row for every value.

    Parameters
    ----------
    table
        The file's cells.
    unit, probability, duration_unit
        What is declared; a unit in a column's name counts only where it is the declared one.
    columns
        Which column is ``point``, ``duration``, ``probability``, ``depth``; else they are found by their names.
    problems
        Takes columns that are not there, and blank ids.

    Returns
    -------
    DesignCells or None
        None where a column is not there.

    Examples
    --------
    >>> frame = pd.DataFrame({"duration_h": ["1"], "AEP": ["0.1"], "depth": ["30"]})
    >>> table = DelimitedTable("depths.csv", tuple(frame.columns), frame, np.array([2]), ".")
    >>> cells = long_cells(table, unit="mm", probability="aep", duration_unit="h", columns={}, problems=Problems())
    >>> cells.duration, cells.probability, cells.depth, cells.point
    ('duration_h', 'AEP', 'depth', None)
    """
    depths = _INTENSITIES if unit.endswith("/h") else _DEPTHS
    in_name = re.sub(r"[\s.\-]+", "_", unit)
    needed = required_columns(
        table,
        {
            "duration": (*_DURATIONS, *(f"{word}_{duration_unit}" for word in _DURATIONS)),
            "probability": _FREQUENCIES[probability],
            "depth": (*depths, *(f"{word}_{in_name}" for word in depths)),
        },
        columns,
        problems,
    )
    point = find_column(table.columns, _POINTS, mapped=columns.get("point"), key="point", problems=problems)
    if needed is None or (point is None and "point" in columns):
        return None
    if point is not None:
        report_blank(table, point, "point", problems)
    return DesignCells(
        table=table,
        duration=needed["duration"],
        probability=needed["probability"],
        depth=needed["depth"],
        point=point,
    )


def wide_cells(table: DelimitedTable, *, columns: Mapping[str, str], problems: Problems) -> DesignCells | None:
    """Return the cells of a table of one point, with a row for every duration and a column for every frequency.

    Parameters
    ----------
    table
        The file's cells.
    columns
        ``duration``: the column of durations; else the first one.
    problems
        Takes columns that are not there.

    Returns
    -------
    DesignCells or None
        None where a column is not there.

    Examples
    --------
    >>> frame = pd.DataFrame({"duration": ["1h", "2h"], "10": ["30", "40"], "100": ["45", "60"]})
    >>> table = DelimitedTable("depths.csv", tuple(frame.columns), frame, np.array([2, 3]), ".")
    >>> cells = wide_cells(table, columns={}, problems=Problems())
    >>> cells.table.frame.to_numpy().tolist(), cells.table.lines.tolist()
    ([['1h', '10', '30'], ['1h', '100', '45'], ['2h', '10', '40'], ['2h', '100', '60']], [2, 2, 3, 3])
    """
    mapped = columns.get("duration")
    duration = find_column(table.columns, (), mapped=mapped, key="duration", problems=problems)
    if duration is None:
        if mapped is not None:
            return None
        duration = table.columns[0]
    headings = [column for column in table.columns if column != duration]
    if not headings:
        problems.add(
            item="the header", found=f"only the column '{duration}'", expected="a column for every frequency as well"
        )
        return None
    n = len(table.lines)
    named = (duration, "its heading", "its cell")
    frame = pd.DataFrame(
        dict(
            zip(
                named,
                (
                    np.repeat(table.frame[duration].to_numpy(), len(headings)),
                    np.tile(np.array(headings, dtype=object), n),
                    table.frame[headings].to_numpy().ravel(),
                ),
                strict=True,
            )
        )
    )
    lines = np.repeat(table.lines, len(headings))
    long = DelimitedTable(table.file, named, frame, lines, table.decimal)
    return DesignCells(table=long, duration=named[0], probability=named[1], depth=named[2], wide=True)

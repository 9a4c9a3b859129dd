"""Positions of the points of a long table, which repeats them in every row."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.errors import DataError, Problems
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.vector import add_no_crs

__all__ = ["POSITION_NAMES", "each_of", "read_positions"]

Floats = npt.NDArray[np.float64]

POSITION_NAMES: Final = MappingProxyType(
    {
        "lon": ("lon", "longitude", "long", "lng"),
        "lat": ("lat", "latitude"),
        "x": ("x", "easting", "east", "x_coord"),
        "y": ("y", "northing", "north", "y_coord"),
    }
)
"""Names under which coordinates are known (common practice), by their key in a job's ``columns``."""

_LISTED: Final = 50


def each_of(rows: npt.NDArray[np.intp], problems: Problems) -> Iterator[int]:
    """Yield the first rows that are at fault, and count the rest as problems that are not listed.

    Examples
    --------
    >>> problems = Problems()
    >>> len(list(each_of(np.arange(1000), problems))), len(problems)
    (50, 950)
    """
    yield from rows[:_LISTED].tolist()
    if len(rows) > _LISTED:
        problems.extend(DataError((), unlisted=len(rows) - _LISTED))


def read_positions(
    table: DelimitedTable,
    point: npt.NDArray[np.int64],
    points: Sequence[str],
    *,
    columns: Mapping[str, str],
    crs: str | None,
    problems: Problems,
) -> tuple[Floats, str]:
    """Return the positions of points.

    Parameters
    ----------
    table
        The file's cells.
    point : array of int, shape (n_rows,)
        The point of every row, as a place in ``points``.
    points
        Their ids.
    columns
        Which column is ``lon``, ``lat``, ``x``, ``y``; else they are found by their names. With a projected or local
        ``crs``, x and y are taken, else longitude and latitude where there are both.
    crs
        The positions' coordinate system; None is EPSG:4326 for longitude and latitude.
    problems
        Takes what is wrong: one coordinate without the other, cells that are no numbers, points with two positions,
        degrees that no place has, x and y without a coordinate system.

    Returns
    -------
    positions : array of float, shape (n_points, 2)
        NaN where a point has none. A position may stand in one of a point's rows or in several.
    crs : str
        Empty where no point has a position.

    Examples
    --------
    >>> import pandas as pd
    >>> frame = pd.DataFrame({"lon": ["9.5", "", "9.6"], "lat": ["47", "", "47.1"]})
    >>> table = DelimitedTable("depths.csv", ("lon", "lat"), frame, np.arange(2, 5), ".")
    >>> read_positions(table, np.array([0, 0, 1]), ["Quill", "Reed"], columns={}, crs=None, problems=Problems())
    (array([[ 9.5, 47. ],
           [ 9.6, 47.1]]), 'EPSG:4326')
    """
    positions = np.full((len(points), 2), np.nan)
    found = {
        key: find_column(table.columns, names, mapped=columns.get(key), key=key, problems=problems)
        for key, names in POSITION_NAMES.items()
    }
    planar = (crs is not None and not ground.is_geographic(crs)) or bool({"x", "y"} & set(columns))
    if not planar and not (found["lon"] and found["lat"]) and found["x"] and found["y"]:
        planar = True
    keys = ("x", "y") if planar else ("lon", "lat")
    pair = tuple(found[key] for key in keys)
    if not all(pair):
        # A mapped column that is not there has been reported.
        for key, other in zip(keys, reversed(keys), strict=True):
            if found[key] is None and found[other] is not None and key not in columns:
                problems.add(
                    item="the points' positions",
                    found=f"no column for {key} beside '{found[other]}'",
                    expected=" and ".join(keys),
                    remedy=f'name it with columns = {{ {key} = "..." }}',
                )
        return positions, ""
    if planar and crs is None:
        add_no_crs(problems)
    cells = _coordinates(table, pair, point, points, problems)
    known = np.flatnonzero(~np.isnan(cells).any(axis=1))
    places, first = np.unique(point[known], return_index=True)
    positions[places] = cells[known[first]]
    line_of = np.zeros(len(points), dtype=np.int64)
    line_of[places] = table.lines[known[first]]
    other = known[(cells[known] != positions[point[known]]).any(axis=1)]
    # Each point once, however many rows it has.
    for row in each_of(other[np.sort(np.unique(point[other], return_index=True)[1])], problems):
        p = int(point[row])
        problems.add(
            item=f"point {points[p]}",
            found=f"position ({cells[row, 0]:.10g}, {cells[row, 1]:.10g}), and ({positions[p, 0]:.10g}, "
            f"{positions[p, 1]:.10g}) on line {line_of[p]}",
            expected="one position for a point",
            remedy="correct one of them, or give the points two ids",
            line=int(table.lines[row]),
        )
    used = crs or (ground.LONLAT if not planar else "")
    if used and ground.is_geographic(used):
        _check_degrees(positions, points, line_of, problems)
    return positions, used if len(known) else ""


def _check_degrees(
    positions: Floats, points: Sequence[str], line_of: npt.NDArray[np.int64], problems: Problems
) -> None:
    with np.errstate(invalid="ignore"):
        wrong = (np.abs(positions[:, 0]) > 180) | (np.abs(positions[:, 1]) > 90)
    for p in each_of(np.flatnonzero(wrong), problems):
        x, y = positions[p].tolist()
        problems.add(
            item=f"point {points[p]}",
            found=f"longitude {x:.10g} and latitude {y:.10g}",
            expected="degrees that a place can have",
            remedy=ground.degree_fault(x, y),
            line=int(line_of[p]),
        )


def _coordinates(
    table: DelimitedTable,
    pair: Sequence[str | None],
    point: npt.NDArray[np.int64],
    points: Sequence[str],
    problems: Problems,
) -> Floats:
    cells = np.empty((len(table.lines), 2))
    bad = np.zeros(cells.shape, dtype=bool)
    for k, column in enumerate(pair):
        cells[:, k], bad[:, k] = numbers(table, str(column))
    blank = np.isnan(cells) & ~bad
    wrong = bad | (blank & ~blank.all(axis=1, keepdims=True))
    for row in each_of(np.flatnonzero(wrong.any(axis=1)), problems):
        for k in np.flatnonzero(wrong[row]).tolist():
            problems.add(
                item=f"point {points[point[row]]}",
                found="nothing" if blank[row, k] else f"'{table.frame[pair[k]].iloc[row]}'",
                expected="a coordinate",
                remedy="correct the cell, or leave both blank",
                line=int(table.lines[row]),
                column=str(pair[k]),
            )
    return np.where(wrong.any(axis=1, keepdims=True), np.nan, cells)

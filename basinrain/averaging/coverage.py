"""Coverage: the exact share of every grid cell that lies inside a polygon.

The boundary is split where it crosses grid lines. A stretch that climbs by dy covers, of the cell it is in, the part on
one side of it, and the whole breadth dy of every cell further along the row; summed over the boundary (Green's theorem,
taken cell by cell) this is the area inside each cell, with no polygon drawn for any cell.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
import shapely

from basinrain.averaging.inputs import AREA_TOLERANCE
from basinrain.errors import MethodError, Problems

__all__ = ["CellShares", "cell_shares"]

_ROUNDING: Final = 1e-12


class CellShares(NamedTuple):
    """The cells that polygons reach, one row per polygon and cell, by polygon, row, column.

    Parameters
    ----------
    polygon, row, column : array of int, shape (n,)
        Which polygon, and which cell: rows count northward and columns eastward from the origin.
    share : array of float, shape (n,)
        Share of the cell inside the polygon, above 0 and at most 1.
    """

    polygon: npt.NDArray[np.int64]
    row: npt.NDArray[np.int64]
    column: npt.NDArray[np.int64]
    share: npt.NDArray[np.float64]


class _Boundary(NamedTuple):
    """Stretches of boundary, each inside one cell, in cells from the origin."""

    polygon: npt.NDArray[np.int64]
    column: npt.NDArray[np.int64]
    row: npt.NDArray[np.int64]
    fall: npt.NDArray[np.float64]
    east: npt.NDArray[np.float64]


def cell_shares(
    polygons: npt.NDArray[np.object_], ids: tuple[str, ...], origin: tuple[float, float], cell: float
) -> CellShares:
    """Return the exact share of every cell of a square grid inside each polygon.

    Parameters
    ----------
    polygons : array of shapely Polygon or MultiPolygon, shape (n_polygons,)
        Valid, each with an area, nowhere west or south of the origin.
    ids
        Their names, for errors.
    origin
        South-west corner of the grid.
    cell
        Side of a cell, in the polygons' unit.

    Raises
    ------
    MethodError
        The shares of a polygon do not sum to its area (to 1e-9 of it).

    Examples
    --------
    A triangle over half of a 2 x 2 grid: one whole cell, and half of each of the two that its slope crosses.

    >>> triangle = np.array([shapely.Polygon([(0, 0), (2, 0), (0, 2)])])
    >>> shares = cell_shares(triangle, ("triangle",), (0.0, 0.0), 1.0)
    >>> [(int(r), int(c), float(s)) for r, c, s in zip(shares.row, shares.column, shares.share)]
    [(0, 0, 1.0), (0, 1, 0.5), (1, 0, 0.5)]
    """
    parts = _stretches(polygons, origin, cell)
    # One number per polygon, row and column, so that one sort brings the boundary cells of every row in order.
    n_rows = int(parts.row.max(initial=0)) + 2
    n_columns = int(parts.column.max(initial=0)) + 2
    key = (parts.polygon * n_rows + parts.row) * n_columns + parts.column
    cells, place = np.unique(key, return_inverse=True)
    fall = np.bincount(place, parts.fall, minlength=len(cells))
    own = np.bincount(place, parts.fall * (1.0 - parts.east), minlength=len(cells))
    line = cells // n_columns
    starts = np.flatnonzero(np.diff(line, prepend=-1))
    through = np.cumsum(fall)
    # Breadth that is inside beyond each boundary cell, counted from the start of its own row.
    through -= np.repeat((through - fall)[starts], np.diff(np.append(starts, len(cells))))
    share = through - fall + own
    gap = np.diff(cells, append=cells[-1:]) - 1
    last = np.append(line[1:] != line[:-1], True)
    gap[last | (through < _ROUNDING)] = 0
    # Cells between two boundary cells of a row are outside and not listed, or inside over the same breadth: a side of
    # the polygon that runs along the row cuts them all alike.
    filled = np.repeat(cells, gap) + 1 + np.arange(gap.sum()) - np.repeat(np.cumsum(gap) - gap, gap)
    cells = np.concatenate((cells, filled))
    share = np.concatenate((share, np.repeat(through, gap)))
    order = np.argsort(cells, kind="stable")
    cells, share = cells[order], share[order]
    polygon = cells // (n_rows * n_columns)
    areas = shapely.area(polygons) / cell**2
    kept = share > _ROUNDING * np.minimum(areas, 1.0)[polygon]
    cells, polygon, share = cells[kept], polygon[kept], np.minimum(share[kept], 1.0)
    _prove(np.bincount(polygon, share, minlength=len(areas)).astype(float), areas, ids, cell)
    return CellShares(polygon, cells // n_columns % n_rows, cells % n_columns, share)


def _stretches(polygons: npt.NDArray[np.object_], origin: tuple[float, float], cell: float) -> _Boundary:
    rings, ring_polygon, inward = _rings(polygons)
    xy, ring = shapely.get_coordinates(rings, return_index=True)
    xy = (xy - np.asarray(origin)) / cell
    side = np.flatnonzero((ring[1:] == ring[:-1]) & (xy[1:, 1] != xy[:-1, 1]))
    x, y = xy[side].T
    dx, dy = (xy[side + 1] - xy[side]).T
    ring = ring[side]
    crossings = [_crossings(start, run) for start, run in ((x, dx), (y, dy))]
    edge = np.concatenate([np.arange(len(side)), *(e for e, _ in crossings)])
    begin = np.concatenate([np.zeros(len(side)), *(t for _, t in crossings)])
    order = np.lexsort((begin, edge))
    edge, begin = edge[order], begin[order]
    end = np.append(begin[1:], 1.0)
    end[np.append(edge[1:] != edge[:-1], True)] = 1.0
    middle = (begin + end) / 2
    mid_x, mid_y = x[edge] + middle * dx[edge], y[edge] + middle * dy[edge]
    column = np.floor(mid_x).astype(np.int64)
    # Going down on the west side of the inside opens a row's inside, going up on its east side closes it.
    fall = -(end - begin) * dy[edge] * inward[ring[edge]]
    return _Boundary(ring_polygon[ring[edge]], column, np.floor(mid_y).astype(np.int64), fall, mid_x - column)


def _rings(
    polygons: npt.NDArray[np.object_],
) -> tuple[npt.NDArray[np.object_], npt.NDArray[np.int64], npt.NDArray[np.float64]]:
    """Return all rings, the polygon of each, and 1 where the inside lies to the left of the ring, -1 to the right."""
    parts, part_polygon = shapely.get_parts(polygons, return_index=True)
    rings, ring_part = shapely.get_rings(parts, return_index=True)
    outer = np.diff(ring_part, prepend=-1) != 0
    inward = np.where(shapely.is_ccw(rings) == outer, 1.0, -1.0)
    return rings, part_polygon[ring_part], inward


def _crossings(
    start: npt.NDArray[np.float64], run: npt.NDArray[np.float64]
) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]:
    """Return where edges cross whole numbers strictly between their ends: the edge, and the part of the way there."""
    low, high = np.minimum(start, start + run), np.maximum(start, start + run)
    first = np.floor(low).astype(np.int64) + 1
    number = np.maximum(np.ceil(high).astype(np.int64) - first, 0)
    edge = np.repeat(np.arange(len(start)), number)
    nth = np.arange(number.sum()) - np.repeat(np.cumsum(number) - number, number)
    return edge, np.clip((first[edge] + nth - start[edge]) / run[edge], 0.0, 1.0)


def _prove(found: npt.NDArray[np.float64], areas: npt.NDArray[np.float64], ids: tuple[str, ...], cell: float) -> None:
    problems = Problems()
    for k in np.flatnonzero(~(np.abs(found - areas) <= AREA_TOLERANCE * areas)):
        problems.add(
            item=f"basin {ids[k]}",
            found=f"grid cells that hold {found[k] * cell**2:.10g} m² of it",
            expected=f"its {areas[k] * cell**2:.10g} m² (to {AREA_TOLERANCE:g} of it)",
            remedy="check the basin's polygon",
            basin=ids[k],
        )
    problems.raise_as(MethodError)

"""Cells of a raster over basins: the exact share of every basin that lies in each cell.

The cells are drawn in the plane of the basins, where areas are taken, and cut with the polygons there. A raster in
longitude and latitude has cells whose areas differ; their shares of a basin are right all the same.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt
import shapely

from basinrain import ground
from basinrain.averaging.inputs import AREA_TOLERANCE
from basinrain.basins import Basins
from basinrain.errors import DataError, Problem, Problems
from basinrain.weights import WeightTable

__all__ = ["CellGrid", "CellWeights", "cell_weights"]

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

_TILE: Final = 64
"""Cells along a side of a tile; a basin is cut to the tile before it is cut with the tile's cells."""

_MOST_CELLS: Final = 4_000_000
"""More cells in the box around the basins are refused."""

_ROUNDING: Final = 1e-12
"""A smaller share of a basin is rounding along a side that basin and cell have in common."""


@dataclass(frozen=True, kw_only=True)
class CellGrid:
    """How the cells of a raster lie.

    Parameters
    ----------
    n_rows, n_columns : int
        Rows count from the first line of the raster, columns from the first value of a line; in messages and ids from
        1, else from 0.
    origin : tuple of float
        The outer corner of the first cell.
    across, down : tuple of float
        The way from a cell to the next in its row, and to the next in its column, in x and y.
    crs : str
        Coordinate system of the corners, or ``"local"`` (metres).

    Examples
    --------
    >>> grid = CellGrid(n_rows=2, n_columns=3, origin=(0.0, 20.0), across=(10.0, 0.0), down=(0.0, -10.0), crs="local")
    >>> grid.bounds
    (0.0, 0.0, 30.0, 20.0)
    >>> grid.centres(np.array([0, 1]), np.array([0, 2])).tolist()
    [[5.0, 15.0], [25.0, 5.0]]
    >>> str(grid)
    '2 rows and 3 columns from x 0 to 30 and y 0 to 20 in local'
    """

    n_rows: int
    n_columns: int
    origin: tuple[float, float]
    across: tuple[float, float]
    down: tuple[float, float]
    crs: str

    def __str__(self) -> str:
        west, south, east, north = self.bounds
        return (
            f"{self.n_rows} rows and {self.n_columns} columns from x {west:.10g} to {east:.10g} and y {south:.10g} to "
            f"{north:.10g} in {ground.title(self.crs)}"
        )

    def at(self, rows: npt.ArrayLike, columns: npt.ArrayLike) -> Floats:
        """Return positions in the raster's system, shape (n, 2), of places counted in rows and columns from the origin.

        Whole numbers are corners of cells.
        """
        rows, columns = np.asarray(rows, dtype=float)[..., None], np.asarray(columns, dtype=float)[..., None]
        return np.asarray(np.array(self.origin) + columns * np.array(self.across) + rows * np.array(self.down))

    def centres(self, rows: Integers, columns: Integers) -> Floats:
        """Return the centres of cells in the raster's system, shape (n, 2)."""
        return self.at(rows + 0.5, columns + 0.5)

    def outlines(
        self, rows: Integers, columns: Integers, *, height: Integers | int = 1, width: Integers | int = 1
    ) -> npt.NDArray[np.object_]:
        """Return blocks of cells as polygons in the raster's system, shape (n,), each given by its first cell."""
        corners = [(rows, columns), (rows, columns + width), (rows + height, columns + width), (rows + height, columns)]
        return np.asarray(shapely.polygons(np.stack([self.at(r, c) for r, c in corners], axis=1)), dtype=object)

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """The box of all cells: least x, least y, greatest x, greatest y."""
        corners = self.at([0, 0, self.n_rows, self.n_rows], [0, self.n_columns, 0, self.n_columns])
        (west, south), (east, north) = corners.min(axis=0), corners.max(axis=0)
        return float(west), float(south), float(east), float(north)

    def block(self, shape: shapely.Geometry) -> tuple[slice, slice]:
        """Return the rows and columns that hold a shape of the raster's system, one more all around where there are."""
        xy = shapely.get_coordinates(shape)
        columns, rows = np.linalg.solve(np.array([self.across, self.down]).T, (xy - self.origin).T)
        found = []
        for places, n in ((rows, self.n_rows), (columns, self.n_columns)):
            # What a map cannot show comes as infinity.
            low, high = (
                float(np.nan_to_num(v, nan=-1.0, posinf=-1.0, neginf=-1.0)) for v in (places.min(), places.max())
            )
            found.append(slice(*(int(np.clip(v, 0, n)) for v in (np.floor(low) - 1, np.ceil(high) + 1))))
        return found[0], found[1]


@dataclass(frozen=True, eq=False)
class CellWeights:
    """Shares of basins in the cells of a raster.

    Parameters
    ----------
    grid : CellGrid
        The whole raster's.
    rows, columns : array of int, shape (n_cells,)
        The cells that hold part of any basin, row by row, counted from 0.
    table : WeightTable
        Basins down, these cells across (as ``gauges``): the share of the basin's area in each, every row summing to 1.
    """

    grid: CellGrid
    rows: Integers
    columns: Integers
    table: WeightTable

    @property
    def ids(self) -> tuple[str, ...]:
        """Ids of the cells, counted from 1: ``"row 12 column 7"``."""
        return self.table.gauges

    @property
    def block(self) -> tuple[slice, slice]:
        """The rows and columns of the raster that hold all these cells."""
        return (
            slice(int(self.rows.min()), int(self.rows.max()) + 1),
            slice(int(self.columns.min()), int(self.columns.max()) + 1),
        )


def cell_weights(basins: Basins, grid: CellGrid) -> CellWeights:
    """Return the share of every basin that lies in each cell of a raster.

    Parameters
    ----------
    basins
        In a plane, or local.
    grid
        The raster's cells; long sides bend as the raster's system bends them.

    Returns
    -------
    CellWeights
        Exact for the polygons given, in the plane of the basins.

    Raises
    ------
    DataError
        The basins are in degrees; one of basins and raster is local and the other is not; part of a basin (over 1e-9 of
        its area) lies outside the raster, each such basin named with the part; the box around the basins holds over
        4 million cells.

    Examples
    --------
    A square of 2 km over the corner that four cells of 2 km share:

    >>> basins = Basins(ids=("square",), polygons=[shapely.box(1500, 1000, 3500, 3000)], crs="local")
    >>> grid = CellGrid(
    ...     n_rows=2, n_columns=2, origin=(0.0, 4000.0), across=(2000.0, 0.0), down=(0.0, -2000.0), crs="local"
    ... )
    >>> found = cell_weights(basins, grid)
    >>> found.ids
    ('row 1 column 1', 'row 1 column 2', 'row 2 column 1', 'row 2 column 2')
    >>> found.table.weights.tolist()  # 0.5 x 1 and 1.5 x 1 km², of 4
    [[0.125, 0.375, 0.125, 0.375]]
    >>> cell_weights(Basins(ids=("out",), polygons=[shapely.box(3000, 0, 5000, 1000)], crs="local"), grid)
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: basin out: found 50 % of its area outside the raster, which has 2 rows and 2 columns \
from x 0 to 4000 and y 0 to 4000 in local; expected a raster that covers it; use rasters that reach beyond the basins, \
or correct crs
    """
    _require_planes(basins, grid)
    found = list(_areas(basins, grid))
    basin, row, column = (np.concatenate([part[k] for part in found]).astype(np.int64) for k in range(3))
    share = np.concatenate([part[3] for part in found]) / basins.areas[basin]
    _require_cover(np.bincount(basin, share, minlength=len(basins)).astype(float), basins, grid)
    kept = share > _ROUNDING
    cells, place = np.unique(row[kept] * grid.n_columns + column[kept], return_inverse=True)
    weights = np.zeros((len(basins), len(cells)))
    weights[basin[kept], place] = share[kept]
    weights /= weights.sum(axis=1, keepdims=True)
    rows, columns = np.divmod(cells, grid.n_columns)
    ids = tuple(f"row {r} column {c}" for r, c in zip((rows + 1).tolist(), (columns + 1).tolist(), strict=True))
    return CellWeights(grid, rows, columns, WeightTable("cells", basins.ids, ids, weights))


def _require_planes(basins: Basins, grid: CellGrid) -> None:
    if ground.is_geographic(basins.crs):
        raise DataError(
            Problem(
                item="coordinate reference system of the basins",
                found=f"'{basins.crs}', which is in degrees",
                expected="a plane, in metres",
                remedy="bring the basins into one with to_crs",
            )
        )
    if (basins.crs == ground.LOCAL) != (grid.crs == ground.LOCAL):
        raise DataError(
            Problem(
                item="coordinate reference systems",
                found=f"'{grid.crs}' for the raster and '{basins.crs}' for the basins",
                expected="both 'local', or both on the map",
                remedy='give the rasters crs = "local" where their corners are metres of the site grid'
                if basins.crs == ground.LOCAL
                else "give the rasters' own crs",
            )
        )


def _areas(basins: Basins, grid: CellGrid) -> Iterator[tuple[Integers, Integers, Integers, Floats]]:
    """Yield basins, rows and columns of cells that basins reach, and the areas they share, tile by tile.

    First comes a part without any, so that there is one where no cell is reached.
    """
    nothing = np.empty(0, dtype=np.int64)
    yield nothing, nothing, nothing, np.empty(0)
    rows, columns = grid.block(ground.project(np.array([shapely.box(*basins.bounds)]), basins.crs, grid.crs)[0])
    n_cells = (rows.stop - rows.start) * (columns.stop - columns.start)
    if n_cells > _MOST_CELLS:
        raise DataError(
            Problem(
                item="the raster",
                found=f"{n_cells:,} cells in the box around the basins",
                expected=f"at most {_MOST_CELLS:,}",
                remedy="take a coarser raster, or fewer basins at a time",
            )
        )
    if not n_cells:
        return
    top, left = (
        places.ravel().astype(np.int64)
        for places in np.meshgrid(*(np.arange(part.start, part.stop, _TILE) for part in (rows, columns)), indexing="ij")
    )
    height, width = np.minimum(_TILE, rows.stop - top), np.minimum(_TILE, columns.stop - left)
    boxes = shapely.bounds(ground.project(grid.outlines(top, left, height=height, width=width), grid.crs, basins.crs))
    # A tile's long side is drawn a hair straighter than the sides of its cells.
    hair = 0.01 * np.ptp(boxes.reshape(-1, 2, 2), axis=1).max(axis=1)[:, None]
    boxes = shapely.box(*(boxes + hair * np.array([-1, -1, 1, 1])).T)
    reached, tile = shapely.STRtree(boxes).query(basins.polygons, predicate="intersects")
    for t in np.unique(tile):
        r, c = (
            v.ravel()
            for v in np.meshgrid(*(np.arange(n, dtype=np.int64) for n in (height[t], width[t])), indexing="ij")
        )
        r, c = r + top[t], c + left[t]
        cells = ground.project(grid.outlines(r, c), grid.crs, basins.crs)
        here = reached[tile == t]
        polygons = shapely.intersection(basins.polygons[here], boxes[t])
        b, k = shapely.STRtree(cells).query(polygons, predicate="intersects")
        shapely.prepare(polygons)
        area = shapely.area(cells[k])
        cut = ~shapely.contains_properly(polygons[b], cells[k])
        area[cut] = shapely.area(shapely.intersection(polygons[b[cut]], cells[k[cut]]))
        yield here[b], r[k], c[k], area


def _require_cover(covered: Floats, basins: Basins, grid: CellGrid) -> None:
    problems = Problems()
    for k in np.flatnonzero(~(np.abs(covered - 1) <= AREA_TOLERANCE)):
        problems.add(
            item=f"basin {basins.ids[k]}",
            found=f"{100 * (1 - covered[k]):.3g} %" + f" of its area outside the raster, which has {grid}",
            expected="a raster that covers it",
            remedy="use rasters that reach beyond the basins, or correct crs",
            basin=basins.ids[k],
        )
    problems.raise_as(DataError)

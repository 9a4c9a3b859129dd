"""The grid of a run: square cells, and the exact share of each that every basin holds."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Final

import numpy as np
import numpy.typing as npt
from scipy import sparse

from basinrain.averaging.coverage import cell_shares
from basinrain.averaging.inputs import union_is_sum
from basinrain.basins import UNION, Basins
from basinrain.errors import JobError, MethodError, Problem

__all__ = ["MOST_CELLS", "SETTLED", "Grid", "lay", "lay_within_limit", "make_grid", "median_area", "too_many_cells"]

MOST_CELLS: Final = 2_000_000
"""A grid with more cells is refused."""

SETTLED: Final = 0.001
"""A cell size has settled when halving it moves at most this much weight in any basin that counts."""

_COUNTED: Final = 0.01
"""Basins under this share of the median basin's area do not hold the cell size of the whole run down."""


@dataclass(frozen=True, eq=False)
class Grid:
    """Square cells over the basins of a run, laid from the south-west corner of their common box.

    Parameters
    ----------
    cell : float
        Side of a cell, m.
    origin : tuple of float
        The grid's south-west corner.
    basins : tuple of str
        Ids of the rows of ``shares``.
    centres : array of float, shape (n_cells, 2)
        Centres of the cells that hold part of any basin, row by row from the south-west.
    shares : sparse array of float, shape (n_basins, n_cells)
        Share of each cell inside each basin: 1 for a cell wholly inside, exact along the boundary.
    counted : array of bool, shape (n_basins,)
        Whether the basin has at least 1 % of the median basin's area, so that the choice of a cell size looks at it.
    halving_change : array of float, shape (n_basins,)
        Half the sum of absolute changes of a basin's weights when the cell is halved, with all gauges present, or the
        change of its covered share where that is more; NaN where it was not measured.

    Examples
    --------
    >>> import shapely
    >>> basins = Basins(ids=("strip",), polygons=[shapely.box(0, 0, 2500, 1000)], crs="local")
    >>> grid = make_grid(basins, 1000.0)
    >>> grid.n_cells, grid.shares.toarray().tolist()
    (3, [[1.0, 1.0, 0.5]])
    >>> grid.sentence
    'Grid of 3 cells of 1000 m; what halving the cell would change was not measured.'
    """

    cell: float
    origin: tuple[float, float]
    basins: tuple[str, ...]
    centres: npt.NDArray[np.float64]
    shares: sparse.csr_array
    counted: npt.NDArray[np.bool_]
    halving_change: npt.NDArray[np.float64] = field(kw_only=True)

    @property
    def n_cells(self) -> int:
        """Number of cells that hold part of any basin."""
        return len(self.centres)

    @property
    def settled(self) -> bool:
        """Whether halving the cell was measured and moves at most 0.001 of the weight in every basin that counts."""
        return bool(np.all(self.halving_change[self.counted] <= SETTLED))

    @property
    def sentence(self) -> str:
        """Size and figure of the grid in one sentence, with a figure of its own for every basin too small to count."""
        head = f"Grid of {self.n_cells:,} cells of {self.cell:g} m; "
        if np.isnan(self.halving_change).all():
            return head + "what halving the cell would change was not measured."
        counted = np.flatnonzero(self.counted)
        worst = counted[np.argmax(self.halving_change[counted])]
        change = f"{self.halving_change[worst]:.2g}"
        figure = f"halving the cell moves at most {change} of the weight (basin {self.basins[worst]})"
        small = [f"{self.basins[k]} {self.halving_change[k]:.2g}" for k in np.flatnonzero(~self.counted)]
        tail = f"; in basins under 1 % of the median area: {', '.join(small)}" if small else ""
        return f"{head}{figure}{tail}."


def make_grid(basins: Basins, cell: float) -> Grid:
    """Lay a grid of given cell size over basins.

    Parameters
    ----------
    basins
        In a plane; the union's row may be among them.
    cell
        Side of a cell, m.

    Returns
    -------
    Grid
        With ``halving_change`` not measured.

    Raises
    ------
    JobError
        The cell is not a length above 0.
    MethodError
        There would be over 2,000,000 cells.

    Examples
    --------
    >>> import shapely
    >>> basins = Basins(ids=("square",), polygons=[shapely.box(0, 0, 10000, 10000)], crs="local")
    >>> make_grid(basins, 5000.0).centres.tolist()
    [[2500.0, 2500.0], [7500.0, 2500.0], [2500.0, 7500.0], [7500.0, 7500.0]]
    >>> make_grid(basins, 1.0)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: idw grid of 1 m: found at least 100,000,000 cells; expected at most 2,000,000; give \
a larger cell
    """
    if not (math.isfinite(cell) and cell > 0):
        raise JobError(
            Problem(
                item="idw cell", found=f"{cell:g}", expected="a length above 0", remedy="correct cell, or leave it out"
            )
        )
    grid = lay_within_limit(basins, cell)
    if grid is None:
        raise too_many_cells(basins, cell, remedy="give a larger cell")
    return grid


def lay_within_limit(basins: Basins, cell: float) -> Grid | None:
    """Lay a grid as :func:`make_grid` does; None where there would be over 2,000,000 cells."""
    if _fewest_cells(basins, cell) > MOST_CELLS:
        return None
    grid = lay(basins, cell)
    return grid if grid.n_cells <= MOST_CELLS else None


def too_many_cells(basins: Basins, cell: float, *, remedy: str) -> MethodError:
    """Return the error that says so of a size for which :func:`lay_within_limit` laid no grid."""
    fewest = _fewest_cells(basins, cell)
    return MethodError(
        Problem(
            item=f"idw grid of {cell:g} m",
            found=f"at least {fewest:,} cells" if fewest > MOST_CELLS else f"over {MOST_CELLS:,} cells",
            expected=f"at most {MOST_CELLS:,}",
            remedy=remedy,
        )
    )


def _fewest_cells(basins: Basins, cell: float) -> int:
    # The largest basin tells without any geometry when there would be far too many.
    return math.ceil(float(basins.areas.max()) / cell**2 * (1 - 1e-9))


def median_area(basins: Basins) -> float:
    """Return the median of the basins' areas in m², the union left out."""
    own = basins.areas[:-1] if basins.ids[-1:] == (UNION,) and len(basins) > 1 else basins.areas
    return float(np.median(own))


def lay(basins: Basins, cell: float) -> Grid:
    """Lay a grid without asking how many cells it will have, as :func:`make_grid` does with a limit.

    Raises
    ------
    MethodError
        The cells of a basin do not hold its area (to 1e-9 of it).
    """
    west, south, _, _ = basins.bounds
    added = union_is_sum(basins)
    n_cut = len(basins) - added
    shares = cell_shares(basins.polygons[:n_cut], basins.ids, (west, south), cell)
    n_columns = int(shares.column.max()) + 1
    number = shares.row * n_columns + shares.column
    cells, place = np.unique(number, return_inverse=True)
    table = sparse.csr_array((shares.share, (shares.polygon, place)), shape=(n_cut, len(cells)))
    if added:
        table = sparse.csr_array(sparse.vstack([table, sparse.csr_array(table.sum(axis=0)[None, :])]))
    centres = np.column_stack((west + (cells % n_columns + 0.5) * cell, south + (cells // n_columns + 0.5) * cell))
    return Grid(
        cell,
        (west, south),
        basins.ids,
        centres,
        table,
        basins.areas >= _COUNTED * median_area(basins),
        halving_change=np.full(len(basins), np.nan),
    )

"""Tiles: the cells of one basin with what every gauge lends them, in single precision and ready for matrix products."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import numpy.typing as npt
from scipy.spatial.distance import cdist

from basinrain.averaging.grid import Grid
from basinrain.averaging.idw import ON_GAUGE

__all__ = ["KEPT_BYTES", "Lent", "Tile", "tiles_of"]

KEPT_BYTES: Final = 128 * 2**20
"""Bytes of what gauges lend that are kept; that of further tiles is reckoned anew whenever it is asked for."""

_MOST_CELLS: Final = 2048
"""Cells of a tile."""

_FIRST: Final = 1e12
"""How many times as much as all others together a gauge lends to a cell whose centre is on it."""

_RANGE: Final = 1e25
"""What gauges lend is held in single precision between one over this and this; shares of a basin divide by it."""

_DEGREE: Final = 8
"""Degree of the polynomials over a tile that stand for far gauges: with fewer terms more gauges would be near."""

_POLYNOMIAL: Final = 3e-6
"""A gauge is far if a polynomial is within this of what it lends to each cell, relatively."""

_WORTH: Final = 0.7
"""Polynomials are taken where they save this much of the work, counted in multiplications."""

Floats = npt.NDArray[np.float64]
Singles = npt.NDArray[np.float32]


@dataclass(frozen=True, eq=False)
class Lent:
    """What gauges lend to cells, as a table or as a product of two: ``spread @ basis``.

    Parameters
    ----------
    basis : array of float32, shape (n_terms, n_cells)
        Polynomials at the cells, then what each near gauge lends; or, without ``spread``, what every gauge lends.
    spread : array of float32, shape (n_gauges, n_terms), optional
        How every gauge is put together from these.
    """

    basis: Singles
    spread: Singles | None

    def sums(self, reporting: Singles) -> Singles:
        """Return what reporting gauges lend together, shape (n_sets, n_cells), for sets as rows of 0 and 1."""
        return np.asarray((reporting if self.spread is None else reporting @ self.spread) @ self.basis)

    def weigh(self, cells: Singles) -> Singles:
        """Return what cells with factors, shape (n_sets, n_cells), take from every gauge, shape (n_sets, n_gauges)."""
        taken = cells @ self.basis.T
        return np.asarray(taken if self.spread is None else taken @ self.spread.T)


@dataclass(frozen=True, eq=False)
class Tile:
    """Some cells of one basin.

    Parameters
    ----------
    basin : int
        The basin's row.
    centres : array of float, shape (n_cells, 2)
        Centres of the cells.
    held : array of float, shape (n_cells,)
        The cells' areas inside the basin as shares of the basin's.
    gauges : array of float, shape (n_gauges, 2)
        Positions of all gauges.
    power : float
        The exponent of distance.
    on_gauge : float
        A gauge this close to a centre is on it.
    kept : Lent, optional
        What the gauges lend, where it is kept.

    Examples
    --------
    Cells 1 and 2 km from A, 2 and 1 km from B: A and B lend to the one as 4 to 1, to the other as 1 to 4. Where B alone
    reports it has all.

    >>> gauges = np.array([[0.0, 0.0], [3000.0, 0.0]])
    >>> tile = Tile(0, np.array([[1000.0, 0.0], [2000.0, 0.0]]), np.array([0.75, 0.25]), gauges, 2.0, 1e-3)
    >>> weights = tile.weights(np.array([[1.0, 1.0], [0.0, 1.0]], dtype=np.float32)).astype(float)
    >>> weights[0].round(6).tolist(), float(weights[1, 1])  # 0.75 x 4/5 + 0.25 x 1/5
    ([0.65, 0.35], 1.0)
    """

    basin: int
    centres: Floats
    held: Floats
    gauges: Floats
    power: float
    on_gauge: float
    kept: Lent | None = None

    def exactly(self) -> Floats:
        """Return what every gauge lends to every cell, shape (n_cells, n_gauges), in double precision.

        It is the reciprocal power of the distance in half breadths of the tile.
        """
        squared = cdist(self.centres, self.gauges, "sqeuclidean")
        on = np.flatnonzero(squared.min(axis=1) <= self.on_gauge**2)
        hit = squared[on] <= self.on_gauge**2
        squared[on] = np.where(hit, np.inf, squared[on])
        lent: Floats = np.divide(self._half_breadth**2, squared, out=squared)
        if self.power != 2:
            np.power(lent, self.power / 2, out=lent)
        lent[on] += hit * np.maximum(_FIRST * lent[on].sum(axis=1, keepdims=True), 1.0)
        return lent

    def weights(self, reporting: Singles) -> Singles:
        """Return what these cells put into the basin's weights for sets of reporting gauges.

        Parameters
        ----------
        reporting : array of float32, shape (n_sets, n_gauges)
            1 for a gauge that reports, 0 for one that does not; one at least reports in every set.

        Returns
        -------
        array of float32, shape (n_sets, n_gauges)
            Weights of the reporting gauges. What stands at the others is not to be used.
        """
        lent = self.kept or self.table()
        # All are positive, so that no sum cancels, as taking the silent ones from the whole would.
        sums = lent.sums(reporting)
        np.divide(self.held.astype(np.float32), sums, out=sums)
        return lent.weigh(sums)

    def table(self) -> Lent:
        """Return what every gauge lends as a table."""
        return Lent(np.ascontiguousarray(self.exactly().T, dtype=np.float32), None)

    @property
    def _half_breadth(self) -> float:
        return max(float(np.ptp(self.centres, axis=0).max()) / 2, self.on_gauge)

    def lent(self, exactly: Floats) -> Lent:
        """Return the same as polynomials and near gauges where that is less work, else as a table.

        The polynomials are the least-squares ones; every gauge that one of them does not match to 3e-6 at every cell is
        a near one.
        """
        n_cells, n_gauges = exactly.shape
        table = Lent(np.ascontiguousarray(exactly.T, dtype=np.float32), None)
        most = _WORTH * n_cells * n_gauges / (n_cells + n_gauges)
        if most < (_DEGREE + 1) * (_DEGREE + 2) / 2:
            return table
        middle = (self.centres.min(axis=0) + self.centres.max(axis=0)) / 2
        x, y = ((self.centres - middle) / self._half_breadth).T
        i, j = np.array([(i, j) for i in range(_DEGREE + 1) for j in range(_DEGREE + 1 - i)]).T
        terms = np.polynomial.chebyshev.chebvander
        basis = np.linalg.qr(terms(x, _DEGREE)[:, i] * terms(y, _DEGREE)[:, j])[0].astype(np.float32)
        spread = (basis.T @ exactly).T.astype(np.float32)
        error = basis.astype(float) @ spread.T.astype(float)
        error -= exactly
        error /= exactly
        near = np.flatnonzero(np.maximum(error.max(axis=0), -error.min(axis=0)) > _POLYNOMIAL)
        if basis.shape[1] + len(near) > most:
            return table
        spread[near] = 0
        alone = np.zeros((n_gauges, len(near)), dtype=np.float32)
        alone[near, np.arange(len(near))] = 1
        return Lent(
            np.ascontiguousarray(np.vstack([basis.T, table.basis[near]])),
            np.ascontiguousarray(np.hstack([spread, alone])),
        )


def tiles_of(grid: Grid, gauges: Floats, *, power: float, n_basins: int) -> list[Tile] | None:
    """Return the tiles of the first ``n_basins`` basins of a grid, basin by basin.

    What the gauges lend to the first of them is kept, up to 128 MiB. None where it is out of the range of single
    precision.
    """
    tiles: list[Tile] = []
    kept_bytes = 0
    shares = grid.shares
    for basin in range(n_basins):
        own = slice(shares.indptr[basin], shares.indptr[basin + 1])
        cells, held = shares.indices[own], shares.data[own] / shares.data[own].sum()
        for first in range(0, len(cells), _MOST_CELLS):
            part = slice(first, first + _MOST_CELLS)
            tile = Tile(basin, grid.centres[cells[part]], held[part], gauges, power, ON_GAUGE * grid.cell)
            exactly = tile.exactly()
            if not (exactly.min() >= 1 / _RANGE and exactly.max() <= _RANGE):
                return None
            if kept_bytes < KEPT_BYTES:
                kept = tile.lent(exactly)
                size = kept.basis.nbytes + (0 if kept.spread is None else kept.spread.nbytes)
                if kept_bytes + size <= KEPT_BYTES:
                    kept_bytes += size
                    tile = replace(tile, kept=kept)
            tiles.append(tile)
    return tiles

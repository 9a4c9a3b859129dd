"""Inverse distance weighting on a grid: each cell weighs the gauges by distance, a basin is the mean of its cells."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import count
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.spatial.distance import cdist

from basinrain.averaging import grid as grids
from basinrain.averaging.grid import Grid, make_grid
from basinrain.averaging.inputs import presence, require_one_plane
from basinrain.averaging.registry import Weigher
from basinrain.basins import Basins
from basinrain.errors import DataError, JobError, MethodError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.notes import Note
from basinrain.weights import WeightTable

__all__ = ["ON_GAUGE", "choose_grid", "idw_weights", "prepare_idw"]

_BLOCK: Final = 500_000
"""Distances held at a time; few enough to stay in a processor's cache, so that memory does not grow with the grid."""

_FEWEST_CELLS: Final = 100
"""Cells that the median basin has at least, where the size is chosen here."""

_OTHER: Final = 0.4
"""Another size, as a share of the cell, that must give the same weights; its lines fall elsewhere than the halves'."""

ON_GAUGE: Final = 1e-6
"""A centre this close to a gauge, as a share of the cell, is on it."""

_TIE: Final = 1e-9
"""Distances this close to each other, relatively, are equal."""


@dataclass(frozen=True, kw_only=True)
class _Surface:
    """How a point takes its depth from the gauges."""

    power: float
    max_gauges: int | None
    radius: float | None

    def weights(
        self, points: npt.NDArray[np.float64], gauges: npt.NDArray[np.float64], on_gauge: float
    ) -> npt.NDArray[np.float64]:
        """Return weights (n_points, n_gauges) of gauges in the order of their ids; zeros where none is in reach."""
        squared = cdist(points, gauges, "sqeuclidean")
        nearest = squared.min(axis=1)
        on = nearest <= on_gauge**2
        hit = squared[on] <= on_gauge**2
        usable = self._usable(squared)
        # Distances relative to the nearest gauge's: no power of them can overflow.
        np.maximum(nearest, np.finfo(float).tiny, out=nearest)
        np.maximum(squared, nearest[:, None], out=squared)
        weights: npt.NDArray[np.float64] = np.divide(nearest[:, None], squared, out=squared)
        if self.power == 1:
            np.sqrt(weights, out=weights)
        elif self.power != 2:
            np.power(weights, self.power / 2, out=weights)
        weights[on] = hit
        if usable is not None:
            weights *= usable
        total = weights.sum(axis=1)
        weights /= np.where(total > 0, total, 1.0)[:, None]
        return weights

    def _usable(self, squared: npt.NDArray[np.float64]) -> npt.NDArray[np.bool_] | None:
        usable = None
        if self.max_gauges is not None and self.max_gauges < squared.shape[1]:
            last = np.partition(squared, self.max_gauges - 1, axis=1)[:, self.max_gauges - 1, None]
            usable = squared < last * (1 - 2 * _TIE)
            tied = ~usable & (squared <= last * (1 + 2 * _TIE))
            left = self.max_gauges - usable.sum(axis=1, keepdims=True)
            usable |= tied & (np.cumsum(tied, axis=1) <= left)
        if self.radius is not None:
            near = squared <= (self.radius * (1 + _TIE)) ** 2
            usable = near if usable is None else usable & near
        return usable


def idw_weights(
    network: GaugeNetwork,
    basins: Basins,
    present: Sequence[bool] | npt.NDArray[np.bool_] | None = None,
    *,
    power: float = 2.0,
    cell: float | None = None,
    max_gauges: int | None = None,
    radius: float | None = None,
    allow_uncovered: bool = False,
    grid: Grid | None = None,
) -> WeightTable:
    """Return the weights of gridded inverse distance: the mean over a basin of each cell's weights.

    At the centre of a cell, gauge i at distance d_i has the weight d_i^-power over the sum of all; a centre on a gauge
    takes that gauge alone. A cell on the boundary counts by its exact share inside the basin.

    Parameters
    ----------
    network, basins
        In one plane. Gauges outside the basins take part.
    present : array of bool, shape (n_gauges,), optional
        The gauges that count; all where not given.
    power
        The exponent, above 0.
    cell
        Side of a cell, m; chosen by halving where not given (:func:`choose_grid`).
    max_gauges
        Take the nearest so many at each cell; of equally near ones those that come first by id.
    radius
        Take the gauges within this distance of a cell's centre, m.
    allow_uncovered
        Accept cells without a gauge in ``radius``; the weights are then those over the rest of the basin.
    grid
        A grid made before for the same basins, in place of ``cell``.

    Returns
    -------
    WeightTable
        Rows sum to 1. ``covered`` is the share of the basin with a gauge in reach. A basin with none, or any basin
        without a present gauge, has a row of NaN. Its notes state the grid's size and figure, and the basins covered in
        part.

    Raises
    ------
    DataError
        Gauges and basins are not in one plane, or the grid was made for other basins.
    JobError
        An option is out of range.
    MethodError
        A basin is not wholly covered and ``allow_uncovered`` is false, or over 2,000,000 cells would be needed.

    Notes
    -----
    Shepard, D. (1968), A two-dimensional interpolation function for irregularly-spaced data, *Proceedings of the 23rd
    ACM National Conference*, 517-524.

    Examples
    --------
    >>> import shapely
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[2500.0, 7500.0, 11000.0], y=[5000.0] * 3, crs="local")
    >>> square = Basins(ids=("square",), polygons=[shapely.box(0, 0, 1e4, 1e4)], crs="local")
    >>> table = idw_weights(network, square, cell=50.0)
    >>> table.weights.round(5).tolist()
    [[0.44349, 0.38513, 0.17138]]
    >>> table.notes[0].text
    'Grid of 40,000 cells of 50 m; halving the cell moves at most 1.8e-06 of the weight (basin square).'
    >>> idw_weights(network, square, cell=50.0, radius=4000.0)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: basin square: found a gauge within 4000 m of 74.99 % of its area; expected 100 %; \
give a larger radius, or set allow_uncovered
    """
    weigh = prepare_idw(
        network,
        basins,
        power=power,
        cell=cell,
        max_gauges=max_gauges,
        radius=radius,
        allow_uncovered=allow_uncovered,
        grid=grid,
    )
    return weigh(presence(network, present))


def prepare_idw(
    network: GaugeNetwork,
    basins: Basins,
    *,
    power: float = 2.0,
    cell: float | None = None,
    max_gauges: int | None = None,
    radius: float | None = None,
    allow_uncovered: bool = False,
    grid: Grid | None = None,
) -> Weigher:
    """Lay the run's grid once and return what weighs any set of present gauges on it; see :func:`idw_weights`."""
    surface = _surface(power, max_gauges, radius)
    require_one_plane(network, basins)
    if grid is None:
        grid = choose_grid(
            network,
            basins,
            power=power,
            cell=cell,
            max_gauges=max_gauges,
            radius=radius,
            allow_uncovered=allow_uncovered,
        )
    elif grid.basins != basins.ids or cell is not None:
        found = "a grid and a cell" if cell is not None else f"a grid of basins {', '.join(grid.basins)}"
        expected = "one of them" if cell is not None else f"a grid of basins {', '.join(basins.ids)}"
        raise DataError(
            Problem(item="idw grid", found=found, expected=expected, remedy="make the grid with these basins")
        )
    laid = grid

    def weigh(present: npt.NDArray[np.bool_]) -> WeightTable:
        mask = presence(network, present)
        weights, covered = _basin_weights(network, mask, laid, surface)
        notes = [Note(code="grid", text=laid.sentence, level="info", method="idw")]
        if radius is not None and mask.any():
            notes += _coverage(basins, covered, radius, allowed=allow_uncovered)
        return WeightTable("idw", basins.ids, network.ids, weights, covered=covered, notes=tuple(notes))

    return weigh


def choose_grid(
    network: GaugeNetwork,
    basins: Basins,
    *,
    power: float = 2.0,
    cell: float | None = None,
    max_gauges: int | None = None,
    radius: float | None = None,
    allow_uncovered: bool = False,
) -> Grid:
    """Return the grid of a run, its cell size chosen by halving unless it is given.

    A size has settled when going to half of it changes the weights and the covered share of every basin of at least 1 %
    of the median basin's area by at most 0.001, with all gauges of the network present, and going to two fifths of it
    does not change them by more either, since two grids alone may agree by accident (left out where those would be over
    2,000,000 cells). The change of weights is half the sum of absolute changes: what moves from some gauges to others.
    The cell chosen is the largest of the series 1, 2, 5 x 10^k that has settled, with at least 100 cells in the median
    basin.

    Parameters
    ----------
    network, basins
        In one plane.
    power, max_gauges, radius, allow_uncovered
        As in :func:`idw_weights`.
    cell
        Side of a cell, m: lay this one, and measure what halving it changes (left out where the halved grid would have
        over 2,000,000 cells).

    Raises
    ------
    JobError
        An option is out of range.
    MethodError
        Over 2,000,000 cells would be needed, or a basin is not wholly covered though every gauge reports.

    Examples
    --------
    >>> import shapely
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[2500.0, 7500.0, 11000.0], y=[5000.0] * 3, crs="local")
    >>> square = Basins(ids=("square",), polygons=[shapely.box(0, 0, 1e4, 1e4)], crs="local")
    >>> choose_grid(network, square).cell
    1000.0
    """
    surface = _surface(power, max_gauges, radius)
    require_one_plane(network, basins)
    everyone = np.ones(len(network), dtype=bool)

    def weigh(grid: Grid) -> _Weighed:
        return _Weighed(grid, *_basin_weights(network, everyone, grid, surface))

    if cell is None:
        chosen = _settled(basins, weigh)
    else:
        chosen = weigh(make_grid(basins, cell))
        if 4 * chosen.grid.n_cells <= grids.MOST_CELLS:
            chosen = chosen.measured(weigh(grids.lay(basins, cell / 2)))
    if radius is not None and len(network):
        _coverage(basins, chosen.covered, radius, allowed=allow_uncovered)
    return chosen.grid


class _Weighed(NamedTuple):
    """A grid with the weights (n_basins, n_gauges) and covered shares (n_basins,) on it."""

    grid: Grid
    weights: npt.NDArray[np.float64]
    covered: npt.NDArray[np.float64]

    def measured(self, half: _Weighed) -> _Weighed:
        """Return the same, its grid with what going to ``half`` of the cell changes."""
        change = np.maximum(_change(self.weights, half.weights), np.abs(half.covered - self.covered))
        return self._replace(grid=replace(self.grid, halving_change=change))


def _settled(basins: Basins, weigh: Callable[[Grid], _Weighed]) -> _Weighed:
    """Return the largest size that has settled; see :func:`choose_grid`."""
    for size in _sizes(basins):
        grid = grids.lay_within_limit(basins, size)
        if grid is None:
            break
        found = weigh(grid)
        found = found.measured(weigh(grids.lay(basins, size / 2)))
        if not found.grid.settled:
            continue
        other = grids.lay_within_limit(basins, _OTHER * size)
        if other is None or found.measured(weigh(other)).grid.settled:
            return found
    raise grids.too_many_cells(basins, size, remedy="choose the size yourself: give cell")


def _sizes(basins: Basins) -> Iterator[float]:
    """Yield the sizes 5, 2, 1 x 10^k downward from the largest that the median basin holds often enough."""
    largest = math.sqrt(grids.median_area(basins) / _FEWEST_CELLS)
    for k in count(math.floor(math.log10(largest)), -1):
        yield from (size for size in (float(f"{m}e{k}") for m in (5, 2, 1)) if size <= largest)


def _change(weights: npt.NDArray[np.float64], halved: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return how much weight moves in every basin; all of it where only one of the two grids reaches the basin."""
    moved = np.abs(halved - weights).sum(axis=1) / 2
    without = np.isnan(weights).all(axis=1) & np.isnan(halved).all(axis=1)
    return np.where(without, 0.0, np.where(np.isnan(moved), 1.0, moved))


def _basin_weights(
    network: GaugeNetwork, present: npt.NDArray[np.bool_], grid: Grid, surface: _Surface
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Return weights (n_basins, n_gauges) and covered shares (n_basins,), block by block of cells."""
    at = np.flatnonzero(present)
    at = at[np.argsort(network.id_rank[at])]
    weights = np.zeros((len(grid.basins), len(network)))
    covered = np.zeros(len(grid.basins))
    if len(at):
        gauges = np.column_stack((network.x[at], network.y[at]))
        by_cell = grid.shares.T.tocsr()
        n = max(1, _BLOCK // len(at))
        part = np.zeros((len(grid.basins), len(at)))
        for first in range(0, grid.n_cells, n):
            lent = surface.weights(grid.centres[first : first + n], gauges, ON_GAUGE * grid.cell)
            held = by_cell[first : first + n].T
            part += held @ lent
            covered += held @ (lent.sum(axis=1) > 0.5).astype(float)
        weights[:, at] = part / np.where(covered > 0, covered, np.nan)[:, None]
        # Rounding may leave a whole basin a hair above its own area.
        covered = np.minimum(covered / np.asarray(grid.shares.sum(axis=1)).ravel(), 1.0)
    weights[covered == 0] = np.nan
    return weights, covered


def _coverage(basins: Basins, covered: npt.NDArray[np.float64], radius: float, *, allowed: bool) -> list[Note]:
    """Return a note for every basin that is covered in part, or refuse them all together."""
    notes, problems = [], Problems()
    for k in np.flatnonzero(covered < 1 - _TIE):
        basin = basins.ids[k]
        found = f"a gauge within {radius:g} m of {100 * covered[k]:.2f} % of its area"
        problems.add(
            item=f"basin {basin}",
            found=found,
            expected="100 %",
            remedy="give a larger radius, or set allow_uncovered",
            basin=basin,
        )
        text = f"Basin {basin} has {found}; its idw weights are those of that part."
        notes.append(Note(code="covered-in-part", text=text, basin=basin, method="idw"))
    if not allowed:
        problems.raise_as(MethodError)
    return notes


def _surface(power: float, max_gauges: int | None, radius: float | None) -> _Surface:
    problems = Problems()
    if not (math.isfinite(power) and power > 0):
        problems.add(item="idw power", found=f"{power:g}", expected="a number above 0")
    if max_gauges is not None and max_gauges < 1:
        problems.add(item="idw max_gauges", found=f"{max_gauges}", expected="a whole number of 1 or more")
    if radius is not None and not (math.isfinite(radius) and radius > 0):
        problems.add(item="idw radius", found=f"{radius:g}", expected="a length above 0")
    problems.raise_as(JobError)
    return _Surface(power=power, max_gauges=max_gauges, radius=radius)

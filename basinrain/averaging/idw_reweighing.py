"""Inverse distance while gauges come and go: what gauges lend to cells once, sets of reporting gauges as products."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import cache
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.averaging.grid import Grid
from basinrain.averaging.idw import choose_grid, prepare_idw
from basinrain.averaging.idw_tiles import Tile, tiles_of
from basinrain.averaging.inputs import union_is_sum
from basinrain.averaging.registry import Reweigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import reweigh_by_sets, steps_of_sets
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

__all__ = ["prepare_idw_reweigher"]

_FEW: Final = 2
"""Up to so many sets of reporting gauges are weighed one by one, in double precision."""

_SETS: Final = 256
"""Sets that are weighed together."""

_BLOCK_BYTES: Final = 64 * 2**20
"""Bytes of weights that are made at a time."""

Floats = npt.NDArray[np.float64]
Steps = slice | npt.NDArray[np.int64]


def prepare_idw_reweigher(
    network: GaugeNetwork,
    basins: Basins,
    *,
    power: float = 2.0,
    cell: float | None = None,
    max_gauges: int | None = None,
    radius: float | None = None,
    allow_uncovered: bool = False,
    grid: Grid | None = None,
) -> Reweigher:
    """Return what averages many steps by gridded inverse distance, each with the gauges that report at it.

    Options and errors are those of :func:`~basinrain.averaging.idw.idw_weights`; give ``grid`` where the run has laid
    one already. With ``max_gauges`` or ``radius`` every set of reporting gauges is weighed by itself, and so are one or
    two sets. Otherwise weights are made in single precision: means are those of
    :func:`~basinrain.averaging.idw.idw_weights` to 1e-5 of themselves, and a step of even rain returns it to 1e-12.
    Memory beside the result is bounded, however many gauges, basins and sets there are.

    Notes
    -----
    With D the distance weights of all gauges at the cells of a basin and R the sets as rows of 0 and 1, the cells' sums
    are S = R D', and the basin's weights (a / S) D, where a are the shares of the basin in its cells.

    Examples
    --------
    >>> import shapely
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[2500.0, 7500.0, 11000.0], y=[5000.0] * 3, crs="local")
    >>> square = Basins(ids=("square",), polygons=[shapely.box(0, 0, 1e4, 1e4)], crs="local")
    >>> depth = np.array([[10.0, 30.0, 100.0], [10.0, 30.0, np.nan], [np.nan, 30.0, np.nan], [np.nan] * 3])
    >>> prepare_idw_reweigher(network, square, cell=50.0)(depth, ReportingRuns.of(~np.isnan(depth))).round(3)
    array([[33.127],
           [20.   ],
           [30.   ],
           [   nan]])
    """
    surface: dict[str, Any] = {
        "power": power,
        "max_gauges": max_gauges,
        "radius": radius,
        "allow_uncovered": allow_uncovered,
    }
    laid = grid
    if laid is None:
        laid = choose_grid(network, basins, cell=cell, **surface)
        cell = None
    weigh = prepare_idw(network, basins, cell=cell, grid=laid, **surface)
    by_sets = reweigh_by_sets(weigh, len(basins))
    if radius is not None or (max_gauges is not None and max_gauges < len(network)):
        return by_sets
    added = union_is_sum(basins)
    gauges = np.column_stack((network.x, network.y))

    @cache
    def all_tiles() -> list[Tile] | None:
        # Made when first needed: a record without gaps never does.
        return tiles_of(laid, gauges, power=power, n_basins=len(basins) - added)

    areas = np.asarray(laid.shares.sum(axis=1)).ravel()[: len(basins) - added]

    def means(depth: Floats, runs: ReportingRuns) -> Floats:
        some = np.flatnonzero(runs.sets.any(axis=1))
        sets, steps = runs.sets[some], list(steps_of_sets(runs))
        steps = [steps[k] for k in some]
        tiles = all_tiles() if len(sets) > _FEW else None
        if tiles is None:
            return by_sets(depth, runs)
        result = np.full((runs.n_steps, len(basins)), np.nan)
        size = min(len(sets), _SETS)
        together = max(1, _BLOCK_BYTES // (4 * size * len(network)))
        for some_tiles in _groups(tiles, together):
            group = _with_tables(some_tiles)
            for first in range(0, len(sets), size):
                block = slice(first, first + size)
                _average(group, sets[block], steps[block], depth, result)
        if added:
            result[:, -1] = result[:, :-1] @ (areas / areas.sum())
        return result

    return means


def _groups(tiles: Sequence[Tile], n_basins: int) -> list[list[Tile]]:
    """Return the tiles in groups of so many basins, in order."""
    groups: list[list[Tile]] = [[] for _ in range(tiles[-1].basin // n_basins + 1)]
    for tile in tiles:
        groups[tile.basin // n_basins].append(tile)
    return groups


def _with_tables(tiles: Sequence[Tile]) -> list[Tile]:
    """Return the tiles with what gauges lend to them at hand for all sets, as far as there is room."""
    room = _BLOCK_BYTES
    result = []
    for tile in tiles:
        size = 0 if tile.kept is not None else 4 * len(tile.centres) * len(tile.gauges)
        result.append(replace(tile, kept=tile.table()) if 0 < size <= room else tile)
        room -= size if size <= room else 0
    return result


def _average(
    tiles: Sequence[Tile], sets: npt.NDArray[np.bool_], steps: Sequence[Steps], depth: Floats, result: Floats
) -> None:
    """Put the means of some basins at the steps of some sets of reporting gauges into their places in the result."""
    low, high = tiles[0].basin, tiles[-1].basin + 1
    reporting = sets.astype(np.float32)
    weights = np.zeros((high - low, *sets.shape), dtype=np.float32)
    for tile in tiles:
        weights[tile.basin - low] += tile.weights(reporting)
    own = np.empty((high - low, sets.shape[1]))
    for k, (present, rows) in enumerate(zip(sets, steps, strict=True)):
        given = depth[rows]
        # The last row sums the weights, so that what they lack of 1 in single precision is made good.
        depths = np.empty((len(given) + 1, len(present)))
        depths[:-1] = np.where(present, given, 0.0)
        depths[-1] = present
        np.copyto(own, weights[:, k])
        sums = depths @ own.T
        result[rows, low:high] = sums[:-1] / sums[-1]

"""Arithmetic mean: every gauge that takes part counts the same."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, Final

import numpy as np
import numpy.typing as npt
import shapely
from scipy import sparse

from basinrain.averaging.inputs import presence, require_one_plane
from basinrain.averaging.registry import Reweigher, Weigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.basins import Basins
from basinrain.errors import JobError, Problem, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.weights import WeightTable

__all__ = ["arithmetic_weights", "prepare_arithmetic", "prepare_arithmetic_reweigher"]

_BOUNDARY: Final = 1e-3
"""A gauge this close to a polygon, in m, counts as on its boundary: projecting moves positions by less."""

_STEPS: Final = 4096
"""Steps that are summed together."""


def arithmetic_weights(
    network: GaugeNetwork,
    basins: Basins,
    present: Sequence[bool] | npt.NDArray[np.bool_] | None = None,
    *,
    gauges: str | Mapping[str, float] = "inside",
) -> WeightTable:
    """Return the weights of the arithmetic mean: 1 over the number of gauges that take part.

    Parameters
    ----------
    network, basins
        In one plane.
    present : array of bool, shape (n_gauges,), optional
        The gauges that count; all where not given.
    gauges : ``"inside"``, ``"all"`` or ``{"buffer": metres}``
        Which of them take part in a basin: those inside it (boundary included, to 1 mm), all, or those inside it or
        within that distance of it.

    Returns
    -------
    WeightTable
        A basin without such a gauge has a row of NaN, and ``covered`` 0: the method has no number for it.

    Raises
    ------
    DataError
        Gauges and basins are not in one plane.
    JobError
        ``gauges`` is none of the above.

    Notes
    -----
    Common practice; the method of every handbook, e.g. World Meteorological Organization, *Guide to Hydrological
    Practices* (WMO-No. 168), areal precipitation. Adjoining basins do not add up to their union.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[2500.0, 7500.0, 11000.0], y=[5000.0] * 3, crs="local")
    >>> basins = Basins(
    ...     ids=("square", "far"), polygons=[shapely.box(0, 0, 1e4, 1e4), shapely.box(5e4, 0, 6e4, 1e4)], crs="local"
    ... )
    >>> arithmetic_weights(network, basins).weights
    array([[0.5, 0.5, 0. ],
           [nan, nan, nan]])
    >>> arithmetic_weights(network, basins, gauges={"buffer": 1000.0}).to_frame().loc["square"].round(3).to_list()
    [0.333, 0.333, 0.333]
    """
    return prepare_arithmetic(network, basins, gauges=gauges)(presence(network, present))


def prepare_arithmetic(
    network: GaugeNetwork, basins: Basins, *, gauges: str | Mapping[str, float] = "inside"
) -> Weigher:
    """Find which gauges take part in which basin, once; options and errors as in :func:`arithmetic_weights`."""
    takes_part = _takes_part(network, basins, gauges)

    def weigh(present: npt.NDArray[np.bool_]) -> WeightTable:
        counted = takes_part & presence(network, present)[None, :]
        number = counted.sum(axis=1)
        weights = np.where(number[:, None] > 0, counted / np.maximum(number, 1)[:, None], np.nan)
        return WeightTable("arithmetic", basins.ids, network.ids, weights, covered=(number > 0).astype(float))

    return weigh


def prepare_arithmetic_reweigher(
    network: GaugeNetwork, basins: Basins, *, gauges: str | Mapping[str, float] = "inside"
) -> Reweigher:
    """Return what averages many steps: the depths that take part and report, summed, over their number.

    Options and errors are those of :func:`arithmetic_weights`. A basin is NaN at steps at which none of its gauges
    reports.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[1.0, 4.0, 8.0], y=[5.0] * 3, crs="local")
    >>> west_east = [shapely.box(0, 0, 5, 10), shapely.box(5, 0, 10, 10)]
    >>> basins = Basins(ids=("west", "east"), polygons=west_east, crs="local")
    >>> depth = np.array([[2.0, 4.0, 9.0], [2.0, np.nan, np.nan]])
    >>> prepare_arithmetic_reweigher(network, basins)(depth, ReportingRuns.of(~np.isnan(depth)))
    array([[ 3.,  9.],
           [ 2., nan]])
    """
    table = sparse.csr_array(_takes_part(network, basins, gauges).astype(float).T)

    def means(depth: npt.NDArray[np.float64], runs: ReportingRuns) -> npt.NDArray[np.float64]:
        number = runs.present @ table
        number[number == 0] = np.nan
        run_of_step = np.repeat(np.arange(len(runs)), runs.lengths)
        result = np.empty((runs.n_steps, len(basins)))
        for first in range(0, runs.n_steps, _STEPS):
            rows = slice(first, first + _STEPS)
            which = run_of_step[rows]
            result[rows] = np.where(runs.present[which], depth[rows], 0.0) @ table
            result[rows] /= number[which]
        return result

    return means


def _takes_part(network: GaugeNetwork, basins: Basins, gauges: str | Mapping[str, float]) -> npt.NDArray[np.bool_]:
    """Return which gauges count in which basin when they are present, shape (n_basins, n_gauges)."""
    reach = _reach(gauges)
    require_one_plane(network, basins)
    if reach is None:
        return np.ones((len(basins), len(network)), dtype=bool)
    takes_part = np.zeros((len(basins), len(network)), dtype=bool)
    positions = shapely.STRtree(np.asarray(shapely.points(network.x, network.y), dtype=object))
    takes_part[tuple(positions.query(basins.polygons, predicate="dwithin", distance=reach))] = True
    return takes_part


def _reach(gauges: Any) -> float | None:  # noqa: ANN401 - whatever a job file holds
    """Return how far from a basin a gauge may stand, in m; None for no limit."""
    if isinstance(gauges, str) and gauges in ("inside", "all"):
        return _BOUNDARY if gauges == "inside" else None
    remedy = "correct gauges"
    if isinstance(gauges, Mapping) and set(gauges) == {"buffer"}:
        buffer = gauges["buffer"]
        if isinstance(buffer, int | float) and not isinstance(buffer, bool) and 0 <= buffer < np.inf:
            return float(buffer) + _BOUNDARY
        remedy = "give the buffer as a length of 0 or more"
    elif isinstance(gauges, str):
        remedy = nearest_name(gauges, ("inside", "all"))
    raise JobError(
        Problem(
            item="gauges of the arithmetic mean",
            found=f"'{gauges}'" if isinstance(gauges, str) else f"{gauges!r}",
            expected="'inside', 'all' or { buffer = length }",
            remedy=remedy,
        )
    )

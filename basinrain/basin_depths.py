"""Basin depths of a storm by one averaging method, and where every millimetre of them came from."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averager import Averager
from basinrain.averaging import Weigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import steps_of_sets
from basinrain.errors import MethodError
from basinrain.infill import Completed
from basinrain.rainfall import Status
from basinrain.weights import WeightTable

__all__ = ["BasinDepths", "average_storm", "spread_across_methods"]


_BLOCK: Final = 1 << 20
"""Values of the record that are looked at together."""


@dataclass(frozen=True, eq=False)
class BasinDepths:
    """What one averaging method gives for one storm, for all basins.

    Parameters
    ----------
    table : WeightTable
        The method's own weights with every gauge present that has a depth in the storm, observed or infilled.
    depth : array of float, shape (n_steps, n_basins)
        Basin means in mm; NaN where the method has no number.
    infilled : array of float, shape (n_basins,)
        mm of the total that rest on infilled values.
    reporting : array of float, shape (n_steps, n_basins)
        Basin means in mm with weights rebuilt at every step from the gauges that report; NaN where none does, or where
        the method refuses those that do.
    reporting_only : array of float, shape (n_basins,)
        Total of ``reporting`` in mm; NaN where it is at some step.
    contribution : array of float, shape (n_basins, n_gauges)
        mm of the total that come from each gauge's own values, directly and through infill; rows sum to the total.
    least, most : array of float, shape (n_basins, n_gauges)
        Least and greatest weight of each gauge's own values over the steps, infill included.
    observed_share : array of float, shape (n_steps, n_basins)
        Share of the weight that lies on gauges which report at the step; NaN where the depth is.
    without_depth : array of int, shape (n_gauges,)
        Steps at which each gauge was in service and had no depth even after infill; weights were rebuilt there.

    Examples
    --------
    Made by :func:`average_storm`. A step without any gauge makes the total missing, never the sum of what is left.

    >>> from basinrain.rainfall import RainRecord
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[3.0], [np.nan]], step="1h")
    >>> def whole(present):
    ...     return WeightTable("whole", ("all",), ("A",), np.array([[1.0]]))
    >>> result = average_storm(Completed(record, (), ()), whole)
    >>> result.depth.ravel(), result.total, result.without_depth
    (array([ 3., nan]), array([nan]), array([1]))
    """

    table: WeightTable
    depth: npt.NDArray[np.float64]
    infilled: npt.NDArray[np.float64]
    reporting: npt.NDArray[np.float64]
    reporting_only: npt.NDArray[np.float64]
    contribution: npt.NDArray[np.float64]
    least: npt.NDArray[np.float64]
    most: npt.NDArray[np.float64]
    observed_share: npt.NDArray[np.float64]
    without_depth: npt.NDArray[np.int64]

    @property
    def total(self) -> npt.NDArray[np.float64]:
        """Storm totals in mm, shape (n_basins,); NaN where any step is: a total is never the sum of what is left."""
        return np.asarray(self.depth.sum(axis=0))


def average_storm(completed: Completed, weigher: Weigher | Averager) -> BasinDepths:
    """Average a completed storm over the basins by one method.

    Parameters
    ----------
    completed
        The storm's window after infill.
    weigher
        Makes the method's weights for any set of gauges that are present; of a long record, whose gauges come and go
        very often, an :class:`~basinrain.averager.Averager` makes them faster.

    Returns
    -------
    BasinDepths

    Notes
    -----
    With D the donor weights of a step, W the weights of the gauges that have a depth and p the reporting gauges' own
    depths, the basin mean of the step is ``W D p``. Hence the contribution of gauge i to basin b over the storm is the
    sum over steps of ``(W D)[b, i] p[i]``, and these sum to the mean exactly. Where the total of a day or storm was
    spread, p is the donors' total in the times of the gauge whose pattern was used.

    Examples
    --------
    >>> from basinrain.infill import InfillOptions, complete
    >>> from basinrain.rainfall import RainRecord
    >>> from basinrain.gauges import GaugeNetwork
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 5000.0, 9000.0], y=[0.0] * 3, crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(network.ids, ends - 3600, ends, [[6.0, np.nan, 2.0], [3.0, 3, 3]], step="1h")
    >>> completed = complete(record, network, InfillOptions(method="station-average", scale="step"))
    >>> def thirds(present):
    ...     return WeightTable("thirds", ("all",), network.ids, np.where(present, 1 / present.sum(), 0.0)[None, :])
    >>> result = average_storm(completed, thirds)  # B's first hour is the mean of A and C, 4 mm
    >>> result.depth.ravel(), result.total
    (array([4., 3.]), array([7.]))
    >>> result.contribution.round(2), result.infilled.round(2)
    (array([[4., 1., 2.]]), array([1.33]))
    """
    record = completed.record
    has_depth = ~np.isnan(record.depth)
    reporting = record.reporting
    averager = weigher if isinstance(weigher, Averager) else Averager(weigher)
    anywhere: npt.NDArray[np.bool_] = np.asarray(has_depth.any(axis=0))
    table = averager.weigher(anywhere)
    n_steps, (n_basins, n_gauges) = len(record), table.weights.shape
    depth = np.full((n_steps, n_basins), np.nan)
    observed_share = np.full((n_steps, n_basins), np.nan)
    infilled = np.zeros(n_basins)
    contribution = np.zeros((n_basins, n_gauges))
    least, most = np.full((n_basins, n_gauges), np.inf), np.full((n_basins, n_gauges), -np.inf)
    runs = ReportingRuns.of(has_depth)
    known: npt.NDArray[np.bool_] = np.asarray(runs.sets.any(axis=1))
    if not known.all():
        contribution[:] = np.nan
        infilled[:] = np.nan
    some = (steps for steps, held in zip(steps_of_sets(runs), known.tolist(), strict=True) if held)
    for of_set, weights in zip(some, averager.weights(runs.sets[known]), strict=True):
        if isinstance(weights, MethodError):
            raise weights
        here, weight_sum = replace(table, weights=weights), weights.sum(axis=1)
        observed = weights.T / np.where(weight_sum == 0, np.nan, weight_sum)
        for steps in _in_blocks(of_set, n_gauges):
            depth[steps] = here.apply(record.depth[steps])
            contribution += weights @ completed.sources(steps)
            low, high = completed.influence(weights, steps)
            least, most = np.minimum(least, low), np.maximum(most, high)
            infilled += weights @ np.where(has_depth[steps] & ~reporting[steps], record.depth[steps], 0.0).sum(axis=0)
            observed_share[steps] = reporting[steps].astype(float) @ observed
    means = averager.means(record.depth, reporting, n_basins)
    return BasinDepths(
        table=table,
        depth=depth,
        infilled=infilled,
        reporting=means,
        reporting_only=np.asarray(means.sum(axis=0)),
        contribution=contribution,
        least=np.where(np.isinf(least), np.nan, least),
        most=np.where(np.isinf(most), np.nan, most),
        observed_share=observed_share,
        without_depth=np.asarray((~has_depth & (record.status != Status.NOT_INSTALLED)).sum(axis=0)),
    )


def _in_blocks(steps: slice | npt.NDArray[np.int64], n_gauges: int) -> Iterator[slice | npt.NDArray[np.int64]]:
    """Yield steps some at a time, so that what is made of their values stays small."""
    most = max(_BLOCK // max(n_gauges, 1), 1)
    if isinstance(steps, slice):
        yield from (slice(k, min(k + most, steps.stop)) for k in range(steps.start, steps.stop, most))
    else:
        yield from (steps[k : k + most] for k in range(0, len(steps), most))


def spread_across_methods(totals: Mapping[str, float] | Sequence[float]) -> tuple[float, float, float, float]:
    """Return least, greatest, their difference and that difference in percent of the mean of the methods' totals.

    Methods without a number are left out; with fewer than two numbers the difference is NaN.

    Examples
    --------
    >>> spread_across_methods([20.0, 25.0, float("nan")])
    (20.0, 25.0, 5.0, 22.22222222222222)
    >>> spread_across_methods([20.0])
    (20.0, 20.0, nan, nan)
    """
    values = np.array(list(totals.values()) if isinstance(totals, Mapping) else totals, dtype=float)
    values = values[~np.isnan(values)]
    if len(values) == 0:
        return (np.nan,) * 4
    least, most = float(values.min()), float(values.max())
    if len(values) == 1:
        return least, most, np.nan, np.nan
    centre = float(values.mean())
    return least, most, most - least, 100 * (most - least) / centre if centre > 0 else 0.0

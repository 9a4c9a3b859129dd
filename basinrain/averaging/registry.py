"""The contract of an averaging method: a name, how to prepare it, and the laws it promises."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt

from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import reweigh_by_sets
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.weights import WeightTable

__all__ = ["AveragingMethod", "Reweigher", "Weigher"]

Weigher = Callable[[npt.NDArray[np.bool_]], WeightTable]
"""Makes the weight table of the gauges that are present, given as a mask of shape (n_gauges,); others get weight 0."""


class Reweigher(Protocol):
    """Basin means of many steps, every step with the weights of the gauges that report at it."""

    def __call__(self, depth: npt.NDArray[np.float64], runs: ReportingRuns, /) -> npt.NDArray[np.float64]:
        """Return basin means in mm, shape (n_steps, n_basins).

        Parameters
        ----------
        depth : array of float, shape (n_steps, n_gauges)
            mm. What stands at gauges that do not report, NaN or a number, does not count. It is not changed.
        runs
            Which gauges report at every step.

        Returns
        -------
        array of float, shape (n_steps, n_basins)
            NaN where no gauge reports, or where the method has no number with those that do.
        """


@dataclass(frozen=True)
class AveragingMethod:
    """One method of areal averaging.

    Parameters
    ----------
    name
        What jobs and tables call it.
    prepare
        ``prepare(network, basins, **options)`` does the geometry once and returns a :data:`Weigher`. Network and basins
        are in the same plane; basins already hold the union's row.
    sums_to_one, non_negative, partition
        The laws it promises: rows sum to 1; no weight below 0; adjoining basins add up by area to their union.
    lengths
        The options that are lengths in m: when the plane is drawn at another scale they scale with it.
    prepare_reweigher
        ``prepare_reweigher(network, basins, **options)`` returns a :class:`Reweigher`, for methods that have a faster
        way than a table of weights for every set of reporting gauges; None for the others.

    Examples
    --------
    A method is one function and one line in :data:`basinrain.averaging.METHODS`. A whole one, which gives every present
    gauge the same weight wherever it stands:

    >>> import shapely
    >>> def prepare_even(network, basins):
    ...     def weigh(present):
    ...         row = present / max(present.sum(), 1)
    ...         return WeightTable("even", basins.ids, network.ids, np.tile(row, (len(basins), 1)))
    ...
    ...     return weigh
    >>> even = AveragingMethod("even", prepare_even)
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 9.0], y=[0.0, 0.0], crs="local")
    >>> basins = Basins(ids=("all",), polygons=[shapely.box(0, 0, 9, 9)], crs="local")
    >>> even(network, basins)(np.array([True, True])).weights
    array([[0.5, 0.5]])
    """

    name: str
    prepare: Callable[..., Weigher]
    sums_to_one: bool = True
    non_negative: bool = True
    partition: bool = False
    lengths: tuple[str, ...] = ()
    prepare_reweigher: Callable[..., Reweigher] | None = None

    def __call__(self, network: GaugeNetwork, basins: Basins, options: Mapping[str, Any] | None = None) -> Weigher:
        """Prepare the method for a network and its basins."""
        return self.prepare(network, basins, **(options or {}))

    def reweigher(self, network: GaugeNetwork, basins: Basins, options: Mapping[str, Any] | None = None) -> Reweigher:
        """Prepare the method for a record whose gauges come and go."""
        if self.prepare_reweigher is not None:
            return self.prepare_reweigher(network, basins, **(options or {}))
        return reweigh_by_sets(self(network, basins, options), len(basins))

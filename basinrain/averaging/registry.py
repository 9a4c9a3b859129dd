"""The registry of averaging methods: a name, how to prepare it, and the laws it promises."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.weights import WeightTable

__all__ = ["AveragingMethod", "Weigher"]

Weigher = Callable[[npt.NDArray[np.bool_]], WeightTable]
"""Makes the weight table of the gauges that are present, given as a mask of shape (n_gauges,); others get weight 0."""


@dataclass(frozen=True)
class AveragingMethod:
    """One method of areal averaging.

    Parameters
    ----------
    name
        What jobs and tables call it.
    prepare
        ``prepare(network, basins, **options)`` does the geometry once and returns a :data:`Weigher`. Network and basins are
        in the same plane; basins already hold the union's row.
    sums_to_one, non_negative, partition
        The laws it promises: rows sum to 1; no weight below 0; adjoining basins add up by area to their union.
    """

    name: str
    prepare: Callable[..., Weigher]
    sums_to_one: bool = True
    non_negative: bool = True
    partition: bool = False

    def __call__(self, network: GaugeNetwork, basins: Basins, options: Mapping[str, Any] | None = None) -> Weigher:
        """Prepare the method for a network and its basins."""
        return self.prepare(network, basins, **(options or {}))

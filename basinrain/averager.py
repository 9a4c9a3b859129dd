"""An averaging method prepared for a network and its basins, for storms and for records whose gauges come and go."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averaging import Weigher
from basinrain.averaging.registry import Reweigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import reweigh_by_sets
from basinrain.errors import MethodError

__all__ = ["FEW_SETS", "Averager"]

FEW_SETS: Final = 64
"""Up to so many sets of gauges are weighed one by one; with more of them the method's faster way is worth preparing."""

_TOGETHER: Final = 1 << 22
"""Values that are averaged together to find weights."""

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Averager:
    """One averaging method, prepared.

    Parameters
    ----------
    weigher
        Makes the method's weights for any set of gauges that are present.
    prepare
        Prepares its :class:`~basinrain.averaging.registry.Reweigher`; called when that is first needed. Without it
        every set of gauges is weighed by itself.

    Examples
    --------
    >>> from basinrain.weights import WeightTable
    >>> def even(present):
    ...     return WeightTable("even", ("all",), ("A", "B"), np.where(present, 1 / present.sum(), 0.0)[None, :])
    >>> averager = Averager(even)
    >>> averager.means(np.array([[2.0, 4.0], [2.0, np.nan]]), np.array([[True, True], [True, False]]), 1).ravel()
    array([3., 2.])
    >>> [weights.tolist() for weights in averager.weights(np.array([[True, True], [True, False]]))]
    [[[0.5, 0.5]], [[1.0, 0.0]]]
    """

    weigher: Weigher
    prepare: Callable[[], Reweigher] | None = None

    @cached_property
    def _reweigher(self) -> Reweigher | None:
        return None if self.prepare is None else self.prepare()

    def means(self, depth: Floats, present: Bools, n_basins: int) -> Floats:
        """Return basin means with the weights of the gauges that are present at every step.

        Parameters
        ----------
        depth : array of float, shape (n_steps, n_gauges)
            mm; what stands at gauges that are not present does not count.
        present : array of bool, shape (n_steps, n_gauges)
        n_basins
            Rows of the method's tables.

        Returns
        -------
        array of float, shape (n_steps, n_basins)
            mm; NaN where no gauge is present, and where the method has no number with those that are.
        """
        runs = ReportingRuns.of(present)
        if len(runs.sets) > FEW_SETS and self._reweigher is not None:
            return self._reweigher(depth, runs)
        return reweigh_by_sets(self.weigher, n_basins)(depth, runs)

    def weights(self, sets: Bools) -> Iterator[Floats | MethodError]:
        """Yield the weights, (n_basins, n_gauges), of every set of present gauges, or why the method refuses it.

        Parameters
        ----------
        sets : array of bool, shape (n_sets, n_gauges)
            All different, none of them empty.
        """
        n = sets.shape[1]
        if len(sets) <= FEW_SETS or self._reweigher is None:
            for present in sets:
                yield self._weigh(present)
            return
        block = max(_TOGETHER // n**2, 1)
        for first in range(0, len(sets), block):
            some = sets[first : first + block]
            # The mean of 1 mm at one gauge and none at the others is that gauge's weight.
            runs = ReportingRuns(np.arange(len(some)) * n, some, len(some) * n)
            means = self._reweigher(np.tile(np.eye(n), (len(some), 1)), runs).reshape(len(some), n, -1)
            for present, weights in zip(some, means, strict=True):
                yield self._weigh(present) if np.isnan(weights).all() else np.ascontiguousarray(weights.T)

    def _weigh(self, present: Bools) -> Floats | MethodError:
        try:
            return self.weigher(present).weights
        except MethodError as error:
            return error

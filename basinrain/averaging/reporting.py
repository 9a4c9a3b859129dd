"""Which gauges report when: stretches of steps at which they are the same."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

__all__ = ["ReportingRuns"]


@dataclass(frozen=True, eq=False)
class ReportingRuns:
    """Stretches of steps, in order and without a break, at which the same gauges report.

    Parameters
    ----------
    first : array of int, shape (n_runs,)
        The step with which each begins; 0 the first of them.
    present : array of bool, shape (n_runs, n_gauges)
        The gauges that report in it.
    n_steps : int
        Steps in all of them together.

    Examples
    --------
    >>> runs = ReportingRuns.of(np.array([[True, True], [True, True], [False, True], [True, True]]))
    >>> runs.first, runs.lengths, len(runs)
    (array([0, 2, 3]), array([2, 1, 1]), 3)
    >>> runs.sets, runs.set_of_run  # the third stretch has the gauges of the first
    (array([[ True,  True],
           [False,  True]]), array([0, 1, 0]))
    >>> len(ReportingRuns.of(np.zeros((0, 2), dtype=bool)))
    0
    """

    first: npt.NDArray[np.int64]
    present: npt.NDArray[np.bool_]
    n_steps: int

    @classmethod
    def of(cls, reporting: npt.NDArray[np.bool_]) -> ReportingRuns:
        """Return the runs of which gauges report at every step, given in shape (n_steps, n_gauges)."""
        packed = np.packbits(reporting, axis=1)
        change = np.flatnonzero((packed[1:] != packed[:-1]).any(axis=1)) + 1
        first = np.concatenate([np.zeros(min(len(packed), 1), dtype=np.int64), change])
        return cls(first, reporting[first], len(reporting))

    def __len__(self) -> int:
        return len(self.first)

    @cached_property
    def lengths(self) -> npt.NDArray[np.int64]:
        """How many steps each has, shape (n_runs,)."""
        return np.diff(self.first, append=self.n_steps)

    @cached_property
    def _distinct(self) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
        packed = np.ascontiguousarray(np.packbits(self.present, axis=1))
        if not packed.size:
            return np.zeros(min(len(packed), 1), dtype=np.int64), np.zeros(len(packed), dtype=np.int64)
        # Rows as single values of so many bytes, which compare many times as fast as rows do.
        whole = packed.view(np.dtype((np.void, packed.shape[1]))).ravel()
        _, first, which = np.unique(whole, return_index=True, return_inverse=True)
        order = np.argsort(first)
        rank = np.empty_like(order)
        rank[order] = np.arange(len(order))
        return first[order], rank[which.ravel()]

    @property
    def sets(self) -> npt.NDArray[np.bool_]:
        """The different sets of reporting gauges, in the order in which they first come, shape (n_sets, n_gauges)."""
        return self.present[self._distinct[0]]

    @property
    def set_of_run(self) -> npt.NDArray[np.int64]:
        """Which of :attr:`sets` reports in each run, shape (n_runs,)."""
        return self._distinct[1]

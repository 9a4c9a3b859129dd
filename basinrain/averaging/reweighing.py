"""Basin means while gauges come and go, through one weight table for every set of gauges that report."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Iterator
from threading import Lock
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averaging.reporting import ReportingRuns
from basinrain.errors import MethodError
from basinrain.weights import WeightTable

__all__ = ["KEPT_BYTES", "reweigh_by_sets", "steps_of_sets"]

KEPT_BYTES: Final = 64 * 2**20
"""Bytes of weight tables that are kept from one call to the next, those used longest ago given up first."""


def reweigh_by_sets(
    weigh: Callable[[npt.NDArray[np.bool_]], WeightTable], n_basins: int
) -> Callable[[npt.NDArray[np.float64], ReportingRuns], npt.NDArray[np.float64]]:
    """Return what averages many steps by any method, asking for its weights once for every set of reporting gauges.

    Parameters
    ----------
    weigh
        Makes the method's weights for the gauges that are present.
    n_basins
        Rows of its tables.

    Returns
    -------
    callable
        As :class:`~basinrain.averaging.registry.Reweigher` says. Steps at which no gauge reports are NaN, and so are
        those whose gauges the method refuses (:class:`~basinrain.errors.MethodError`, such as too small a reach). It
        keeps 64 MiB of tables for later calls, which changes no number.

    Examples
    --------
    >>> def even(present):
    ...     row = present / present.sum()
    ...     return WeightTable("even", ("all",), ("A", "B"), row[None, :])
    >>> depth = np.array([[2.0, 4.0], [np.nan, 6.0], [np.nan, np.nan]])
    >>> reweigh_by_sets(even, 1)(depth, ReportingRuns.of(~np.isnan(depth)))
    array([[ 3.],
           [ 6.],
           [nan]])
    >>> reweigh_by_sets(even, 1)(depth[:0], ReportingRuns.of(~np.isnan(depth[:0]))).shape
    (0, 1)
    """
    tables = _Tables(weigh)

    def means(depth: npt.NDArray[np.float64], runs: ReportingRuns) -> npt.NDArray[np.float64]:
        result = np.full((runs.n_steps, n_basins), np.nan)
        for present, steps in zip(runs.sets, steps_of_sets(runs), strict=True):
            table = tables(present) if present.any() else None
            if table is not None:
                result[steps] = table.apply(np.where(present, depth[steps], 0.0))
        return result

    return means


def steps_of_sets(runs: ReportingRuns) -> Iterator[slice | npt.NDArray[np.int64]]:
    """Yield the steps of every set of reporting gauges, a slice where they follow each other.

    Examples
    --------
    >>> runs = ReportingRuns.of(np.array([[True, True], [True, True], [False, True], [True, True]]))
    >>> list(steps_of_sets(runs))
    [array([0, 1, 3]), slice(2, 3, None)]
    """
    set_of_step = np.repeat(runs.set_of_run, runs.lengths)
    order = np.argsort(set_of_step, kind="stable")
    number = np.bincount(set_of_step)
    for end, n in zip(np.cumsum(number), number, strict=True):
        steps = order[end - n : end]
        low, high = int(steps[0]), int(steps[-1]) + 1
        yield slice(low, high) if high - low == len(steps) else steps


class _Tables:
    """Weight tables by set of present gauges; None where the method refuses them."""

    def __init__(self, weigh: Callable[[npt.NDArray[np.bool_]], WeightTable]) -> None:
        self._weigh = weigh
        self._kept: OrderedDict[bytes, WeightTable | None] = OrderedDict()
        self._bytes = 0
        self._lock = Lock()

    def __call__(self, present: npt.NDArray[np.bool_]) -> WeightTable | None:
        key = np.packbits(present).tobytes()
        with self._lock:
            if key in self._kept:
                self._kept.move_to_end(key)
                return self._kept[key]
        table: WeightTable | None
        try:
            table = self._weigh(present)
        except MethodError:
            table = None
        with self._lock:
            if key not in self._kept:
                self._kept[key] = table
                self._bytes += _size(key, table)
            while self._bytes > KEPT_BYTES:
                self._bytes -= _size(*self._kept.popitem(last=False))
        return table


def _size(key: bytes, table: WeightTable | None) -> int:
    # What python needs for a key, an entry and a table beside their numbers is reckoned at 1 KiB.
    return 1024 + len(key) + (0 if table is None else table.weights.nbytes + table.covered.nbytes)

"""Stretches of a record over which the same gauges are absent, and the large holes that are left in them."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

__all__ = ["Epoch", "Holes", "epochs_of", "large_holes"]

Ints = npt.NDArray[np.int64]
Bools = npt.NDArray[np.bool_]

LARGE: Final = 6
"""A group of more missing neighbours than this is a hole, and its cells are shared out all at once."""

_FEW: Final = 8
"""Runs with holes that are not worth a tessellation of their own."""

_SHORT: Final = 16
"""A stretch of fewer runs is not divided any further."""

_JOINTLY: Final = 6
"""At least so many gauges, and one of fifty, come or go together at a border that is preferred to the middle."""

_RUNS: Final = 8192
"""Runs that are looked at together."""


class Holes(NamedTuple):
    """Groups of more than :data:`LARGE` neighbours that are missing together, run by run.

    Parameters
    ----------
    run : array of int, shape (n_holes,)
        Rising.
    gauges : list of tuple of int
        The gauges of each, rising.
    """

    run: Ints
    gauges: list[tuple[int, ...]]


class Epoch(NamedTuple):
    """A stretch of runs.

    Parameters
    ----------
    first, stop : int
        The runs, ``stop`` not included.
    absent : array of bool, shape (n_gauges,)
        Gauges that are missing in all of them, and are left out of their tessellation.
    holes
        What is large among the others; runs counted from ``first``.
    """

    first: int
    stop: int
    absent: Bools
    holes: Holes


def large_holes(missing: Bools, edges: Ints) -> Holes:
    """Return the large groups of missing neighbours.

    Parameters
    ----------
    missing : array of bool, shape (n_runs, n_gauges)
        Gauges missing from the tessellation.
    edges : array of int, shape (n_edges, 2)
        Its pairs of neighbours.

    Examples
    --------
    >>> row = np.array([[1, 1, 1, 1, 1, 1, 1, 0, 1]], dtype=bool)
    >>> large_holes(row, np.column_stack((np.arange(8), np.arange(1, 9))))
    Holes(run=array([0]), gauges=[(0, 1, 2, 3, 4, 5, 6)])
    """
    n_gauges = missing.shape[1]
    runs: list[int] = []
    groups: list[tuple[int, ...]] = []
    for begin in range(0, len(missing), _RUNS):
        some = missing[begin : begin + _RUNS]
        crowded = np.flatnonzero(some.sum(axis=1) > LARGE)
        if not len(crowded):
            continue
        packed = np.packbits(some[crowded].T, axis=1)
        edge, byte = np.nonzero(packed[edges[:, 0]] & packed[edges[:, 1]])
        bits = np.unpackbits((packed[edges[edge, 0], byte] & packed[edges[edge, 1], byte])[:, None], axis=1)
        hit, bit = np.nonzero(bits)
        run, ends = byte[hit] * 8 + bit, edges[edge[hit]]
        places, which = np.unique(run[:, None] * n_gauges + ends, return_inverse=True)
        which = which.reshape(ends.shape)
        graph = coo_array((np.ones(len(which)), (which[:, 0], which[:, 1])), shape=(len(places), len(places)))
        n, label = connected_components(graph, directed=False)
        large = np.bincount(label, minlength=n) > LARGE
        at = np.flatnonzero(large[label])
        # Places rise by run, then gauge, so a stable sort by group keeps the gauges of each rising.
        at = at[np.argsort(label[at], kind="stable")]
        borders = np.flatnonzero(np.diff(label[at])) + 1
        found = sorted(
            (int(lot[0]) // n_gauges, tuple((lot % n_gauges).tolist()))
            for lot in np.split(places[at], borders)
            if len(lot)
        )
        runs += [begin + int(crowded[k]) for k, _ in found]
        groups += [gauges for _, gauges in found]
    return Holes(np.array(runs, dtype=np.int64), groups)


def epochs_of(present: Bools, edges_without: Callable[[Bools], Ints]) -> Iterator[Epoch]:
    """Divide runs into stretches, few of whose runs have large holes once the gauges absent throughout are left out.

    Parameters
    ----------
    present : array of bool, shape (n_runs, n_gauges)
        Which gauges report.
    edges_without
        Returns the pairs of neighbours in the tessellation without some gauges.

    Yields
    ------
    Epoch
        In order. They depend on nothing but ``present`` and the neighbours.
    """
    some: Bools = np.asarray(present.any(axis=1))
    jointly = max(_JOINTLY, -(-present.shape[1] // 50))
    changes = np.concatenate([np.zeros(min(len(present), 1), dtype=np.int64), _changes(present)])
    nobody = np.zeros(present.shape[1], dtype=bool)
    stack = [(0, len(present))] if len(present) else []
    while stack:
        first, stop = stack.pop()
        inside = present[first:stop]
        # Where nobody reports there is nothing to compute.
        missing = ~inside & some[first:stop, None]
        holes = large_holes(missing, edges_without(nobody))
        absent = nobody
        if _many(holes):
            throughout: Bools = np.asarray(~inside.any(axis=0))
            if throughout.any() and not throughout.all():
                absent = throughout
                holes = large_holes(missing & ~absent, edges_without(absent))
        if _many(holes) and stop - first >= _SHORT:
            inner = changes[first + 1 : stop]
            border = int(inner.argmax())
            if inner[border] < jointly:
                border = (stop - first) // 2 - 1
            border += first + 1
            stack += [(border, stop), (first, border)]
            continue
        yield Epoch(first, stop, absent, holes)


def _many(holes: Holes) -> bool:
    return len(np.unique(holes.run)) > _FEW


def _changes(present: Bools) -> Ints:
    """Return how many gauges come or go at the beginning of every run but the first."""
    before, after = present[:-1], present[1:]
    lots = [(before[k : k + _RUNS] != after[k : k + _RUNS]).sum(axis=1) for k in range(0, len(before), _RUNS)]
    return np.concatenate([np.empty(0, dtype=np.int64), *lots])

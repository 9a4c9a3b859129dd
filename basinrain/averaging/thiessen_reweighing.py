"""Thiessen basin means of long records while gauges come and go, without a tessellation for every set of gauges."""

from __future__ import annotations

from collections import OrderedDict
from threading import RLock
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.sparse import csr_array

from basinrain.averaging.inputs import require_one_plane, union_is_sum
from basinrain.averaging.registry import Reweigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import reweigh_by_sets
from basinrain.averaging.thiessen import prepare_thiessen
from basinrain.averaging.thiessen_corrections import Corrections, Spans
from basinrain.averaging.thiessen_epochs import Epoch, Holes, epochs_of
from basinrain.averaging.thiessen_removal import Removals
from basinrain.averaging.thiessen_tessellation import Tessellation, edges_among, whole_tessellation
from basinrain.basins import Basins
from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork

__all__ = ["ThiessenReweigher", "prepare_thiessen_reweigher"]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]

CACHE_BYTES: Final = 128 << 20
"""What is kept between calls is cut down to this."""

_RUNS: Final = 8192
"""Runs whose removals are held together."""

_BUFFER: Final = 1 << 20
"""Depths and means of a chunk of steps together, 8 MiB, so that they stay near the processor."""

_LONG: Final = 24
"""Over at least so many steps a silence is set at once; shorter ones are gathered."""

_DENSE: Final = 0.2
"""A table with at least this share of its places taken is multiplied whole."""


class _Kept(NamedTuple):
    """A tessellation and what was learned of its removals."""

    tessellation: Tessellation
    removals: Removals


def prepare_thiessen_reweigher(network: GaugeNetwork, basins: Basins) -> Reweigher:
    """Check network and basins once and return what averages records over them, gauges coming and going.

    Means are those of :func:`basinrain.averaging.thiessen_weights` for the gauges that report at every step, to 1e-9.

    Raises
    ------
    DataError
        Gauges and basins are not in one plane. When it is called: two gauges that report together stand at one place.
    MethodError
        The pieces of a basin do not sum to its area.

    Examples
    --------
    Three gauges in a row, the square between x = 0 and 10: with B silent, A and C share it at x = 6.

    >>> import shapely
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[1.0, 5.0, 11.0], y=[5.0] * 3, crs="local")
    >>> square = Basins(ids=("square",), polygons=[shapely.box(0, 0, 10, 10)], crs="local")
    >>> depth = np.array([[10.0, 20.0, 30.0], [10.0, np.nan, 30.0], [np.nan, np.nan, np.nan]])
    >>> reweigh = prepare_thiessen_reweigher(network, square)
    >>> reweigh(depth, ReportingRuns.of(~np.isnan(depth))).round(9)
    array([[19.],
           [18.],
           [nan]])
    """
    require_one_plane(network, basins)
    present = np.ones(len(network), dtype=bool)
    try:
        whole = whole_tessellation(network, basins, present, len(basins) - union_is_sum(basins))
    except DataError:
        # Two gauges at one place may never report together.
        return reweigh_by_sets(prepare_thiessen(network, basins), len(basins))
    return ThiessenReweigher(network, basins, whole)


class ThiessenReweigher:
    """Averages records by Thiessen weights of the gauges that report at each step.

    Parameters
    ----------
    network, basins
        In one plane.
    whole
        The tessellation of all gauges; the union is not cut where the other basins sum to it.

    Notes
    -----
    Cells are cut from the basins' outlines once. Where gauges are silent, only their own cells are shared anew among
    neighbours, and what is computed for a set of silent neighbours serves every step at which they are silent. Gauges
    absent over a long stretch are left out of that stretch's tessellation; more than six neighbours silent together
    have their cells shared all at once. Whatever does not sum to the part that is shared is given up for a tessellation
    of its own. What is kept between calls changes their time, never a bit of what they return.
    """

    def __init__(self, network: GaugeNetwork, basins: Basins, whole: Tessellation) -> None:
        self._network, self._basins, self._whole = network, basins, whole
        self._n_cut = len(whole.ground.areas)
        self._weigh = prepare_thiessen(network, basins)
        nobody = np.zeros(len(network), dtype=bool)
        self._kept: OrderedDict[bytes, _Kept] = OrderedDict({nobody.tobytes(): _Kept(whole, Removals(whole))})
        self._own: dict[bytes, csr_array] = {}
        self._own_bytes = 0
        self._lock = RLock()

    def __call__(self, depth: Floats, runs: ReportingRuns, /) -> Floats:
        """Return basin means in mm, shape (n_steps, n_basins); NaN where no gauge reports.

        Parameters
        ----------
        depth : array of float, shape (n_steps, n_gauges)
            mm; finite where a gauge reports. It is not changed.
        runs
            Which gauges report at every step.

        Raises
        ------
        MethodError
            A tessellation of its own, where one is needed, does not sum to the basins.
        """
        result = np.empty((runs.n_steps, len(self._basins)))
        for epoch in epochs_of(runs.present, self._edges_without):
            for first in range(epoch.first, epoch.stop, _RUNS):
                self._average(depth, runs, epoch, slice(first, min(first + _RUNS, epoch.stop)), result)
        nobody = np.flatnonzero(~runs.present.any(axis=1))
        for run in nobody.tolist():
            result[runs.first[run] : runs.first[run] + runs.lengths[run]] = np.nan
        return result

    def _edges_without(self, absent: Bools) -> Ints:
        if not absent.any():
            return self._whole.edges
        kept = self._kept.get(absent.tobytes())
        return kept.tessellation.edges if kept else edges_among(self._whole.ground, ~absent)

    def _without(self, absent: Bools) -> _Kept:
        key = absent.tobytes()
        if key not in self._kept:
            made = self._whole.without(absent)
            if made is None:
                made = whole_tessellation(self._network, self._basins, ~absent, self._n_cut, self._whole.ground)
            self._kept[key] = _Kept(made, Removals(made))
        self._kept.move_to_end(key)
        return self._kept[key]

    def _cut_down(self) -> None:
        """Forget what was used longest ago, and at last what was learned of the tessellation in use."""
        for key, kept in list(self._kept.items()):
            if self._nbytes <= CACHE_BYTES:
                break
            if kept.tessellation is self._whole or key == next(reversed(self._kept)):
                self._kept[key] = _Kept(kept.tessellation, Removals(kept.tessellation))
            else:
                del self._kept[key]

    @property
    def _nbytes(self) -> int:
        return sum(kept.tessellation.nbytes + kept.removals.nbytes for kept in self._kept.values())

    def _average(self, depth: Floats, runs: ReportingRuns, epoch: Epoch, some: slice, result: Floats) -> None:
        """Fill in the means of some runs of an epoch."""
        present = runs.present[some]
        end = runs.n_steps if some.stop == len(runs) else int(runs.first[some.stop])
        borders = np.append(runs.first[some], end)
        silent = Spans.where(~present.T, borders)
        missing = ~present & ~epoch.absent & present.any(axis=1, keepdims=True)
        with self._lock:
            kept = self._without(epoch.absent)
            corrections = Corrections(kept.tessellation, kept.removals, missing, _holes_in(epoch, some), borders)
            self._cut_down()
        own = Spans(corrections.own, borders[corrections.own], borders[corrections.own + 1])
        weights = _quicker(kept.tessellation.weights)
        n_gauges = depth.shape[1]
        chunk = max(_BUFFER // (n_gauges + self._n_cut), 16)
        store = np.empty(chunk * n_gauges)
        shares = self._whole.ground.areas / self._whole.ground.areas.sum()
        for first in range(int(borders[0]), end, chunk):
            stop = min(first + chunk, end)
            known = store[: n_gauges * (stop - first)].reshape(n_gauges, stop - first)
            known[...] = depth[first:stop].T
            _silence(known, silent.within(first, stop))
            means = np.ascontiguousarray(weights @ known)
            corrections.add_to(means, known, first, stop)
            for run, a, b in zip(*(ints.tolist() for ints in own.within(first, stop)), strict=True):
                means[:, a:b] = self._weights_of(present[run]) @ known[:, a:b]
            result[first:stop, : self._n_cut] = means.T
            if len(self._basins) > self._n_cut:
                result[first:stop, -1] = shares @ means

    def _weights_of(self, present: Bools) -> csr_array:
        """Return the weights of a tessellation of its own, the union's row left out where it is a sum."""
        key = present.tobytes()
        with self._lock:
            if key not in self._own:
                weights = csr_array(self._weigh(present).weights[: self._n_cut])
                self._own[key] = weights
                self._own_bytes += 2 * weights.data.nbytes
                while self._own_bytes > CACHE_BYTES // 4 and len(self._own) > 1:
                    self._own_bytes -= 2 * self._own.pop(next(iter(self._own))).data.nbytes
            return self._own[key]


def _holes_in(epoch: Epoch, some: slice) -> Holes:
    """Return the holes of some runs, counted from the first of these."""
    first, stop = np.searchsorted(epoch.holes.run, [some.start - epoch.first, some.stop - epoch.first])
    return Holes(epoch.holes.run[first:stop] + epoch.first - some.start, epoch.holes.gauges[first:stop])


def _quicker(weights: csr_array) -> csr_array | Floats:
    """Return weights in the form that is multiplied sooner."""
    whole = weights.nnz >= _DENSE * weights.shape[0] * weights.shape[1]
    return np.asarray(weights.toarray()) if whole else weights


def _silence(known: Floats, silent: Spans) -> None:
    """Set depths, shape (n_gauges, n_steps), to 0 where their gauge does not report."""
    long = silent.lengths >= _LONG
    for gauge, first, stop in zip(*(ints.tolist() for ints in silent.chosen(long)), strict=True):
        known[gauge, first:stop] = 0.0
    short = silent.chosen(~long)
    known.reshape(-1)[np.repeat(short.of * known.shape[1], short.lengths) + short.steps()] = 0.0

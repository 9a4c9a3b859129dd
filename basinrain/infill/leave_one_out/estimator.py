"""Estimates of every gauge from the others alone, for a whole array of depths."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.options import InfillOptions
from basinrain.infill.substitutes import Pairs, Substitutes, sum_donors

__all__ = ["Estimator", "Piece"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_BLOCK: Final = 1 << 22
"""Values whose silent gauges are looked at together."""
_PIECE: Final = 1 << 18
"""Values that are estimated together: few enough to stay in a processor's cache."""
_FEW_SETS: Final = 64
"""Up to so many sets of silent gauges the weights of each are asked for, without looking for those that are alike."""


class Piece(NamedTuple):
    """Estimates of some steps.

    Parameters
    ----------
    steps : array of int, shape (n,), or slice
        The steps.
    observed : array of float, shape (n, n_gauges)
        mm, 0 where there is no value.
    estimated : array of float, shape (n, n_gauges)
        mm, from the other gauges; any number where not ``valid``.
    valid : array of bool, shape (n, n_gauges)
        Where the gauge has a value and enough donors.
    """

    steps: Ints | slice
    observed: Floats
    estimated: Floats
    valid: Bools


class Estimator:
    """Leave-one-out estimates by one method.

    Donor weights are asked for once for every set of silent donors that occurs, and kept: so one estimator serves any
    number of stretches of a record.

    Parameters
    ----------
    network : GaugeNetwork
        The gauges, with normals where the method needs them.
    options : InfillOptions
        Method and numbers.
    distances : array of float, shape (n_gauges, n_gauges), optional
        m; taken from the network where not given.
    reporting : array of bool, shape (n_gauges,), optional
        Gauges that report at any time; all where not given. What is not known of the others, a normal or an elevation,
        does not matter.
    further
        What the method's weights depend on besides: ``relations`` between gauges, ``ratios`` of normals from the
        record.

    Examples
    --------
    The second step lacks B, so C is estimated from A alone, which is one donor.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 3e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> options = InfillOptions(method="station-average", min_donors=1)
    >>> depth = np.array([[4.0, 2.0, 0.0], [4.0, np.nan, 1.0]])
    >>> Estimator(network, options).estimates(depth)
    array([[ 1.,  2.,  3.],
           [ 1., nan,  4.]])
    """

    def __init__(
        self,
        network: GaugeNetwork,
        options: InfillOptions,
        *,
        distances: Floats | None = None,
        reporting: Bools | None = None,
        **further: Any,  # noqa: ANN401 - handed to the method as it is
    ) -> None:
        self._network, self._options, self._further = network, options, further
        self._distances = network.distances() if distances is None else distances
        self._reporting = np.ones(len(network), dtype=bool) if reporting is None else reporting
        monthly = "ratios" in further or (network.normals is not None and network.normals.shape[1] > 1)
        self._by_month = options.chosen_method.needs_normals and monthly
        self._substitutes: dict[int, Substitutes] = {}

    def estimates(self, depth: Floats, months: Ints | None = None) -> Floats:
        """Return the estimate of every value from the other gauges of its step.

        Parameters
        ----------
        depth : array of float, shape (n_steps, n_gauges)
            mm; NaN where there is no value.
        months : array of int, shape (n_steps,), optional
            1 to 12, 0 without times; needed only by methods that use monthly normals. Not given: no times.

        Returns
        -------
        array of float, shape (n_steps, n_gauges)
            mm; NaN where there is no value or there are too few donors.

        Raises
        ------
        DataError
            Normals are missing or not above 0 at a gauge that takes part.
        """
        result = np.full(depth.shape, np.nan)
        for piece in self.pieces(depth, months):
            result[piece.steps] = np.where(piece.valid, piece.estimated, np.nan)
        return result

    def pieces(self, depth: Floats, months: Ints | None = None) -> Iterator[Piece]:
        """Yield the estimates piece by piece; a piece's arrays are used again for the next one.

        Parameters
        ----------
        depth, months
            As for :meth:`estimates`.
        """
        n = len(self._network)
        block = max(_BLOCK // max(n, 1), 1)
        for month, steps in self._groups(len(depth), months):
            for first in range(0, len(steps), block):
                chosen = steps[first : first + block]
                # Steps without a break are read in place, not gathered.
                whole = int(chosen[-1]) - int(chosen[0]) + 1 == len(chosen)
                rows = slice(int(chosen[0]), int(chosen[-1]) + 1) if whole else np.asarray(chosen)
                yield from self._block(depth, rows, chosen, month)

    def _groups(self, n_steps: int, months: Ints | None) -> Iterator[tuple[int, Ints | range]]:
        if not self._by_month or months is None:
            yield 0, range(n_steps)
            return
        for month in np.unique(months):
            yield int(month), np.flatnonzero(months == month)

    def _weights(self, month: int, target: int, reporting: Bools, /) -> Floats:
        return self._options.weights(
            self._network,
            target,
            reporting,
            month=month or None,
            distances=self._distances[target],
            **self._further,
        )

    def _substitutes_of(self, month: int) -> Substitutes:
        if month not in self._substitutes:
            self._substitutes[month] = Substitutes(self._reporting, partial(self._weights, month))
        return self._substitutes[month]

    def _block(self, depth: Floats, rows: Ints | slice, steps: Ints | range, month: int) -> Iterator[Piece]:
        silent: Bools = np.isnan(depth[rows], order="C")
        run = _runs(silent)
        n = silent.shape[1]
        substitutes = pairs = None
        if len(run) - 1 > _FEW_SETS or month in self._substitutes:
            substitutes = self._substitutes_of(month)
            pairs = None if substitutes.wide else substitutes.of(silent[run[:-1]])
        size = max(_PIECE // max(n, 1), 1)
        observed, estimated = np.empty((size, n)), np.empty((size, n))
        for first in range(0, len(steps), size):
            stop = min(first + size, len(steps))
            mine = slice(first, stop)
            p, e = observed[: stop - first], estimated[: stop - first]
            if isinstance(rows, slice):
                part: Ints | slice = slice(rows.start + first, rows.start + stop)
                np.copyto(p, depth[part])
            else:
                part = np.asarray(steps[mine])
                np.take(depth, part, axis=0, out=p)
            np.copyto(p, 0.0, where=silent[mine])
            valid = ~silent[mine]
            piece = Piece(part, p, e, valid)
            if substitutes is None or pairs is None:
                self._row_by_row(p, e, valid, month)
            else:
                np.matmul(p, substitutes.base, out=e)
                without = ~substitutes.estimable(np.arange(n))
                if without.any():
                    valid[:, without] = False
                _correct(piece, substitutes, pairs, run, first)
            yield piece

    def _row_by_row(self, p: Floats, e: Floats, valid: Bools, month: int) -> None:
        """Ask for the weights of every set of gauges that report."""
        run = _runs(valid)
        reporting = valid[run[:-1]]
        of_row = np.repeat(np.arange(len(reporting)), np.diff(run))
        for g in np.flatnonzero(valid.any(axis=0)).tolist():
            others = reporting.copy()
            others[:, g] = False
            weights = self._weights(month, g, others)
            e[:, g] = np.einsum("tg,tg->t", p, weights[of_row])
            valid[:, g] &= np.asarray(weights.any(axis=1))[of_row]


def _runs(silent: Bools) -> Ints:
    """Return the first rows of the stretches of equal rows, and the number of rows at the end."""
    packed = np.packbits(silent, axis=1)
    change = np.flatnonzero((packed[1:] != packed[:-1]).any(axis=1)) + 1
    return np.concatenate([[0], change, [len(silent)]])


def _correct(piece: Piece, substitutes: Substitutes, pairs: Pairs, run: Ints, first: int) -> None:
    """Estimate anew where a donor is silent, over the rows ``first`` and on."""
    p, e, valid = piece.observed, piece.estimated, piece.valid
    stop = first + len(p)
    runs = np.searchsorted(run, [first, stop], side="right") - 1
    lo, hi = np.searchsorted(pairs.row, [runs[0], runs[1] + (run[runs[1]] < stop)])
    if lo == hi:
        return
    row, target, node = pairs.row[lo:hi], pairs.target[lo:hi], pairs.node[lo:hi]
    begin = np.maximum(run[row], first) - first
    length = np.minimum(run[row + 1], stop) - first - begin
    at, sums = sum_donors(p, begin, length, *substitutes.donors(node))
    at += np.repeat(target, length)
    e.ravel()[at] = sums
    lost = ~substitutes.estimable(node)
    if lost.any():
        valid.ravel()[at[np.repeat(lost, length)]] = False

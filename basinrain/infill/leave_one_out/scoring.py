"""Scores of estimates against observed depths, summed chunk by chunk."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.infill.leave_one_out.comparison import Score

__all__ = ["TOP", "ScoreSums"]

TOP: Final = 20
"""How many of the largest depths are compared."""

_EDGE: Final = 1e-9
_CONSTANT: Final = 1e-12

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]


class ScoreSums:
    """All that the scores of one candidate need, by gauge.

    Parameters
    ----------
    n_gauges : int
    wet : float
        mm from which a depth counts as wet.

    Examples
    --------
    Errors of 1 and -1 mm; the second, dry, is estimated as wet.

    >>> sums = ScoreSums(1, wet=1.0)
    >>> sums.add(np.array([[3.0], [0.0]]), np.array([[2.0], [1.0]]), np.array([[True], [True]]))
    >>> score = sums.scores("station-average", ("A",), "day")[1]
    >>> score.gauge, score.n, score.rmse, score.bias, score.hits, score.false_alarms, score.top20_ratio
    ('A', 2, 1.0, 0.0, 1, 1, 1.0)
    """

    def __init__(self, n_gauges: int, *, wet: float) -> None:
        self._wet = wet
        self._sums = np.zeros((8, n_gauges))
        self._wets = np.zeros((4, n_gauges), dtype=np.int64)
        self._top = np.full((2, TOP, n_gauges), -np.inf)

    def add(self, observed: Floats, estimated: Floats, valid: Bools) -> None:
        """Add some cases.

        Parameters
        ----------
        observed, estimated : array of float, shape (n_cases, n_gauges)
            mm.
        valid : array of bool, shape (n_cases, n_gauges)
            The cases that count; elsewhere the depths may be anything.
        """
        p, e = np.where(valid, observed, 0.0), np.where(valid, estimated, 0.0)
        error = e - p
        self._sums += np.stack(
            [
                valid.sum(axis=0, dtype=float),
                error.sum(axis=0),
                np.abs(error).sum(axis=0),
                np.einsum("tg,tg->g", error, error),
                p.sum(axis=0),
                e.sum(axis=0),
                np.einsum("tg,tg->g", p, p),
                np.einsum("tg,tg->g", p, e),
            ]
        )
        fell, came = p >= self._wet - _EDGE, e >= self._wet - _EDGE
        for k, both in enumerate((fell & came, fell & ~came, ~fell & came, ~fell & ~came)):
            self._wets[k] += (both & valid).sum(axis=0)
        for k, values in enumerate((observed, estimated)):
            pool = np.concatenate([self._top[k], np.where(valid, values, -np.inf)])
            self._top[k] = np.partition(pool, len(pool) - TOP, axis=0)[-TOP:]

    def scores(self, candidate: str, gauges: tuple[str, ...], scale: str) -> list[Score]:
        """Return the score of all gauges pooled, then of each."""
        everyone = slice(None)
        return [
            self._score(candidate, "", scale, everyone),
            *(self._score(candidate, gauge, scale, slice(g, g + 1)) for g, gauge in enumerate(gauges)),
        ]

    def _score(self, candidate: str, gauge: str, scale: str, columns: slice) -> Score:
        sums, wets = self._sums[:, columns].sum(axis=1), self._wets[:, columns].sum(axis=1)
        top = self._top[:, :, columns].reshape(2, -1)
        n, error, absolute, squared, p, e, pp, pe = sums.tolist()
        ee = squared - pp + 2 * pe
        largest = np.sort(top, axis=1)[:, -min(TOP, int(n)) :] if n else np.zeros((2, 0))
        fell, came = largest.sum(axis=1).tolist()
        nan = float("nan")
        spread = (pp - p * p / n, ee - e * e / n) if n else (0.0, 0.0)
        varies = n > 1 and spread[0] > _CONSTANT * pp and spread[1] > _CONSTANT * max(ee, pp)
        return Score(
            candidate=candidate,
            gauge=gauge,
            scale=scale,
            n=int(n),
            rmse=float(np.sqrt(squared / n)) if n else nan,
            mae=absolute / n if n else nan,
            bias=error / n if n else nan,
            correlation=float(np.clip((pe - p * e / n) / np.sqrt(spread[0] * spread[1]), -1, 1)) if varies else nan,
            hits=int(wets[0]),
            misses=int(wets[1]),
            false_alarms=int(wets[2]),
            dry_hits=int(wets[3]),
            top20_ratio=came / fell if fell > 0 else nan,
        )

"""Whether a difference in error can be told from chance: a bootstrap over the times of the cases."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.infill.leave_one_out.comparison import Difference

__all__ = ["FEWEST_WEEKS", "RESAMPLES", "differences_to_best"]

RESAMPLES: Final = 1000
FEWEST_WEEKS: Final = 5
"""With fewer weeks of cases than this there is no interval, and nothing can be told apart."""

_NOTHING: Final = 1e-12
_BOUNDS: Final = (2.5, 97.5)

Floats = npt.NDArray[np.float64]


def differences_to_best(
    candidates: tuple[str, ...], squared: Floats, count: Floats, week: npt.NDArray[np.int64], *, seed: int
) -> tuple[Difference, ...]:
    """Return how much worse every candidate is than the best.

    Parameters
    ----------
    candidates : tuple of str
        Labels, from simple to complex; of two that are equally good the first is the best.
    squared : array of float, shape (n_candidates, n_cases)
        Sums over the gauges of squared errors, mm².
    count : array of float, shape (n_cases,)
        Number of gauges in each sum; above 0 in all.
    week : array of int, shape (n_cases,)
        Cases of equal numbers are drawn together: gauges err together, and days of one storm do.
    seed
        Of the random draws.

    Returns
    -------
    tuple of Difference
        With the percentile interval at 95 % over 1,000 resamples of whole weeks (Efron and Tibshirani 1993, An
        Introduction to the Bootstrap, ch. 13; from memory). A difference below 1e-12 mm, or fewer than 5 weeks, for
        which the bounds are NaN, are not distinguishable.

    Examples
    --------
    Errors of 1 and 3 mm in every week, one gauge each.

    >>> squared = np.array([[1.0] * 6, [9.0] * 6])
    >>> worse = differences_to_best(("a", "b"), squared, np.ones(6), np.arange(6), seed=1)[1]
    >>> worse.best, worse.difference, worse.low, worse.high, worse.distinguishable
    ('a', 2.0, 2.0, 2.0, True)
    """
    rmse = np.sqrt(squared.sum(axis=1) / count.sum())
    best = int(np.flatnonzero(rmse <= rmse.min() + _NOTHING)[0])
    weeks, of_case = np.unique(week, return_inverse=True)
    sums = np.stack([np.bincount(of_case.ravel(), row, len(weeks)) for row in (*squared, count)])
    low, high = np.full((2, len(candidates)), np.nan)
    if len(weeks) >= FEWEST_WEEKS:
        draws = np.random.default_rng(seed).multinomial(len(weeks), np.full(len(weeks), 1 / len(weeks)), RESAMPLES)
        drawn = sums @ draws.T.astype(float)
        errors = np.sqrt(drawn[:-1] / drawn[-1])
        low, high = np.percentile(errors - errors[best], _BOUNDS, axis=1)
    return tuple(
        Difference(
            candidate=label,
            best=candidates[best],
            difference=max(float(rmse[k] - rmse[best]), 0.0),
            low=float(low[k]),
            high=float(high[k]),
            distinguishable=bool(rmse[k] - rmse[best] > _NOTHING and low[k] > 0),
        )
        for k, label in enumerate(candidates)
    )

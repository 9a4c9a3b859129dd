"""Whether a difference in error can be told from chance: a bootstrap over weeks, times or single cases."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.infill.leave_one_out.comparison import Difference

__all__ = ["FEWEST", "FEWEST_WEEKS", "RESAMPLES", "differences_to_best", "what_is_drawn"]

RESAMPLES: Final = 1000
FEWEST_WEEKS: Final = 10
"""With fewer weeks of cases than this their times are drawn instead."""
FEWEST: Final = 5
"""With fewer times than this single cases are drawn; with fewer cases there is no interval."""

_NOTHING: Final = 1e-12
_BOUNDS: Final = (2.5, 97.5)

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


def what_is_drawn(week: Ints | None, count: Floats) -> str:
    """Return what a bootstrap may draw anew: the largest parts of which there are enough.

    Parameters
    ----------
    week : array of int, shape (n_times,), or None
        The week of every time with a case; None where times are longer than a day, or have no dates.
    count : array of float, shape (n_times,)
        Number of cases at every time.

    Returns
    -------
    str
        ``"week"`` from 10 weeks on; else ``"time"`` from 5 times on (of days of one storm the errors go together, so
        that intervals come out too narrow); else ``"case"`` from 5 cases on, a gauge at a time each (far too narrow);
        else ``""``, nothing.

    Examples
    --------
    >>> days = np.arange(14)
    >>> what_is_drawn(days // 7, np.ones(14)), what_is_drawn(days * 7, np.ones(14))
    ('time', 'week')
    >>> what_is_drawn(None, np.array([9.0, 9.0])), what_is_drawn(None, np.array([2.0, 2.0]))
    ('case', '')
    """
    if week is not None and len(np.unique(week)) >= FEWEST_WEEKS:
        return "week"
    if len(count) >= FEWEST:
        return "time"
    return "case" if count.sum() >= FEWEST else ""


def differences_to_best(
    candidates: tuple[str, ...], squared: Floats, count: Floats, group: Ints | None, *, seed: int
) -> tuple[Difference, ...]:
    """Return how much worse every candidate is than the best.

    Parameters
    ----------
    candidates : tuple of str
        Labels, from simple to complex; of two that are equally good the first is the best.
    squared : array of float, shape (n_candidates, n)
        Sums of squared errors, mm²: over the gauges at a time, or of single cases.
    count : array of float, shape (n,)
        Number of cases in each sum; above 0 in all.
    group : array of int, shape (n,), or None
        Sums of equal numbers are drawn together: gauges err together, and days of one storm do. None: nothing is drawn.
    seed
        Of the random draws.

    Returns
    -------
    tuple of Difference
        With the percentile interval at 95 % over 1,000 resamples of whole groups (Efron and Tibshirani 1993, An
        Introduction to the Bootstrap, ch. 13; from memory). Not distinguishable are a difference below 1e-12 mm, and
        any where nothing is drawn, for which the bounds are NaN.

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
    low, high = np.full((2, len(candidates)), np.nan)
    if group is not None:
        groups, of_sum = np.unique(group, return_inverse=True)
        n = len(groups)
        sums = np.stack([np.bincount(of_sum.ravel(), row, n) for row in (*squared, count)])
        draws = np.random.default_rng(seed).multinomial(n, np.full(n, 1 / n), RESAMPLES)
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

"""The double-mass curve: does a gauge keep its proportion to its neighbours over the years."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.special import fdtrc

from basinrain.errors import DataError, Problem
from basinrain.screening.annual import calendar_days

__all__ = ["PERSISTENCE", "DoubleMass", "double_mass"]

PERSISTENCE: Final = 5
"""Years that a regime should last before it is more than a run of chance (Searcy and Hardison 1960, from memory)."""

_SIGNIFICANT: Final = 0.01
_ROUNDING: Final = 1e-12
"""A sum of squares below this part of the whole is rounding."""


@dataclass(frozen=True, eq=False)
class DoubleMass:
    """The curve of a gauge's cumulative totals against those of its neighbours' mean, with its break.

    Parameters
    ----------
    gauge
        The gauge's id.
    reference
        Ids of the gauges whose mean is the reference.
    years : array of int, shape (n,)
        The years that took part, in the order of accumulation.
    totals : array of float, shape (n,)
        mm, the gauge's own.
    days : array of int, shape (n,)
        Days of the year that its total, and the reference's, are over.
    x, y : array of float, shape (n,)
        mm, cumulative totals of the reference and of the gauge.
    break_after
        The last year, in the order of accumulation, before the break; None where there are too few years to look.
    slopes
        mm per mm, of the chords before and after the break; the slope of the whole twice where there is none.
    ratio
        Slope of the newer years over that of the older: what the older years are multiplied by to agree with the newer.
        NaN without a break, or where a slope is 0.
    fitted_ratio
        The same with least squares lines through the points of either part, the break's own in both and the origin in
        neither. How far it is from ``ratio`` tells how well the slopes are known.
    f
        Of the analysis of covariance, with 1 and n - 2 degrees of freedom; NaN without a break or a third year.
    significance
        The probability of so large an ``f`` by chance. Where the break was looked for, it is multiplied by the number
        of breaks that were tried (Bonferroni), at most 1. NaN without a break.
    found
        Whether the break was looked for, rather than given.
    adjusted : array of float, shape (n,)
        mm, the totals with the older years multiplied by ``ratio``; the totals themselves where there is none. The
        record itself is never changed by it.
    """

    gauge: str
    reference: tuple[str, ...]
    years: npt.NDArray[np.int64]
    totals: npt.NDArray[np.float64]
    days: npt.NDArray[np.int64]
    x: npt.NDArray[np.float64]
    y: npt.NDArray[np.float64]
    break_after: int | None = field(kw_only=True)
    slopes: tuple[float, float] = field(kw_only=True)
    ratio: float = field(kw_only=True)
    fitted_ratio: float = field(kw_only=True)
    f: float = field(kw_only=True)
    significance: float = field(kw_only=True)
    found: bool = field(kw_only=True)
    adjusted: npt.NDArray[np.float64] = field(kw_only=True)

    @property
    def significant(self) -> bool:
        """Whether chance would make such a break in at most 1 % of homogeneous records."""
        return self.significance <= _SIGNIFICANT

    @property
    def persists(self) -> bool:
        """Whether either side of the break has :data:`PERSISTENCE` years."""
        return self.break_after is not None and min(self._stop, len(self.years) - self._stop) >= PERSISTENCE

    @property
    def older_until(self) -> int | None:
        """The last of the older years; None without a break."""
        if self.break_after is None:
            return None
        return int(min(self.years[self._stop - 1], self.years[self._stop]) if self._newest_first else self.break_after)

    @property
    def _newest_first(self) -> bool:
        return bool(self.years[0] > self.years[-1])

    @property
    def _stop(self) -> int:
        return int(np.flatnonzero(self.years == self.break_after)[0]) + 1


def double_mass(
    totals: npt.ArrayLike,
    reference_totals: npt.ArrayLike,
    years: npt.ArrayLike,
    *,
    gauge: str = "",
    reference: tuple[str, ...] = (),
    break_after: int | None = None,
    days: npt.ArrayLike | None = None,
) -> DoubleMass:
    """Return the double-mass curve of a gauge against a reference, with its most likely break or the one given.

    Parameters
    ----------
    totals, reference_totals : array-like of float, shape (n_years,)
        mm, annual totals of the gauge and the mean ones of several neighbours. Years in which either is NaN, or the
        reference is 0, are left out.
    years : array-like of int, shape (n_years,)
        Increasing or decreasing: totals are accumulated in the order given.
    gauge, reference
        The gauge's id and those of its neighbours, for the result.
    break_after
        The last year before the break, in the order of accumulation; where not given, the break is looked for.
    days : array-like of int, shape (n_years,), optional
        Days that the totals of a year are over, the same ones at the gauge and in the reference; all of the calendar
        year where not given. For the result: the sums are taken as they are.

    Returns
    -------
    DoubleMass
        The model is y = s x for the totals y and the reference's x of a year, with a variance in proportion to x, so
        that the best slope of several years is their chord's, Σy/Σx. A break is looked for where two such slopes leave
        the smallest sum of squares, with at least five years on either side; below ten years there is none. ``f`` is
        the variance ratio of that sum and the one of a single slope (analysis of covariance).

    Raises
    ------
    DataError
        Years neither increase nor decrease, lengths disagree, or no year has values after the given break or up to it.

    Notes
    -----
    Searcy and Hardison (1960), *US Geological Survey Water-Supply Paper* 1541-B, from memory: the pattern is the mean
    of several stations; a break is tested by the analysis of covariance and should persist for five years.

    Examples
    --------
    >>> years = np.arange(2001, 2013)
    >>> reference = np.full(12, 100.0)
    >>> totals = np.where(years <= 2006, 120.0, 90.0) + np.tile([1.0, -1.0], 6)
    >>> curve = double_mass(totals, reference, years)
    >>> curve.break_after, curve.slopes, round(curve.ratio, 9), curve.significant
    (2006, (1.2, 0.9), 0.75, True)
    """
    y, x, when = np.asarray(totals, float), np.asarray(reference_totals, float), np.asarray(years, dtype=np.int64)
    item = f"gauge {gauge}" if gauge else "double-mass curve"
    if not len(y) == len(x) == len(when):
        found = f"{len(y)} totals, {len(x)} of the reference and {len(when)} years"
        raise DataError(Problem(item=item, found=found, expected="one of each a year", gauge=gauge))
    if not ((np.diff(when) > 0).all() or (np.diff(when) < 0).all()):
        raise DataError(
            Problem(item=item, found="years out of order", expected="increasing or decreasing", gauge=gauge)
        )
    used = np.isfinite(y) & np.isfinite(x) & (x > 0)
    over = calendar_days(when) if days is None else np.asarray(days, dtype=np.int64)
    y, x, when, over = y[used], x[used], when[used], over[used]
    if break_after is not None and break_after not in when[:-1]:
        span = f"{when[0]} to {when[-1]}" if len(when) else "no year with values"
        raise DataError(
            Problem(
                item=item,
                found=f"a break after {break_after} and {span}",
                expected="the break after one of the years with values, and not after the last",
                gauge=gauge,
            )
        )
    sums = _Sums(np.cumsum(x), np.cumsum(y))
    tried = (
        np.arange(PERSISTENCE, len(y) - PERSISTENCE + 1)
        if break_after is None
        else np.flatnonzero(when == break_after) + 1
    )
    if not len(tried):
        slope = float(sums.y[-1] / sums.x[-1]) if len(y) else np.nan
        return DoubleMass(
            gauge,
            reference,
            when,
            y,
            over,
            *sums,
            break_after=None,
            slopes=(slope, slope),
            ratio=np.nan,
            fitted_ratio=np.nan,
            f=np.nan,
            significance=np.nan,
            found=True,
            adjusted=y,
        )
    f = _variance_ratios(x, y, sums, tried)
    best = int(f.argmax())
    stop = int(tried[best])
    slopes = _chords(sums, stop)
    newest_first = bool(when[0] > when[-1])
    ratio = _ratio(slopes, newest_first=newest_first)
    older = (np.arange(len(y)) >= stop) == newest_first
    return DoubleMass(
        gauge,
        reference,
        when,
        y,
        over,
        *sums,
        break_after=int(when[stop - 1]),
        slopes=slopes,
        ratio=ratio,
        fitted_ratio=_ratio(_fitted(sums, stop), newest_first=newest_first),
        f=float(f[best]),
        significance=float(np.minimum(1.0, len(tried) * fdtrc(1, len(y) - 2, f[best]))),
        found=break_after is None,
        adjusted=np.where(older & np.isfinite(ratio), y * ratio, y),
    )


class _Sums(NamedTuple):
    """Cumulative totals of the reference and the gauge, shape (n,)."""

    x: npt.NDArray[np.float64]
    y: npt.NDArray[np.float64]


def _variance_ratios(
    x: npt.NDArray[np.float64], y: npt.NDArray[np.float64], sums: _Sums, tried: npt.NDArray[np.int64]
) -> npt.NDArray[np.float64]:
    """Return F of two slopes against one, for a break after the first ``tried`` years each."""
    squares = float((y**2 / x).sum())
    x1, y1 = sums.x[tried - 1], sums.y[tried - 1]
    x2, y2 = sums.x[-1] - x1, sums.y[-1] - y1
    one = squares - sums.y[-1] ** 2 / sums.x[-1]
    two = squares - y1**2 / x1 - y2**2 / x2
    one, two = (np.where(value <= _ROUNDING * squares, 0.0, value) for value in (one, two))
    explained = np.maximum(one - two, 0.0)
    if len(x) <= 2:
        return np.full(len(tried), np.nan)  # two slopes through two years leave nothing to judge them by
    f = np.divide(explained * (len(x) - 2), two, out=np.where(explained > 0, np.inf, 0.0), where=two > 0)
    return np.asarray(f)


def _chords(sums: _Sums, stop: int) -> tuple[float, float]:
    x, y = sums.x[stop - 1], sums.y[stop - 1]
    return float(y / x), float((sums.y[-1] - y) / (sums.x[-1] - x))


def _fitted(sums: _Sums, stop: int) -> tuple[float, float]:
    """Return the slopes of the least squares lines through the points up to the break, and from it."""
    slopes = []
    for part in (slice(0, stop), slice(stop - 1, None)):
        x, y = (values[part] - values[part].mean() for values in sums)
        slopes.append(float(x @ y / (x @ x)) if len(x) > 1 else np.nan)
    return slopes[0], slopes[1]


def _ratio(slopes: tuple[float, float], *, newest_first: bool) -> float:
    """Return the slope of the newer years over that of the older."""
    newer, older = slopes if newest_first else slopes[::-1]
    return newer / older if newer > 0 and older > 0 else np.nan

"""Tests of whether a series of years is homogeneous: one climate, one instrument, one place.

All are tried on a series in time order and look for a change of the mean somewhere in it. Their critical values:
:mod:`basinrain.screening.critical_values`.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import ClassVar, Final, Literal

import numpy as np
import numpy.typing as npt
from scipy.stats import rankdata

from basinrain.screening.annual import calendar_days
from basinrain.screening.critical_values import critical_values

__all__ = [
    "Grade",
    "Homogeneity",
    "TestResult",
    "buishand_q",
    "buishand_range",
    "homogeneity_of",
    "pettitt",
    "pettitt_probability",
    "snht",
    "von_neumann",
]

Grade = Literal["useful", "doubtful", "suspect"]

_GRADING: Final = 0.01
_DOUBTFUL: Final = 2
_LEAST_VARIATION: Final = 1e-9
"""A standard deviation below this part of the mean is rounding, not variation."""


@dataclass(frozen=True)
class TestResult:
    """What one test says of one series.

    Parameters
    ----------
    test
        ``"snht"``, ``"buishand-range"``, ``"buishand-q"``, ``"pettitt"`` or ``"von-neumann"``.
    n
        Values that took part; NaN are left out.
    statistic
        NaN where the series has fewer than two values or does not vary.
    critical
        The value that it is held against, by level; empty where ``n`` is below the table's shortest series.
    rejected_at
        The strictest level whose critical value is reached, 0.01 or 0.05; None where homogeneity is not rejected.
    break_after
        Position in the series of the last value before the most likely change; None where the test finds none.
    """

    __test__: ClassVar[bool] = False

    test: str
    n: int
    statistic: float
    critical: Mapping[float, float]
    rejected_at: float | None
    break_after: int | None


@dataclass(frozen=True, eq=False)
class Homogeneity:
    """The tests of one gauge's years, and the grade that follows.

    Parameters
    ----------
    gauge
        The gauge's id.
    years : array of int, shape (n,)
        The years that took part, in order; years may be absent between them.
    series : array of float, shape (n,)
        Annual totals in mm (from :func:`basinrain.screening.consistency.consistency`, mean depths of a day), or their
        ratios to the reference series.
    days : array of int, shape (n,)
        Days of the year that each is over.
    reference
        Ids of the gauges whose mean is the reference; empty where the totals themselves were tested.
    tests
        SNHT, Buishand's range, Pettitt and von Neumann, which are counted; then Buishand's Q, which is not.
    """

    gauge: str
    years: npt.NDArray[np.int64]
    series: npt.NDArray[np.float64]
    days: npt.NDArray[np.int64] = field(kw_only=True)
    reference: tuple[str, ...] = field(kw_only=True)
    tests: tuple[TestResult, ...] = field(kw_only=True)

    @property
    def counted(self) -> tuple[TestResult, ...]:
        """The four tests that make the grade."""
        return tuple(test for test in self.tests if test.test != "buishand-q")

    @property
    def rejections(self) -> int:
        """How many of the four reject at 1 %."""
        return sum(test.rejected_at == _GRADING for test in self.counted)

    @property
    def grade(self) -> Grade | None:
        """``"useful"`` (0 or 1 rejects), ``"doubtful"`` (2) or ``"suspect"`` (3 or 4); None without critical values."""
        if not all(test.critical for test in self.counted):
            return None
        if self.rejections < _DOUBTFUL:
            return "useful"
        return "doubtful" if self.rejections == _DOUBTFUL else "suspect"

    @property
    def break_after(self) -> int | None:
        """The last year before the change, from the first test that rejects at 1 % and places it; None otherwise."""
        for test in self.counted:
            if test.rejected_at == _GRADING and test.break_after is not None:
                return int(self.years[test.break_after])
        return None


def snht(series: npt.ArrayLike) -> TestResult:
    """Return the standard normal homogeneity test for one shift of the mean.

    Alexandersson (1986), *Journal of Climatology* 6, 661-675. With z the series less its mean over its standard
    deviation (n - 1), T(k) = k z̄₁² + (n - k) z̄₂² for the first k values and the rest; T₀ is the greatest T(k).

    Parameters
    ----------
    series : array-like of float, shape (n,)
        In time order; NaN are left out. It is most telling on ratios to a reference series.

    Returns
    -------
    TestResult
        The printed 1 % values are for another standard deviation and up to 6 % too high for this one; critical values
        are simulated.

    Examples
    --------
    >>> result = snht([0.0, 0.0, 2.0, 2.0])  # z = ±√3/2, so T(2) = 4 × 3/4
    >>> round(result.statistic, 9), result.break_after, dict(result.critical)
    (3.0, 1, {})
    """
    values, place = _given(series)
    z = _standardised(values, ddof=1)
    if z is None:
        return _result("snht", len(values), math.nan)
    n = len(z)
    k = np.arange(1, n)
    before = np.cumsum(z)[:-1]
    # The whole sums to zero, so both parts have the same sum but for its sign.
    t = before**2 / k + before**2 / (n - k)
    at = _first_greatest(t)
    return _result("snht", n, float(t[at]), int(place[at]))


def buishand_range(series: npt.ArrayLike) -> TestResult:
    """Return Buishand's test on the range of the cumulative deviations, R/√n.

    Buishand (1982), *Journal of Hydrology* 58, 11-27. With S_k the sum of the first k deviations from the mean over the
    population standard deviation (n), S_0 = 0: R = max S_k - min S_k.

    Parameters
    ----------
    series : array-like of float, shape (n,)
        In time order; NaN are left out.

    Returns
    -------
    TestResult
        The change is placed where S_k is farthest from 0.

    Examples
    --------
    >>> buishand_range([0.0, 0.0, 2.0, 2.0]).statistic  # S = 0, -1, -2, -1, 0
    1.0
    """
    return _buishand(series, "buishand-range")


def buishand_q(series: npt.ArrayLike) -> TestResult:
    """Return Buishand's test on the greatest cumulative deviation, Q/√n = max abs(S_k)/√n.

    Buishand (1982), as for :func:`buishand_range`; critical values up to n = 100 from memory, simulated
    within 0.016, beyond that simulated.

    Parameters
    ----------
    series : array-like of float, shape (n,)
        In time order; NaN are left out.

    Returns
    -------
    TestResult

    Examples
    --------
    >>> buishand_q([0.0, 2.0, 2.0, 0.0]).statistic  # S = 0, -1, 0, 1, 0
    0.5
    """
    return _buishand(series, "buishand-q")


def _buishand(series: npt.ArrayLike, test: Literal["buishand-range", "buishand-q"]) -> TestResult:
    values, place = _given(series)
    z = _standardised(values, ddof=0)
    if z is None:
        return _result(test, len(values), math.nan)
    sums = np.cumsum(z)[:-1]
    spread = max(0.0, sums.max()) - min(0.0, sums.min()) if test == "buishand-range" else np.abs(sums).max()
    return _result(test, len(z), float(spread / math.sqrt(len(z))), int(place[_first_greatest(np.abs(sums))]))


def pettitt(series: npt.ArrayLike) -> TestResult:
    """Return Pettitt's rank test, K = max abs(2 Σ r_i - k (n + 1)) over the first k ranks.

    Pettitt (1979), *Applied Statistics* 28, 126-135. Equal values take the mean of their ranks.

    Parameters
    ----------
    series : array-like of float, shape (n,)
        In time order; NaN are left out.

    Returns
    -------
    TestResult
        Critical values are two-sided and simulated. Those that are often printed as 5 % and 1 % (57 and 71 for n = 20)
        are the two-sided 10 % and 2 % points.

    Examples
    --------
    >>> result = pettitt([1.0, 2.0, 3.0, 4.0])  # after two: 2 (1 + 2) - 2 × 5
    >>> result.statistic, result.break_after
    (4.0, 1)
    """
    values, place = _given(series)
    if _standardised(values, ddof=0) is None:
        return _result("pettitt", len(values), math.nan)
    n = len(values)
    k = np.arange(1, n)
    u = np.abs(2 * np.cumsum(rankdata(values))[:-1] - k * (n + 1))
    at = _first_greatest(u)
    return _result("pettitt", n, float(u[at]), int(place[at]))


def pettitt_probability(statistic: float, n: int) -> float:
    """Return the approximate two-sided probability of Pettitt's statistic, 2 exp(-6 K² / (n³ + n²)), at most 1.

    Pettitt (1979). It is too high for n up to 100, so that it rejects too seldom: for n = 20 it gives 0.196 for K = 57,
    which chance exceeds in 0.109 of series. It is a formula for comparison; :func:`pettitt` does not rest on it.

    Examples
    --------
    >>> round(pettitt_probability(57, 20), 3)
    0.196
    """
    return min(1.0, 2 * math.exp(-6 * statistic**2 / (n**3 + n**2)))


def von_neumann(series: npt.ArrayLike) -> TestResult:
    """Return the von Neumann ratio, Σ (x_i - x_i+1)² / Σ (x_i - x̄)².

    Von Neumann (1941), *Annals of Mathematical Statistics* 12, 367-395; Bartels (1982), *Journal of the American
    Statistical Association* 77, 40-46, for its use on a change of level. It is near 2 in a homogeneous series and lower
    where the mean changes, so the lower tail rejects. It does not say when.

    Parameters
    ----------
    series : array-like of float, shape (n,)
        In time order; NaN are left out, and the values on both sides of one count as neighbours.

    Returns
    -------
    TestResult

    Examples
    --------
    >>> von_neumann([0.0, 0.0, 2.0, 2.0]).statistic  # 4 over 4
    1.0
    """
    values, _ = _given(series)
    z = _standardised(values, ddof=0)
    if z is None:
        return _result("von-neumann", len(values), math.nan)
    return _result("von-neumann", len(z), float((np.diff(z) ** 2).sum() / (z**2).sum()))


def homogeneity_of(
    years: npt.NDArray[np.int64],
    totals: npt.NDArray[np.float64],
    *,
    gauge: str,
    reference: npt.NDArray[np.float64] | None = None,
    reference_gauges: tuple[str, ...] = (),
    days: npt.NDArray[np.int64] | None = None,
) -> Homogeneity:
    """Return the four tests of a gauge's annual totals, relative to a reference series where one is given.

    Parameters
    ----------
    years : array of int, shape (n_years,)
        Increasing.
    totals : array of float, shape (n_years,)
        mm, or mm a day; NaN where the year does not count.
    gauge
        The gauge's id.
    reference : array of float, shape (n_years,), optional
        mm, the mean of the reference gauges. Then the ratios of the totals to it are tested, in which weather that all
        share is no longer noise; years in which it is NaN or 0 are left out.
    reference_gauges
        Their ids.
    days : array of int, shape (n_years,), optional
        Days that the totals of a year are over, for the result; all of the calendar year where not given.

    Returns
    -------
    Homogeneity
        Graded by how many of SNHT, Buishand's range, Pettitt and von Neumann reject at 1 %, after Wijngaard, Klein Tank
        and Können (2003), *International Journal of Climatology* 23, 679-692: none or one, useful; two, doubtful; three
        or four, suspect. Below 20 years there is no grade.

    Examples
    --------
    >>> years = np.arange(2001, 2031)
    >>> totals = np.where(years <= 2015, 800.0, 600.0) + 10.0 * (years % 3)
    >>> tested = homogeneity_of(years, totals, gauge="W03")
    >>> tested.grade, tested.rejections, tested.break_after
    ('suspect', 4, 2015)
    """
    series = np.asarray(totals, dtype=float)
    if reference is not None:
        series = np.divide(series, reference, out=np.full(series.shape, np.nan), where=np.asarray(reference) > 0)
    kept = np.isfinite(series)
    series = series[kept]
    tests = tuple(test(series) for test in (snht, buishand_range, pettitt, von_neumann, buishand_q))
    over = calendar_days(np.asarray(years)) if days is None else np.asarray(days)
    return Homogeneity(gauge, np.asarray(years)[kept], series, days=over[kept], reference=reference_gauges, tests=tests)


def _given(series: npt.ArrayLike) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.int64]]:
    """Return the values that are there and their positions."""
    values = np.asarray(series, dtype=float)
    place = np.flatnonzero(np.isfinite(values))
    return values[place], place


def _standardised(values: npt.NDArray[np.float64], *, ddof: int) -> npt.NDArray[np.float64] | None:
    """Return the values less their mean over their standard deviation; None where they do not vary."""
    if len(values) < 2:
        return None
    deviation = float(values.std(ddof=ddof))
    if deviation <= _LEAST_VARIATION * float(np.abs(values).max()):
        return None
    return np.asarray((values - values.mean()) / deviation)


def _first_greatest(values: npt.NDArray[np.float64]) -> int:
    """Return the first position of the greatest value, rounding apart."""
    greatest = values.max()
    return int(np.argmax(values >= greatest - _LEAST_VARIATION * abs(greatest)))


def _result(test: str, n: int, statistic: float, break_after: int | None = None) -> TestResult:
    critical = critical_values(test, n)
    beyond = [
        level
        for level, value in critical.items()
        if (statistic <= value if test == "von-neumann" else statistic >= value)
    ]
    return TestResult(test, n, statistic, critical, min(beyond, default=None), break_after)

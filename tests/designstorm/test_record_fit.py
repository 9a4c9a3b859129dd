"""One distribution fitted to the maxima of areas and durations, with intervals and goodness."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from invented_maxima import MINUTES, annual_maxima, crossing_maxima
from scipy import stats

from basinrain.designstorm.l_moments import l_moments
from basinrain.designstorm.record_fit import RecordFit, fit_record
from basinrain.designstorm.resampling import draw_years

Floats = npt.NDArray[np.float64]

VARIATES = np.array([0.3665, 2.2504, 4.6001])


def fit_of(
    distribution: str, maxima: Floats, *, minutes: Floats = MINUTES, resamples: int = 400, seed: int = 3
) -> RecordFit:
    """Fit one distribution at about 2, 10 and 100 years."""
    moments = l_moments(maxima.transpose(0, 2, 1))
    drawn = draw_years(len(maxima), resamples, seed=seed)
    return fit_record(distribution, maxima, moments, minutes=minutes, variates=VARIATES, drawn=drawn)


def numbers(fit: RecordFit, area: int) -> list[Floats]:
    """Return all arrays of one area."""
    arrays = (fit.quantiles, fit.depth, fit.lower, fit.upper, fit.ratio_error)
    return [array[area] for array in (*arrays, fit.goodness.correlation, fit.goodness.p_value)]


@pytest.mark.parametrize("distribution", ["gumbel", "gev"])
def test_an_area_does_not_depend_on_the_others(distribution: str) -> None:
    """Areas in another order, or alone, have the same numbers to the last digit."""
    maxima = annual_maxima(25, areas=3)
    together, turned = fit_of(distribution, maxima), fit_of(distribution, maxima[:, :, [2, 0, 1]])
    alone = fit_of(distribution, maxima[:, :, [1]])
    for a, b, c in zip(numbers(together, 1), numbers(turned, 2), numbers(alone, 0), strict=True):
        assert np.array_equal(a, b)
        assert np.array_equal(a, c)


@pytest.mark.parametrize("distribution", ["gumbel", "gev"])
@pytest.mark.parametrize("by", [0.125, 25.4])
def test_follows_scale(distribution: str, by: float) -> None:
    """Maxima times a give depths and intervals times a, and the same goodness."""
    maxima = annual_maxima(25)
    before, after = fit_of(distribution, maxima), fit_of(distribution, maxima * by)
    for name in ("quantiles", "depth", "lower", "upper"):
        np.testing.assert_allclose(getattr(after, name), by * getattr(before, name), rtol=1e-9)
    np.testing.assert_allclose(after.goodness.correlation, before.goodness.correlation, rtol=1e-9)
    np.testing.assert_allclose(after.goodness.p_value, before.goodness.p_value, atol=1e-12)


def test_years_that_do_not_count_are_left_out() -> None:
    """Quantiles and correlation of a series with gaps are those of the years that it has."""
    maxima = annual_maxima(30, areas=1)
    maxima[[3, 4, 19], 1, 0] = np.nan
    whole, part = fit_of("gev", maxima), fit_of("gev", np.delete(maxima, [3, 4, 19], axis=0))
    np.testing.assert_allclose(whole.quantiles[0, 1], part.quantiles[0, 1], rtol=1e-12)
    np.testing.assert_allclose(whole.goodness.correlation[0, 1], part.goodness.correlation[0, 1], rtol=1e-12)
    np.testing.assert_allclose(whole.ratio_error[0, 1], part.ratio_error[0, 1], rtol=0.15)
    np.testing.assert_allclose((whole.upper - whole.lower)[0, 1], (part.upper - part.lower)[0, 1], rtol=0.25)


def test_interval_of_a_gumbel_is_that_of_fresh_samples() -> None:
    """The ends are the 5 % and 95 % points of refits to samples that the statistics library draws of the fit."""
    maxima = annual_maxima(25, areas=1)[:, [1]]
    fit = fit_of("gumbel", maxima, minutes=MINUTES[[1]], resamples=4000)
    known = stats.gumbel_r(float(fit.parameters.location[0, 0]), float(fit.parameters.scale[0, 0]))
    moments = l_moments(known.rvs((25, 20_000), random_state=np.random.default_rng(9)))
    scale = moments.scale / np.log(2)
    depth = (moments.mean - np.euler_gamma * scale)[:, None] + scale[:, None] * VARIATES
    np.testing.assert_allclose([fit.lower[0, 0], fit.upper[0, 0]], np.quantile(depth, [0.05, 0.95], axis=0), rtol=0.015)


@pytest.mark.parametrize(("distribution", "least"), [("gumbel", 0.86), ("gev", 0.81)])
def test_interval_holds_the_truth_as_often_as_told(distribution: str, least: float) -> None:
    """About 90 % of 500 records of 30 Gumbel years have the true 100-year depth in the interval, by GEV some fewer."""
    chance = np.random.default_rng(10).random((30, 1, 500))
    maxima = 30 - 10 * np.log(-np.log(chance))
    fit = fit_of(distribution, maxima, minutes=MINUTES[[1]])
    true = 30 + 10 * VARIATES[2]
    assert least < np.mean((fit.lower[:, 0, 2] <= true) & (true <= fit.upper[:, 0, 2])) < 0.94


def test_p_values_are_even_when_the_distribution_is_right() -> None:
    """p-values of 300 records of Gumbel fitted by either distribution are no smaller than even spread has them."""
    chance = np.random.default_rng(12).random((25, 1, 300))
    maxima = 30 - 10 * np.log(-np.log(chance))
    for distribution in ("gumbel", "gev"):
        p_value = fit_of(distribution, maxima, minutes=MINUTES[[1]]).goodness.p_value[:, 0]
        assert stats.kstest(p_value, "uniform").pvalue > 0.01


def test_error_of_the_ratio_is_the_spread_of_its_samples() -> None:
    """The standard error of L-skewness of 25 Gumbel years is that of the library's samples of Gumbel, within 6 %."""
    fit = fit_of("gumbel", annual_maxima(25), resamples=2000)
    samples = np.asarray(stats.gumbel_r.rvs(size=(25, 20_000), random_state=np.random.default_rng(13)))
    np.testing.assert_allclose(fit.ratio_error, float(l_moments(samples).ratio.std()), rtol=0.06)


def test_fits_that_cross_are_raised() -> None:
    """The three hours are raised to the hour where the hour's fit is greater; as fitted they stay as they were."""
    fit = fit_of("gumbel", crossing_maxima(), minutes=MINUTES[[1, 2]])
    assert fit.quantiles[0, 1, 2] < fit.quantiles[0, 0, 2] == fit.depth[0, 0, 2] == fit.depth[0, 1, 2]
    assert fit.depth[0, 1, 0] == fit.quantiles[0, 1, 0]
    assert fit.lower[0, 1, 2] >= fit.lower[0, 0, 2]
    assert fit.upper[0, 1, 2] >= fit.upper[0, 0, 2]


def test_lower_end_is_no_negative_depth() -> None:
    """Where some samples' depths of 1 in 1.1 are below 0, the interval ends at 0 and not below."""
    maxima = crossing_maxima()[:, :1]
    drawn = draw_years(20, 400)
    moments = l_moments(maxima.transpose(0, 2, 1))
    often = -np.log(np.log(11.0))
    fit = fit_record("gumbel", maxima, moments, minutes=MINUTES[[1]], variates=np.array([often]), drawn=drawn)
    assert fit.lower[0, 0, 0] == 0 < fit.upper[0, 0, 0]


def test_no_fit_has_no_numbers() -> None:
    """One wet year among dry ones has no shape, so no depths by GEV in that area, and the other area has its own."""
    maxima = annual_maxima(20)
    maxima[:, 2, 0] = np.eye(20)[4] * 50
    fit = fit_of("gev", maxima)
    assert np.isnan(fit.quantiles[0, 2]).all()
    assert np.isnan([fit.depth[0], fit.lower[0], fit.upper[0]]).all()
    assert np.isnan([fit.goodness.p_value[0, 2], fit.goodness.correlation[0, 2], fit.ratio_error[0, 2]]).all()
    assert all(np.isfinite(array).all() for array in numbers(fit, 1))

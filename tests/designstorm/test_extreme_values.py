"""Gumbel and generalised extreme value distributions beside closed forms and a general statistics library."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate, stats

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.extreme_values import (
    GUMBEL_RATIO,
    ExtremeValues,
    check_distribution,
    fit_gev,
    fit_gumbel,
    quantiles_of_shape,
)
from basinrain.designstorm.l_moments import LMoments, l_moments
from basinrain.errors import JobError

Floats = npt.NDArray[np.float64]

CHANCES = np.array([0.01, 0.2, 0.5, 0.9, 0.99, 0.998])
VARIATES = -np.log(-np.log(CHANCES))


def moments_of(mean: float, scale: float, ratio: float | Floats) -> LMoments:
    """Return L-moments of 40 years."""
    shape = np.shape(ratio)
    return LMoments(
        n=np.full(shape, 40), mean=np.full(shape, mean), scale=np.full(shape, scale), ratio=np.asarray(ratio)
    )


def drawn(shape: float, size: tuple[int, int], *, seed: int) -> Floats:
    """Draw annual maxima of location 30 and scale 10 with the statistics library."""
    return np.asarray(stats.genextreme(shape, 30, 10).rvs(size, random_state=np.random.default_rng(seed)))


def test_gumbel_quantiles_are_the_library_s() -> None:
    """Quantiles of shape 0 are those of scipy.stats.gumbel_r."""
    fit = ExtremeValues(location=np.array(31.0), scale=np.array(7.5), shape=np.array(0.0))
    np.testing.assert_allclose(fit.quantiles(VARIATES), stats.gumbel_r(31.0, 7.5).ppf(CHANCES), rtol=1e-12)


@pytest.mark.parametrize("shape", [-0.4, -0.1, -1e-7, 1e-7, 0.1, 0.6])
def test_gev_quantiles_are_the_library_s(shape: float) -> None:
    """Quantiles are those of scipy.stats.genextreme, whose shape has the same sign."""
    fit = ExtremeValues(location=np.array(31.0), scale=np.array(7.5), shape=np.array(shape))
    expected = stats.genextreme(shape, 31.0, 7.5).ppf(CHANCES)
    np.testing.assert_allclose(fit.quantiles(VARIATES), expected, rtol=1e-8)


def test_hundred_years_of_a_gumbel_by_hand() -> None:
    """L-moments 40 and 10 ln 2 give scale 10, location 40 - 5.772 and 34.228 + 46.001 = 80.229 mm at 1 in 100."""
    fit = fit_gumbel(moments_of(40.0, 10 * math.log(2), 0.3))
    hundred = fit.quantiles(np.array([Frequency(100.0, "annual-maximum").variate]))
    np.testing.assert_allclose(
        [fit.location, fit.scale, fit.shape, hundred[0]], [34.22784, 10, 0, 80.22933], atol=1e-5, rtol=0
    )


@pytest.mark.parametrize("ratio", [-0.5, 0.0, 0.1, GUMBEL_RATIO, 0.25, 0.6, 0.85])
def test_fitted_gev_has_the_l_moments_that_it_was_fitted_to(ratio: float) -> None:
    """Integrating the library's quantiles times the Legendre polynomials gives back mean, scale and ratio."""
    fit = fit_gev(moments_of(37.0, 6.0, ratio))
    known = stats.genextreme(float(fit.shape), float(fit.location), float(fit.scale))

    def integral(of: list[float]) -> float:
        # Over the logarithm of the distance to either end, where the heaviest tails are smooth.
        def part(t: float) -> float:
            e = math.exp(-t)
            low, high = np.polyval(of, e), np.polyval(of, -math.expm1(-t))
            return float(known.ppf(e) * low + known.isf(e) * high) * e

        return float(integrate.quad(part, math.log(2), 600, limit=400, points=[1, 3, 10, 40, 150])[0])

    first, second, third = integral([1]), integral([2, -1]), integral([6, -6, 1])
    np.testing.assert_allclose([first, second, third / second], [37.0, 6.0, ratio], atol=1e-6)


@given(st.floats(-0.999, 0.999))
def test_shape_solves_its_equation(ratio: float) -> None:
    """2 (1 - 3^-k) / (1 - 2^-k) - 3 is the ratio again, to rounding, for all ratios."""
    k = float(fit_gev(moments_of(0.0, 1.0, ratio)).shape)
    left = 2 * math.expm1(-k * math.log(3)) / math.expm1(-k * math.log(2)) - 3 if k else GUMBEL_RATIO
    assert left == pytest.approx(ratio, abs=1e-11)


def test_approximation_is_as_close_as_published() -> None:
    """For shapes of -0.5 to 0.5 it is within 9e-4 (Hosking, Wallis and Wood, 1985, from memory): 8.8e-4 here."""
    k = np.linspace(-0.5, 0.5, 4002)
    ratio = 2 * (1 - 3**-k) / (1 - 2**-k) - 3
    c = 2 / (3 + ratio) - math.log(2) / math.log(3)
    apart = np.abs(7.8590 * c + 2.9554 * c**2 - fit_gev(moments_of(0.0, 1.0, ratio)).shape)
    assert 8.5e-4 < apart.max() < 9e-4


def test_gev_at_the_gumbel_ratio_is_gumbel() -> None:
    """A ratio of log2(9/8) gives shape 0 and Gumbel's location and scale."""
    both = fit_gumbel(moments_of(37.0, 6.0, GUMBEL_RATIO)), fit_gev(moments_of(37.0, 6.0, GUMBEL_RATIO))
    for name in ("location", "scale", "shape"):
        np.testing.assert_allclose(getattr(both[1], name), getattr(both[0], name), atol=1e-13)


def test_fit_is_smooth_where_the_shape_passes_zero() -> None:
    """Quantiles about the Gumbel ratio lie on one smooth curve, from shapes of 1e-3 to 1e-12 on either side."""
    steps = np.concatenate([-np.logspace(-3, -12, 40), [0.0], np.logspace(-12, -3, 40)])
    found = fit_gev(moments_of(37.0, 6.0, GUMBEL_RATIO + steps)).quantiles(np.array([4.6]))[:, 0]
    line = np.polynomial.Polynomial.fit(steps, found, 3)
    np.testing.assert_allclose(found, line(steps), atol=1e-8)


@given(st.floats(-0.9, 0.9), st.sampled_from([0.04, 25.4, 1e3]), st.sampled_from([-20.0, 0.0, 400.0]))
def test_fits_follow_scale_and_shift(ratio: float, by: float, to: float) -> None:
    """L-moments of a x + b give quantiles a q + b, by both distributions."""
    for fit in (fit_gumbel, fit_gev):
        before = fit(moments_of(37.0, 6.0, ratio)).quantiles(VARIATES)
        after = fit(moments_of(37.0 * by + to, 6.0 * by, ratio)).quantiles(VARIATES)
        np.testing.assert_allclose(after, before * by + to, rtol=1e-10, atol=1e-9 * by)


@pytest.mark.parametrize("shape", [-0.2, -0.1, 0.0, 0.15])
def test_long_records_give_back_what_they_were_drawn_from(shape: float) -> None:
    """200,000 years drawn from a known distribution are fitted within 1 % of location and scale, 0.01 of shape."""
    fit = fit_gev(l_moments(drawn(shape, (200_000, 1), seed=11)))
    np.testing.assert_allclose([fit.location[0], fit.scale[0]], [30, 10], rtol=0.01)
    assert fit.shape[0] == pytest.approx(shape, abs=0.01)


def test_gumbel_fits_of_short_records_are_unbiased() -> None:
    """The mean of 20,000 fits to 15 years of a Gumbel is its 100-year depth, within four standard errors."""
    y = np.array([Frequency(100.0, "annual-maximum").variate])
    found = fit_gumbel(l_moments(drawn(0.0, (15, 20_000), seed=12))).quantiles(y)[:, 0]
    assert abs(found.mean() - (30 + 10 * y[0])) < 4 * found.std() / math.sqrt(20_000)


def test_spread_of_the_shape_is_as_published() -> None:
    """For Gumbel the shape's variance is 0.5633 / n (Hosking, Wallis and Wood, 1985, from memory), here within 5 %."""
    shape = fit_gev(l_moments(drawn(0.0, (400, 8000), seed=13))).shape
    assert 400 * shape.var() == pytest.approx(0.5633, rel=0.05)


def test_bound_is_never_exceeded() -> None:
    """A positive shape has the library's upper end as bound, others have none; no fit has no bound."""
    fit = ExtremeValues(
        location=np.array([30.0, 30.0, 30.0, np.nan]),
        scale=np.array([10.0, 10.0, 10.0, np.nan]),
        shape=np.array([0.2, 0.0, -0.2, np.nan]),
    )
    assert fit.bound[:3].tolist() == [stats.genextreme(0.2, 30, 10).support()[1], np.inf, np.inf]
    assert np.isnan(fit.bound[3])
    assert fit.quantiles(np.array([700.0]))[0, 0] == pytest.approx(80)


@pytest.mark.parametrize("ratio", [1.0, -1.0, math.nan])
def test_no_shape_has_a_ratio_of_one(ratio: float) -> None:
    """A ratio of 1 or -1, or none, has no generalised extreme value distribution; Gumbel does not look at it."""
    fit = fit_gev(moments_of(37.0, 6.0, ratio))
    assert np.isnan([fit.location, fit.scale, fit.shape]).all()
    assert np.isnan(fit.quantiles(VARIATES)).all()
    assert np.isfinite(fit_gumbel(moments_of(37.0, 6.0, ratio)).quantiles(VARIATES)).all()


def test_gumbel_of_no_spread_is_one_value() -> None:
    """Maxima that are all 37 mm give 37 mm at every frequency."""
    assert fit_gumbel(moments_of(37.0, 0.0, math.nan)).quantiles(VARIATES).tolist() == [37.0] * 6


def test_shapes_and_variates_are_broadcast() -> None:
    """Shapes of one axis and variates of another give a table, Gumbel's row being the variates."""
    found = quantiles_of_shape(np.array([[-0.1], [0.0]]), VARIATES)
    assert found.shape == (2, 6)
    assert found[1].tolist() == VARIATES.tolist()


def test_unknown_distribution_is_refused() -> None:
    """The message names what was given, what is known and what may have been meant."""
    with pytest.raises(
        JobError, match=r"^distribution: found 'gevv'; expected one of: gumbel, gev; did you mean 'gev'\?$"
    ):
        check_distribution("gevv")

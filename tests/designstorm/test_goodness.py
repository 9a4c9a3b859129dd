"""Goodness of fit beside published critical values, a general statistics library and its own size."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from basinrain.designstorm.extreme_values import fit_gev
from basinrain.designstorm.goodness import plot_correlation, plotting_variates, shape_test, share_at_or_below
from basinrain.designstorm.l_moments import l_moments

Floats = npt.NDArray[np.float64]


def gumbel_samples(number: int, n: int, *, seed: int) -> Floats:
    """Draw sorted samples of the standard Gumbel distribution."""
    return np.sort(-np.log(np.random.default_rng(seed).exponential(size=(number, n))), axis=1)


@pytest.mark.parametrize("shape", [-0.3, 0.0, 0.2])
def test_correlation_is_that_with_the_library_s_quantiles(shape: float) -> None:
    """The coefficient is numpy's correlation with scipy's quantiles at (i - 0.44) / (n + 0.12)."""
    ranked = np.sort(np.random.default_rng(4).gamma(3.0, 8.0, (6, 25)), axis=1)
    expected = stats.genextreme.ppf((np.arange(1, 26) - 0.44) / 25.12, shape)
    found = plot_correlation(ranked, np.full(6, shape))
    np.testing.assert_allclose(found, [np.corrcoef(row, expected)[0, 1] for row in ranked], rtol=1e-10)


@pytest.mark.parametrize(
    ("n", "ten", "five"),
    [
        (10, 0.9260, 0.9084),
        (20, 0.9517, 0.9390),
        (30, 0.9622, 0.9526),
        (40, 0.9689, 0.9594),
        (50, 0.9729, 0.9646),
        (100, 0.9831, 0.9779),
    ],
)
def test_critical_values_are_the_published_ones(n: int, ten: float, five: float) -> None:
    """10 % and 5 % points for Gumbel are Vogel's (1986; Handbook of Hydrology, 1993, table 18.3.3; from memory)."""
    found = plot_correlation(gumbel_samples(40_000, n, seed=n), np.array(0.0))
    np.testing.assert_allclose(np.quantile(found, [0.10, 0.05]), [ten, five], atol=2e-3)


def test_a_straight_plot_has_correlation_one() -> None:
    """Values on a line over the variates correlate by 1, whatever the line; the other shape's do not."""
    y = plotting_variates(30)
    assert plot_correlation(20 + 7 * y, np.array(0.0)) == pytest.approx(1, abs=1e-12)
    assert plot_correlation(20 + 7 * y, np.array(-0.3)) < 0.99


def test_equal_values_and_no_shape_have_no_correlation() -> None:
    """Equal values have no plot, nor has a distribution without a shape."""
    assert np.isnan(plot_correlation(np.full(10, 8.0), np.array(0.0)))
    assert np.isnan(plot_correlation(np.arange(10.0), np.array(np.nan)))


def test_p_value_counts_samples_at_or_below() -> None:
    """Two of four samples are at or below: (1 + 2) / (1 + 4); below all it is 1 / 5, and of nothing nothing."""
    simulated = np.array([0.9, 0.95, 0.97, 0.99])
    assert share_at_or_below(simulated, np.array(0.95)) == pytest.approx(3 / 5)
    assert share_at_or_below(simulated, np.array(0.5)) == pytest.approx(1 / 5)
    assert np.isnan(share_at_or_below(simulated, np.array(np.nan)))


def test_p_values_are_even_when_the_distribution_is_right() -> None:
    """p-values of 2,000 samples of Gumbel are spread evenly (Kolmogorov and Smirnov), those of a lighter tail low."""
    simulated = plot_correlation(gumbel_samples(2000, 30, seed=5), np.array(0.0))[:, None]
    fair = share_at_or_below(simulated, plot_correlation(gumbel_samples(2000, 30, seed=6), np.array(0.0)))
    assert stats.kstest(fair, "uniform").pvalue > 0.01
    bounded = np.sort(np.random.default_rng(7).random((500, 30)), axis=1)
    assert np.median(share_at_or_below(simulated, plot_correlation(bounded, np.array(0.0)))) < 0.2


def test_shape_test_rejects_as_often_as_it_says() -> None:
    """Of 20,000 Gumbel records of 50 years the test rejects 4 to 6 % at 5 %."""
    fit = fit_gev(l_moments(gumbel_samples(20_000, 50, seed=8).T))
    _, p_value = shape_test(fit.shape, np.full(20_000, 50))
    assert 0.04 < np.mean(p_value < 0.05) < 0.06


def test_shape_test_finds_a_heavy_tail() -> None:
    """Shape -0.2 from 45 years: -0.2 sqrt(45 / 0.5633) = -1.7876, p = 2 Phi(-1.7876)."""
    statistic, p_value = shape_test(np.array(-0.2), np.array(45))
    assert statistic == pytest.approx(-1.7876, abs=1e-4)
    assert p_value == pytest.approx(2 * stats.norm.cdf(-1.7876), abs=1e-4)

"""Samples of fitted distributions in which the series of a year stay together."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from basinrain.designstorm.resampling import draw_years, interval_of_samples
from basinrain.errors import JobError

Floats = npt.NDArray[np.float64]


def variates_of(maxima: Floats, *, resamples: int = 2000, seed: int = 1) -> dict[int, Floats]:
    """Return the sorted variates by series, each of shape (n_samples, n_counting)."""
    drawn = draw_years(len(maxima), resamples, seed=seed)
    return {
        int(column): variate[:, place]
        for series, variate in drawn.variates(maxima)
        for place, column in enumerate(series)
    }


def gappy(years: int) -> Floats:
    """Return maxima of three series, the second without seven years and the third without the first ten."""
    maxima = np.random.default_rng(3).gumbel(30, 10, (years, 3))
    maxima[4:11, 1] = np.nan
    maxima[:10, 2] = np.nan
    return maxima


def test_every_series_is_a_random_sample() -> None:
    """Variates of all samples are Gumbel's, with and without years that do not count, and as many as those that do."""
    found = variates_of(gappy(30))
    for column, n in {0: 30, 1: 23, 2: 20}.items():
        assert found[column].shape == (2000, n)
        assert stats.kstest(found[column].ravel(), "gumbel_r").statistic < 0.01


@pytest.mark.parametrize("column", [0, 1, 2])
def test_values_of_a_sample_are_independent(column: int) -> None:
    """The greatest of a sample is below y as often as n independent ones are: exp(-n exp(-y))."""
    found = variates_of(gappy(30))[column]
    n = found.shape[1]
    assert stats.kstest(found[:, -1], stats.gumbel_r(np.log(n), 1).cdf).pvalue > 0.01
    assert stats.kstest(found[:, 0], lambda y: 1 - (1 - np.exp(-np.exp(-y))) ** n).pvalue > 0.01


def test_series_that_rank_alike_stay_together() -> None:
    """Means of samples are equal for series of one order, and unrelated for series in unrelated order."""
    first = np.random.default_rng(4).gumbel(30, 10, 30)
    other = np.random.default_rng(5).permutation(first)
    assert abs(stats.spearmanr(first, other).statistic) < 0.15
    found = variates_of(np.stack([first, first**2, other], axis=1))
    assert np.array_equal(found[0], found[1])
    assert abs(np.corrcoef(found[0].mean(axis=1), found[2].mean(axis=1))[0, 1]) < 0.25


def test_series_in_opposite_order_go_opposite_ways() -> None:
    """Where one series is wet in the years in which the other is dry, so it is in the samples."""
    first = np.arange(30.0)
    found = variates_of(np.stack([first, -first], axis=1))
    assert np.corrcoef(np.exp(-found[0]).mean(axis=1), np.exp(-found[1]).mean(axis=1))[0, 1] < -0.4


def test_the_same_arguments_draw_the_same() -> None:
    """One seed always draws the same years, another one others."""
    maxima = gappy(25)
    one, again, other = (variates_of(maxima, seed=seed)[1] for seed in (1, 1, 2))
    assert np.array_equal(one, again)
    assert not np.array_equal(one, other)


def test_no_variate_is_infinite() -> None:
    """A drawn place of exactly 0 below the lowest rank still has a variate."""
    drawn = draw_years(3, 100)
    drawn.within[:] = 0.0
    ((_, variates),) = drawn.variates(np.array([[1.0], [2.0], [3.0]]))
    assert np.isfinite(variates).all()


@pytest.mark.parametrize("number", [1, 2, 57, 1000])
def test_interval_is_the_library_s_quantiles(number: int) -> None:
    """The ends are numpy's 5 % and 95 % points of the samples that have a value."""
    samples = np.random.default_rng(6).gumbel(30, 10, (number, 2, 3))
    samples[: number // 3, 1, 2] = np.nan
    expected = np.nanquantile(samples, [0.05, 0.95], axis=0)
    np.testing.assert_allclose(interval_of_samples(samples), expected, rtol=1e-9)


def test_interval_of_nothing_is_none() -> None:
    """Where no sample has a value there is no interval."""
    lower, upper = interval_of_samples(np.full((5, 2), np.nan))
    assert np.isnan([lower, upper]).all()


def test_too_few_samples_are_refused() -> None:
    """99 samples are one too few."""
    assert draw_years(12, 100).year.shape == (100, 12)
    with pytest.raises(JobError, match=r"^resamples: found 99; expected 100 at least$"):
        draw_years(12, 99)

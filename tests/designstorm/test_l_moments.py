"""Sample L-moments beside their definition and a general statistics library."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from basinrain.designstorm.l_moments import LMoments, l_moments, l_moments_of_sorted

Floats = npt.NDArray[np.float64]

DEPTHS = st.lists(st.integers(0, 2000), min_size=3, max_size=30).map(lambda tenths: np.array(tenths) / 8)


def by_definition(values: Floats) -> tuple[float, float, float]:
    """Return the first three L-moments as means over all pairs and triples of the sample."""
    pairs = [(b - a) / 2 for a, b in combinations(sorted(values), 2)]
    triples = [(c - 2 * b + a) / 3 for a, b, c in combinations(sorted(values), 3)]
    return float(np.mean(values)), float(np.mean(pairs)), float(np.mean(triples))


def assert_same(found: LMoments, expected: LMoments, *, rtol: float = 1e-12) -> None:
    """Compare all parts of L-moments."""
    for name in ("n", "mean", "scale", "ratio"):
        np.testing.assert_allclose(getattr(found, name), getattr(expected, name), rtol=rtol, atol=1e-12)


@given(DEPTHS)
def test_are_means_over_pairs_and_triples(values: Floats) -> None:
    """The scale is half the mean difference of all pairs, the third the mean over triples, in any sample."""
    found = l_moments(values)
    mean, scale, third = by_definition(values)
    np.testing.assert_allclose([found.mean, found.scale], [mean, scale], rtol=1e-12, atol=1e-12)
    if scale:
        np.testing.assert_allclose(found.ratio * scale, third, rtol=1e-10, atol=1e-11)


@pytest.mark.skipif(not hasattr(stats, "lmoment"), reason="scipy before 1.15")
@pytest.mark.parametrize("n", [10, 31, 200])
def test_agree_with_a_statistics_library(n: int) -> None:
    """Mean, scale and ratio of many series equal those of scipy.stats.lmoment."""
    values = np.random.default_rng(n).gamma(3.0, 8.0, (n, 5))
    found = l_moments(values)
    expected = stats.lmoment(values, order=[1, 2, 3], standardize=True, axis=0)
    np.testing.assert_allclose([found.mean, found.scale, found.ratio], expected, rtol=1e-11)
    assert found.n.tolist() == [n] * 5


def test_years_that_do_not_count_change_nothing() -> None:
    """Every series has the L-moments of the years that count in it."""
    values = np.random.default_rng(1).gumbel(30, 10, (20, 3, 2))
    gappy = values.copy()
    gappy[[2, 7], 1, 0] = np.nan
    gappy[5:17, 2, 1] = np.nan
    found = l_moments(gappy)
    assert found.n.tolist() == [[20, 20], [18, 20], [20, 8]]
    for d, a in np.ndindex(3, 2):
        alone = l_moments(gappy[~np.isnan(gappy[:, d, a]), d, a])
        np.testing.assert_allclose(
            [found.mean[d, a], found.scale[d, a], found.ratio[d, a]], [alone.mean, alone.scale, alone.ratio], rtol=1e-12
        )


def test_of_sorted_samples_are_the_same() -> None:
    """Samples sorted along the last axis have the L-moments of the same samples along the first, unsorted."""
    values = np.random.default_rng(2).gumbel(30, 10, (25, 4, 3))
    assert_same(l_moments_of_sorted(np.sort(np.moveaxis(values, 0, -1), axis=-1)), l_moments(values))


@given(DEPTHS, st.sampled_from([0.01, 0.5, 25.4, 1e4]), st.sampled_from([-50.0, 0.0, 3.0, 1e3]))
def test_follow_scale_and_shift(values: Floats, by: float, to: float) -> None:
    """Values times a and plus b have mean a m + b, scale a l and the same ratio."""
    before, after = l_moments(values), l_moments(values * by + to)
    np.testing.assert_allclose(after.mean, before.mean * by + to, rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(after.scale, before.scale * by, rtol=1e-9, atol=1e-9)
    if before.scale:
        np.testing.assert_allclose(after.ratio, before.ratio, atol=1e-6)


@given(DEPTHS)
def test_ratio_is_within_one_and_turns_with_the_values(values: Floats) -> None:
    """The ratio lies in -1 to 1, and that of the mirrored values is its opposite; no scale is negative."""
    found, mirrored = l_moments(values), l_moments(-values)
    assert found.scale >= 0
    if found.scale > 0:
        assert -1 <= found.ratio.round(12) <= 1
        np.testing.assert_allclose(mirrored.ratio, -found.ratio, atol=1e-9)


def test_one_wet_year_among_dry_ones_has_ratio_one() -> None:
    """Of n values all but one are equal: the ratio is 1, the most that there is."""
    assert float(l_moments(np.array([0.0] * 11 + [40.0])).ratio) == pytest.approx(1, abs=1e-14)


def test_equal_values_have_scale_zero_and_no_ratio() -> None:
    """Values that are all 0.1 have a scale of exactly 0, whatever rounding, and no ratio."""
    found = l_moments(np.full(17, 0.1))
    assert float(found.scale) == 0.0
    assert np.isnan(found.ratio)


@pytest.mark.parametrize("n", [0, 1, 2])
def test_fewer_than_three_values_have_none(n: int) -> None:
    """With no, one or two values that count there is a number and nothing else."""
    values = np.full((4, 2), np.nan)
    values[:n] = np.arange(2 * n).reshape(n, 2)
    found = l_moments(values)
    assert found.n.tolist() == [n, n]
    assert np.isnan([found.mean, found.scale, found.ratio]).all()


def test_no_years_at_all() -> None:
    """A record without a year has L-moments of no values."""
    found = l_moments(np.empty((0, 3)))
    assert found.n.tolist() == [0, 0, 0]
    assert np.isnan(found.mean).all()

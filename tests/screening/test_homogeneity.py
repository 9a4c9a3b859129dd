"""The homogeneity tests against plain loops, scipy, hand arithmetic, and the size that their tables promise."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable
from typing import Final

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from screening.long_critical_values import many

from basinrain.screening import homogeneity
from basinrain.screening.critical_values import critical_values

Floats = npt.NDArray[np.float64]

FUNCTIONS: Final[dict[str, Callable[[npt.ArrayLike], homogeneity.TestResult]]] = {
    "snht": homogeneity.snht,
    "buishand-range": homogeneity.buishand_range,
    "buishand-q": homogeneity.buishand_q,
    "pettitt": homogeneity.pettitt,
    "von-neumann": homogeneity.von_neumann,
}


def loops(test: str, values: list[float]) -> float:
    """Return the statistic as its definition reads, term by term."""
    n = len(values)
    mean = sum(values) / n
    squares = sum((v - mean) ** 2 for v in values)
    if test == "snht":
        z = [(v - mean) / math.sqrt(squares / (n - 1)) for v in values]
        return max(k * (sum(z[:k]) / k) ** 2 + (n - k) * (sum(z[k:]) / (n - k)) ** 2 for k in range(1, n))
    if test.startswith("buishand"):
        s = [sum(v - mean for v in values[:k]) / math.sqrt(squares / n) for k in range(n + 1)]
        return (max(s) - min(s) if test == "buishand-range" else max(map(abs, s))) / math.sqrt(n)
    if test == "pettitt":
        return max(abs(sum((a > b) - (a < b) for a in values[:k] for b in values[k:])) for k in range(1, n))
    return sum((a - b) ** 2 for a, b in itertools.pairwise(values)) / squares


def normal(m: int, n: int, seed: int = 11) -> Floats:
    return np.random.default_rng([seed, n]).standard_normal((m, n))


@pytest.mark.parametrize("test", FUNCTIONS)
@given(values=st.lists(st.integers(0, 40), min_size=2, max_size=12).filter(lambda v: len(set(v)) > 1))
def test_plain_loops(test: str, values: list[int]) -> None:
    """Every statistic is its definition, term by term, ties among the values included."""
    assert FUNCTIONS[test](values).statistic == pytest.approx(loops(test, [float(v) for v in values]), rel=1e-9)


@pytest.mark.parametrize("test", FUNCTIONS)
def test_many_series_at_once(test: str) -> None:
    """The form in which the sizes below are simulated gives what the function gives."""
    series = normal(50, 35)
    assert many(test, series) == pytest.approx([FUNCTIONS[test](one).statistic for one in series], rel=1e-9)


def test_snht_and_the_t_test() -> None:
    """T(k) is (n - 1) t² / (n - 2 + t²) of scipy's two-sample t test; the greatest of them is T₀, and k its place."""
    values = normal(1, 30)[0]
    t = np.array([stats.ttest_ind(values[:k], values[k:]).statistic for k in range(1, 30)])
    expected = 29 * t**2 / (28 + t**2)
    result = homogeneity.snht(values)
    assert result.statistic == pytest.approx(expected.max(), rel=1e-9)
    assert result.break_after == expected.argmax()


def test_pettitt_and_mann_whitney() -> None:
    """Pettitt's statistic is the greatest |2 U - k (n - k)| of scipy's Mann-Whitney U over all splits."""
    values = normal(1, 25)[0]
    u = [stats.mannwhitneyu(values[:k], values[k:]).statistic for k in range(1, 25)]
    expected = np.abs([2 * one - k * (25 - k) for k, one in enumerate(u, 1)])
    result = homogeneity.pettitt(values)
    assert result.statistic == expected.max()
    assert result.break_after == expected.argmax()


@pytest.mark.parametrize("n", [20, 25, 30, 40, 50, 60, 70, 85, 100])
@pytest.mark.parametrize("test", FUNCTIONS)
def test_size(test: str, n: int) -> None:
    """Of 30 000 normal series a test rejects 5 % and 1 %, within sampling error and the rounding of the tables."""
    statistics = many(test, normal(30_000, n))
    for level, value in critical_values(test, n).items():
        share = np.mean(statistics <= value if test == "von-neumann" else statistics >= value)
        # Three standard errors, and as much as a step of 0.015 in a printed value moves the share.
        assert share == pytest.approx(level, abs=3 * math.sqrt(level / 30_000) + 0.06 * level + 0.0005)


@pytest.mark.parametrize("n", [125, 150, 200, 250, 300])
@pytest.mark.parametrize("test", FUNCTIONS)
def test_size_of_long_series(test: str, n: int) -> None:
    """Of 20 000 normal series of 125 to 300 values a test rejects 5 % and 1 %, at and between the lengths tabled."""
    statistics = many(test, normal(20_000, n))
    for level, value in critical_values(test, n).items():
        share = np.mean(statistics <= value if test == "von-neumann" else statistics >= value)
        # Three standard errors; (2 - N) √n, which is held from 100 on for von Neumann, moves its share by a twentieth.
        assert share == pytest.approx(level, abs=3 * math.sqrt(level / 20_000) + 0.05 * level)


@pytest.mark.parametrize("test", FUNCTIONS)
@given(
    values=st.lists(st.integers(0, 1000), min_size=5, max_size=30, unique=True),
    factor=st.floats(0.01, 100),
    offset=st.floats(0, 1000),
)
def test_unit_and_level_do_not_matter(test: str, values: list[int], factor: float, offset: float) -> None:
    """Another unit or another level changes no statistic and no break."""
    plain, moved = FUNCTIONS[test](values), FUNCTIONS[test](np.array(values) * factor + offset)
    assert moved.statistic == pytest.approx(plain.statistic, rel=1e-6)


@pytest.mark.parametrize("test", FUNCTIONS)
@given(values=st.lists(st.floats(0, 1000), min_size=5, max_size=30))
def test_reversed_time(test: str, values: list[float]) -> None:
    """Time reversed gives the same statistic: all of them are symmetric."""
    forward, backward = FUNCTIONS[test](values).statistic, FUNCTIONS[test](values[::-1]).statistic
    assert forward == pytest.approx(backward, rel=1e-6, nan_ok=True)


@pytest.mark.parametrize("test", ["snht", "buishand-range", "buishand-q", "pettitt"])
def test_break_is_placed(test: str) -> None:
    """A step of three standard deviations after the 18th of 30 values is found where it is, rejecting at 1 %."""
    values = normal(1, 30, seed=4)[0] + 3 * (np.arange(30) >= 18)
    result = FUNCTIONS[test](values)
    assert (result.break_after, result.rejected_at) == (17, 0.01)


def test_von_neumann_rejects_without_a_place() -> None:
    """The same step lowers the ratio below its 1 % point; the ratio does not say when."""
    values = normal(1, 30, seed=4)[0] + 3 * (np.arange(30) >= 18)
    result = homogeneity.von_neumann(values)
    assert result.statistic < result.critical[0.01]
    assert (result.break_after, result.rejected_at) == (None, 0.01)


def test_between_the_levels() -> None:
    """A statistic between the two critical values rejects at 5 % only."""
    # S goes 0, -10 and back to 0 for ten values at -1 and ten at 1; noise brings R/√n to 1.5, between 1.43 and 1.60.
    values = np.r_[-np.ones(10), np.ones(10)] * 1.0 + np.tile([1.1, -1.1], 10)
    result = homogeneity.buishand_range(values)
    assert 1.43 < result.statistic < 1.60
    assert result.rejected_at == 0.05


@pytest.mark.parametrize("test", FUNCTIONS)
def test_missing_values_are_left_out(test: str) -> None:
    """NaN take no part; the break's position counts in the series as given."""
    values = normal(1, 30, seed=4)[0] + 3 * (np.arange(30) >= 18)
    holed = np.insert(values, [3, 18], np.nan)
    plain, result = FUNCTIONS[test](values), FUNCTIONS[test](holed)
    assert (result.n, result.statistic) == (30, plain.statistic)
    assert result.break_after == (None if test == "von-neumann" else 18)


@pytest.mark.parametrize("test", FUNCTIONS)
@pytest.mark.parametrize("values", [[], [1.0], [np.nan] * 4, [7.1] * 25, [0.0] * 25, 7.1 + 1e-15 * np.arange(25)])
def test_no_variation_no_statistic(test: str, values: npt.ArrayLike) -> None:
    """Without two values that differ by more than rounding there is no statistic, and nothing is rejected."""
    result = FUNCTIONS[test](values)
    assert math.isnan(result.statistic)
    assert (result.rejected_at, result.break_after) == (None, None)


def test_pettitt_formula() -> None:
    """The formula gives 0.196 for K = 57 and 0.055 for K = 71 of 20, where simulation gives 0.109 and 0.020."""
    statistics = many("pettitt", normal(30_000, 20))
    for k, formula, simulated in ((57, 0.196, 0.109), (71, 0.055, 0.020)):
        assert homogeneity.pettitt_probability(k, 20) == pytest.approx(formula, abs=5e-4)
        assert np.mean(statistics >= k) == pytest.approx(simulated, abs=0.006)
    assert homogeneity.pettitt_probability(0, 20) == 1.0


YEARS = np.arange(1991, 2021)


def stepped(by: float, seed: int = 4) -> Floats:
    """Thirty annual totals around 800 mm, with a step after the 15th."""
    return np.asarray(800 + 80 * normal(1, 30, seed=seed)[0] + by * (np.arange(30) >= 15))


def test_grades() -> None:
    """The grade counts which of four tests reject at 1 %; Buishand's Q is shown beside them and not counted."""
    useful, suspect = (homogeneity.homogeneity_of(YEARS, stepped(by), gauge="A") for by in (0.0, 300.0))
    assert (useful.rejections, useful.grade, useful.break_after) == (0, "useful", None)
    assert (suspect.rejections, suspect.grade, suspect.break_after) == (4, "suspect", 2005)
    assert [one.test for one in suspect.tests] == ["snht", "buishand-range", "pettitt", "von-neumann", "buishand-q"]
    assert len(suspect.counted) == 4


@pytest.mark.parametrize(
    ("rejecting", "grade"), list(enumerate(["useful", "useful", "doubtful", "suspect", "suspect"]))
)
def test_grade_by_count(rejecting: int, grade: str) -> None:
    """None or one rejects: useful; two: doubtful; three or four: suspect (Wijngaard et al. 2003)."""
    names = ("snht", "buishand-range", "pettitt", "von-neumann")
    tests = tuple(
        homogeneity.TestResult(name, 30, 0.0, {0.01: 1.0}, 0.01 if k < rejecting else 0.05, None)
        for k, name in enumerate(names)
    )
    assert (
        homogeneity.Homogeneity("A", YEARS, stepped(0.0), days=np.full(30, 365), reference=(), tests=tests).grade
        == grade
    )


def test_below_twenty_years_there_is_no_grade() -> None:
    """Statistics are given for 19 years; two of the tests have no critical values there, so there is no grade."""
    tested = homogeneity.homogeneity_of(YEARS[:19], stepped(300.0)[:19], gauge="A")
    assert tested.grade is None
    assert tested.counted[0].statistic > 0
    assert not tested.counted[0].critical


def test_relative_to_neighbours() -> None:
    """A step of 10 % that the weather hides in the totals stands out in the ratios to the neighbours' mean."""
    weather = 800 + 160 * normal(1, 30, seed=8)[0]
    own = weather * (1 + 0.02 * normal(1, 30, seed=10)[0]) * np.where(np.arange(30) >= 15, 0.9, 1.0)
    alone = homogeneity.homogeneity_of(YEARS, own, gauge="A")
    beside = homogeneity.homogeneity_of(YEARS, own, gauge="A", reference=weather, reference_gauges=("B", "C", "D"))
    assert (alone.rejections, beside.rejections) == (0, 4)
    assert beside.break_after == 2005
    assert beside.series == pytest.approx(own / weather)
    assert beside.reference == ("B", "C", "D")


def test_years_without_ratio_are_left_out() -> None:
    """Years that lack a total, lack a reference or have a dry one take no part."""
    totals, reference = stepped(0.0), np.full(30, 700.0)
    totals[2], reference[5], reference[7] = np.nan, np.nan, 0.0
    tested = homogeneity.homogeneity_of(YEARS, totals, gauge="A", reference=reference)
    assert sorted(set(YEARS) - set(tested.years)) == [1993, 1996, 1998]
    # The leap years 1996, with the others, is out: 1992, 2000 to 2020 are left.
    assert tested.days.sum() == 27 * 365 + 7

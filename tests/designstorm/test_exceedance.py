"""Annual exceedance probability, return period, and the two kinds of series."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency, reduced_variate
from basinrain.errors import JobError


@pytest.mark.parametrize(("years", "aep"), [(0.5, 0.8647), (2.0, 0.3935), (10.0, 0.0952)])
def test_partial_duration_probabilities(years: float, aep: float) -> None:
    """AEP = 1 - exp(-1/T) (Langbein 1949): the twice-a-year storm is exceeded in 86 of 100 years."""
    assert round(Frequency(years, PARTIAL_DURATION).aep, 4) == aep


def test_annual_maximum_probabilities() -> None:
    """In an annual maximum series AEP and return period are each other's inverse."""
    assert Frequency.of_aep(0.02) == Frequency(50.0, ANNUAL_MAXIMUM)
    assert Frequency(2.0, ANNUAL_MAXIMUM).aep == 0.5


@pytest.mark.parametrize("aep", [0.9, 0.5, 0.1, 0.01, 1e-6])
def test_reduced_variate_is_a_gumbel_quantile(aep: float) -> None:
    """The reduced variate is the quantile of the standard Gumbel distribution, here as SciPy has it."""
    assert reduced_variate(aep) == pytest.approx(stats.gumbel_r.ppf(1 - aep), rel=1e-9)


def test_reduced_variate_of_the_median() -> None:
    """-ln(ln 2) = 0.36651, by hand."""
    assert round(reduced_variate(0.5), 5) == 0.36651


@given(st.floats(0.05, 5000.0))
def test_both_series_have_one_variate(years: float) -> None:
    """Brought to the other series and back, a frequency keeps its probability, variate and return period."""
    partial = Frequency(years, PARTIAL_DURATION)
    annual = partial.to(ANNUAL_MAXIMUM)
    assert annual.return_period > 1
    assert annual.aep == pytest.approx(partial.aep, rel=1e-12)
    assert annual.variate == pytest.approx(math.log(years), abs=1e-7)
    assert annual.to(PARTIAL_DURATION).return_period == pytest.approx(years, rel=1e-6)


@given(st.floats(1.01, 1e6))
def test_rarer_in_both_series(years: float) -> None:
    """The partial duration return period is shorter by about half a year, and never longer."""
    annual = Frequency(years, ANNUAL_MAXIMUM)
    partial = annual.to(PARTIAL_DURATION).return_period
    assert 0 < years - partial < 1
    assert annual.to(ANNUAL_MAXIMUM) is annual


def test_very_rare_probabilities_keep_their_digits() -> None:
    """1 - exp(-1/T) of a million million years is not rounded away."""
    assert Frequency(1e12, PARTIAL_DURATION).aep == pytest.approx(1e-12, rel=1e-9)


def test_labels() -> None:
    """A frequency is said as its series counts it."""
    assert Frequency.of_aep(0.01).label == "AEP 0.01 (1 in 100)"
    assert Frequency(0.25, PARTIAL_DURATION).label == "0.25-year, partial duration"


@pytest.mark.parametrize("years", [1.0, 0.5, 0.0, -2.0, math.nan, math.inf])
def test_annual_maximum_return_periods_that_cannot_be(years: float) -> None:
    """An annual maximum is exceeded at most once a year: return periods are above 1."""
    with pytest.raises(
        JobError, match=rf"^return period: found {years:g} years of an annual maximum series; expected more than 1; "
    ):
        Frequency(years, ANNUAL_MAXIMUM)


@pytest.mark.parametrize("years", [0.0, -0.5, math.nan, math.inf])
def test_partial_duration_return_periods_that_cannot_be(years: float) -> None:
    """A partial duration return period may be any above 0."""
    with pytest.raises(
        JobError, match=rf"^return period: found {years:g} years of a partial duration series; expected more than 0; "
    ):
        Frequency(years, PARTIAL_DURATION)


@pytest.mark.parametrize(
    ("aep", "remedy"),
    [
        (0.0, "correct it"),
        (1.0, "correct it"),
        (-0.1, "correct it"),
        (2.0, "write 0.02 for 2 %"),
        (100.0, "correct it"),
    ],
)
def test_probabilities_that_cannot_be(aep: float, remedy: str) -> None:
    """A probability of 0, 1 or in percent is refused, and percent is told how to be written."""
    with pytest.raises(
        JobError,
        match=rf"^annual exceedance probability: found {aep:g}; expected a fraction between 0 and 1; {remedy}$",
    ):
        Frequency.of_aep(aep)


def test_unknown_series() -> None:
    """A series is one of two, and the nearest is named."""
    with pytest.raises(
        JobError,
        match=r"^series: found 'partial'; expected one of: annual-maximum, partial-duration; did you mean",
    ):
        Frequency(2.0, "partial")

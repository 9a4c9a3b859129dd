"""The exponential formula with given coefficients."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import (
    ExponentialCoefficients,
    areal_reduction,
    exponential,
    leclerc_schaake,
)
from basinrain.errors import JobError, MethodError

KM2 = 1e6
METHOD = areal_reduction("exponential")
CALABRIA = ExponentialCoefficients(c1=0.0021, c2=0.53, c3=0.25, source="from memory")


@pytest.mark.parametrize(("km2", "hours", "expected"), [(100, 1, 0.88851), (100, 6, 0.91736), (500, 24, 0.79886)])
def test_coefficients_of_calabria(km2: float, hours: float, expected: float) -> None:
    """The coefficients remembered for Calabria (from memory) give the factors computed from them, to five decimals."""
    factor = METHOD.reduce(km2 * KM2, np.array([hours * 60]), coefficients=CALABRIA).factor
    assert factor == pytest.approx([expected], abs=5.01e-6)


@given(area=st.floats(1.0, 1e12), minutes=st.floats(1.0, 1e5))
def test_it_has_leclerc_and_schaake_as_a_case(area: float, minutes: float) -> None:
    """With 0.01 a square mile, 1.1 and 0.25 it is the formula of Leclerc and Schaake, at every area and duration."""
    same = ExponentialCoefficients(c1=0.01 / 2.589988110336, c2=1.1, c3=0.25, source="derived")
    expected = leclerc_schaake(area, minutes)
    assert exponential(area, minutes, coefficients=same) == pytest.approx(expected, abs=1e-12, rel=0)


def test_limits_of_the_formula() -> None:
    """Without area nothing is reduced; a boundless area has 1 - exp(-c2 d^c3)."""
    assert exponential(0.0, 60, coefficients=CALABRIA) == 1.0
    assert exponential(1e15, 60, coefficients=CALABRIA) == pytest.approx(1 - math.exp(-0.53), abs=1e-12)


@given(
    areas=st.lists(st.floats(1.0, 1e11), min_size=2, max_size=2),
    minutes=st.lists(st.floats(1.0, 1e4), min_size=2, max_size=2),
    c1=st.floats(1e-5, 0.1),
    c2=st.floats(0.01, 3),
    c3=st.floats(0.05, 1),
)
def test_it_falls_with_area_and_rises_with_duration(
    areas: list[float], minutes: list[float], c1: float, c2: float, c3: float
) -> None:
    """With any coefficients a larger area has no greater factor and a longer duration no smaller one."""
    given_ones = ExponentialCoefficients(c1=c1, c2=c2, c3=c3, source="drawn")
    durations = np.sort(minutes)
    small, large = (METHOD.reduce(area, durations, coefficients=given_ones).factor for area in sorted(areas))
    assert (large <= small).all()
    assert (np.diff(small) >= 0).all()
    assert (large > 0).all()
    assert (small <= 1).all()


def test_a_stated_range_is_held() -> None:
    """Areas and durations that the coefficients are stated for are held to, at both ends."""
    stated = ExponentialCoefficients(
        c1=0.0021, c2=0.53, c3=0.25, source="a study", areas=(1e7, 1e9), minutes=(60.0, 1440.0)
    )
    for area in (1e7, 1e9):
        assert METHOD.reduce(area, np.array([60.0, 1440.0]), coefficients=stated).clamped == ()
    with pytest.raises(
        MethodError, match=r"(?s)found 30 min and 48 h; expected 1 to 24 h.*found 5 km²; .* at least 10 km²"
    ):
        METHOD.reduce(5e6, np.array([30.0, 60.0, 2880.0]), coefficients=stated)
    with pytest.raises(MethodError, match="found 2000 km²; expected at most 1000 km²"):
        METHOD.reduce(2e9, np.array([60.0]), coefficients=stated)


def test_what_was_not_stated_is_remarked() -> None:
    """The source of the coefficients is told, and that no range could be held where none was stated."""
    minutes = np.array([60.0])
    told = "The coefficients of the areal reduction were given with the job: from memory."
    unheld = "No range of {} was stated for the coefficients of the areal reduction: none was held."
    remarks = METHOD.reduce(KM2, minutes, coefficients=CALABRIA).remarks
    assert remarks == (told, unheld.format("areas or durations"))
    areas_only = ExponentialCoefficients(c1=0.0021, c2=0.53, c3=0.25, source="from memory", areas=(0.0, 1e9))
    assert METHOD.reduce(KM2, minutes, coefficients=areas_only).remarks == (told, unheld.format("durations"))
    both = ExponentialCoefficients(
        c1=0.0021, c2=0.53, c3=0.25, source="from memory", areas=(0.0, 1e9), minutes=(60.0, 1440.0)
    )
    assert METHOD.reduce(KM2, minutes, coefficients=both).remarks == (told,)


def test_coefficients_that_cannot_be_are_refused_together() -> None:
    """Every coefficient that is no number above 0, both ranges and the missing source are named in one error."""
    with pytest.raises(JobError) as refused:
        ExponentialCoefficients(
            c1=-0.1, c2=math.nan, c3=math.inf, source=" ", areas=(1e9, 1e7), minutes=(60.0, math.inf)
        )
    items = ("coefficients, c1", "coefficients, c2", "coefficients, c3", "source", "valid_areas", "valid")
    assert [problem.item for problem in refused.value.problems] == [
        f"[design.areal_reduction] {item}" for item in items
    ]
    assert "valid_areas: found 1e+09 to 1e+07 m²; expected the least and the greatest, in this order" in str(
        refused.value
    )


def test_a_factor_of_zero_is_refused() -> None:
    """Where the formula takes everything away there is no factor: it is not passed on as 0."""
    steep = ExponentialCoefficients(c1=0.1, c2=1e-17, c3=0.25, source="drawn")
    with pytest.raises(MethodError, match="found a factor of 0 for 1e\\+06 km² at 1 h; expected a factor above 0"):
        METHOD.reduce(1e12, np.array([60.0]), coefficients=steep)

"""Areal reduction after Leclerc and Schaake; formula, range and readings of the curves from memory."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import areal_reduction, leclerc_schaake
from basinrain.errors import MethodError
from basinrain.units import area_factor

FILE = Path(__file__).parents[2] / "data" / "published" / "arf_leclerc_schaake_checks.csv"
CHECKS = [
    tuple(float(value) for value in row.values())
    for row in csv.DictReader(FILE.read_text(encoding="utf-8").splitlines())
]
MI2 = area_factor("mi2")
METHOD = areal_reduction("leclerc-schaake")


def test_the_checks_are_all_there() -> None:
    """Seven durations times ten areas are compared."""
    assert len(CHECKS) == 70


@pytest.mark.parametrize(("hours", "square_miles", "expected"), CHECKS)
def test_factors_computed_elsewhere(hours: float, square_miles: float, expected: float) -> None:
    """The factor is that of the formula (from memory) computed apart from this package, to its six decimals."""
    assert leclerc_schaake(square_miles * MI2, hours * 60) == pytest.approx(expected, abs=5.01e-7)


@pytest.mark.parametrize(
    ("hours", "square_miles", "expected"),
    [(1, 100, 0.7896), (3, 100, 0.8514), (6, 100, 0.8870), (24, 100, 0.9446), (24, 400, 0.9140), (0.5, 400, 0.6107)],
)
def test_four_decimals(hours: float, square_miles: float, expected: float) -> None:
    """Six factors, derived from the formula (from memory), to four decimals."""
    assert METHOD.reduce(square_miles * MI2, np.array([hours * 60])).factor == pytest.approx([expected], abs=5.01e-5)


@pytest.mark.parametrize(("hours", "read"), [(0.5, 0.58), (1, 0.66), (3, 0.77), (6, 0.83), (24, 0.91)])
def test_the_curves_of_technical_paper_40(hours: float, read: float) -> None:
    """At 400 square miles the formula is within 0.03 of fig. 15 of Technical Paper 40, read from memory."""
    assert METHOD.reduce(400 * MI2, np.array([hours * 60])).factor == pytest.approx([read], abs=0.031)


@pytest.mark.parametrize(("hours", "limit"), [(0.5, 0.6035), (1, 0.6671), (3, 0.7649), (6, 0.8212), (24, 0.9124)])
def test_limits_of_the_formula(hours: float, limit: float) -> None:
    """Without area nothing is reduced; a boundless area has 1 - exp(-1.1 t^0.25), here to four decimals."""
    assert leclerc_schaake(0.0, hours * 60) == 1.0
    assert leclerc_schaake(1e15, hours * 60) == pytest.approx(limit, abs=5.01e-5)


def test_sixty_millimetres_in_six_hours() -> None:
    """60 mm at a point in 6 h are 53.22 mm over 100 square miles and 57.63 mm over 25."""
    over = [60 * METHOD.reduce(area * MI2, np.array([360.0])).factor[0] for area in (100, 25)]
    assert over == pytest.approx([53.22, 57.63], abs=0.005)


def test_the_unit_of_area_does_not_matter() -> None:
    """100 square miles give the same factors whether they come as mi², km² or acres."""
    minutes = np.array([30.0, 360.0, 1440.0])
    expected = METHOD.reduce(100 * area_factor("mi2"), minutes).factor
    for area in (258.9988110336 * area_factor("km2"), 64_000 * area_factor("acre")):
        np.testing.assert_allclose(METHOD.reduce(area, minutes).factor, expected, rtol=1e-12)


def test_the_ends_of_the_range_are_in_it() -> None:
    """30 minutes, 24 hours and 400 square miles are answered, however the area was converted."""
    for area in (400 * MI2, 400 * 2.589988110336e6):
        reduced = METHOD.reduce(area, np.array([30.0, 1440.0]))
        assert reduced.factor == pytest.approx([0.6107, 0.9140], abs=5.01e-5)
        assert reduced.clamped == ()


def test_beyond_the_range_is_refused_in_one_error() -> None:
    """All durations outside and the area are named together, with the range in the method's own unit."""
    with pytest.raises(MethodError) as refused:
        METHOD.reduce(500 * MI2, np.array([10.0, 60.0, 2160.0, 2880.0]))
    assert [str(problem) for problem in refused.value.problems] == [
        (
            "[design.areal_reduction] leclerc-schaake, duration: found 10 min, 36 h and 48 h; expected 30 min to 24 h;"
            ' outside = "clamp" takes the factor of the range\'s nearest end'
        ),
        (
            "[design.areal_reduction] leclerc-schaake, area: found 1294.99 km² (500 mi²);"
            ' expected at most 1036 km² (400 mi²); outside = "clamp" takes the factor of the range\'s nearest end'
        ),
    ]


@given(
    areas=st.lists(st.floats(1e3, 400 * MI2), min_size=2, max_size=2),
    minutes=st.lists(st.floats(30, 1440), min_size=2, max_size=2),
)
def test_it_falls_with_area_and_rises_with_duration(areas: list[float], minutes: list[float]) -> None:
    """A larger area has no greater factor, a longer duration no smaller one; all are above 0 and at most 1."""
    durations = np.sort(minutes)
    small, large = (METHOD.reduce(area, durations).factor for area in sorted(areas))
    assert (large <= small).all()
    assert (np.diff(small) >= 0).all()
    assert 0 < large[0] <= small[1] <= 1

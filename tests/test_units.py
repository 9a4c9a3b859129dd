"""Units are exact by their definitions, and an unknown one is named with the nearest."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import pytest

from basinrain.errors import JobError
from basinrain.units import (
    AREA_UNITS,
    DEPTH_UNITS,
    LENGTH_UNITS,
    VOLUME_UNITS,
    area_factor,
    depth_factor,
    length_factor,
    volume_factor,
    volume_unit_for,
)

# International yard and pound agreement (1959): 1 yd = 0.9144 m exactly; US survey foot (Mendenhall order, 1893):
# 1200/3937 m; 1 acre = 4840 yd², 1 mi = 1760 yd. From memory.
YARD = Fraction(9144, 10000)
FOOT = YARD / 3
INCH = FOOT / 12
MILE = 1760 * YARD
ACRE = 4840 * YARD**2


@pytest.mark.parametrize(
    ("factor", "exact"),
    [
        (depth_factor, {"mm": 1, "cm": 10, "m": 1000, "in": INCH * 1000, "kg m-2": 1}),
        (depth_factor, {"0.1 mm": Fraction(1, 10), "0.01 mm": Fraction(1, 100)}),
        (depth_factor, {"0.1 in": INCH * 100, "0.01 in": INCH * 10, "0.001 in": INCH}),
        (length_factor, {"m": 1, "km": 1000, "ft": FOOT, "us-ft": Fraction(1200, 3937), "mi": MILE}),
        (area_factor, {"m2": 1, "km2": 1000**2, "ha": 100**2, "ft2": FOOT**2, "acre": ACRE, "mi2": MILE**2}),
        (volume_factor, {"m3": 1, "acre-ft": ACRE * FOOT}),
    ],
)
def test_factors_are_those_of_the_definitions(factor: Callable[[str], float], exact: dict[str, int | Fraction]) -> None:
    """Every factor is the exact quotient, to the last bits of a float."""
    for unit, value in exact.items():
        assert factor(unit) == pytest.approx(float(value), rel=4e-16), unit


def test_every_unit_is_checked_above() -> None:
    """No unit escapes the check of the definitions."""
    assert set(DEPTH_UNITS) == {"mm", "cm", "m", "in", "0.1 mm", "0.01 mm", "0.1 in", "0.01 in", "0.001 in", "kg m-2"}
    assert set(LENGTH_UNITS) == {"m", "km", "ft", "us-ft", "mi"}
    assert set(AREA_UNITS) == {"m2", "km2", "ha", "ft2", "acre", "mi2"}
    assert set(VOLUME_UNITS) == {"m3", "acre-ft"}


def test_units_hang_together() -> None:
    """640 acres are a square mile, 12 inches a foot; an inch on a square mile is 53 1/3 acre-feet (640/12)."""
    assert 640 * area_factor("acre") == pytest.approx(area_factor("mi2"), rel=1e-15)
    assert 12 * depth_factor("in") == pytest.approx(1000 * length_factor("ft"), rel=1e-15)
    volume = depth_factor("in") / 1000 * area_factor("mi2") / volume_factor(volume_unit_for("in"))
    assert volume == pytest.approx(640 / 12, rel=1e-15)
    assert volume_factor(volume_unit_for("mm")) == 1.0


@pytest.mark.parametrize(
    ("factor", "unit", "message"),
    [
        (depth_factor, "inch", r"depth unit: found 'inch'; expected one of: mm, .*; did you mean 'in'\?$"),
        (depth_factor, "MM", r"depth unit: found 'MM'; .*did you mean 'mm'\?$"),
        (length_factor, "feet", r"length unit: found 'feet'; expected one of: m, km, ft, us-ft, mi"),
        (length_factor, "usft", r"did you mean 'us-ft'\?$"),
        (area_factor, "acres", r"area unit: found 'acres'; .*did you mean 'acre'\?$"),
        (volume_factor, "acre ft", r"volume unit: found 'acre ft'; .*did you mean 'acre-ft'\?$"),
        (volume_factor, "", "volume unit: found ''; expected one of: m3, acre-ft$"),
    ],
)
def test_an_unknown_unit_is_named_with_the_nearest(factor: Callable[[str], float], unit: str, message: str) -> None:
    """What was written, all that is accepted, and the nearest of it."""
    with pytest.raises(JobError, match=message):
        factor(unit)

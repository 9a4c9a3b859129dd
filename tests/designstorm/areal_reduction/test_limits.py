"""Ranges, and areas in words."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.designstorm.areal_reduction import Limits
from basinrain.designstorm.areal_reduction.limits import area_words, between_words, joined

STEPPED = Limits(minutes=(15, 36_000), largest_areas=((0, 3e9), (30, 1e10), (60, 3e10)))


@pytest.mark.parametrize(
    ("minutes", "largest"),
    [(15, 3e9), (29.9, 3e9), (30, 1e10), (30 * (1 - 1e-12), 1e10), (59, 1e10), (60, 3e10), (36_000, 3e10)],
)
def test_the_largest_area_of_a_duration(minutes: float, largest: float) -> None:
    """Each step of the largest area begins with its duration, a last bit below it included."""
    assert STEPPED.largest_area(np.array([minutes])).tolist() == [largest]


def test_without_limits() -> None:
    """Nothing stated means that no area and no duration is too large."""
    assert np.isinf(Limits().largest_area(np.array([1.0, 1e9]))).all()
    assert Limits().minutes == (0.0, np.inf)


def test_until_when_an_area_is_the_largest() -> None:
    """All steps but the last say below which duration they hold."""
    assert [STEPPED.below_words(area) for area in (3e9, 1e10, 3e10)] == [" below 30 min", " below 1 h", ""]


def test_words() -> None:
    """The method's own unit of area beside km², ranges with their unit once."""
    assert area_words(1e5) == "0.1 km²"
    assert area_words(100 * 1609.344**2, "mi2") == "258.999 km² (100 mi²)"
    assert STEPPED.duration_words() == "15 min to 25 days"
    assert between_words("1 min", "10 min") == "1 to 10 min"
    assert joined(["a", "b"]) == "a and b"

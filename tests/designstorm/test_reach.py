"""Between which known values something lies, and what lies outside."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.reach import bracket, check_reach, refuse_unphysical
from basinrain.errors import MethodError

TEN = Frequency(10.0, ANNUAL_MAXIMUM)


@given(st.lists(st.integers(-50, 50), min_size=2, max_size=8, unique=True), st.lists(st.floats(-60, 60), max_size=8))
def test_value_is_the_neighbours_at_the_share(known: list[int], wanted: list[float]) -> None:
    """Low + share x (high - low) is the value itself, inside and outside; inside, the share is within 0 and 1."""
    axis, asked = np.sort(np.array(known, dtype=float)), np.array(wanted, dtype=float)
    low, high, share = bracket(axis, asked)
    np.testing.assert_array_equal(high, low + 1)
    np.testing.assert_allclose(axis[low] + share * (axis[high] - axis[low]), asked, atol=1e-9)
    inside = (asked >= axis[0]) & (asked <= axis[-1])
    assert ((share[inside] >= 0) & (share[inside] <= 1)).all()


def test_one_known_value() -> None:
    """With one known value, that is both neighbours of everything."""
    low, high, share = bracket(np.array([3.0]), np.array([1.0, 3.0]))
    assert (low.tolist(), high.tolist(), share.tolist()) == ([0, 0], [0, 0], [0.0, 0.0])


def test_whether_anything_lies_outside() -> None:
    """What is within says false; what is outside and allowed says true."""
    frequencies = [Frequency(2.0, ANNUAL_MAXIMUM), TEN]

    def outside(minutes: float, years: float) -> bool:
        return check_reach(
            np.array([minutes]),
            Frequency(years, ANNUAL_MAXIMUM),
            durations=[60.0, 120.0],
            frequencies=frequencies,
            extrapolate=True,
        )

    assert [outside(60.0, 2.0), outside(30.0, 2.0), outside(90.0, 20.0)] == [False, True, True]


def test_a_law_goes_on_from_one_frequency() -> None:
    """What has a law of its own may go on from one frequency; else there is no segment to go on along."""
    rarer = Frequency(20.0, ANNUAL_MAXIMUM)

    def check(*, law: bool) -> bool:
        span = [60.0, 120.0]
        return check_reach(np.array([60.0]), rarer, durations=span, frequencies=[TEN], extrapolate=True, fixed_law=law)

    assert check(law=True)
    with pytest.raises(MethodError, match=r"^AEP 0\.05 .*: found that the depths have only AEP 0\.1 \(1 in 10\)"):
        check(law=False)


def test_sound_depths_pass_and_each_unsound_point_is_named_once() -> None:
    """Three points: sound; falling, then rising in intensity; below 0 from the start."""
    minutes = np.array([60.0, 120.0, 180.0])
    depth = np.array([[10.0, 15.0, 20.0], [10.0, 9.0, 60.0], [-1.0, -2.0, 5.0]])
    refuse_unphysical(depth[:1], minutes, ["A"], TEN)
    with pytest.raises(MethodError) as caught:
        refuse_unphysical(depth, minutes, ["A", "B", "C"], TEN)
    assert [problem.item for problem in caught.value.problems] == [
        "point B, 2 h, AEP 0.1 (1 in 10)",
        "point C, 1 h, AEP 0.1 (1 in 10)",
    ]
    assert "found 9 mm (4.5 mm/h) after 10 mm (10 mm/h) of 1 h by extrapolation" in str(caught.value)

"""Depths of steps from depths that add up: by hand, and against plain ways to the same."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from nesting_cases import Array, durations, falling_depths
from sklearn.isotonic import IsotonicRegression

from basinrain.designstorm.patterns.increments import (
    check_growth,
    check_step,
    falling_increments,
    increments_of,
    known_depth,
    span_in_words,
)
from basinrain.errors import MethodError, Problem

RISE = 'shape "nested": found a depth per step that rises with duration, from '
RISE_EXPECTED = (
    " h; expected one that never rises with duration; check the depths and areal reductions of these durations, or "
    "even them out with smooth = true"
)


def exactly(*lines: str) -> str:
    """Return what matches these lines and no others."""
    return "^" + re.escape("\n".join(lines)) + "$"


def told(span: str, change: str) -> str:
    """Return what is said of evening out."""
    return (
        f"What a step adds to the depth rose with duration and was evened out over {span}: {change} greater, the "
        "largest change; the total is kept."
    )


def log_log(minutes: list[float], depth: list[float], at: Array) -> Array:
    """Return depths between durations, along straight lines in logarithms."""
    return np.exp(np.interp(np.log(at), np.log(minutes), np.log(depth)))


@pytest.mark.parametrize(
    ("minutes", "step", "said"),
    [
        (90, 60, "1 h for a duration of 90 min; expected a step that divides the duration; a step of 30 min does"),
        (30, 60, "1 h for a duration of 30 min; expected a step no longer than the duration; a step of 30 min is"),
        (50, 60, "1 h for a duration of 50 min; expected a step no longer than the duration; a step of 10 min is"),
        (0, 10, "10 min for a duration of 0 min; expected minutes above 0; correct it"),
        (60, -5, "-5 min for a duration of 60 min; expected minutes above 0; correct it"),
    ],
)
def test_step_that_does_not_divide(minutes: int, step: int, said: str) -> None:
    """A step that does not divide its duration is refused with both, and with one that does."""
    with pytest.raises(MethodError, match=exactly("[design] step: found " + said)):
        check_step(minutes, step)


@given(st.integers(1, 5000), st.integers(1, 5000))
def test_step_that_divides(minutes: int, step: int) -> None:
    """A step passes exactly when the duration is a whole number of it, and the one advised then passes."""
    if minutes % step == 0:
        check_step(minutes, step)
        return
    with pytest.raises(MethodError, match=r"\[design\] step: found") as refused:
        check_step(minutes, step)
    number, unit = re.findall(r"a step of (\d+) (min|h|days)", str(refused.value))[-1]
    check_step(minutes, int(number) * {"min": 1, "h": 60, "days": 1440}[unit])


def test_increments_by_hand() -> None:
    """Of 80 mm a tenth, three and six tenths fall; where the shape begins and in what unit makes no difference."""
    np.testing.assert_allclose(increments_of(np.array([0, 0.1, 0.4, 1]), 80), [8, 24, 48], rtol=1e-15)
    np.testing.assert_allclose(increments_of(np.array([7.0, 8, 11, 17]), 80), [8, 24, 48], rtol=1e-15)


@given(
    st.lists(st.floats(0, 1e6), min_size=1, max_size=300).filter(lambda steps: sum(steps) > 1e-3), st.floats(1e-3, 2e3)
)
def test_total_is_kept(steps: list[float], total: float) -> None:
    """Increments sum to the total to 1e-12 and none is negative."""
    found = increments_of(np.concatenate([[0.0], np.cumsum(steps)]), total)
    assert found.sum() == pytest.approx(total, rel=1e-12)
    assert (found >= 0).all()


def test_rounding_is_no_fall() -> None:
    """A cumulative curve that falls by rounding only has a dry step there."""
    np.testing.assert_array_equal(increments_of(np.array([0, 0.5, 0.5 - 1e-13, 1]), 10) > 0, [True, False, True])


@pytest.mark.parametrize(
    ("cumulative", "found"),
    [
        ([0, 0.6, 0.5, 1], "a fall in step 2 of 3"),
        ([1, 1, 1], "none between the begin and the end"),
        ([0, np.nan, 1], "no number at border 1 of a step"),
    ],
)
def test_what_does_not_add_up(cumulative: list[float], found: str) -> None:
    """A cumulative curve that falls, never rises, or has a gap is refused."""
    line = f"cumulative depth: found {found}; expected a depth that rises; check the pattern"
    with pytest.raises(MethodError, match=exactly(line)):
        increments_of(np.array(cumulative), 10)


@given(falling_depths())
def test_what_falls_stays(depths: list[float]) -> None:
    """Increments that nowhere rise come back as they are, whether evening out is allowed or not, with nothing said."""
    for smooth in (False, True):
        found, remarks = falling_increments(np.cumsum(depths), 10, shape="nested", smooth=smooth)
        np.testing.assert_allclose(found, depths, rtol=0, atol=1e-9 * sum(depths))
        assert (np.diff(found) <= 0).all()
        assert remarks == ()


def test_a_rise_between_tabulated_durations() -> None:
    """50, 55 and 90 mm in 1, 2 and 6 h: by ln(90/55)/ln 3 the third hour adds 55 (3/2)^b - 55 mm, after 5 mm."""
    depth = log_log([60, 120, 360], [50, 55, 90], durations(6, 60))
    third = 55 * 1.5 ** (np.log(90 / 55) / np.log(3)) - 55
    assert third == pytest.approx(10.963, abs=0.0005)
    with pytest.raises(MethodError, match=exactly(f"{RISE}5 mm in 1 to 2 h to 10.96 mm in 2 to 3{RISE_EXPECTED}")):
        falling_increments(depth, 60, shape="nested")
    found, remarks = falling_increments(depth, 60, shape="nested", smooth=True)
    # Hours 2 to 6 add 5, 10.96, 9.08, 7.90 and 7.06 mm: from 7.90 on they are below the mean of those before.
    pooled = (depth[3] - 50) / 3
    np.testing.assert_allclose(found, [50, pooled, pooled, pooled, depth[4] - depth[3], 90 - depth[4]], rtol=1e-12)
    assert found.sum() == pytest.approx(90, rel=1e-14)
    assert remarks == (told("1 to 4 h", f"the depth of 2 h is {50 + pooled - 55:.3g} mm"),)


def test_all_places_together() -> None:
    """Two rises and a fall are told at once, each with its durations; a rise over several steps is one."""
    with pytest.raises(
        MethodError,
        match=exactly(
            f"{RISE}2 mm in 1 to 2 h to 5 mm in 3 to 4{RISE_EXPECTED}",
            f"{RISE}-1 mm in 4 to 5 h to 1 mm in 5 to 6{RISE_EXPECTED}",
            'shape "nested": found a depth that falls with duration, from 20 mm in 4 h to 19 mm in 5 h; expected one '
            "that never falls with duration; check the depths and areal reductions of these durations",
        ),
    ):
        falling_increments(np.cumsum([10.0, 2, 3, 5, -1, 1]), 60, shape="nested")


def test_small_rises_are_told_apart() -> None:
    """A rise in the seventh digit is printed with the digits that show it."""
    with pytest.raises(MethodError, match=r"from 1 mm in 10 to 20 min to 1\.000001 mm in 20 to 30 min"):
        falling_increments(np.cumsum([2.0, 1, 1.000001]), 10, shape="nested")


@pytest.mark.parametrize(("share", "refused"), [(0.5e-9, False), (2e-9, True)])
def test_where_rounding_ends(share: float, refused: bool) -> None:  # noqa: FBT001
    """A rise of less than 1e-9 of the depth is rounding, one of more is a finding."""
    depth = np.cumsum([60.0, 20, 20 + share * 100])
    if refused:
        with pytest.raises(MethodError, match="a depth per step that rises with duration"):
            falling_increments(depth, 10, shape="nested")
    else:
        found, remarks = falling_increments(depth, 10, shape="nested")
        assert (np.diff(found) <= 0).all()
        assert remarks == ()


def test_a_fall_can_be_evened_out_only_before_more() -> None:
    """40, -2 and 6 mm become 40, 2 and 2 mm; 40, 6 and -2 mm have nothing after the fall to make up for it."""
    found, remarks = falling_increments(np.cumsum([40.0, -2, 6]), 10, shape="nested", smooth=True)
    np.testing.assert_allclose(found, [40, 2, 2], rtol=1e-14)
    assert remarks == (told("10 to 30 min", "the depth of 20 min is 4 mm"),)
    line = (
        'shape "nested": found a depth that falls with duration, from 46 mm in 20 min to 44 mm in 30 min; expected one '
        "that never falls with duration; check the depths and areal reductions of these durations"
    )
    for smooth in (False, True):
        with pytest.raises(MethodError, match=exactly(line)):
            falling_increments(np.cumsum([40.0, 6, -2]), 10, shape="nested", smooth=smooth)


@given(st.lists(st.floats(0, 50), min_size=2, max_size=40).filter(lambda steps: sum(steps) > 1))
def test_evening_out_is_isotonic_regression(steps: list[float]) -> None:
    """What is evened out falls, keeps the total, lowers no depth, and is what scikit-learn fits."""
    depth = np.cumsum(steps)
    found, remarks = falling_increments(depth, 10, shape="nested", smooth=True)
    slack = 1e-9 * depth[-1]
    other = IsotonicRegression(increasing=False).fit_transform(np.arange(len(steps)), steps)
    np.testing.assert_allclose(found, other, rtol=0, atol=len(steps) * slack)
    assert (np.diff(found) <= 0).all()
    assert (found >= 0).all()
    assert found.sum() == pytest.approx(depth[-1], rel=1e-12)
    assert (np.cumsum(found) >= depth - len(steps) * slack).all()
    assert bool(remarks) == bool((np.diff(steps) > slack).any())


def test_largest_change_is_told() -> None:
    """1, 3 and 2 mm in ten minutes each: pooled to 2, 2 and 2 mm, the first ten minutes gain 1 mm."""
    found, remarks = falling_increments(np.array([1.0, 4, 6]), 10, shape="nested", smooth=True)
    np.testing.assert_allclose(found, [2, 2, 2], rtol=1e-15)
    assert remarks == (told("0 to 30 min", "the depth of 10 min is 1 mm"),)


def test_depths_that_the_curve_has() -> None:
    """Known depths are the curve's; to ask for none does not trouble it."""

    def curve(minutes: Array) -> Array:
        assert len(minutes)
        return minutes * 2

    np.testing.assert_array_equal(known_depth(curve, np.array([5.0, 10]), shape="nested", remedy="wait"), [10, 20])
    assert known_depth(curve, np.array([]), shape="nested", remedy="wait").shape == (0,)


def test_depths_that_the_curve_has_not() -> None:
    """The curve's own messages pass, all of them and their count, each with what the pattern would need."""

    def curve(minutes: Array) -> Array:
        raise MethodError(
            [
                Problem(
                    item="depths", found=f"{minutes.min():g} min", expected="1 h to 24 h", remedy="extrapolate = true"
                ),
                Problem(item="reduction", found="too short"),
            ],
            unlisted=3,
        )

    advice = 'shape "chicago" needs durations from 15 to 30 min: take a longer step'
    with pytest.raises(
        MethodError,
        match=exactly(
            f"depths: found 15 min; expected 1 h to 24 h; extrapolate = true; {advice}",
            f"reduction: found too short; {advice}",
            "3 more problems: found but not listed",
        ),
    ):
        known_depth(curve, np.array([30.0, 15]), shape="chicago", remedy="take a longer step")


def test_depths_that_are_no_numbers() -> None:
    """A curve that answers with no number is refused with the first duration that has none."""
    line = (
        'shape "nested": found no depth of 20 min; expected depths of durations from 10 to 30 min; take a longer step'
    )
    with pytest.raises(MethodError, match=exactly(line)):
        known_depth(
            lambda minutes: np.where(minutes < 15, 1, np.nan),
            np.array([10.0, 20, 30]),
            shape="nested",
            remedy="take a longer step",
        )


def test_growth() -> None:
    """Depths that stay the same grow well enough; every stretch in which they fall is named once."""
    check_growth(np.array([7.5, 60, 61]), np.array([10.0, 10, 10 - 1e-10]), shape="chicago")
    end = "; expected one that never falls with duration; check the depths and areal reductions of these durations"
    start = 'shape "chicago": found a depth that falls with duration, from'
    with pytest.raises(
        MethodError,
        match=exactly(f"{start} 10 mm in 7.5 min to 8 mm in 2 h{end}", f"{start} 9 mm in 3 h to 8.5 mm in 4 h{end}"),
    ):
        check_growth(np.array([7.5, 60, 120, 180, 240]), np.array([10.0, 9, 8, 9, 8.5]), shape="chicago")


def test_words_of_durations() -> None:
    """Hours where both ends are whole hours, else minutes."""
    assert [span_in_words(60, 180), span_in_words(60, 75)] == ["1 to 3 h", "60 to 75 min"]

"""The alternating block storm: by hand, the worked example of Chow, Maidment and Mays, and as laws."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from nesting_cases import (
    INCH,
    added_up,
    case_of,
    denver,
    durations,
    falling_depths,
    greatest,
    has_one_peak,
    peaks,
    published,
)

from basinrain.designstorm.patterns.alternating_block import ALTERNATING_BLOCK, alternating_block, around_peak
from basinrain.designstorm.patterns.nested import nested
from basinrain.designstorm.patterns.peak import peak_fraction, peak_step
from basinrain.errors import JobError, MethodError


def test_by_hand() -> None:
    """Blocks of 9, 6, 4, 2 and 1 mm: the largest in the middle of five, then right, left, right, left."""
    case = added_up([9, 6, 4, 2, 1], 10)
    np.testing.assert_allclose(alternating_block(case).depth, [1, 4, 9, 6, 2], rtol=1e-12)
    # 1.25 steps before the peak: it stands in the second, and the left side is full after one block.
    np.testing.assert_allclose(alternating_block(case, peak="early").depth, [4, 9, 6, 2, 1], rtol=1e-12)
    np.testing.assert_allclose(alternating_block(case, peak="late").depth, [1, 2, 4, 9, 6], rtol=1e-12)
    np.testing.assert_allclose(alternating_block(case, peak=0.1).depth, [9, 6, 4, 2, 1], rtol=1e-12)
    np.testing.assert_allclose(alternating_block(case, peak=0.9).depth, [1, 2, 4, 6, 9], rtol=1e-12)


def test_one_step_and_two() -> None:
    """One step holds the whole depth; of two the second is the lesser, unless the peak is late."""
    np.testing.assert_allclose(alternating_block(added_up([9], 10)).depth, [9], rtol=1e-15)
    np.testing.assert_allclose(alternating_block(added_up([9, 6], 10)).depth, [9, 6], rtol=1e-15)
    np.testing.assert_allclose(alternating_block(added_up([9, 6], 10), peak="late").depth, [6, 9], rtol=1e-15)


def test_worked_example() -> None:
    """Chow, Maidment and Mays (1988), example 14.4.1 (from memory): Denver, 10 years, 2 h by 10 min, inches."""
    depth = alternating_block(case_of(denver, 120, 10)).depth / INCH
    rows = published("alternating_block_chow_14_4_1.csv")
    printed = np.array([float(row["published_hyetograph"]) for row in rows])
    np.testing.assert_array_equal(
        printed, [0.024, 0.033, 0.050, 0.084, 0.178, 0.693, 0.308, 0.117, 0.063, 0.040, 0.028, 0.021]
    )
    np.testing.assert_allclose(depth, printed, rtol=0, atol=6e-4)
    np.testing.assert_allclose(depth, [float(row["hyetograph_in"]) for row in rows], rtol=0, atol=6e-6)
    assert depth.sum() == pytest.approx(1.63943, abs=5e-6)
    assert int(np.argmax(depth)) == 5


@given(falling_depths(), peaks())
def test_laws(blocks: list[float], peak: str | float) -> None:
    """The total is kept, the largest stands at the peak, and in every duration the greatest depth is the curve's."""
    case = added_up(blocks, 10)
    shaped = alternating_block(case, peak=peak)
    depth = shaped.depth
    assert depth.shape == (case.n_steps,)
    assert depth.sum() == pytest.approx(case.total, rel=1e-12)
    assert (depth >= 0).all()
    assert depth[peak_step(peak_fraction(peak), case.n_steps)] == depth.max()
    assert has_one_peak(depth)
    assert shaped.remarks == ()
    np.testing.assert_allclose(greatest(depth), np.cumsum(blocks), rtol=1e-9)
    np.testing.assert_allclose(np.sort(depth)[::-1], blocks, rtol=0, atol=1e-9 * case.total)


@given(falling_depths(), peaks())
def test_the_largest_stand_side_by_side(blocks: list[float], peak: str | float) -> None:
    """For every k the places of the k largest blocks are k in a row, the peak among them."""
    at = peak_step(peak_fraction(peak), len(blocks))
    rank = around_peak(np.arange(len(blocks), dtype=float), at)
    for k in range(1, len(blocks) + 1):
        places = np.flatnonzero(rank < k)
        assert places[-1] - places[0] == k - 1
        assert places[0] <= at <= places[-1]


@given(falling_depths(), st.floats(0.3, 1), peaks())
def test_nested_is_the_same_where_the_reduction_is_one(blocks: list[float], factor: float, peak: str | float) -> None:
    """Where all durations have one reduction the nested storm is this one."""
    point = added_up(blocks, 10)
    reduced = [block * factor for block in blocks]
    case = case_of(
        lambda times: point.curve(times) * factor, point.minutes, 10, by_duration=added_up(reduced, 10).curve
    )
    here, there = alternating_block(case, peak=peak).depth, nested(case, peak=peak).depth
    np.testing.assert_allclose(here, there, rtol=0, atol=1e-9 * case.total)


def test_the_whole_duration_has_the_reduction() -> None:
    """The curve with the reduction of the whole duration is used, and not that by duration."""
    case = case_of(denver, 120, 10, by_duration=lambda minutes: np.full(len(minutes), np.nan))
    np.testing.assert_allclose(greatest(alternating_block(case).depth), denver(durations(12, 10)), rtol=1e-9)


def test_total_is_that_of_the_case() -> None:
    """Where the curve's end differs from the total in the last digits the total is kept."""
    case = case_of(denver, 120, 10)
    case = replace(case, total=case.total * (1 + 1e-10))
    assert alternating_block(case).depth.sum() == pytest.approx(case.total, rel=1e-13)


def test_blocks_that_grow() -> None:
    """Blocks that grow with duration are refused by this pattern's name, or evened out and told."""
    case = added_up([8, 2, 5, 1], 15)
    with pytest.raises(
        MethodError,
        match=r'^shape "alternating-block": found a depth per step that rises with duration, from 2 mm in 15 to 30 min '
        r"to 5 mm in 30 to 45 min; expected one that never rises with duration; check the depths and areal reductions "
        r"of these durations, or even them out with smooth = true$",
    ):
        alternating_block(case)
    shaped = alternating_block(case, smooth=True)
    np.testing.assert_allclose(shaped.depth, [3.5, 8, 3.5, 1], rtol=1e-12)
    assert [remark.split(":")[0] for remark in shaped.remarks] == [
        "What a step adds to the depth rose with duration and was evened out over 15 to 45 min"
    ]


def test_what_is_asked_wrongly() -> None:
    """A peak that is none and a step that does not divide the duration are refused."""
    with pytest.raises(JobError, match=r"peak: found 'left'; expected early, centre, late, or a fraction"):
        alternating_block(case_of(denver, 120, 10), peak="left")
    with pytest.raises(MethodError, match=r"step: found 50 min for a duration of 2 h; .* a step of 10 min does$"):
        alternating_block(case_of(denver, 120, 50))


def test_registered_options() -> None:
    """The pattern's options are those that its function takes."""
    case = added_up([9, 6, 4], 10)
    options = dict(zip(ALTERNATING_BLOCK.options, ("late", True), strict=True))
    np.testing.assert_allclose(ALTERNATING_BLOCK.shape(case, **options).depth, [4, 6, 9], rtol=1e-12)
    assert ALTERNATING_BLOCK.name == "alternating-block"

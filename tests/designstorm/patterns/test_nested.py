"""The nested storm: its law over all windows, and the nesting of NRCS ratios."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from nesting_cases import (
    Array,
    added_up,
    case_of,
    denver,
    durations,
    falling_depths,
    greatest,
    has_one_peak,
    peaks,
    published,
    through,
)

from basinrain.designstorm.patterns.alternating_block import alternating_block
from basinrain.designstorm.patterns.nested import NESTED, nested
from basinrain.errors import MethodError, Problem

REDUCED_AREA = 250.0


def reduced(minutes: Array) -> Array:
    """Return Denver's depths over 250 mi², each reduced by its own duration (Leclerc and Schaake 1972, from memory)."""
    strength = -1.1 * (minutes / 60) ** 0.25
    factor = 1 - np.exp(strength) + np.exp(strength - 0.01 * REDUCED_AREA)
    return np.asarray(denver(minutes) * factor, dtype=np.float64)


def test_by_hand() -> None:
    """Reduced depths of 6, 10, 12 and 13 mm in 1 to 4 h: increments 6, 4, 2, 1, laid right, left, right of the peak."""
    case = case_of(
        through([60, 120, 180, 240], [10, 12, 12.5, 13]),
        240,
        60,
        by_duration=through([60, 120, 180, 240], [6, 10, 12, 13]),
    )
    np.testing.assert_allclose(nested(case).depth, [2, 6, 4, 1], rtol=1e-12)
    np.testing.assert_allclose(nested(case, peak="late").depth, [1, 2, 6, 4], rtol=1e-12)
    np.testing.assert_allclose(greatest(nested(case).depth), [6, 10, 12, 13], rtol=1e-12)


@pytest.mark.parametrize("peak", ["early", "centre", "late", 0.375, 0.01, 0.99])
@pytest.mark.parametrize(("minutes", "step"), [(120, 10), (360, 5), (1440, 60), (90, 18)])
def test_every_duration_has_its_reduced_depth(minutes: int, step: int, peak: str | float) -> None:
    """In every whole number of steps the greatest depth over all windows is that duration's own reduced depth."""
    by_duration = reduced(durations(minutes // step, step))
    total = by_duration[-1]
    whole = total / denver(np.array([float(minutes)]))[0]
    case = case_of(lambda times: denver(times) * whole, minutes, step, by_duration=reduced)
    depth = nested(case, peak=peak).depth
    np.testing.assert_allclose(greatest(depth), by_duration, rtol=1e-9)
    assert depth.sum() == pytest.approx(total, rel=1e-12)
    assert has_one_peak(depth)
    # A short duration is reduced more by itself than as part of the whole one.
    assert depth.max() < alternating_block(case, peak=peak).depth.max()


@given(falling_depths(), st.floats(0.2, 1), peaks())
def test_laws(blocks: list[float], lowest: float, peak: str | float) -> None:
    """For any curve that stays concave when reduced the greatest depths are the reduced ones; nothing is remarked."""
    case = added_up(blocks, 10)
    by_duration = np.cumsum(blocks)
    # Between the curve and its chord lies a concave curve: short durations lose most, the whole one nothing.
    times = durations(len(blocks), 10)
    lower = lowest * by_duration + (1 - lowest) * by_duration[-1] * times / times[-1]
    own = case_of(case.curve, case.minutes, case.step, by_duration=through(times, lower))
    shaped = nested(own, peak=peak)
    np.testing.assert_allclose(greatest(shaped.depth), lower, rtol=1e-9)
    assert shaped.depth.sum() == pytest.approx(case.total, rel=1e-12)
    assert has_one_peak(shaped.depth)
    assert shaped.remarks == ()


def ratios(region: str) -> tuple[Array, Array]:
    """Return durations in minutes and their share of the 24-h depth: NRCS, NEH 630 chapter 4, figures 4-31 and 4-72."""
    rows = published("neh630_ch4_duration_ratios.csv")
    column = next(name for name in rows[0] if name.startswith(region))
    return (
        np.array([float(row["duration_min"]) for row in rows]),
        np.array([float(row[column]) for row in rows]),
    )


@pytest.mark.parametrize("region", ["type_II", "region_A", "region_B", "region_C", "region_D"])
def test_nesting_of_nrcs_ratios(region: str) -> None:
    """The storm and its mirror together follow F(12 h -+ d/2) = 0.5 -+ r(d)/2 (NRCS, NEH 630 ch. 4, seen)."""
    minutes, ratio = ratios(region)
    case = case_of(through(minutes, ratio), 1440, 5)
    depth = nested(case).depth
    symmetric = np.concatenate([[0.0], np.cumsum((depth + depth[::-1]) / 2)])
    borders = np.arange(0, 1445, 5.0)
    # Half of a duration ends on a border for 10, 30, 60 ... min, not for 5 and 15 min.
    even = minutes % 10 == 0
    assert even.sum() == 8
    for sign in (-1, 1):
        found = np.interp(720 + sign * minutes[even] / 2, borders, symmetric)
        np.testing.assert_allclose(found, 0.5 + sign * ratio[even] / 2, rtol=0, atol=1e-12)
    # The greatest depths need no mirror, and hold for 5 and 15 min too.
    np.testing.assert_allclose(greatest(depth)[(minutes / 5).astype(int) - 1], ratio, rtol=1e-9)


@pytest.mark.parametrize("region", ["region_A", "region_B", "region_C", "region_D"])
def test_published_ratios_may_rise_between_durations(region: str) -> None:
    """Straight lines in logarithms between a table's durations bend upward at 3 h: refused, or evened out on demand."""
    minutes, ratio = ratios(region)

    def straight(wanted: Array) -> Array:
        return np.exp(np.interp(np.log(wanted), np.log(minutes), np.log(100 * ratio)))

    case = case_of(straight, 1440, 30)
    with pytest.raises(MethodError, match=r"mm in 150 to 180 min to [0-9.]+ mm in 180 to 210 min; expected one that"):
        nested(case)
    shaped = nested(case, smooth=True)
    assert has_one_peak(shaped.depth)
    assert shaped.depth.sum() == pytest.approx(100, rel=1e-12)
    change = greatest(shaped.depth) - straight(durations(48, 30))
    assert change.min() > -1e-9
    (remark,) = shaped.remarks
    told = re.search(r"the depth of 3 h is ([0-9.]+) mm greater, the largest change; the total is kept\.$", remark)
    assert told
    assert float(told[1]) == pytest.approx(change.max(), rel=5e-3)
    assert int(np.argmax(change)) == 5


def test_increments_that_rise() -> None:
    """50, 55 and 90 mm in 1, 2 and 6 h: the third hour adds more than the second; both are named with what to do."""

    def rising(minutes: Array) -> Array:
        return np.exp(np.interp(np.log(minutes), np.log([60, 120, 360]), np.log([50, 55, 90])))

    case = case_of(rising, 360, 60)
    with pytest.raises(
        MethodError,
        match=r'^shape "nested": found a depth per step that rises with duration, from 5 mm in 1 to 2 h to 10\.96 mm '
        r"in 2 to 3 h; expected one that never rises with duration; check the depths and areal reductions of these "
        r"durations, or even them out with smooth = true$",
    ):
        nested(case)
    depth = nested(case, smooth=True).depth
    assert has_one_peak(depth)
    assert depth.sum() == pytest.approx(90, rel=1e-12)


def test_depth_that_falls_after_reduction() -> None:
    """A reduced depth that falls with duration is refused, and evening out does not help where nothing comes after."""
    case = case_of(through([60, 120, 180], [40, 46, 44]), 180, 60)
    for smooth in (False, True):
        with pytest.raises(
            MethodError,
            match=r'^shape "nested": found a depth that falls with duration, from 46 mm in 2 h to 44 mm in 3 h; '
            r"expected one that never falls with duration; check the depths and areal reductions of these durations$",
        ):
            nested(case, smooth=smooth)


def test_durations_that_the_table_has_not() -> None:
    """Where depths begin at 15 min and the step is 5 min the table's own message passes, with what to do."""

    def table(minutes: Array) -> Array:
        if minutes.min() < 15:
            raise MethodError(Problem(item="depths", found=f"{minutes.min():g} min", expected="15 min or more"))
        return denver(minutes)

    with pytest.raises(
        MethodError,
        match=r'^depths: found 5 min; expected 15 min or more; shape "nested" needs durations from 5 to 120 min: take '
        r"a longer step, or depths of shorter durations$",
    ):
        nested(case_of(table, 120, 5))
    np.testing.assert_allclose(greatest(nested(case_of(table, 120, 15)).depth), denver(durations(8, 15)), rtol=1e-9)


def test_registered_options() -> None:
    """The pattern's options are those that its function takes."""
    options = dict(zip(NESTED.options, ("late", True), strict=True))
    np.testing.assert_allclose(NESTED.shape(added_up([9, 6, 4], 10), **options).depth, [4, 6, 9], rtol=1e-12)
    assert NESTED.name == "nested"

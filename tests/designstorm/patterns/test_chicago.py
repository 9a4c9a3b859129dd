"""The Chicago storm: against the published intensity and its integral, by hand, and as laws."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from nesting_cases import (
    INCH,
    Array,
    Curve,
    added_up,
    case_of,
    denver,
    falling_depths,
    greatest,
    has_one_peak,
    peaks,
    through,
)
from scipy.integrate import quad

from basinrain.designstorm.patterns.chicago import CHICAGO, chicago
from basinrain.errors import JobError, MethodError, Problem

A, B, C = 96.6, 0.97, 13.90


def intensity(time: float, *, minutes: float, fraction: float) -> float:
    """Return in/h of Denver's storm at minutes after its begin: Keifer and Chu (1957), the form from memory."""
    before = fraction * minutes - time
    x = before / fraction if before > 0 else -before / (1 - fraction)
    return float(A * ((1 - B) * x**B + C) / (x**B + C) ** 2)


def test_published_intensity() -> None:
    """The formula itself, of derived values: a/c at the peak, and 10 min to its left and right with r = 0.375."""
    assert intensity(45, minutes=120, fraction=0.375) == pytest.approx(6.949640, abs=5e-7)
    assert intensity(35, minutes=120, fraction=0.375) == pytest.approx(0.97503, abs=5e-6)
    assert intensity(55, minutes=120, fraction=0.375) == pytest.approx(1.69101, abs=5e-6)
    whole, _ = quad(intensity_of(120, 0.375), 0, 120, points=[45])
    assert whole / 60 == pytest.approx(1.639434, abs=5e-7)


def intensity_of(minutes: float, fraction: float) -> Callable[[float], float]:
    """Return the intensity as a function of time alone."""
    return lambda time: intensity(time, minutes=minutes, fraction=fraction)


@pytest.mark.parametrize(
    ("minutes", "step", "fraction"),
    [(120, 5, 0.375), (120, 10, 0.5), (120, 10, 0.375), (60, 1, 0.25), (360, 30, 0.75), (100, 20, 0.37), (60, 60, 0.4)],
)
def test_steps_hold_the_integral_of_the_intensity(minutes: int, step: int, fraction: float) -> None:
    """Every step holds the integral of the published intensity, the peak on a border of steps or inside one."""
    depth = chicago(case_of(denver, minutes, step), peak=fraction).depth / INCH
    peak = fraction * minutes
    borders = np.arange(0, minutes + step, step)
    # In two parts where the peak stands inside a step: the intensity has a cusp there.
    integrals = [
        sum(
            quad(intensity_of(minutes, fraction), low, high, epsabs=1e-13, epsrel=1e-12, limit=200)[0] / 60
            for low, high in ((start, min(max(peak, start), end)), (max(min(peak, end), start), end))
        )
        for start, end in zip(borders[:-1].tolist(), borders[1:].tolist(), strict=True)
    ]
    np.testing.assert_allclose(depth, integrals, rtol=0, atol=1e-9)


def test_derived_hyetographs() -> None:
    """Denver, 2 h: ten-minute blocks with the peak in the middle, and five-minute blocks with r = 0.375; inches."""
    depth = chicago(case_of(denver, 120, 10)).depth / INCH
    np.testing.assert_allclose(depth[:6], [0.02266, 0.03080, 0.04498, 0.07351, 0.14747, 0.50030], rtol=0, atol=5e-6)
    np.testing.assert_allclose(depth, depth[::-1], rtol=1e-12)
    assert depth.sum() == pytest.approx(1.639434, abs=5e-7)
    fine = chicago(case_of(denver, 120, 5), peak=0.375).depth / INCH
    assert fine.max() == pytest.approx(0.37588, abs=5e-6)
    assert int(np.argmax(fine)) == 9
    assert fine.sum() == pytest.approx(1.639434, abs=5e-7)


def test_by_hand() -> None:
    """20, 28, 32 and 34 mm in 10 to 40 min, peak in the middle: half of each increment on either side, in 5 min."""
    case = case_of(through([10, 20, 30, 40], [20, 28, 32, 34]), 40, 5)
    np.testing.assert_allclose(chicago(case).depth, [1, 2, 4, 10, 10, 4, 2, 1], rtol=1e-12)
    # A quarter before the peak at 10 min: there five minutes are a duration of 20, after it of 6 2/3 min.
    depth = chicago(case, peak="early").depth
    np.testing.assert_allclose(depth[:2], [0.25 * 6, 0.25 * 28], rtol=1e-12)
    np.testing.assert_allclose(depth[2:4], [0.75 * 40 / 3, 0.75 * (20 + 8 / 3 - 40 / 3)], rtol=1e-12)
    assert depth.sum() == pytest.approx(34, rel=1e-14)


def test_peak_inside_a_step() -> None:
    """Three steps of 10 min with the peak in the middle of the second: it holds all that 10 min have, no more."""
    case = case_of(through([10, 20, 30], [20, 28, 32]), 30, 10)
    np.testing.assert_allclose(chicago(case).depth, [6, 20, 6], rtol=1e-12)


@given(falling_depths(), peaks())
def test_laws(blocks: list[float], peak: str | float) -> None:
    """For any concave curve the total is kept, there is one peak, and no duration has more than the curve."""
    case = added_up(blocks, 10)
    shaped = chicago(case, peak=peak)
    assert shaped.depth.shape == (case.n_steps,)
    assert shaped.depth.sum() == pytest.approx(case.total, rel=1e-12)
    assert (shaped.depth >= 0).all()
    assert has_one_peak(shaped.depth)
    assert shaped.remarks == ()
    assert (greatest(shaped.depth) <= np.cumsum(blocks) * (1 + 1e-9) + 1e-9).all()


@given(falling_depths(), st.floats(0.01, 0.99))
def test_mirror(blocks: list[float], fraction: float) -> None:
    """A peak as far from the end as another is from the begin makes the mirrored storm."""
    case = added_up(blocks, 10)
    here, there = (chicago(case, peak=peak).depth for peak in (fraction, 1 - fraction))
    np.testing.assert_allclose(here, there[::-1], rtol=0, atol=1e-7 * case.total)


@given(st.integers(1, 12), st.integers(1, 12), st.integers(1, 90))
def test_shortest_duration_that_is_needed(before: int, after: int, step: int) -> None:
    """With the peak on a border no duration under step / max(r, 1 - r) is asked for, nor one as long as the storm."""
    n_steps = before + after
    fraction = before / n_steps
    asked: list[float] = []

    def curve(minutes: Array) -> Array:
        asked.extend(minutes.tolist())
        return minutes**0.4

    case = case_of(curve, n_steps * step, step)
    asked.clear()
    chicago(case, peak=fraction)
    # With one step on either side the only border is the peak's, and no depth is asked for.
    assert (asked == []) == (n_steps == 2)
    assert min(asked, default=1e9) >= step / max(fraction, 1 - fraction) - 1e-6
    assert max(asked, default=0) < n_steps * step


def table_from(shortest: float, longest: float = 1e9) -> Curve:
    """Return Denver's curve, which knows no duration outside the two."""

    def curve(minutes: Array) -> Array:
        if minutes.min() < shortest or minutes.max() > longest:
            raise MethodError(
                Problem(item="depths", found=f"{minutes.min():g} min", expected=f"{shortest:g} min or more")
            )
        return denver(minutes)

    return curve


def test_short_durations_that_the_table_has_not() -> None:
    """A peak inside a step needs shorter durations than one on a border; a table without them says what to do."""
    with pytest.raises(
        MethodError,
        match=r'^depths: found 8 min; expected 10 min or more; shape "chicago" needs durations from 8 to 104 min: put '
        r"the peak on the border of two steps, take a longer step, or depths of shorter durations$",
    ):
        chicago(case_of(table_from(10), 120, 10), peak=0.375)
    with pytest.raises(
        MethodError,
        match=r'^depths: found 10 min; expected 15 min or more; shape "chicago" needs durations from 10 to 110 min: '
        r"take a longer step, or depths of shorter durations$",
    ):
        chicago(case_of(table_from(15), 120, 5))
    # On the border of two 15-minute steps the shortest is 15 / 0.625 = 24 min, and none is over 2 h.
    depth = chicago(case_of(table_from(24, 120), 120, 15), peak=0.375).depth
    assert depth.sum() == pytest.approx(denver(np.array([120.0]))[0], rel=1e-12)


def test_rounding_moves_no_peak_off_its_border() -> None:
    """A third of an hour is 20 min, and 0.55 of 100 min are 55, but for rounding: no duration near 0 is asked for."""
    assert 0.55 * 100 > 55
    assert 0.333333333 * 60 < 20
    decimal = chicago(case_of(table_from(9), 100, 5), peak=0.55).depth
    assert decimal[10] == pytest.approx(0.55 * denver(np.array([5 / 0.55]))[0], rel=1e-9)
    third = chicago(case_of(table_from(15), 60, 10), peak=0.333333333).depth
    assert third[1] == pytest.approx(denver(np.array([30.0]))[0] / 3, rel=1e-6)


def test_total_is_that_of_the_case() -> None:
    """Where the curve's end differs from the total in the last digits the total is kept."""
    case = case_of(denver, 120, 10)
    case = replace(case, total=case.total * (1 + 1e-10))
    assert chicago(case).depth.sum() == pytest.approx(case.total, rel=1e-13)


def test_depth_that_falls() -> None:
    """A depth that falls with duration is refused by its durations."""
    case = case_of(through([20, 40, 60], [30, 25, 40]), 60, 10)
    with pytest.raises(
        MethodError,
        match=r'^shape "chicago": found a depth that falls with duration, from 30 mm in 20 min to 25 mm in 40 min; '
        r"expected one that never falls with duration; check the depths and areal reductions of these durations$",
    ):
        chicago(case)


def test_curve_that_is_not_concave() -> None:
    """Where longer durations add more the intensity rises away from the peak on both sides: kept, and told."""
    case = case_of(through([20, 40, 60], [30, 32, 40]), 60, 10)
    shaped = chicago(case)
    np.testing.assert_allclose(shaped.depth, [4, 1, 15, 15, 1, 4], rtol=1e-12)
    told = (
        "The intensity rises away from the peak from 0 to 20 min, 40 to 60 min after the begin, as the depths there "
        "add more in a longer duration than in a shorter one."
    )
    assert shaped.remarks == (told,)


def test_what_is_asked_wrongly() -> None:
    """A peak that is none and a step that does not divide the duration are refused."""
    with pytest.raises(JobError, match=r"peak: found 1; expected early, centre, late, or a fraction"):
        chicago(case_of(denver, 120, 10), peak=1)
    with pytest.raises(MethodError, match=r"step: found 4 h for a duration of 2 h; .* a step of 2 h is$"):
        chicago(case_of(denver, 120, 240))


def test_registered_options() -> None:
    """The pattern's options are those that its function takes."""
    case = case_of(through([10, 20, 30, 40], [20, 28, 32, 34]), 40, 5)
    options = dict(zip(CHICAGO.options, (0.5,), strict=True))
    np.testing.assert_allclose(CHICAGO.shape(case, **options).depth, [1, 2, 4, 10, 10, 4, 2, 1], rtol=1e-12)
    assert CHICAGO.name == "chicago"

"""The triangular pattern against hand arithmetic, the published height, and numerical integration."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pattern_cases import pattern_case
from scipy.integrate import quad

from basinrain.designstorm.patterns.triangular import triangular
from basinrain.errors import JobError, MethodError


def test_halves_of_a_triangle() -> None:
    """A centred triangle over four steps gives 1/8, 3/8, 3/8, 1/8 of 80 mm."""
    np.testing.assert_allclose(triangular(pattern_case(240, 60, total=80)).depth, [10, 30, 30, 10], rtol=1e-14)


def test_a_peak_on_a_step_border_parts_the_total() -> None:
    """With r = 0.25 a quarter of the depth falls in the first quarter, and 5/12, 3/12, 1/12 of it after that."""
    depth = triangular(pattern_case(240, 60, total=96), peak="early").depth
    np.testing.assert_allclose(depth, [24, 40, 24, 8], rtol=1e-14)
    np.testing.assert_allclose(triangular(pattern_case(240, 60, total=96), peak="late").depth, depth[::-1], rtol=1e-13)


def test_a_peak_inside_a_step_counts_on_both_sides() -> None:
    """With r = 0.5 and three steps the middle one holds the peak: 1 - 2 (2/9) = 5/9 of 9 mm."""
    np.testing.assert_allclose(triangular(pattern_case(90, 30, total=9)).depth, [2, 5, 2], rtol=1e-14)


def test_the_height_is_twice_the_mean_intensity() -> None:
    """1.639 in over 2 h at r = 0.375 peak at 2 P / T = 1.639 in/h after 0.75 h (Yen and Chow 1980, from memory)."""
    depth = triangular(pattern_case(120, 1, total=1.639), peak=0.375).depth
    assert int(depth.argmax()) in (44, 45)
    # In the minute beside the peak the intensity falls by at most 1/45 of its height, on average by half of that.
    assert 60 * depth.max() == pytest.approx(1.639, rel=1 / 90)
    assert depth[:45].sum() == pytest.approx(0.375 * 1.639, rel=1e-12)


@given(st.floats(0.01, 0.99), st.integers(1, 12))
def test_steps_hold_the_integral_of_the_intensity(ratio: float, n_steps: int) -> None:
    """Numerical integration (QUADPACK through SciPy) of the triangle itself gives the same steps."""
    total, length = 60.0, float(n_steps)

    def intensity(t: float) -> float:
        top = 2 * total / length
        return top * t / (ratio * length) if t <= ratio * length else top * (length - t) / ((1 - ratio) * length)

    corner = ratio * length
    expected = [quad(intensity, k, k + 1, points=[corner] if k < corner < k + 1 else None)[0] for k in range(n_steps)]
    case = pattern_case(10 * n_steps, 10, total=total)
    np.testing.assert_allclose(triangular(case, peak=ratio).depth, expected, rtol=1e-9, atol=1e-10)


@pytest.mark.parametrize("peak", [5e-324, 1e-300, 1 - 2**-53])
def test_the_peak_may_stand_next_to_an_end(peak: float) -> None:
    """However close to an end the peak stands, the total is kept: 3/4 and 1/4, or the reverse."""
    depth = triangular(pattern_case(60, 30, total=4), peak=peak).depth
    np.testing.assert_allclose(depth, [3, 1] if peak < 0.5 else [1, 3], rtol=1e-12)


def test_what_cannot_be_is_refused() -> None:
    """A peak at the very end and a step that does not divide the duration are errors."""
    with pytest.raises(JobError, match="peak: found 1; expected early, centre, late, or a fraction"):
        triangular(pattern_case(), peak=1)
    with pytest.raises(MethodError, match=re.escape("[design] step: found 7 min for a duration of 6 h")):
        triangular(pattern_case(360, 7))

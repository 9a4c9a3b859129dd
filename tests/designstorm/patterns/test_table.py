"""The user's own pattern."""

from __future__ import annotations

import re

import numpy as np
import pytest
from pattern_cases import pattern_case

from basinrain.designstorm.patterns.ordinates import Ordinates
from basinrain.designstorm.patterns.table import by_table
from basinrain.errors import MethodError

CURVE = Ordinates(np.array([0.0, 0.25, 0.5, 1.0]), np.array([0.0, 0.1, 0.7, 1.0]))


def test_steps_get_what_the_curve_rises_by() -> None:
    """60 mm in 4 h by the curve 0, 0.1, 0.7, 1 at 0, 1, 2, 4 h: 6, 36, 9 and 9 mm."""
    shaped = by_table(pattern_case(240, 60), ordinates=CURVE)
    np.testing.assert_allclose(shaped.depth, [6, 36, 9, 9], rtol=1e-14)
    assert shaped.remarks == ()


def test_a_step_over_several_ordinates_gets_all_of_them() -> None:
    """One step of 4 h gets everything; two of 2 h get 0.7 and 0.3."""
    np.testing.assert_allclose(by_table(pattern_case(240, 240), ordinates=CURVE).depth, [60], rtol=1e-15)
    np.testing.assert_allclose(by_table(pattern_case(240, 120), ordinates=CURVE).depth, [42, 18], rtol=1e-14)


def test_a_step_that_does_not_divide_the_duration_is_refused() -> None:
    """240 min cannot be made of steps of 7."""
    with pytest.raises(MethodError, match=re.escape("[design] step: found 7 min for a duration of 4 h")):
        by_table(pattern_case(240, 7), ordinates=CURVE)

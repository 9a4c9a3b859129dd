"""Increments of a cumulative curve on the step grid."""

from __future__ import annotations

import re

import numpy as np
import pytest
from pattern_cases import pattern_case

from basinrain.designstorm.patterns.cumulative import fall_by, step_problems
from basinrain.errors import MethodError


def test_steps_get_the_integral_whatever_runs_within() -> None:
    """The square of time gives 1/9, 3/9 and 5/9 of 90 mm to three steps."""
    np.testing.assert_allclose(fall_by(np.square, pattern_case(180, 60, total=90)), [10, 30, 50], rtol=1e-14)


def test_a_depth_of_nothing_falls_as_nothing() -> None:
    """A total of 0 gives zeros."""
    assert fall_by(np.square, pattern_case(180, 60, total=0)).tolist() == [0, 0, 0]


def test_bad_steps_are_refused() -> None:
    """A step that does not divide the duration, or is longer, is an error, and can be collected with others."""
    with pytest.raises(MethodError, match=re.escape("[design] step: found 25 min for a duration of 3 h")):
        fall_by(np.square, pattern_case(180, 25))
    assert len(step_problems(pattern_case(180, 200))) == 1
    assert len(step_problems(pattern_case(180, 20))) == 0

"""The uniform pattern."""

from __future__ import annotations

import re

import pytest
from pattern_cases import pattern_case

from basinrain.designstorm.patterns.uniform import uniform
from basinrain.errors import MethodError


def test_every_step_gets_the_same() -> None:
    """60 mm in six steps are 10 mm each; in one step all of it."""
    assert uniform(pattern_case(360, 60)).depth.tolist() == [10] * 6
    assert uniform(pattern_case(360, 360)).depth.tolist() == [60]


def test_a_step_that_does_not_divide_the_duration_is_refused() -> None:
    """One hour cannot be made of steps of 50 minutes."""
    with pytest.raises(MethodError, match=re.escape("[design] step: found 50 min for a duration of 1 h")):
        uniform(pattern_case(60, 50))

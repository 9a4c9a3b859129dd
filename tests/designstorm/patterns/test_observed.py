"""The pattern of an observed storm."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pattern_cases import pattern_case

from basinrain.designstorm.patterns.observed import by_observed, ordinates_of
from basinrain.errors import DataError, MethodError


def test_a_storm_of_another_duration_is_said_to_be_stretched() -> None:
    """Four steps of an hour to two hours and to eight; not where the duration is its own, nor where none is known."""
    storm = np.array([1.0, 5.0, 3.0, 1.0])
    told = [by_observed(pattern_case(m, 30), ordinates=ordinates_of(storm, step=60)).remarks for m in (120, 480, 240)]
    assert told == [
        ("The observed storm of 4 h is shortened to 2 h: equal depths fall in 0.5 times the time that they took.",),
        ("The observed storm of 4 h is stretched to 8 h: equal depths fall in 2 times the time that they took.",),
        (),
    ]
    assert by_observed(pattern_case(120, 30), ordinates=ordinates_of(storm)).remarks == ()


def test_a_storm_keeps_its_shape_at_another_depth_and_length() -> None:
    """1, 5, 3, 1 mm in four steps become 6, 30, 18, 6 mm of 60, whether an hour or ten minutes long each."""
    curve = ordinates_of(np.array([1.0, 5.0, 3.0, 1.0]))
    for case in (pattern_case(240, 60), pattern_case(40, 10)):
        np.testing.assert_allclose(by_observed(case, ordinates=curve).depth, [6, 30, 18, 6], rtol=1e-14)


def test_rain_is_even_within_a_step_of_the_storm() -> None:
    """On steps half as long every depth is halved."""
    depth = by_observed(pattern_case(240, 30), ordinates=ordinates_of(np.array([1.0, 5.0, 3.0, 1.0]))).depth
    np.testing.assert_allclose(depth, [3, 3, 15, 15, 9, 9, 3, 3], rtol=1e-13)


def test_dry_ends_are_kept_and_told_above_a_tenth() -> None:
    """Two dry steps of ten before and one after: the first fifth is told, the last tenth is not; all of it is kept."""
    shaped = by_observed(
        pattern_case(100, 10, total=7), ordinates=ordinates_of(np.array([0.0] * 2 + [1.0] * 7 + [0.0]))
    )
    np.testing.assert_allclose(shaped.depth, [0] * 2 + [1] * 7 + [0], rtol=1e-12)
    assert shaped.remarks == ("The first 20 % of the observed storm are dry; they are kept as part of its pattern.",)


def test_both_ends_may_be_dry() -> None:
    """One wet step of four in the middle: 50 % before it and 25 % after it."""
    shaped = by_observed(pattern_case(), ordinates=ordinates_of(np.array([0.0, 0.0, 2.0, 0.0])))
    assert [remark.split(" of ")[0] for remark in shaped.remarks] == ["The first 50 %", "The last 25 %"]


def test_a_tenth_at_either_end_is_not_told() -> None:
    """One dry step of ten before the rain and one after it are nothing to remark on."""
    storm = np.array([0.0] + [1.0] * 8 + [0.0])
    assert by_observed(pattern_case(), ordinates=ordinates_of(storm)).remarks == ()


def test_dry_steps_inside_are_no_dry_ends() -> None:
    """A pause in the middle of the storm is nothing to remark on."""
    assert by_observed(pattern_case(), ordinates=ordinates_of(np.array([2.0, 0.0, 0.0, 2.0]))).remarks == ()


@given(st.lists(st.floats(0, 100), min_size=1, max_size=60).filter(lambda depths: sum(depths) > 0.1))
def test_at_its_own_length_and_depth_a_storm_comes_back(depths: list[float]) -> None:
    """A storm that falls in as many steps as it was observed in, with its own total, is itself."""
    observed = np.array(depths)
    case = pattern_case(5 * len(observed), 5, total=float(observed.sum()))
    depth = by_observed(case, ordinates=ordinates_of(observed)).depth
    np.testing.assert_allclose(depth, observed, rtol=0, atol=1e-12 * observed.sum())


@pytest.mark.parametrize(
    ("depth", "said"),
    [
        ([1, np.nan], "observed storm, step 2: found no depth; expected a depth of 0 or more; infill it, or choose"),
        ([-0.5, 1], "observed storm, step 1: found -0.5 mm; expected a depth of 0 or more; correct it"),
        ([np.inf], "observed storm, step 1: found inf mm; expected a depth of 0 or more; correct it"),
        ([0, 0, 0], "observed storm: found no rain in its 3 steps; expected a storm with rain; choose another storm"),
        ([], "observed storm: found depths of shape (0,); expected one depth a step"),
        ([[1, 2]], "observed storm: found depths of shape (1, 2); expected one depth a step"),
    ],
)
def test_what_is_no_storm_is_refused(depth: list[float], said: str) -> None:
    """Steps without depth or with an impossible one, and a storm without rain, are named."""
    with pytest.raises(DataError, match="^" + re.escape(said)):
        ordinates_of(np.array(depth, dtype=float))


def test_all_bad_steps_are_named_at_once() -> None:
    """Two missing steps and a negative one are three problems; they are not also called dry."""
    with pytest.raises(DataError, match="step 2: found no depth") as caught:
        ordinates_of(np.array([0.0, np.nan, -1.0, np.nan]))
    assert [problem.item for problem in caught.value.problems] == [f"observed storm, step {k}" for k in (2, 3, 4)]


def test_a_step_that_does_not_divide_the_duration_is_refused() -> None:
    """As for every pattern."""
    with pytest.raises(MethodError, match=re.escape("[design] step: found 7 min for a duration of 6 h")):
        by_observed(pattern_case(360, 7), ordinates=ordinates_of(np.array([1.0])))

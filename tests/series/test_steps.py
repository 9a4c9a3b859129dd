"""Steps of a series."""

from __future__ import annotations

import numpy as np
import pytest
from plain_series import DAY, HOUR, steps

from basinrain.errors import DataError, JobError, MethodError, Problems
from basinrain.series.steps import (
    check_between,
    check_month,
    check_steps,
    constant_step,
    in_words,
    middles,
    steps_in,
    year_starts,
    years_of,
)

STARTS, ENDS = steps(3)


def test_a_series_comes_back_in_seconds_and_floats() -> None:
    """Times in any unit and whole numbers are accepted; values that need no change are not copied."""
    starts, ends, depth = check_steps(STARTS.astype("datetime64[h]"), ENDS, np.array([1, 0, 2]))
    assert (starts == STARTS).all()
    assert [str(array.dtype) for array in (starts, ends, depth)] == ["datetime64[s]", "datetime64[s]", "float64"]
    given = np.array([[1.0], [np.nan], [0.0]])
    assert check_steps(STARTS, ENDS, given)[2] is given


@pytest.mark.parametrize(
    ("starts", "ends", "depth", "text"),
    [
        (STARTS, ENDS, np.zeros((3, 2, 2)), "depth: found 3 dimensions; expected one or two dimensions"),
        (STARTS, ENDS, np.zeros(2), "series: found 3 starts, 3 ends and 2 rows of depth; expected one of each a step"),
        (STARTS[:0], ENDS[:0], np.zeros(0), "series: found no steps; expected one step at least"),
        (np.full(3, np.datetime64("NaT", "s")), ENDS, np.zeros(3), "series: found steps without times"),
        (ENDS, STARTS, np.zeros(3), "expected a start before its end"),
        (STARTS[[0, 2]], ENDS[[0, 2]], np.zeros(2), "2031-05-04T01:00:00, where the step before ends; put missing"),
        (STARTS, ENDS, np.array([0.0, np.nan, -1.0]), "step ending 2031-05-04T03:00:00: found -1.0 mm; expected"),
        (STARTS, ENDS, np.array([np.inf, 0.0, 0.0]), "step ending 2031-05-04T01:00:00: found inf mm; expected"),
    ],
)
def test_what_is_no_series_is_refused(starts: np.ndarray, ends: np.ndarray, depth: np.ndarray, text: str) -> None:
    """Shapes, times and depths that cannot be are told in one line each."""
    with pytest.raises(DataError, match=text):
        check_steps(starts, ends, depth)


def test_all_problems_of_a_series_come_together() -> None:
    """A hole in time and two bad depths are three lines."""
    with pytest.raises(DataError, match="where the step before ends") as caught:
        check_steps(STARTS[[0, 2]], ENDS[[0, 2]], np.array([[-1.0, 0.0], [0.0, np.inf]]))
    assert len(caught.value.problems) == 3


def test_several_basins_are_refused_where_one_is_meant() -> None:
    """A table of basins is no series of one."""
    with pytest.raises(DataError, match="found 2 dimensions; expected one dimension, the series of one basin"):
        check_steps(STARTS, ENDS, np.zeros((3, 1)), basins=False)


def test_a_missing_series_is_a_series() -> None:
    """Steps none of which has a number are accepted."""
    assert np.isnan(check_steps(STARTS, ENDS, np.full(3, np.nan))[2]).all()


def test_one_length_of_steps_or_a_clear_line() -> None:
    """Hours are 3600 s; an hour beside a day is refused with both lengths."""
    assert constant_step(STARTS, ENDS, wanted_for="dry gap") == 3600
    ends = np.array([ENDS[0], ENDS[0] + DAY])
    with pytest.raises(MethodError, match="dry gap: found steps from 1h to 1d; expected steps of one length"):
        constant_step(np.array([STARTS[0], ENDS[0]]), ends, wanted_for="dry gap")


def test_every_length_that_is_no_number_of_steps_is_named() -> None:
    """Of four lengths the two that cannot be are told, in words."""
    problems = Problems()
    assert steps_in([HOUR, 36 * HOUR, HOUR // 4, 0 * HOUR], 3600, item="duration", problems=problems)[:2] == [1, 36]
    with pytest.raises(JobError, match=r"duration 15min: found steps of 1h in the series.*\nduration 0s: found no len"):
        problems.raise_as(JobError)


def test_limits_of_options() -> None:
    """An end of a range is taken where it is closed, and never where it is open; months are 1 to 12."""
    check_between(1.0, 0, 1, item="complete", closed=True)
    check_between(1e9, 0, np.inf, item="wet_depth", closed=False)
    with pytest.raises(JobError, match="complete: found 0; expected a number above 0 and up to 1"):
        check_between(0, 0, 1, item="complete", closed=True)
    with pytest.raises(JobError, match=r"wet_depth: found nan; expected a number above 0$"):
        check_between(float("nan"), 0, np.inf, item="wet_depth", closed=False)
    check_month(12, item="water_year")
    with pytest.raises(JobError, match="water_year: found 0; expected the number of a month, 1 to 12"):
        check_month(0, item="water_year")


@pytest.mark.parametrize(("seconds", "word"), [(1, "1s"), (60, "1min"), (7200, "2h"), (172800, "2d"), (90000, "25h")])
def test_lengths_in_words(seconds: int, word: str) -> None:
    """The largest unit of which a length is a whole number."""
    assert in_words(seconds) == word


@pytest.mark.parametrize("first_month", [1, 4, 10, 12])
def test_years_begin_where_they_are_said_to(first_month: int) -> None:
    """The first moment of a year is in it, the last second before is not, and it ends in the year of its name."""
    years = np.arange(1895, 2105)
    starts = year_starts(years, first_month=first_month)
    assert (years_of(starts, first_month=first_month) == years).all()
    assert (years_of(starts - 1, first_month=first_month) == years - 1).all()
    last = (starts[1:] - 1).astype("datetime64[Y]").astype(int) + 1970
    assert (last == years[:-1]).all()


def test_the_middle_of_a_step_says_where_it_belongs() -> None:
    """A step of an odd number of seconds has its middle rounded down."""
    start = np.array(["2031-05-04T00:00:00"], dtype="datetime64[s]")
    assert middles(start, start + 3)[0] == start[0] + 1

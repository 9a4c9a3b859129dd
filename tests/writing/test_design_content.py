"""What files of design hyetographs hold is checked once."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from small_hyetographs import BASINS, COMMON, RARE, drawn_content, hyetograph, two_steps

from basinrain.designstorm.exceedance import Frequency
from basinrain.errors import DataError, JobError
from basinrain.writing.design_content import column_word, frequency_word


def test_everything_that_disagrees_is_named_together() -> None:
    """Names, areas and positions of another set, a basin not known, another step, a storm twice, other basins."""
    first = hyetograph([[1.0], [2.0]], basins=("west",))
    message = (
        r"^names: found 1; expected 2\nareas: found 3; expected 2\npositions: found 0; expected 2\n"
        r"start: found no time; expected a time, or None\n"
        r"hyetograph bridge, AEP 0.01 \(1 in 100\), 2 h, nrcs-type-ii: found two; expected one of each point, "
        r"frequency, duration and pattern\n"
        r"hyetograph .*chicago: found basins north; expected basins of the content\n"
        r"hyetograph .*chicago: found basins north; expected west as in bridge, .*nrcs-type-ii\n"
        r"hyetograph bridge, .*, 30 min, nested: found a step of 30 min; expected 60 min as the first$"
    )
    with pytest.raises(DataError, match=message):
        two_steps(
            hyetographs=(
                first,
                first,
                replace(first, basins=("north",), pattern="chicago"),
                hyetograph([[1.0]], basins=("west",), step=30, pattern="nested"),
            ),
            names=("one",),
            areas=np.ones(3),
            positions=np.empty((0, 2)),
            start=np.datetime64("NaT"),
        )


def test_there_is_something_to_write() -> None:
    """Files of no hyetograph would look like a storm without rain."""
    with pytest.raises(DataError, match="hyetographs: found none; expected at least one"):
        two_steps(hyetographs=())


def test_units_are_known_ones() -> None:
    """A unit is refused before anything is written."""
    with pytest.raises(JobError, match="depth unit: found 'inch'"):
        two_steps(depth_unit="inch")
    with pytest.raises(JobError, match="area unit: found 'sqm'"):
        two_steps(area_unit="sqm")


def test_depths_and_areas_are_in_the_units_that_are_written() -> None:
    """25.4 mm are an inch; a million m² are a km². Basin after basin."""
    content = two_steps()
    np.testing.assert_array_equal(content.depth(content.hyetographs[0]), [[1.0, 0.5], [2.54 / 25.4, 0.0]])
    assert content.written_areas.tolist() == [1.0, 2.0]


def test_groups_hold_whole_hyetographs() -> None:
    """In order, as many as fit, and at least one: of 18 and 108 values over the bridge, 6 and 36 over the weir."""
    content = drawn_content()
    groups = list(content.groups(130))
    assert [one for group in groups for one in group] == list(content.hyetographs)
    assert [sum(one.depth.size for one in group) for group in groups] == [36, 108, 126, 126, 120, 120, 36]
    assert [len(group) for group in content.groups(1)] == [1] * 16


def test_storms_of_a_point_and_duration_stand_together() -> None:
    """Two points and two durations are four storms, of two frequencies by two patterns each."""
    storms = drawn_content().by_storm()
    assert list(storms) == [("bridge", 60), ("bridge", 360), ("old weir", 60), ("old weir", 360)]
    assert [column_word(one) for one in storms["bridge", 60]] == [
        "aep_0.01_nrcs-type-ii",
        "aep_0.01_late, peak",
        "return_period_2_nrcs-type-ii",
        "return_period_2_late, peak",
    ]
    assert storms["bridge", 60][0].basins == BASINS[::-1]


def test_times_count_from_the_nominal_start() -> None:
    """To the minute, or to the second where the start needs it; without a start there are none."""
    elapsed = np.array([10, 1440])
    assert drawn_content().time_texts(elapsed) == ["2031-05-04T06:10", "2031-05-05T06:00"]
    late = drawn_content(start=np.datetime64("2031-05-04T06:00:30"))
    assert late.time_texts(elapsed) == ["2031-05-04T06:10:30", "2031-05-05T06:00:30"]
    assert np.isnat(drawn_content(start=None).ends(elapsed)).all()


def test_a_partial_duration_series_states_no_probability() -> None:
    """What was not converted is not written as if it were."""
    assert (RARE.written_aep, RARE.written_years, frequency_word(RARE)) == (0.01, 100.0, "aep_0.01")
    assert np.isnan(COMMON.written_aep)
    assert (COMMON.written_years, frequency_word(COMMON)) == (2.0, "return_period_2")


@given(st.integers(1, 999))
def test_a_probability_is_written_as_it_was_given(thousandths: int) -> None:
    """On the way through the return period no digit is lost and none is left behind."""
    assert Frequency.of_aep(thousandths / 1000).written_aep == thousandths / 1000

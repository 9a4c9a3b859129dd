"""What series files hold is checked once, and given out in bounded pieces."""

from __future__ import annotations

import numpy as np
import pytest
from small_series import AREAS, SERIES, drawn, small_content

from basinrain.errors import DataError, JobError, WriteError
from basinrain.writing.series_content import writing


def test_everything_that_disagrees_is_named_together() -> None:
    """Times of another record, a name too few, areas of another set, series with a basin too many."""
    message = (
        r"starts: found 49; expected 50\nnames: found 1; expected 4\nareas: found 3; expected 4\n"
        r"points: found 0; expected 4\nseries reweight thiessen: found 5; expected 4\nseries infill-then-reweight idw"
    )
    with pytest.raises(DataError, match=message):
        small_content(
            source=drawn(50, 5),
            starts=small_content().starts[1:],
            names=("one",),
            areas=AREAS[1:],
            points=np.empty((0, 2)),
        )


def test_units_are_known_ones() -> None:
    """A unit is refused before anything is written."""
    with pytest.raises(JobError, match="depth unit: found 'inch'"):
        small_content(depth_unit="inch")
    with pytest.raises(JobError, match="area unit: found 'sqm'"):
        small_content(area_unit="sqm")


def test_blocks_cover_all_steps_and_no_more_is_held() -> None:
    """Of 4 basins 50 values are 12 steps; the last block is what is left; one step is the least."""
    content = small_content()
    assert [(steps.start, steps.stop) for steps in content.blocks(50)][-2:] == [(36, 48), (48, 50)]
    assert len(list(content.blocks(3))) == 50
    assert [steps.stop for steps in content.blocks(50, width=1)] == [50]


def test_a_block_is_in_the_unit_that_is_written() -> None:
    """25.4 mm are an inch; areas in km² are those in m² over a million."""
    content = small_content(depth_unit="in", area_unit="km2")
    block = content.block(*SERIES[0], slice(2, 5), slice(1, 3))
    np.testing.assert_array_equal(block.depth, content.source.depth(*SERIES[0])[slice(2, 5), slice(1, 3)] / 25.4)
    assert (block.observed_share.shape, block.flags.shape) == ((3, 2), (3, 2))
    assert content.written_areas.tolist() == [1.5, 2.25, 0.4, 4.15]


def test_times_say_their_clock_where_it_is_known() -> None:
    """To the minute, to the second where one is needed, with the offset, Z for UTC, nothing for a clock not known."""
    content = small_content()
    assert content.time_texts(slice(0, 2)) == ["2031-05-04T01:00+02:00", "2031-05-04T02:00+02:00"]
    assert small_content(zone="+00:00").time_texts(slice(0, 1)) == ["2031-05-04T01:00Z"]
    assert small_content(zone="").time_texts(slice(0, 1)) == ["2031-05-04T01:00"]
    late = small_content(ends=content.ends + np.timedelta64(30, "s"))
    assert late.time_texts(slice(0, 1)) == ["2031-05-04T01:00:30+02:00"]


def test_what_stops_a_file_is_one_line() -> None:
    """A library that says nothing but its own words is quoted; what is no fault of writing passes."""

    def fail(error: Exception) -> None:
        with writing("series.nc", faults=(OSError, RuntimeError)):
            raise error

    with pytest.raises(WriteError, match=r"^series.nc: cannot be written: found netCDF: HDF error; .* room"):
        fail(RuntimeError("NetCDF: HDF error"))
    with pytest.raises(KeyError, match="other"):
        fail(KeyError("other"))

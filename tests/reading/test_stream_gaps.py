"""Long gaps of a record that is read in parts are those of the whole."""

from __future__ import annotations

import pickle
import tempfile
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from streamfiles import hours, network_of, write

from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step
from basinrain.reading.stream import open_stream
from basinrain.reading.stream_gaps import long_gaps


@st.composite
def gappy(draw: st.DrawFn) -> tuple[np.ndarray[Any, Any], list[int], int]:
    """Draw depths of ten gauges with long runs of NaN, borders, and a limit in steps."""
    n = draw(st.integers(1, 30))
    depth = np.ones((n, 10))
    for _ in range(draw(st.integers(0, 12))):
        first, gauge = draw(st.integers(0, n - 1)), draw(st.integers(0, 9))
        depth[first : first + draw(st.integers(1, n)), gauge] = np.nan
    inner = draw(st.lists(st.integers(1, n), max_size=6, unique=True))
    return depth, sorted({0, *inner, n}), draw(st.integers(1, 8))


@settings(max_examples=60)
@given(case=gappy())
def test_equal_to_the_whole(case: tuple[np.ndarray[Any, Any], list[int], int]) -> None:
    """Whatever the borders, a gap is long where it is in the whole record, those out of service excepted."""
    depth, borders, limit = case
    gauges = [f"G{k}" for k in range(10)]
    closed = np.array(["NaT"] * 9 + ["2031-05-04T03:00"], dtype="datetime64[s]")
    network = network_of(*gauges, closed=closed)
    with tempfile.TemporaryDirectory() as folder:
        source = write(Path(folder), "NetCDF", hours(len(depth)), gauges, depth)
        record, notes = bring_to_step([read_rainfall(**source)], network)
        found = long_gaps(open_stream([source], network), limit / 24, borders)
    expected = longer_than(record, gap_mask(record), limit / 24)
    np.testing.assert_array_equal(found.mask(0, len(record)), expected)
    assert found.notes == notes
    assert found.never == tuple(gauge for g, gauge in enumerate(gauges) if not record.reporting[:, g].any())
    for first, stop in pairwise(borders):
        part = pickle.loads(pickle.dumps(found.part(first, stop)))  # noqa: S301 - just written
        assert len(part.packed) == stop - first
        np.testing.assert_array_equal(part.mask(first, stop), expected[first:stop])


def test_what_is_done_to_the_parts_counts(tmp_path: Path) -> None:
    """Values that are rejected while parts are read are gaps, and a gauge of none but these never reports."""
    source = write(tmp_path, "wide text", hours(5), "AB", np.ones((5, 2)))
    stream = open_stream([source], network_of("A", "B"))
    assert long_gaps(stream, 1 / 24, [0, 5]).never == ()
    found = long_gaps(stream.changed_by(_without_a), 1 / 24, [0, 2, 5])
    assert found.never == ("A",)
    assert found.mask(0, 5).tolist() == [[True, False]] * 5


def _without_a(record: RainRecord) -> RainRecord:
    depth, status = record.depth.copy(), record.status.copy()
    depth[:, 0], status[:, 0] = np.nan, Status.REJECTED
    return replace(record, depth=depth, status=status)


@pytest.mark.parametrize(("days", "long"), [(3 / 24, False), (2.99 / 24, True)])
def test_a_gap_of_just_the_limit(tmp_path: Path, days: float, long: bool) -> None:  # noqa: FBT001 - a row of the table
    """Three hours over two borders are longer than a shorter limit, and not longer than three hours."""
    depth = np.ones((5, 1))
    depth[1:4] = np.nan
    stream = open_stream([write(tmp_path, "wide text", hours(5), "A", depth)], network_of("A"))
    assert long_gaps(stream, days, [0, 2, 3, 5]).mask(0, 5).ravel().tolist() == [False, *[long] * 3, False]

"""A record is cut on whole rainfall days, and its chunks are the record."""

from __future__ import annotations

import pickle

import numpy as np
import pytest
from chunked import small_record
from hypothesis import given
from hypothesis import strategies as st

from basinrain.rainfall import KnownTotal, RainRecord
from basinrain.series.chunks import RecordSource, chunk_borders, chunk_steps_within


@given(
    n_steps=st.integers(0, 500),
    steps_per_day=st.sampled_from([1, 2, 24, 96]),
    chunk_steps=st.integers(1, 300),
    head=st.integers(0, 95),
)
def test_borders_lie_on_days_and_chunks_are_within_bounds(
    n_steps: int, steps_per_day: int, chunk_steps: int, head: int
) -> None:
    """Borders rise from 0 to the end and lie whole days behind the first; no chunk exceeds its size but for a day."""
    head %= steps_per_day
    borders = chunk_borders(n_steps, steps_per_day=steps_per_day, chunk_steps=chunk_steps, head=head)
    lengths = np.diff(borders)
    assert (borders.dtype, int(borders[0]), int(borders[-1])) == (np.dtype(np.int64), 0, n_steps)
    assert (lengths > 0).all()
    assert ((borders[1:-1] - head) % steps_per_day == 0).all()
    assert lengths.max(initial=0) <= max(chunk_steps, steps_per_day)
    # As large as whole days allow: two neighbours would not fit into one, but for the broken days at both ends.
    if len(lengths) > 3:
        assert lengths[1] + steps_per_day > chunk_steps
        assert (lengths[1:-1] == lengths[1]).all()


def test_a_broken_first_day_counts_as_a_day() -> None:
    """Seven hours, then days, in chunks of two days: the first chunk has one whole day with the hours."""
    borders = chunk_borders(7 + 5 * 24, steps_per_day=24, chunk_steps=48, head=7)
    assert borders.tolist() == [0, 31, 79, 127]


@pytest.mark.parametrize(
    ("n_steps", "steps_per_day", "chunk_steps", "head"),
    [(-1, 24, 24, 0), (9, 0, 24, 0), (9, 24, 0, 0), (9, 24, 24, -1)],
)
def test_what_makes_no_chunks_is_refused(n_steps: int, steps_per_day: int, chunk_steps: int, head: int) -> None:
    """Numbers below their least are said, all in one line."""
    with pytest.raises(ValueError, match=rf"{n_steps} steps, {head} at the head.*make no chunks"):
        chunk_borders(n_steps, steps_per_day=steps_per_day, chunk_steps=chunk_steps, head=head)


@given(chunk_days=st.integers(1, 15), with_long=st.booleans())
def test_chunks_together_are_the_record(chunk_days: int, with_long: bool) -> None:  # noqa: FBT001 - drawn
    """Whatever the borders, chunks joined again have the record's times, depths, statuses and long gaps."""
    record = small_record()
    long = np.isnan(record.depth) if with_long else None
    source = RecordSource(record, long, chunk_borders(len(record), steps_per_day=24, chunk_steps=24 * chunk_days))
    chunks = [source.task(k)() for k in range(len(source.borders) - 1)]
    assert source.n_steps == len(record)
    for name in ("starts", "ends", "depth", "status"):
        joined = np.concatenate([getattr(part, name) for part, _ in chunks])
        assert joined.tobytes() == getattr(record, name).tobytes()
    if long is None:
        assert all(part is None for _, part in chunks)
    else:
        assert np.concatenate([part for _, part in chunks if part is not None]).tobytes() == long.tobytes()
    assert {(part.step, part.recorders, part.gauges) for part, _ in chunks} == {
        (record.step, record.recorders, record.gauges)
    }


def test_a_chunk_is_as_a_window_of_the_record() -> None:
    """A chunk passes all checks that a record passes, though they are not made again."""
    source = RecordSource(small_record(), None, np.array([0, 24, 48, 288]))
    part, _ = source.task(1)()
    made = RainRecord(
        part.gauges, part.starts, part.ends, part.depth, part.status, step=part.step, recorders=part.recorders
    )
    assert made.depth.tobytes() == small_record().window(24, 48).depth.tobytes()


def test_a_chunk_has_the_totals_that_reach_into_it() -> None:
    """Of four totals the second day has the one within it, the one that ends and the one that begins in it."""
    record = small_record()
    hours = [(0, 24), (20, 30), (25, 26), (40, 60), (48, 72)]
    totals = tuple(KnownTotal("G00", record.starts[first], record.ends[stop - 1], 1.0) for first, stop in hours)
    known = RainRecord(record.gauges, record.starts, record.ends, record.depth, record.status, step="1h", totals=totals)
    source = RecordSource(known, None, np.array([0, 24, 48, 288]))
    assert source.task(1)()[0].totals == totals[1:4]
    assert [len(source.task(k)()[0].totals) for k in (0, 2)] == [2, 2]


def test_rows_are_step_by_step_in_memory_whatever_the_record() -> None:
    """A record kept gauge by gauge gives chunks in the order in which they arrive elsewhere; another is not copied."""
    record = small_record()
    by_gauge = RainRecord(
        record.gauges, record.starts, record.ends, np.asfortranarray(record.depth), record.status, step="1h"
    )
    borders = np.array([0, 24, 288])
    here, _ = RecordSource(by_gauge, None, borders).task(1)()
    there, _ = pickle.loads(pickle.dumps(RecordSource(by_gauge, None, borders).task(1)))()  # noqa: S301 - made here
    assert here.depth.flags.c_contiguous
    assert here.depth.strides == there.depth.strides
    assert here.depth.tobytes() == there.depth.tobytes()
    assert np.shares_memory(RecordSource(record, None, borders).task(1)()[0].depth, record.depth)


def test_storm_totals_without_times_keep_all_totals() -> None:
    """Where there are no times nothing can be said of what reaches into a chunk."""
    none = np.full(2, "NaT", dtype="datetime64[s]")
    total = KnownTotal("A", np.datetime64("2031-05-04", "s"), np.datetime64("2031-05-05", "s"), 1.0)
    record = RainRecord(("A",), none, none, np.ones((2, 1)), np.zeros((2, 1), np.uint8), step="storm", totals=(total,))
    assert RecordSource(record, None, np.array([0, 1, 2])).task(0)()[0].totals == (total,)


def test_more_of_anything_leaves_room_for_fewer_steps() -> None:
    """The bound falls with gauges, basins and series, rises with memory, and is never below one step."""
    base = chunk_steps_within(2 << 30, 300, 200, 3)
    assert chunk_steps_within(2 << 30, 600, 200, 3) < base
    assert chunk_steps_within(2 << 30, 300, 400, 3) < base
    assert chunk_steps_within(2 << 30, 300, 200, 6) < base
    assert chunk_steps_within(4 << 30, 300, 200, 3) > 2 * base
    assert chunk_steps_within(0, 300, 200, 3) == 1

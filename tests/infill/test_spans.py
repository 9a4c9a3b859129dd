"""Spans of time."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from basinrain.infill.spans import month_of, span_starts
from basinrain.rainfall import RainRecord


def record(start: str, hours: int, n: int, *, day_phase: int = 0) -> RainRecord:
    step = np.timedelta64(3600 * hours, "s")
    ends = np.datetime64(start, "s") + np.arange(1, n + 1) * step
    made = RainRecord.from_depths(("A",), ends - step, ends, np.zeros((n, 1)), step=f"{hours}h")
    return replace(made, day_phase=day_phase)


def test_days_are_clipped_to_the_window() -> None:
    """From 22:00 on, 30 hours: two hours of the first day, 24 of the second, four of the third."""
    assert span_starts(record("2031-05-04T22", 1, 30), "day").tolist() == [0, 2, 26]


def test_the_rainfall_day_begins_at_its_phase() -> None:
    """A day that begins at 08:00 puts the first ten hours from 22:00 into one span."""
    assert span_starts(record("2031-05-04T22", 1, 30, day_phase=8 * 3600), "day").tolist() == [0, 10]


def test_daily_values_of_any_reading_hour_are_a_day_each() -> None:
    """Days from 08:00 to 08:00 in a record whose own day begins at midnight."""
    assert span_starts(record("2031-05-04T08", 24, 3), "day").tolist() == [0, 1, 2]


def test_a_storm_is_the_window() -> None:
    """However long."""
    assert span_starts(record("2031-05-04T22", 1, 30), "storm").tolist() == [0]


def test_totals_without_times_are_a_span_each() -> None:
    """At every scale."""
    nat = np.full(3, "NaT", dtype="datetime64[s]")
    totals = RainRecord.from_depths(("A",), nat, nat, np.zeros((3, 1)), step="storm")
    assert [span_starts(totals, scale).tolist() for scale in ("step", "day", "storm")] == [[0, 1, 2]] * 3


def test_an_empty_window_has_no_spans() -> None:
    """At every scale."""
    assert [len(span_starts(record("2031-05-04", 1, 0), scale)) for scale in ("step", "day", "storm")] == [0, 0, 0]


def test_the_month_is_that_of_the_middle() -> None:
    """A December total ends on 1 January, and a storm over New Year belongs where most of it lies."""
    starts = np.array(["2031-12-01", "2031-12-31T20", "NaT"], dtype="datetime64[s]")
    ends = np.array(["2032-01-01", "2032-01-01T10", "NaT"], dtype="datetime64[s]")
    assert month_of(starts, ends).tolist() == [12, 1, 0]

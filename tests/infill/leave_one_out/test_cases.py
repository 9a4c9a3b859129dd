"""Which days and steps are compared."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from leave_one_out_data import Floats, daily_record, small_network

from basinrain.infill.days import Days, day_totals
from basinrain.infill.leave_one_out import cases as module
from basinrain.infill.leave_one_out.cases import Cases, cases_of, steps_of_cases
from basinrain.rainfall import RainRecord, Status

NAN = np.nan


def hourly(depth: Floats, *, first: str = "2031-05-04T00", hours: int = 1) -> RainRecord:
    step = np.timedelta64(hours * 3600, "s")
    ends = np.datetime64(first, "s") + np.arange(1, len(depth) + 1) * step
    return RainRecord.from_depths(tuple("ABC"[: depth.shape[1]]), ends - step, ends, depth, step=f"{hours}h")


def both(record: RainRecord) -> tuple[Cases, bool, Days]:
    days = day_totals(record)
    return *cases_of(record, days), days


def test_wet_days_by_the_mean_of_the_gauges_that_know_theirs() -> None:
    """Means of 1.0, 0.99 and, of the two that report, 1.5 mm; and a day that nobody knows."""
    network = small_network(3)
    record = daily_record(network, np.array([[3.0, 0, 0], [2.97, 0, 0], [3.0, NAN, 0], [NAN, NAN, NAN]]))
    cases, finer, _ = both(record)
    assert not finer
    assert cases.scale == "day"
    assert cases.ends.astype(str).tolist() == ["2021-01-02T00:00:00", "2021-01-04T00:00:00"]
    assert np.array_equal(cases.depth(slice(None)), [[3.0, 0, 0], [3.0, NAN, 0]], equal_nan=True)


def test_hours_are_summed_to_rainfall_days_of_which_all_is_known() -> None:
    """24 hours of 0.5 mm are 12 mm; a gauge that misses one hour has no total; its other hours are scored as steps."""
    depth = np.full((30, 2), 0.5)
    depth[5, 1] = NAN
    record = hourly(depth)
    cases, finer, days = both(record)
    assert finer
    assert np.array_equal(cases.depth(slice(None)), [[12.0, NAN]], equal_nan=True)
    steps = steps_of_cases(record, days, cases)
    assert steps.scale == "step"
    assert len(steps) == 24  # the six hours of the next day, which is not whole, are left out
    assert np.array_equal(steps.depth(slice(None)), depth[:24], equal_nan=True)
    assert np.array_equal(steps.ends, record.ends[:24])


def test_a_rainfall_day_that_begins_in_the_morning() -> None:
    """With the day from 9 to 9, 15 hours before and after are of days that are not whole."""
    depth = np.zeros((54, 2))
    depth[9:33] = 0.1
    record = replace(hourly(depth), day_phase=9 * 3600)
    cases, _, days = both(record)
    assert cases.ends.astype(str).tolist() == ["2031-05-05T09:00:00"]
    np.testing.assert_allclose(cases.depth(slice(None)), [[2.4, 2.4]])
    assert len(steps_of_cases(record, days, cases)) == 24


def test_values_that_are_not_measured_at_the_step() -> None:
    """A spread value counts in a day's total, not at its step; an infilled one in neither."""
    record = hourly(np.full((24, 3), 1.0))
    status = record.status.copy()
    status[3, 0] = Status.SPREAD
    status[4, 1] = Status.INFILLED
    record = replace(record, status=status)
    cases, _, days = both(record)
    assert np.array_equal(cases.depth(slice(None)), [[24.0, NAN, 24.0]], equal_nan=True)
    at_steps = steps_of_cases(record, days, cases).depth(slice(None))
    assert np.isnan(at_steps).sum() == 2
    assert np.isnan(at_steps[3, 0])
    assert np.isnan(at_steps[4, 1])


def test_a_spread_day_is_no_case_of_a_daily_record() -> None:
    """At its own step a record's donors are what was measured at that step."""
    record = daily_record(small_network(2), np.full((2, 2), 5.0))
    status = record.status.copy()
    status[0, 0] = Status.SPREAD
    cases, _, _ = both(replace(record, status=status))
    assert np.array_equal(cases.depth(slice(None)), [[NAN, 5.0], [5.0, 5.0]], equal_nan=True)


def test_months() -> None:
    """Steps of a month are cases wherever anything fell, of no week; the month is its middle's."""
    ends = np.array(["2031-02-01", "2031-03-01", "2031-04-01"], dtype="datetime64[s]")
    starts = np.array(["2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    record = RainRecord.from_depths(("A", "B"), starts, ends, [[0.0, 0.0], [0.4, 0.0], [60.0, 80.0]], step="1mo")
    cases, finer, _ = both(record)
    assert (cases.scale, finer) == ("step", False)
    assert cases.months.tolist() == [2, 3]
    assert cases.week is None
    assert cases.noun == "step"


def test_totals_without_times() -> None:
    """Storm totals have no month and stand alone."""
    record = RainRecord(
        ("A", "B"),
        np.full(3, "NaT", dtype="datetime64[s]"),
        np.full(3, "NaT", dtype="datetime64[s]"),
        np.array([[40.0, 50.0], [0.0, 0.0], [9.0, 7.0]]),
        np.array([[0, 0], [1, 1], [0, 0]], dtype=np.uint8),
        step="storm",
        labels=("Quill", "Reed", "Sedge"),
    )
    cases, finer, _ = both(record)
    assert (cases.scale, finer, len(cases)) == ("step", False, 2)
    assert cases.months.tolist() == [0, 0]


def test_weeks_and_parts() -> None:
    """Days 1 to 7 are a week, whether wet or not; parts are fifths of all days."""
    depth = np.full((20, 2), 4.0)
    depth[[2, 8, 9]] = 0.0
    cases, _, _ = both(daily_record(small_network(2), depth))
    days = np.setdiff1d(np.arange(20), [2, 8, 9])
    assert cases.week is not None
    assert np.array_equal(cases.week, days // 7)
    assert np.array_equal(cases.part, days // 4)


def test_chunks_are_all_cases(monkeypatch: object) -> None:
    """Put together they are the cases, in order."""
    cases, _, _ = both(daily_record(small_network(3), np.full((11, 3), 4.0)))
    cut = Cases(**{**vars(cases), "n_gauges": module._CHUNK // 4})
    assert [chunk.stop - chunk.start for chunk in cut.chunks()] == [4, 4, 3]


def test_no_day_at_all() -> None:
    """A record without steps, and one of a few hours, have no case."""
    empty = RainRecord.from_depths(
        ("A", "B"), np.empty(0, "datetime64[s]"), np.empty(0, "datetime64[s]"), np.empty((0, 2)), step="1h"
    )
    assert len(both(empty)[0]) == 0
    assert len(both(hourly(np.full((5, 2), 3.0)))[0]) == 0

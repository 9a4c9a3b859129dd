"""Rainfall days of a record."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from windows import hourly, with_status

from basinrain.infill import day_totals
from basinrain.rainfall import KnownTotal, RainRecord, Status

NAN = float("nan")


def test_whole_days_only() -> None:
    """From 20:00 on, 30 hours: four of the first day and two of the third are left out; 24 mm fell on the second."""
    record = hourly([1.0] * 30, start="2031-04-30T20")
    days = day_totals(record)
    assert (days.totals.tolist(), days.months.tolist()) == ([[24.0]], [5])
    assert days.starts.tolist() == [np.datetime64("2031-05-01T00:00:00").item()]
    assert days.ends.tolist() == [np.datetime64("2031-05-02T00:00:00").item()]


def test_the_day_begins_at_its_phase() -> None:
    """Days from 08:00 to 08:00: the record from 08:00 on has two whole ones."""
    depths = [float(h) for h in range(48)]
    days = day_totals(hourly(depths, start="2031-05-04T08", day_phase=8 * 3600))
    assert days.totals.tolist() == [[sum(range(24))], [sum(range(24, 48))]]


def test_a_gauge_needs_every_step() -> None:
    """B misses an hour of the first day, C one of the second; zero is a value."""
    b, c = [1.0] * 48, [0.0] * 48
    b[3] = c[30] = NAN
    totals = day_totals(hourly([2.0] * 48, b, c)).totals
    assert np.array_equal(totals, [[48, NAN, 0], [48, 24, NAN]], equal_nan=True)


def test_only_own_values_count() -> None:
    """An infilled or rejected hour spoils the day; traces and spread daily readings are the gauge's own."""
    record = hourly([1.0] * 24, [1.0] * 24, [0.0] * 24)
    record = with_status(record, "A", slice(5, 6), Status.INFILLED)
    record = with_status(record, "B", slice(None), Status.SPREAD)
    record = with_status(record, "C", slice(0, 2), Status.TRACE)
    assert np.array_equal(day_totals(record).totals, [[NAN, 24, 0]], equal_nan=True)


def test_a_day_is_not_known_from_part_of_a_longer_total() -> None:
    """B's two days were read at once and spread: neither day is known, nor is C's whose reading began at 06:00."""
    record = hourly([1.0] * 48, [1.0] * 48, [1.0] * 48)
    for gauge in "BC":
        record = with_status(record, gauge, slice(None), Status.SPREAD)
    start, day = record.starts[0], np.timedelta64(86400, "s")
    shift = np.timedelta64(6, "h")
    totals = (
        KnownTotal("B", start, start + 2 * day, 48.0),
        KnownTotal("C", start + shift - day, start + shift, 24.0),
        KnownTotal("C", start + shift, start + shift + day, 24.0),
        KnownTotal("Z", start, start + 2 * day, 1.0),
    )
    found = day_totals(replace(record, totals=totals)).totals
    assert np.array_equal(found, [[24, NAN, NAN], [24, NAN, NAN]], equal_nan=True)


def test_a_daily_reading_of_the_very_day_is_known() -> None:
    """Spread over the day's hours, its total is what was read."""
    record = with_status(hourly([1.0] * 24), "A", slice(None), Status.SPREAD)
    total = KnownTotal("A", record.starts[0], record.ends[-1], 24.0)
    assert day_totals(replace(record, totals=(total,))).totals.tolist() == [[24.0]]


def test_steps_of_a_day_or_longer_are_the_days() -> None:
    """Daily and monthly steps stay as they are; so do totals without times, which have no month."""
    daily = hourly([1.0, NAN, 3.0], hours=24, start="2031-05-04T08")
    assert np.array_equal(day_totals(daily).totals.ravel(), [1, NAN, 3], equal_nan=True)
    assert (day_totals(daily).ends == daily.ends).all()
    ends = np.array(["2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    starts = np.array(["2031-01-01", "2031-02-01"], dtype="datetime64[s]")
    monthly = RainRecord.from_depths(("A",), starts, ends, [[50.0], [60.0]], step="1mo")
    assert day_totals(monthly).months.tolist() == [1, 2]
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    undated = day_totals(RainRecord.from_depths(("A",), nat, nat, [[50.0], [60.0]], step="storm"))
    assert (undated.months.tolist(), undated.totals.ravel().tolist()) == ([0, 0], [50, 60])


def test_absent_times_make_no_whole_day() -> None:
    """A record without the hour from 05:00 to 06:00 has 23 hours of that day."""
    record = hourly([1.0] * 48)
    keep = np.arange(48) != 5
    holed = RainRecord.from_depths(("A",), record.starts[keep], record.ends[keep], record.depth[keep], step="1h")
    assert day_totals(holed).totals.tolist() == [[24.0]]
    assert day_totals(holed).starts.astype("datetime64[D]").astype(str).tolist() == ["2031-05-05"]


def test_an_empty_record() -> None:
    """No days, and still a column a gauge."""
    assert day_totals(hourly([], [])).totals.shape == (0, 2)

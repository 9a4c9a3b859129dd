"""Normals from the record."""

from __future__ import annotations

import numpy as np
import pytest
from related import line

from basinrain.errors import DataError
from basinrain.infill import InfillOptions, complete, normals_from_record
from basinrain.infill.record_normals import NormalRatios
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def monthly(years: int, *columns: np.ndarray) -> RainRecord:
    """Return a record by months from January 2001, (years * 12) values a gauge."""
    months = np.datetime64("2001-01", "M") + np.arange(years * 12 + 1)
    bounds = months.astype("datetime64[s]")
    return RainRecord.from_depths(
        tuple("XABCDE"[: len(columns)]), bounds[:-1], bounds[1:], np.column_stack(columns), step="1mo"
    )


def test_common_years_only() -> None:
    """X has years 1 to 15, A 6 to 20 at double its rain; rain grew by 1 mm a year, which common years cancel."""
    rain = np.repeat(np.arange(10.0, 30.0), 12)
    x, a = rain.copy(), 2 * rain
    x[15 * 12 :] = a[: 5 * 12] = NAN
    ratios, notes = normals_from_record(monthly(20, x, a), line(2))
    assert (ratios.years[:, 0, 1] == 10).all()
    assert ratios.of(line(2), 0, 3) == pytest.approx([1, 0.5])
    assert ratios.of(line(2), 1, 3) == pytest.approx([2, 1])
    # Means of all years of each would give 17 over 44 instead.
    assert np.nanmean(x) / np.nanmean(a) == pytest.approx(17 / 44)
    assert [note.code for note in notes] == ["normals-from-short-record"]
    assert notes[0].text == (
        "Normals are means of the record, in which no gauge has more than 15 years of every month; standard normals "
        "are means of 30 years."
    )


def test_ten_common_years() -> None:
    """A misses the Junes of one year more than B: with X A has 9 of them and no ratio, B has 10."""
    x = np.full(240, 40.0)
    a, b = x * 2, x / 2
    a.reshape(20, 12)[:11, 5] = NAN
    b.reshape(20, 12)[:10, 5] = NAN
    ratios, notes = normals_from_record(monthly(20, x, a, b), line(3))
    assert np.array_equal(ratios.of(line(3), 0, 6), [1, NAN, 2], equal_nan=True)
    assert ratios.of(line(3), 0, 7).tolist() == [1, 0.5, 2]
    assert [note.code for note in notes] == ["normals-from-short-record", "few-common-years"]
    assert notes[1].text == (
        "Gauges with fewer than 10 common years of a month do not donate to each other in it by a method that needs "
        "normals: A and B (Jun); A and X (Jun)."
    )


def test_many_pairs_are_counted() -> None:
    """Five gauges with nine years: ten pairs, three of which are named."""
    _, notes = normals_from_record(monthly(9, *np.full((5, 108), 40.0)), line(5))
    assert notes[1].text.endswith(
        "A and B (every month); A and C (every month); A and D (every month); and 7 more pairs."
    )


def test_thirty_years_need_no_remark() -> None:
    """A standard normal's length."""
    _, notes = normals_from_record(monthly(30, *np.full((2, 360), 40.0)), line(2))
    assert notes == ()


def test_a_month_that_is_always_dry_has_no_ratio() -> None:
    """X never has rain in July: neither as target nor as donor."""
    x, a = np.full(240, 40.0), np.full(240, 20.0)
    x.reshape(20, 12)[:, 6] = 0
    ratios, _ = normals_from_record(monthly(20, x, a), line(2))
    assert np.isnan(ratios.of(line(2), 0, 7)).all()
    assert np.isnan(ratios.of(line(2), 1, 7)[0])
    assert ratios.of(line(2), 0, 8).tolist() == [1, 2]


def daily(start: str, days: int, depth: float, *, hour: int = 0) -> RainRecord:
    ends = np.datetime64(f"{start}T{hour:02d}", "s") + np.arange(1, days + 1) * np.timedelta64(86400, "s")
    return RainRecord.from_depths(
        ("X", "A"), ends - np.timedelta64(86400, "s"), ends, np.full((days, 2), depth), step="1d"
    )


@pytest.mark.parametrize("hour", [0, 8])
def test_months_of_days(hour: int) -> None:
    """From 15 January 2001 over 11 years: 31 mm every whole January, which is ten, 28.2 on average in February."""
    record = daily("2001-01-15", 365 * 11, 1.0, hour=hour)
    ratios, _ = normals_from_record(record, line(2))
    assert ratios.years[:, 0, 0].tolist() == [10] + [11] * 11
    assert ratios.means[0, 0, 1] == pytest.approx(31)
    assert ratios.means[1, 0, 1] == pytest.approx((28 * 11 + 2) / 11)


@pytest.mark.parametrize("days", [2, 7, 10])
def test_steps_that_divide_no_month_are_refused(days: int) -> None:
    """Four weeks are no month but in February, and steps of two days only where the month has an even number."""
    step = np.timedelta64(days, "D")
    ends = np.datetime64("2001-01-01", "s") + np.arange(1, 15 * 365 // days) * step
    record = RainRecord.from_depths(("X", "A"), ends - step, ends, np.ones((len(ends), 2)), step=f"{days}d")
    with pytest.raises(
        DataError, match=f"found steps of {days}d; expected steps of a day at most, or of calendar months: normals are"
    ):
        normals_from_record(record, line(2))


@pytest.mark.parametrize(("begin", "refused"), [("01T08", False), ("15T00", True)])
def test_months_may_begin_at_the_hour_of_the_reading_and_no_later(begin: str, *, refused: bool) -> None:
    """Months from 08:00 on the first are months; from the 15th to the 15th are not."""
    months = [f"{2001 + k // 12}-{k % 12 + 1:02d}-{begin}" for k in range(241)]
    bounds = np.array(months, dtype="datetime64[s]")
    record = RainRecord.from_depths(("X", "A"), bounds[:-1], bounds[1:], np.full((240, 2), 40.0), step="1mo")
    if refused:
        with pytest.raises(DataError, match="found steps of 1mo; expected steps of a day at most, or of calendar"):
            normals_from_record(record, line(2))
    else:
        assert (normals_from_record(record, line(2))[0].years == 20).all()


def test_hours_and_their_days_have_the_same_months() -> None:
    """A month of hours is the sum of its days, and counts where all of them are there."""
    rng = np.random.default_rng(2)
    depth = rng.gamma(0.1, 5.0, (365 * 10 + 60, 1)) * np.ones(2)
    days = daily("2001-01-01", len(depth), 0.0)
    ends = days.starts[0] + np.arange(1, 4 * len(depth) + 1) * np.timedelta64(6, "h")
    quarters = RainRecord.from_depths(
        ("X", "A"), ends - np.timedelta64(6, "h"), ends, np.repeat(depth / 4, 4, axis=0), step="6h"
    )
    one, other = (
        normals_from_record(record, line(2))[0]
        for record in (RainRecord.from_depths(("X", "A"), days.starts, days.ends, depth, step="1d"), quarters)
    )
    assert np.array_equal(one.years, other.years)
    np.testing.assert_allclose(one.means, other.means, rtol=1e-12)


def test_a_month_counts_only_whole() -> None:
    """One missing day takes X's January of that year; A keeps it."""
    record = daily("2001-01-01", 365 * 11 + 2, 1.0)
    depth = record.depth.copy()
    depth[12, 0] = NAN
    holed = RainRecord.from_depths(record.gauges, record.starts, record.ends, depth, step="1d")
    ratios, _ = normals_from_record(holed, line(2))
    assert ratios.years[0].tolist() == [[10, 10], [10, 11]]


def test_infilled_months_do_not_count() -> None:
    """Only the gauge's own values make a normal."""
    record = daily("2001-01-01", 365 * 11 + 2, 1.0)
    status = record.status.copy()
    status[12, 0] = Status.INFILLED
    filled = RainRecord(record.gauges, record.starts, record.ends, record.depth, status, step="1d")
    assert normals_from_record(filled, line(2))[0].years[0, 0, 0] == 10


def test_the_normal_ratio_by_normals_from_the_record() -> None:
    """X has half of A's and twice B's rain; its missing month, 80 mm at A and 10 at B, is (40 + 20)/2 = 30 mm."""
    rain = 40 + 10 * np.sin(np.arange(240.0))
    x, a, b = rain.copy(), 2 * rain, rain / 2
    x[-1], a[-1], b[-1] = NAN, 80, 10
    record = monthly(20, x, a, b)
    # The last December itself is no common year.
    ratios, _ = normals_from_record(record, line(3))
    options = InfillOptions(method="normal-ratio", scale="step", longest_gap=40)
    completed = complete(record, line(3), options, ratios=ratios)
    assert completed.record.depth[-1, 0] == pytest.approx(30)
    assert [note.code for note in completed.notes] == []


def test_a_gauge_without_ratios_stays_missing_and_it_is_said() -> None:
    """With nine years nobody has a ratio."""
    depths = np.full((3, 108), 40.0)
    depths[0, -1] = NAN
    record = monthly(9, *depths)
    ratios, _ = normals_from_record(record, line(3))
    options = InfillOptions(method="normal-ratio", scale="step", longest_gap=40)
    completed = complete(record, line(3), options, ratios=ratios)
    (note,) = [note for note in completed.notes if note.code == "not-infilled"]
    assert "fewer than 2 other gauges with normals of enough common years reported at the step" in note.text


def test_a_depth_without_a_date() -> None:
    """Normals from the record are monthly, so an undated storm total cannot use them."""
    ratios = NormalRatios(("X", "A", "B"), np.full((12, 3, 3), 10), np.ones((12, 3, 3)))
    nat = np.full(1, "NaT", dtype="datetime64[s]")
    record = RainRecord.from_depths(("X", "A", "B"), nat, nat, [[NAN, 1.0, 2.0]], step="storm")
    with pytest.raises(DataError, match="normals from the record: found a depth without a date; expected dates"):
        complete(record, line(3), InfillOptions(method="normal-ratio"), ratios=ratios)


def test_ratios_of_another_network() -> None:
    """They are not taken for this one's."""
    ratios = NormalRatios(("X", "A"), np.full((12, 2, 2), 10), np.ones((12, 2, 2)))
    with pytest.raises(DataError, match=r"normals from the record: found other gauges .* expected X, A, B"):
        ratios.of(line(3), 0, 1)


def test_records_that_have_no_months() -> None:
    """No dates, steps of a year, or other columns."""
    nat = np.full(1, "NaT", dtype="datetime64[s]")
    undated = RainRecord.from_depths(("X", "A"), nat, nat, [[1.0, 2.0]], step="storm")
    with pytest.raises(DataError, match="normals from the record: found no dates; expected a record of several years"):
        normals_from_record(undated, line(2))
    starts, ends = (np.array([f"{year}-01-01"], dtype="datetime64[s]") for year in (2031, 2032))
    yearly = RainRecord.from_depths(("X", "A"), starts, ends, [[900.0, 800.0]], step="1y")
    with pytest.raises(DataError, match="normals from the record: found steps of 1y; expected steps of a day at most"):
        normals_from_record(yearly, line(2))
    with pytest.raises(DataError, match="rain record: found columns that are not the network's gauges"):
        normals_from_record(daily("2001-01-01", 3, 1.0), line(3))

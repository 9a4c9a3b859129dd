"""The view that the checks share, by hand."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import line_of, record_of

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status
from basinrain.screening import ScreeningOptions
from basinrain.screening.screened import Screened, runs_of


def view_of(record: RainRecord, network: GaugeNetwork | None = None) -> Screened:
    """Return the view of a record on a line of gauges."""
    return Screened(record, line_of(len(record.gauges)) if network is None else network, ScreeningOptions())


def test_the_neighbours_of_a_day_are_ranked_by_hand() -> None:
    """Gauge A sees 10, 2 and 6 mm: median 6, least 2, greatest 10; roots 0.71, 1.04 and 0 apart."""
    view = view_of(record_of([[99.0, 10.0, 2.0, 6.0]]))
    assert view.middle[0, 0] == 6
    assert view.least_measured[0, 0] == 2
    assert view.greatest[0, 0] == 10
    assert view.spread[0, 0] == pytest.approx(np.sqrt(10) - np.sqrt(6))
    assert view.reporting[0].tolist() == [3, 3, 3, 3]


def test_a_silent_neighbour_does_not_count() -> None:
    """With B silent A's median is the mean of 2 and 6; with all silent it has none."""
    view = view_of(record_of([[9.0, np.nan, 2.0, 6.0], [9.0, np.nan, np.nan, np.nan]]))
    assert view.middle[0, 0] == 4
    assert view.reporting[:, 0].tolist() == [2, 0]
    assert np.isnan(view.middle[1, 0])


def test_the_climate_of_a_gauge_is_that_of_its_common_wet_days() -> None:
    """B has twice the depth of A on 40 days; a wrong 5000 mm of one day changes that little, 20 days do not tell."""
    depths = np.tile([[4.0, 8.0]], (40, 1))
    assert view_of(record_of(depths)).climate[1, 0] == pytest.approx(2)
    depths[7, 1] = 5000
    assert view_of(record_of(depths)).climate[1, 0] == pytest.approx(2, rel=0.1)
    assert view_of(record_of(depths[:20])).climate[1, 0] == 1


def test_neighbours_are_the_nearest_eight_within_a_hundred_kilometres() -> None:
    """Of gauges 20 km apart on a line, the first has five within reach."""
    view = view_of(record_of(np.zeros((1, 12))), line_of(12, 20_000.0))
    assert view.neighbours[0] == [1, 2, 3, 4, 5]
    assert len(view.neighbours[6]) == 8


def test_spread_values_count_by_the_day_and_not_by_the_step() -> None:
    """A daily gauge in an hourly record: its hours are not measured, its day is known."""
    hours = record_of(np.ones((24, 2)), "1h")
    status = hours.status.copy()
    status[:, 1] = Status.SPREAD
    record = RainRecord(
        hours.gauges, hours.starts, hours.ends, hours.depth, status, step="1h", recorders=frozenset({"A"})
    )
    view = view_of(record)
    assert np.isnan(view.steps.depths[:, 1]).all()
    assert view.cases.depths.tolist() == [[24.0, 24.0]]
    by_step, by_day = view.sheets
    assert (by_step.gauges.tolist(), by_day.gauges.tolist()) == ([0], [1])


def test_the_scatter_of_a_short_record_is_the_usual_one() -> None:
    """A week tells nothing of a gauge's scatter; side by side gauges over 90 days have the least one."""
    assert view_of(record_of(np.ones((7, 4)))).scatter[0, 0] == 1.2
    assert view_of(record_of(np.full((90, 4), 9.0))).scatter[0, 0] == 0.6


def test_dry_surprise_is_the_share_of_dry_days_among_like_ones() -> None:
    """Ten days on which the neighbours have 10 mm, A dry on none: p = 1/12; on dry days it is dry on ten of ten."""
    depths = np.vstack([np.full((10, 4), 10.0), np.zeros((10, 4))])
    surprise = view_of(record_of(depths)).dry_surprise
    assert surprise[0, 0] == pytest.approx(np.log(12))
    assert surprise[15, 0] == pytest.approx(-np.log(11 / 12))


def test_runs_are_found_at_both_ends() -> None:
    """A run may begin with the first value and end with the last."""
    assert list(runs_of(np.array([True, False, True, True]))) == [(0, 1), (2, 4)]
    assert list(runs_of(np.zeros(0, dtype=bool))) == []

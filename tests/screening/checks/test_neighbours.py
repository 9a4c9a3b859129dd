"""A gauge against its neighbours, by hand."""

from __future__ import annotations

import numpy as np
from screening.drawn_records import found, rain_of, record_of


def test_a_day_far_above_all_neighbours_is_an_outlier() -> None:
    """120 mm where four others have 9 to 12: (sqrt(120) - sqrt(10.5)) / 1.2 = 6.4 standard deviations, over 4.5."""
    (finding,) = found("spatial-outlier", record_of([[120.0, 9.0, 10.0, 11.0, 12.0]]))
    assert finding.key == "spatial-outlier A 2031-01-01T00:00"
    assert "120.0 mm in the day 2031-01-01, against a median of 10.5 mm at 4 neighbours" in finding.evidence
    assert "6.4 standard deviations" in finding.evidence
    assert finding.others == ("B", "C", "D", "E")


def test_a_storm_that_a_neighbour_shares_is_none() -> None:
    """With 70 mm at one of the neighbours 120 mm are less than twice the greatest."""
    assert found("spatial-outlier", record_of([[120.0, 9.0, 10.0, 11.0, 70.0]])) == []


def test_days_on_end_are_one_finding() -> None:
    """Three days far above the neighbours are one stretch."""
    days = [[120.0, 9.0, 10.0, 11.0, 12.0]] * 3 + [[5.0] * 5]
    (finding,) = found("spatial-outlier", record_of(days))
    assert (str(finding.start), str(finding.end)) == ("2031-01-01T00:00:00", "2031-01-04T00:00:00")


def test_two_reporting_neighbours_are_too_few() -> None:
    """With two of three silent nobody can tell who is wrong."""
    assert found("spatial-outlier", record_of([[120.0, 9.0, np.nan, np.nan, 12.0]])) == []


def test_a_dry_gauge_among_wet_ones_is_found() -> None:
    """Zero where the others have 20 to 26 mm: sqrt(23) / 1.2 = 4.0 standard deviations, over 3."""
    (finding,) = found("zero-among-wet", record_of([[0.0, 20.0, 22.0, 24.0, 26.0]]))
    assert finding.gauge == "A"
    assert finding.evidence.startswith(
        "No rain in the day 2031-01-01. All 4 neighbours were wet: the driest had 20.0 mm, and their median is 23.0 mm "
        "in this gauge's climate."
    )
    assert finding.edit is not None
    assert finding.edit.action == "reject"


def test_a_dry_gauge_beside_another_dry_one_is_none() -> None:
    """One neighbour with 0.4 mm says that rain was patchy."""
    assert found("zero-among-wet", record_of([[0.0, 20.0, 22.0, 24.0, 0.4]])) == []


def test_zeros_over_wet_weeks_are_one_run() -> None:
    """Forty days of zeros, with gaps in them, while the others have rain; the run begins and ends with their rain."""
    depths = rain_of(200, 5)
    depths[100:140, 2] = 0
    depths[120:123, 2] = np.nan
    (finding,) = found("zero-run", record_of(depths))
    assert finding.gauge == "C"
    wet = [k for k in range(100, 140) if np.median(depths[k, [0, 1, 3, 4]]) >= 1]
    day = np.datetime64("2031-01-01")
    assert finding.start == day + wet[0]
    assert finding.end == day + wet[-1] + 1
    assert finding.edit is not None


def test_a_drought_that_all_share_is_none() -> None:
    """Zeros at every gauge are dry weather."""
    depths = rain_of(200, 5)
    depths[100:160] = 0
    assert found("zero-run", record_of(depths)) == []

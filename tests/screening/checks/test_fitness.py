"""What a record is not fit for."""

from __future__ import annotations

import numpy as np
from screening.drawn_records import found, line_of, rain_of, record_of

from basinrain.screening import CHECKS, ScreeningOptions
from basinrain.screening.screened import Screened


def test_years_are_complete_with_ninety_five_percent_of_their_days() -> None:
    """2031 to 2042: A has 12 years, B lost 18 days of one (kept) and 19 of another (not), C has nine years."""
    depths = rain_of(12 * 365 + 3, 3)
    depths[100:118, 1] = np.nan
    depths[500:519, 1] = np.nan
    depths[: 3 * 365 + 1, 2] = np.nan
    (finding,) = found("short-record", record_of(depths))
    assert finding.evidence == (
        "3 gauges have fewer than the 30 complete years of a standard normal, 1 of them fewer than the 10 complete "
        "years that normals take (95 % of the days of each): C 9, B 11, A 12."
    )
    assert (finding.key, finding.severity, finding.others) == ("short-record", "remark", ("A", "B", "C"))
    (finding,) = found("short-record", record_of(depths[:, 2:]))
    assert finding.evidence.startswith("1 gauge has fewer than the 10 complete years that normals take")
    assert finding.action == "Give normals from elsewhere, or use a method without normals."


def test_thirty_years_are_enough() -> None:
    """A record of 30 years raises no remark."""
    assert found("short-record", record_of(rain_of(30 * 365 + 8, 1))) == []


def test_a_storm_is_no_short_record() -> None:
    """Nobody takes normals from six weeks, and nobody is told so gauge by gauge."""
    view = Screened(record_of(np.zeros((42, 2))), line_of(2), ScreeningOptions())
    assert CHECKS["short-record"].lacks(view) == "the record covers 42 days; nobody takes normals from it"


def test_unheated_gauges_are_remarked_on_with_their_share() -> None:
    """January has 31 mm at 1 mm a day, the next 59 days 118 mm: 31 of 149 mm are 21 %."""
    depths = np.full((90, 2), 2.0)
    depths[:31] = 1.0
    options = ScreeningOptions(unheated=("B",), cold_months=(1, 12))
    (finding,) = found("cold-season", record_of(depths), options=options)
    assert finding.gauge == "B"
    assert "January, December: 31.0 of 149.0 mm (21 %), on 31 of 90 wet days" in finding.evidence
    assert finding.severity == "remark"
    assert found("cold-season", record_of(depths), options=ScreeningOptions(unheated=("B",), cold_months=(7,))) == []


def test_without_unheated_gauges_the_check_is_not_made() -> None:
    """The job must say which gauges and which months."""
    record = record_of(np.zeros((42, 2)))
    check = CHECKS["cold-season"]
    assert "no gauge as unheated" in check.lacks(Screened(record, line_of(2), ScreeningOptions()))
    assert "no cold months" in check.lacks(Screened(record, line_of(2), ScreeningOptions(unheated=("A",))))

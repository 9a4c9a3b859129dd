"""Readings over several days."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import found, rain_of, record_of


def days_with_a_wet_spell() -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    """Return 400 days of rain, with 8, 12 and 10 mm at all gauges on days 200 to 202 and a dry one after them."""
    depths = rain_of(400, 5)
    depths[195:210] = 0
    depths[200:203] = [[8.0], [12.0], [10.0]]
    return depths


@pytest.mark.parametrize(("blank", "words"), [(0.0, "without rain"), (np.nan, "without a reading")])
def test_a_reading_over_four_days_is_found(blank: float, words: str) -> None:
    """A has nothing on the three wet days and their 30 mm on the dry day after."""
    depths = days_with_a_wet_spell()
    depths[200:203, 0], depths[203, 0] = blank, 30.0
    (finding,) = found("unflagged-accumulation", record_of(depths))
    assert finding.gauge == "A"
    assert (str(finding.start)[:10], str(finding.end)[:10]) == ("2031-07-20", "2031-07-24")
    assert f"30.0 mm in the day 2031-07-23, after 3 days {words}" in finding.evidence
    assert "mm on the day itself" in finding.evidence


def test_a_storm_after_rain_that_was_missed_is_none() -> None:
    """Ninety mm are three times what the others had over the days; and 30 mm on a day with 30 mm are its own."""
    depths = days_with_a_wet_spell()
    depths[200:203, 0], depths[203, 0] = 0.0, 90.0
    assert found("unflagged-accumulation", record_of(depths)) == []
    depths[203] = 30.0
    assert found("unflagged-accumulation", record_of(depths)) == []


def test_a_gauge_that_rests_at_weekends_is_named_with_its_days() -> None:
    """Saturdays and Sundays are zero and stand in Monday's reading; 2031 began on a Wednesday."""
    depths = rain_of(730, 5)
    for saturday in range(3, 725, 7):
        depths[saturday + 2, 1] += depths[saturday : saturday + 2, 1].sum()
        depths[saturday : saturday + 2, 1] = 0
    (finding,) = found("unflagged-accumulation", record_of(depths))
    assert (finding.gauge, finding.whole_record) == ("B", True)
    assert "Saturday" in finding.evidence
    assert "Sunday" in finding.evidence
    assert "Monday" not in finding.evidence
    assert "accumulated into the next reading" in finding.action


def test_weekends_that_are_lost_are_missing() -> None:
    """The same without the sums on Monday: the rain is lost, and the days are to be declared missing."""
    depths = rain_of(730, 5)
    for saturday in range(3, 725, 7):
        depths[saturday : saturday + 2, 1] = 0
    (finding,) = found("unflagged-accumulation", record_of(depths))
    assert "declare those days missing" in finding.action

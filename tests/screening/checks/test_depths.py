"""Depths that are too great for their duration."""

from __future__ import annotations

import numpy as np
from screening.drawn_records import found, record_of

from basinrain.screening import ScreeningOptions


def test_an_hour_over_the_world_record_is_erroneous() -> None:
    """410 mm in an hour are more than the 401 mm of Shangdi; the neighbour's day is named, the hour is to reject."""
    depths = np.zeros((48, 2))
    depths[30] = 410, 12
    (finding,) = found("greatest-depths", record_of(depths, "1h"))
    assert finding.key == "greatest-depths A 2031-01-02T06:00"
    assert str(finding.end) == "2031-01-02T07:00:00"
    assert finding.severity == "erroneous"
    assert finding.evidence.startswith(
        "410.0 mm in 1 h to 2031-01-02 07:00, more than was ever measured in that time: the greatest known depths "
        "reach 401.0 mm."
    )
    assert "Neighbours, over the same day or days: B 12.0." in finding.evidence
    assert finding.edit is not None
    assert finding.edit.action == "reject"


def test_a_third_of_the_world_record_is_doubtful_and_kept() -> None:
    """140 mm in an hour are over a third of 401 mm; 130 mm are not. Nobody is told to drop it."""
    depths = np.zeros((48, 1))
    depths[30] = 140
    (finding,) = found("greatest-depths", record_of(depths, "1h"))
    assert finding.severity == "doubtful"
    assert finding.edit is None
    assert "it may be the storm" in finding.action
    depths[30] = 130
    assert found("greatest-depths", record_of(depths, "1h")) == []


def test_the_regions_own_limit_takes_the_place_of_the_third() -> None:
    """With 250 mm an hour allowed 140 mm are nothing, with 90 mm they are doubtful; the world's limit holds beside."""
    depths = np.zeros((48, 1))
    depths[30] = 140
    record = record_of(depths, "1h")
    assert found("greatest-depths", record, options=ScreeningOptions(envelope=((1, 250), (24, 900)))) == []
    (finding,) = found("greatest-depths", record, options=ScreeningOptions(envelope=((1, 90), (24, 900))))
    assert "more than the region's limit of 90.0 mm" in finding.evidence
    depths[30] = 420
    (finding,) = found("greatest-depths", record_of(depths, "1h"), options=ScreeningOptions(envelope=((1, 500),)))
    assert finding.severity == "erroneous"


def test_hours_that_are_possible_add_up_to_a_day_that_is_not() -> None:
    """Ninety mm an hour over a day are 2160 mm, more than the 1825 mm of Foc-Foc; the stretch is the rain itself."""
    depths = np.zeros((72, 1))
    depths[24:48] = 90
    (finding,) = found("greatest-depths", record_of(depths, "1h"))
    assert "2160.0 mm in 24 h to 2031-01-03 00:00" in finding.evidence
    assert "1825.0 mm" in finding.evidence
    assert (str(finding.start), str(finding.end)) == ("2031-01-02T00:00:00", "2031-01-03T00:00:00")


def test_rain_that_has_fallen_is_not_erroneous() -> None:
    """The record days themselves, 1144 mm in 12 h and 1825 mm in 24 h at Foc-Foc (from memory), are doubtful only."""
    depths = np.zeros((72, 1))
    depths[24:36], depths[36:48] = 1144 / 12, (1825 - 1144) / 12
    assert [f.severity for f in found("greatest-depths", record_of(depths, "1h"))] == ["doubtful"]


def test_missing_steps_take_nothing_from_a_window() -> None:
    """Two depths of 1000 mm around a missing hour are over any three hours."""
    depths = np.zeros((24, 1))
    depths[5:8, 0] = 300, np.nan, 380
    (finding,) = found("greatest-depths", record_of(depths, "1h"))
    assert "680.0 mm in 3 h" in finding.evidence
    assert finding.severity == "erroneous"

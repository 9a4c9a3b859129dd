"""Rain that stands in the record twice."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import found, rain_of, record_of


def test_a_month_copied_to_another_year_is_found_value_by_value() -> None:
    """The days 60 to 90 stand again at 400 to 430; wet days decide where the stretch begins and ends."""
    depths = rain_of(600, 2)
    depths[400:430, 0] = depths[60:90, 0]
    (finding,) = found("duplicated-stretch", record_of(depths))
    wet = np.flatnonzero(depths[400:430, 0] > 0) + 400
    assert finding.gauge == "A"
    assert finding.start == np.datetime64("2031-01-01") + wet[0]
    assert finding.end == np.datetime64("2031-01-01") + wet[-1] + 1
    assert f"{len(wet)} wet days" in finding.evidence
    first, last = (np.datetime64("2031-01-01") + wet[k] - 340 for k in (0, -1))
    assert f"those of the {wet[-1] - wet[0] + 1} days {first} to {last}." in finding.evidence


def test_the_same_depths_with_other_dry_days_between_are_no_copy() -> None:
    """The wet values of a month in their order, but on end instead of apart."""
    depths = rain_of(600, 1)
    wet = depths[60:90, 0][depths[60:90, 0] > 0]
    depths[400 : 400 + len(wet), 0] = wet
    assert found("duplicated-stretch", record_of(depths)) == []


def test_drizzle_in_tips_repeats_itself_by_chance() -> None:
    """A thousand days of 0 and 0.2 mm hold every short pattern many times."""
    depths = np.where(np.random.default_rng(2).random((1000, 1)) < 0.5, 0.2, 0.0)
    assert found("duplicated-stretch", record_of(depths)) == []


def test_one_record_under_two_names_is_said_of_the_whole() -> None:
    """C is A throughout; nothing is left to tell by whose it is, so that the later id is named, with the other."""
    depths = rain_of(300, 3)
    depths[:, 2] = depths[:, 0]
    (finding,) = found("one-record-two-gauges", record_of(depths))
    assert (finding.gauge, finding.others, finding.whole_record) == ("C", ("A",), True)
    assert "those of A, 10.0 km away" in finding.evidence
    assert finding.edit is None


def test_a_stretch_of_another_gauge_is_found_with_its_days() -> None:
    """B has A's values over 60 of 300 days; with one other gauge nobody can tell whose they are."""
    depths = rain_of(300, 3)
    depths[100:160, 1] = depths[100:160, 0]
    (finding,) = found("one-record-two-gauges", record_of(depths))
    wet = np.flatnonzero(depths[100:160, 1] > 0) + 100
    assert finding.start == np.datetime64("2031-01-01") + wet[0]
    assert finding.end == np.datetime64("2031-01-01") + wet[-1] + 1
    assert (finding.gauge, finding.others, finding.edit) == ("B", ("A",), None)
    assert "Whether they are A's or B's the other gauges do not tell." in finding.evidence
    assert "B or A" in finding.action


@pytest.mark.parametrize(("wrong", "right"), [("A", "B"), ("B", "A")])
def test_the_other_gauges_tell_whose_a_stretch_is(wrong: str, right: str) -> None:
    """C lies by A and D by B in two valleys with rain of their own; the edit is at the gauge that holds the other's."""
    one, two = rain_of(800, 2, seed=5), rain_of(800, 2, seed=6)
    depths = np.column_stack([one[:, 0], two[:, 0], one[:, 1], two[:, 1]])
    column = {"A": 0, "B": 1}
    depths[300:390, column[wrong]] = depths[300:390, column[right]]
    (finding,) = found("one-record-two-gauges", record_of(depths))
    assert (finding.gauge, finding.others) == (wrong, (right,))
    assert f"By the other gauges they are {right}'s at odds of over 1000 to 1" in finding.evidence
    assert finding.edit is not None
    assert (finding.edit.gauge, finding.edit.action) == (wrong, "reject")
    assert (finding.edit.start, finding.edit.end) == (finding.start, finding.end)


def test_of_three_gauges_with_one_record_two_are_named_in_any_order() -> None:
    """A, B and C are one record: B is A's, C is B's, whatever the order of the columns."""
    depths = np.repeat(rain_of(300, 1), 3, axis=1)
    record = record_of(depths)
    from screening.drawn_records import line_of

    network = line_of(3)
    order = [2, 0, 1]
    turned = record.ordered(tuple(record.gauges[k] for k in order))
    moved = type(network)(ids=turned.gauges, x=network.x[order], y=network.y[order], crs="local")
    named = [(f.gauge, f.others) for f in found("one-record-two-gauges", record, network)]
    assert sorted(named) == [("B", ("A",)), ("C", ("B",))]
    assert sorted((f.gauge, f.others) for f in found("one-record-two-gauges", turned, moved)) == sorted(named)

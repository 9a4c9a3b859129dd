"""Completing a storm window by the totals of the storm and of its days, by hand."""

from __future__ import annotations

import numpy as np
import pytest
from windows import average, codes, column, hourly, with_status

from basinrain.rainfall import Status

NAN = float("nan")
A, B, C = [5.0, 10.0, 5.0, 0.0], [6.0, NAN, NAN, 1.0], [4.0, 8.0, 6.0, 2.0]


class TestStorm:
    """At the storm scale."""

    def test_silent_gauge(self) -> None:
        """B's total is (20 + 40)/2 = 30, in the pattern of its nearest recorder A (A and C are equally near)."""
        completed = average(hourly([5, 10, 5, 0], [NAN] * 4, [10, 0, 0, 30]))
        assert column(completed) == pytest.approx([7.5, 15, 7.5, 0])
        (estimate,) = completed.estimates
        assert (estimate.first, estimate.stop, estimate.scale, estimate.depth) == (0, 4, "storm", 30)
        assert (completed.record.status[:, 1] == Status.INFILLED).all()

    def test_at_least_half_observed(self) -> None:
        """Two of four hours are half: B's other two are infilled hour by hour."""
        completed = average(hourly(A, B, C))
        assert column(completed) == [6, 9, 5.5, 1]
        assert [estimate.scale for estimate in completed.estimates] == ["step", "step"]

    def test_fewer_than_half_observed(self) -> None:
        """One of four hours: B's total is (20 + 20)/2 = 20, of which 6 were observed; 14 go 10 : 5 : 0 as at A."""
        completed = average(hourly(A, [6, NAN, NAN, NAN], C))
        assert column(completed) == pytest.approx([6, 14 * 10 / 15, 14 * 5 / 15, 0])
        assert completed.estimates[0].depth == 20
        assert completed.record.status[0, 1] == Status.OBSERVED
        # The total rests on A and C alone; what B observed is evidence of its pattern, not a source of its depth.
        assert completed.sources()[1].tolist() == [10, 0, 10]

    def test_total_below_what_was_observed(self) -> None:
        """B caught 50 where (20 + 20)/2 was estimated; the missing hours are (10 + 8)/2, (5 + 6)/2, (0 + 2)/2."""
        completed = average(hourly(A, [50, NAN, NAN, NAN], C))
        assert column(completed) == [50, 9, 5.5, 1]
        assert [estimate.scale for estimate in completed.estimates] == ["step"] * 3
        (note,) = [n for n in completed.notes if n.code == "total-raised"]
        assert (note.gauge, note.level) == ("B", "warning")
        assert "Gauge B observed more than the storm total estimated for it" in note.text

    def test_total_equal_to_what_was_observed(self) -> None:
        """Nothing is left to spread, and nothing to say."""
        completed = average(hourly(A, [20, NAN, NAN, NAN], C))
        assert column(completed) == [20, 0, 0, 0]
        assert codes(completed) == ["gap-over-peak"]

    def test_the_next_recorder_where_the_nearest_is_dry(self) -> None:
        """A rains only in the hour that B observed; C gives the pattern 1 : 3 of the rest, (4 + 8)/2 - 2 = 4 mm."""
        completed = average(hourly([4, 0, 0, 0], [2, NAN, NAN, NAN], [4, 0, 1, 3]))
        assert column(completed) == pytest.approx([2, 0, 1, 3])

    def test_only_recorders_give_patterns(self) -> None:
        """A is nearest by its id but a daily gauge, spread; C is measured hour by hour."""
        record = hourly([5, 5, 5, 5], [NAN] * 4, [10, 0, 0, 30], recorders="BC")
        spread = with_status(record, "A", slice(None), Status.SPREAD)
        completed = average(spread, scale="storm")
        assert column(completed) == pytest.approx([7.5, 0, 0, 22.5])
        # A gauge that does not record gives no pattern even where its values count as measured.
        assert column(average(record, scale="storm")) == pytest.approx([7.5, 0, 0, 22.5])

    def test_spread_evenly_where_no_recorder_is_wet(self) -> None:
        """A and C rain only in the hour that B observed: the other 3 mm are 1 mm an hour, and it is said."""
        completed = average(hourly([5, 0, 0, 0], [2, NAN, NAN, NAN], [5, 0, 0, 0]))
        assert column(completed) == pytest.approx([2, 1, 1, 1])
        (note,) = [n for n in completed.notes if n.code == "spread-evenly"]
        assert note.text == (
            "Gauge B: the infilled storm total was spread evenly over 3 of 4 steps (2031-05-04T01:00 to "
            "2031-05-04T04:00), because no recording gauge is wet in them."
        )

    def test_spread_evenly_where_no_recorder_is_complete(self) -> None:
        """A and C are daily gauges."""
        record = hourly([3, 1], [NAN, NAN], [4, 0])
        record = with_status(with_status(record, "A", slice(None), Status.SPREAD), "C", slice(None), Status.SPREAD)
        completed = average(record, scale="storm")
        assert column(completed) == [2, 2]
        assert "because no recording gauge is complete over the storm" in completed.notes[-1].text

    def test_a_dry_storm_needs_no_pattern(self) -> None:
        """Zero is zero in every hour, without a note."""
        completed = average(hourly([0, 0, 0], [NAN] * 3, [0, 0, 0]))
        assert (column(completed), completed.notes) == ([0, 0, 0], ())

    def test_donors_have_the_whole_storm(self) -> None:
        """C misses an hour: it is no donor of a total, though its own gap is infilled; A and D are."""
        completed = average(hourly([5, 5], [NAN, NAN], [50, NAN], [7, 7]))
        by_gauge = {estimate.gauge: estimate for estimate in completed.estimates}
        assert by_gauge["B"].donors == {"A": 0.5, "D": 0.5}
        assert by_gauge["B"].depth == 12

    def test_too_few_donors_of_the_whole_storm(self) -> None:
        """Only A is complete: B stays missing, and the reason is the storm's."""
        completed = average(hourly([5, 5, 5], [NAN, NAN, NAN], [5, 5, NAN]))
        assert np.isnan(column(completed)).all()
        assert [note.text for note in completed.notes if note.code == "not-infilled" and note.gauge == "B"] == [
            (
                "Gauge B stays without a depth at 3 of 3 steps (2031-05-04T00:00 to 2031-05-04T03:00): "
                "fewer than 2 other gauges have values of their own at every step of the storm."
            )
        ]

    def test_a_long_gap_forbids_the_total(self) -> None:
        """Most of B is missing, in part by a gap of 3 days where 2 are allowed: no total is made up for the storm."""
        record = hourly([1] * 6, [NAN, NAN, NAN, 1, NAN, 1], [3] * 6, hours=24)
        completed = average(record, scale="storm", longest_gap=2)
        assert np.isnan(column(completed)).tolist() == [True, True, True, False, True, False]
        reasons = [note.text.split("): ")[1] for note in completed.notes if note.code == "not-infilled"]
        assert reasons == [
            "the gap is longer than 2 days (longest_gap).",
            "most of the storm is missing, in part by a gap longer than 2 days (longest_gap).",
        ]

    def test_a_gauge_that_opens_during_the_storm(self) -> None:
        """B was installed for the last two hours and missed both: its total is that of these, (5 + 0 + 6 + 2)/2."""
        record = with_status(hourly(A, [NAN] * 4, C), "B", slice(0, 2), Status.NOT_INSTALLED)
        completed = average(record)
        (estimate,) = completed.estimates
        assert (estimate.first, estimate.stop, estimate.depth) == (2, 4, 6.5)
        assert column(completed)[2:] == pytest.approx([6.5, 0])
        assert completed.record.status[:2, 1].tolist() == [Status.NOT_INSTALLED] * 2

    def test_gap_over_the_peak(self) -> None:
        """B misses the wettest hour."""
        notes = [note for note in average(hourly(A, B, C)).notes if note.code == "gap-over-peak"]
        assert [(note.gauge, note.level) for note in notes] == [("B", "warning")]

    def test_gap_over_the_peak_that_stays(self) -> None:
        """With one donor where two are asked for nothing is infilled, and nothing is said to be."""
        (note,) = [n for n in average(hourly(A, B)).notes if n.code == "gap-over-peak"]
        assert note.text.endswith("or next to it; it stays missing there.")


class TestDay:
    """At the day scale: two days of two 12-hour steps each."""

    def test_day_by_day(self) -> None:
        """The first day is half there, the second is not: 12 h infilled as (10 + 8)/2, the day's (5 + 8)/2 as at A."""
        record = hourly([5, 10, 5, 0], [6, NAN, NAN, NAN], [4, 8, 6, 2], hours=12)
        completed = average(record, scale="day")
        assert column(completed) == pytest.approx([6, 9, 6.5, 0])
        assert [(e.scale, e.first, e.stop, e.depth) for e in completed.estimates] == [
            ("step", 1, 2, 9),
            ("day", 2, 4, 6.5),
        ]

    def test_the_day_is_the_rainfall_day(self) -> None:
        """With days that begin at noon the spans are 1, 2 and 1 steps."""
        record = hourly([5, 10, 5, 0], [NAN] * 4, [4, 8, 6, 2], hours=12, day_phase=12 * 3600)
        estimates = average(record, scale="day").estimates
        assert [(e.first, e.stop, e.depth) for e in estimates] == [(0, 1, 4.5), (1, 3, 14.5), (3, 4, 1)]

    def test_spread_values_donate_to_days(self) -> None:
        """C is a daily gauge: its day's total donates, its pattern does not."""
        record = hourly([1, 9], [NAN, NAN], [15, 15], hours=12)
        completed = average(with_status(record, "C", slice(None), Status.SPREAD))
        assert column(completed) == pytest.approx([2, 18])
        assert completed.estimates[0].scale == "day"

    def test_daily_record(self) -> None:
        """In a record of days a day is its step; nothing is to be spread."""
        completed = average(hourly([1, 2], [5, NAN], [3, 4], hours=24), scale="day")
        assert column(completed) == [5, 3]
        assert [estimate.scale for estimate in completed.estimates] == ["day"]

"""Completing a storm window, by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from windows import average, column, hourly, network, with_status

from basinrain.errors import DataError
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def totals(*columns: list[float]) -> RainRecord:
    """Storm totals without times."""
    nat = np.full(len(columns[0]), "NaT", dtype="datetime64[s]")
    gauges = tuple("ABCDEF"[: len(columns)])
    return RainRecord.from_depths(gauges, nat, nat, np.array(columns).T, step="storm")


def codes(completed: Completed) -> list[str]:
    return [note.code for note in completed.notes]


A, B, C = [5.0, 10.0, 5.0, 0.0], [6.0, NAN, NAN, 1.0], [4.0, 8.0, 6.0, 2.0]


class TestStep:
    """At the step scale."""

    def test_station_average(self) -> None:
        """B's missing hours are (10 + 8)/2 and (5 + 6)/2; its own values stay."""
        completed = average(hourly(A, B, C), scale="step")
        assert column(completed) == [6, 9, 5.5, 1]
        status = completed.record.status[:, 1].tolist()
        assert status == [Status.OBSERVED, Status.INFILLED, Status.INFILLED, Status.OBSERVED]

    def test_basin_mean_and_contributions(self) -> None:
        """With thirds: mean 20.50; A, B, C contribute 9.167, 2.333 and 9.000, which is not the sum of what is left."""
        completed = average(hourly(A, B, C), scale="step")
        assert completed.record.depth.sum() / 3 == pytest.approx(20.50)
        contributions = completed.sources().sum(axis=0) / 3
        assert contributions == pytest.approx([27.5 / 3, 7 / 3, 9])
        assert contributions == pytest.approx([9.167, 2.333, 9.000], abs=5e-4)
        assert np.nansum([A, B, C]) / 3 == pytest.approx(15.67, abs=0.005)

    def test_estimates_say_how(self) -> None:
        """One estimate for every value, by time, with the weights of the donors."""
        first, second = average(hourly(A, B, C), scale="step").estimates
        assert (first.gauge, first.first, first.stop, first.scale, first.depth) == ("B", 1, 2, "step", 9)
        assert (second.first, second.depth, second.method) == (2, 5.5, "station-average")
        assert first.donors == {"A": 0.5, "C": 0.5}

    def test_infilled_values_never_donate(self) -> None:
        """B and C miss the second hour; both rest on A and D, neither on the other."""
        completed = average(hourly([1, 2], [1, NAN], [1, NAN], [1, 6]), scale="step")
        assert completed.record.depth[1].tolist() == [2, 4, 4, 6]
        assert all(estimate.donors == {"A": 0.5, "D": 0.5} for estimate in completed.estimates)

    def test_spread_values_are_no_donors(self) -> None:
        """C is a daily gauge, spread over the hours: at the hour only A and D donate."""
        record = hourly([1, 2], [1, NAN], [30, 30], [1, 6])
        completed = average(with_status(record, "C", slice(None), Status.SPREAD), scale="step")
        assert column(completed)[1] == (2 + 6) / 2

    def test_too_few_donors(self) -> None:
        """One reporting gauge is too few: B stays missing there, and it is said where; min_donors = 1 infills it."""
        record = hourly([5, 10, 5, 0], [6, NAN, NAN, 1], [4, 8, NAN, 2])
        completed = average(record, scale="step")
        assert column(completed)[1] == 9
        assert np.isnan(completed.record.depth[2]).tolist() == [False, True, True]
        (note,) = [n for n in completed.notes if n.code == "not-infilled" and n.gauge == "B"]
        assert note.text == (
            "Gauge B stays without a depth at 1 of 4 steps (2031-05-04T02:00 to 2031-05-04T03:00): "
            "fewer than 2 other gauges reported at the step."
        )
        assert completed.record.status[2, 1] == Status.MISSING
        assert column(average(record, scale="step", min_donors=1)) == [6, 9, 5, 1]

    def test_radius_is_named_where_it_leaves_too_few(self) -> None:
        """Only B lies within 1.5 km of A."""
        completed = average(hourly([NAN, 1], [2, 1], [3, 1]), scale="step", radius=1500)
        assert "fewer than 2 other gauges within 1.5 km reported" in completed.notes[-1].text
        assert np.isnan(column(completed, "A")[0])

    def test_a_gauge_not_in_service_is_no_gap(self) -> None:
        """D opens after the storm: no value, no estimate, no note."""
        record = hourly([1, 2], [3, 4], [5, 6], [NAN, NAN])
        completed = average(with_status(record, "D", slice(None), Status.NOT_INSTALLED), scale="step")
        assert (completed.estimates, completed.notes) == ((), ())
        assert np.isnan(column(completed, "D")).all()

    def test_rejected_values_are_infilled(self) -> None:
        """A value that screening rejected is a gap like any other."""
        record = hourly([1, 2, 0], [3, NAN, 0], [5, 6, 0])
        completed = average(with_status(record, "B", slice(1, 2), Status.REJECTED), scale="step")
        assert column(completed) == [3, 4, 0]

    def test_dry_donors_give_zero(self) -> None:
        """No rain around is no rain here."""
        assert column(average(hourly([0, 0], [1, NAN], [0, 0]), scale="step")) == [1, 0]

    def test_a_long_gap_is_left(self) -> None:
        """Three missing days are longer than 2 days, one is not."""
        record = hourly([1] * 6, [NAN, NAN, NAN, 1, NAN, 1], [3] * 6, hours=24)
        completed = average(record, scale="step", longest_gap=2)
        assert np.isnan(column(completed)).tolist() == [True] * 3 + [False] * 3
        assert column(completed)[3:] == [1, 2, 1]
        (note,) = [n for n in completed.notes if n.code == "not-infilled"]
        assert note.text == (
            "Gauge B stays without a depth at 3 of 6 steps (2031-05-04T00:00 to 2031-05-07T00:00): "
            "the gap is longer than 2 days (longest_gap)."
        )


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


class TestLongGaps:
    """A gap may be longer than the storm."""

    def test_a_gauge_silent_for_60_days(self) -> None:
        """A storm of 6 h sees 6 h of B's gap; measured on the whole record it is over 31 days, and is left."""
        n = 61 * 24
        record = hourly([1.0] * n, [2.0] * 12 + [NAN] * (60 * 24) + [2.0] * 12, [3.0] * n)
        window, options = record.window(720, 726), InfillOptions(method="station-average")
        long = longer_than(record, gap_mask(record), options.longest_gap)[720:726]
        left = complete(window, network(3), options, long=long)
        assert np.isnan(column(left)).all()
        (note,) = [n for n in left.notes if n.code == "not-infilled"]
        assert note.text.endswith("the gap is longer than 31 days (longest_gap).")
        assert column(complete(window, network(3), options)) == [2.0] * 6

    def test_only_gaps_are_too_long(self) -> None:
        """Of four hours marked as long B misses two: these are left, and only these are said to be."""
        everything = np.ones((4, 3), dtype=bool)
        completed = complete(hourly(A, B, C), network(3), InfillOptions(), long=everything)
        np.testing.assert_array_equal(column(completed), B)
        (note,) = [n for n in completed.notes if n.code == "not-infilled"]
        assert note.text.startswith("Gauge B stays without a depth at 2 of 4 steps")


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


class TestScale:
    """Which scale is used when none is given."""

    SILENT = ([1.0, 9.0], [NAN, NAN], [2.0, 8.0])

    def used(self, record: RainRecord) -> str:
        """Return the scale of the only estimate."""
        (estimate,) = complete(record, network(3), InfillOptions()).estimates
        return estimate.scale

    def test_storm_where_all_record(self) -> None:
        """No daily gauge takes part."""
        assert self.used(hourly(*self.SILENT)) == "storm"

    def test_day_where_a_daily_gauge_takes_part(self) -> None:
        """Said by spread values or by the record's list of recorders."""
        record = hourly(*self.SILENT)
        assert self.used(with_status(record, "C", slice(None), Status.SPREAD)) == "day"
        assert self.used(replace(record, recorders=frozenset("AB"))) == "day"


class TestTotals:
    """Records of storm totals without times."""

    def test_every_total_is_a_span_of_its_own(self) -> None:
        """Three storms; B misses two of them."""
        completed = average(totals([10, 20, 30], [NAN, 5, NAN], [30, 40, 50]))
        assert column(completed) == [20, 5, 40]
        assert [(e.first, e.stop, e.scale) for e in completed.estimates] == [(0, 1, "storm"), (2, 3, "storm")]
        assert completed.notes == ()

    def test_monthly_normals_count_as_the_years(self) -> None:
        """A total without a date has no month: the ratio is that of the sums, 1 to 2, and it is said."""
        normals = np.ones((3, 12))
        normals[1] *= 2
        completed = complete(totals([10], [NAN], [20]), network(3, normals), InfillOptions(method="normal-ratio"))
        assert column(completed) == [(2 * 10 + 2 * 20) / 2]
        assert [note.text for note in completed.notes] == [
            (
                "Normals of the year are used for depths over less than a year, because the totals have no dates: "
                "the ratio between gauges in the season of the storm may be another."
            )
        ]


class TestNormals:
    """What the normal ratio needs."""

    def test_the_months_of_the_steps_are_used(self) -> None:
        """30 April and 1 May: the ratio is 2 in April and 3 in May."""
        normals = np.ones((3, 12))
        normals[1, 3], normals[1, 4] = 2, 3
        record = hourly([1, 1], [NAN, NAN], [1, 1], start="2031-04-30", hours=24)
        options = InfillOptions(method="normal-ratio", scale="day")
        completed = complete(record, network(3, normals), options)
        assert column(completed) == [2, 3]
        assert codes(completed) == ["gap-over-peak"]

    def test_annual_normals_are_said_to_be_so(self) -> None:
        """At a step under a year."""
        record = hourly([1, 1], [NAN, 1], [1, 1])
        completed = complete(record, network(3, [[4], [8], [4]]), InfillOptions(method="normal-ratio", scale="step"))
        assert column(completed) == [2, 1]
        assert codes(completed) == ["gap-over-peak", "annual-normals"]

    def test_annual_normals_fit_annual_values(self) -> None:
        """A year's depth by the year's normals needs no warning."""
        year = np.array(["2031-01-01", "2032-01-01"], dtype="datetime64[s]")
        record = RainRecord.from_depths(("A", "B", "C"), year[:1], year[1:], [[500, NAN, 700]], step="1y")
        options = InfillOptions(method="normal-ratio", longest_gap=366)
        completed = complete(record, network(3, [[4], [8], [4]]), options)
        assert (column(completed), codes(completed)) == ([1200], [])

    def test_all_wrong_normals_at_once(self) -> None:
        """Before anything is computed."""
        with pytest.raises(DataError, match="gauge A: found a normal of 0 mm") as caught:
            complete(hourly(A, B, C), network(3, [[0], [8], [NAN]]), InfillOptions(method="normal-ratio"))
        assert [problem.gauge for problem in caught.value.problems] == ["A", "C"]

    def test_normals_are_not_needed_without_a_gap(self) -> None:
        """A complete record is returned as it is."""
        completed = complete(hourly(A, C), network(2), InfillOptions(method="normal-ratio"))
        assert completed.estimates == ()


class TestMisuse:
    """Records that cannot be completed."""

    def test_columns_of_another_network(self) -> None:
        """The columns must be the network's gauges in their order."""
        with pytest.raises(
            DataError, match=r"rain record: found columns that are not the network's gauges .* A, B, C, D"
        ):
            complete(hourly(A, B, C), network(4), InfillOptions())

    def test_a_record_that_was_infilled_before(self) -> None:
        """Infilled values would pass as observed ones."""
        once = average(hourly(A, B, C)).record
        with pytest.raises(DataError, match="gauge B: found infilled values; expected a record as it was observed"):
            average(once)

    def test_the_record_handed_in_is_not_changed(self) -> None:
        """Its arrays are the same after as before."""
        record = hourly(A, B, C)
        depth, status = record.depth.copy(), record.status.copy()
        average(record)
        assert np.array_equal(record.depth, depth, equal_nan=True)
        assert np.array_equal(record.status, status)

    def test_an_empty_window(self) -> None:
        """No steps, no estimates."""
        completed = average(hourly([], [], []))
        assert (len(completed.record), completed.estimates, list(completed.donor_tables())) == (0, (), [])

"""Completing a storm window, by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from windows import average, codes, column, hourly, network, with_status

from basinrain.errors import DataError
from basinrain.infill import METHODS, InfillOptions, complete, relations_of
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def totals(*columns: list[float]) -> RainRecord:
    """Storm totals without times."""
    nat = np.full(len(columns[0]), "NaT", dtype="datetime64[s]")
    gauges = tuple("ABCDEF"[: len(columns)])
    return RainRecord.from_depths(gauges, nat, nat, np.array(columns).T, step="storm")


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

    @pytest.mark.parametrize(("hours", "scale"), [(12, "storm"), (24, "day"), (48, "day")])
    def test_day_where_steps_are_a_day_or_longer(self, hours: int, scale: str) -> None:
        """All gauges have these steps; from a day on each is filled by itself, so the two gaps are two estimates."""
        length = np.timedelta64(hours, "h")
        ends = np.datetime64("2031-05-04", "s") + np.arange(1, 3) * length
        depths = np.column_stack(self.SILENT)
        record = RainRecord.from_depths(("A", "B", "C"), ends - length, ends, depths, step=f"{hours}h")
        estimates = complete(record, network(3), InfillOptions()).estimates
        assert [estimate.scale for estimate in estimates] == [scale] * (1 if scale == "storm" else 2)


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
        assert codes(completed) == ["gap-over-peak", "infill-beyond-donors"]

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


class TestTrace:
    """Without keeping how estimates came about."""

    @pytest.mark.parametrize("scale", ["step", "day", "storm"])
    @pytest.mark.parametrize("method", METHODS)
    def test_the_record_is_the_same(self, method: str, scale: str) -> None:
        """Only estimates and notes are absent."""
        rng = np.random.default_rng(4)
        depth = rng.gamma(0.5, 4.0, (60, 6))
        depth[rng.random(depth.shape) < 0.2] = NAN
        depth[20:34, 1] = NAN
        record = hourly(*depth.T.tolist())
        days = relations_of(rng.gamma(0.5, 6, (60, 1)) + rng.gamma(0.5, 1, (60, 6)), (net := network(6, [[900]] * 6)))
        options = InfillOptions(method=method, scale=scale)  # type: ignore[arg-type]
        traced, plain = (complete(record, net, options, relations=days, trace=trace) for trace in (True, False))
        assert traced.estimates
        assert (plain.estimates, plain.notes) == ((), ())
        assert np.array_equal(plain.record.depth, traced.record.depth, equal_nan=True)
        assert np.array_equal(plain.record.status, traced.record.status)


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

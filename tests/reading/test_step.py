"""The common step."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rainfiles import labels, read, times
from strategies import networks

from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork
from basinrain.intervals import parse_interval
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.step import bring_to_step

START = np.datetime64("2031-06-04T00:00:00")


def network(*ids: str, **service: list[str]) -> GaugeNetwork:
    """Gauges 1 km apart on a line."""
    kept: dict[str, Any] = {key: np.array(value, dtype="datetime64[s]") for key, value in service.items()}
    return GaugeNetwork(ids=ids, x=np.arange(0, 1000.0 * len(ids), 1000.0), y=np.zeros(len(ids)), crs="local", **kept)


def record(
    gauges: str, depth: npt.ArrayLike, step: str = "1h", *, start: str = "2031-06-04T00:00", zone: str = ""
) -> RainRecord:
    """Single-letter gauges from a start."""
    length = np.timedelta64(parse_interval(step).seconds or 0, "s")
    values = np.array(depth, dtype=float).reshape(-1, len(gauges))
    ends = np.datetime64(start, "s") + np.arange(1, len(values) + 1) * length
    return RainRecord.from_depths(tuple(gauges), ends - length, ends, values, step=step, zone=zone)


def storm_totals(gauges: str, depth: npt.ArrayLike, *names: str) -> RainRecord:
    """Storm totals without times."""
    never = np.full(len(names), "NaT", dtype="datetime64[s]")
    plain = RainRecord.from_depths(tuple(gauges), never, never, depth, step="storm")
    return replace(plain, labels=names, recorders=frozenset())


def complaints(*records: RainRecord, gauges: GaugeNetwork, **options: Any) -> list[str]:  # noqa: ANN401 - any option
    """Return the lines of the DataError."""
    with pytest.raises(DataError) as caught:
        bring_to_step(records, gauges, **options)
    return str(caught.value).splitlines()


# one daily gauge beside a recorder


@pytest.mark.parametrize(
    ("options", "expected"),
    [
        ({"read_hour": "08:00", "date_means": "ends"}, {"2031-06-04T20:00": 16.0, "2031-06-05T02:00": 32.0}),
        ({}, {"2031-06-05T02:00": 38.4, "2031-06-05T12:00": 9.6}),
        ({"read_hour": "08:00", "date_means": "starts"}, {"2031-06-05T12:00": 48.0}),
    ],
)
def test_daily_gauge_beside_a_recorder(tmp_path: Path, options: dict[str, Any], expected: dict[str, float]) -> None:
    """12, 24 and 6 mm of a recorder give 48 mm of a daily gauge their pattern, by what its date means."""
    caught = {"2031-06-04T20:00": 12, "2031-06-05T02:00": 24, "2031-06-05T12:00": 6}
    hours = [str(START + np.timedelta64(k, "h"))[:16] for k in range(1, 73)]
    recorder = read(tmp_path, "time,R\n" + "".join(f"{hour},{caught.get(hour, 0)}\n" for hour in hours))
    daily = read(tmp_path, "date,D\n2031-06-05,48\n", interval="1d", **options)
    result, notes = bring_to_step([recorder, daily], network("D", "R"))
    wet = result.depth[:, 0] > 0
    found = dict(zip([end for _, end in times(result)], result.depth[:, 0], strict=True))
    assert {end: mm for end, mm in found.items() if mm > 0} == pytest.approx(expected, rel=1e-14)
    assert {labels(result)[row][0] for row in np.flatnonzero(wet)} == {"spread"}
    assert (result.step, result.recorders, notes) == ("1h", frozenset({"R"}), ())
    assert result.day_phase == (28800 if options else 0)
    assert [total.depth for total in result.totals] == [48.0]


def test_axis_covers_all_sources() -> None:
    """A day that sticks out beyond the recorder extends the axis; the recorder is missing there."""
    recorder = record("R", np.ones(12))
    daily = record("D", [24.0], "1d")
    result, notes = bring_to_step([recorder, daily], network("R", "D"))
    assert len(result) == 24
    assert labels(result)[12] == ["missing", "spread"]
    assert result.depth[:, 1].sum() == pytest.approx(24.0, abs=1e-9)
    assert [note.code for note in notes] == ["spread-evenly"]


def test_zero_and_missing_days() -> None:
    """A day of zero is zero at every step, a missing one missing; neither is spread."""
    result, notes = bring_to_step([record("R", np.ones(48)), record("D", [0.0, np.nan], "1d")], network("R", "D"))
    assert {row[1] for row in labels(result)[:24]} == {"zero"}
    assert {row[1] for row in labels(result)[24:]} == {"missing"}
    assert (notes, result.totals) == ((), ())


def test_no_recorder_at_all() -> None:
    """Daily gauges at an hourly step have no pattern: spread evenly, and said so for each."""
    result, notes = bring_to_step([record("AB", [[24, 48]], "1d")], network("A", "B"), common="1h")
    np.testing.assert_allclose(result.depth, [[1.0, 2.0]] * 24)
    assert [(note.code, note.gauge) for note in notes] == [("spread-evenly", "A"), ("spread-evenly", "B")]
    assert result.recorders == frozenset()


def test_months_over_days() -> None:
    """A monthly total is spread over the days of its month."""
    month = np.array(["2031-05-01", "2031-06-01"], dtype="datetime64[s]")
    monthly = RainRecord.from_depths(("M",), month[:1], month[1:], [[62.0]], step="1mo")
    daily = record("D", np.r_[2.0, 0.0, np.full(29, 1.0)], "1d", start="2031-05-01")
    result, _ = bring_to_step([daily, monthly], network("D", "M"))
    np.testing.assert_allclose(result.depth[:3, 1], [4.0, 0.0, 2.0])
    assert result.depth[:, 1].sum() == pytest.approx(62.0, abs=1e-9)


def test_accumulation_of_a_recorder(tmp_path: Path) -> None:
    """An accumulated value is spread like a reading, in its neighbour's pattern: 10, 0, 20 makes 45 into 15, 0, 30."""
    text = "date,A,B\n2031-05-01,1,1\n2031-05-02,,10\n2031-05-03,,0\n2031-05-04,45A,20\n"
    result, notes = bring_to_step([read(tmp_path, text, interval="1d", accumulated="A")], network("A", "B"))
    np.testing.assert_allclose(result.depth[:, 0], [1, 15, 0, 30], rtol=1e-12)
    assert ([row[0] for row in labels(result)], notes) == (["observed", "spread", "spread", "spread"], ())


# several sources


def test_finer_sources_are_summed() -> None:
    """Four quarter hours make an hour at the step of the coarser recorder, where it is the common one."""
    quarter = record("Q", [1, 2, 3, 4, 0, 0, np.nan, 0], "15min")
    result, _ = bring_to_step([quarter, record("H", [5, 6])], network("H", "Q"), common="1h")
    np.testing.assert_array_equal(result.depth, [[5, 10], [6, np.nan]])
    assert result.recorders == {"H", "Q"}


def test_finest_is_the_default() -> None:
    """Without a common step it is the finest source's."""
    result, _ = bring_to_step([record("H", [4.0]), record("Q", [1, 0, 0, 1], "15min")], network("H", "Q"))
    assert (result.step, result.depth[:, 0].tolist()) == ("15min", [2.0, 0.0, 0.0, 2.0])


def test_columns_in_the_networks_order() -> None:
    """Columns are the network's, whatever order the sources have."""
    result, _ = bring_to_step([record("CA", [[3, 1]]), record("B", [2])], network("A", "B", "C"))
    assert (result.gauges, result.depth.tolist()) == (("A", "B", "C"), [[1.0, 2.0, 3.0]])


def test_a_gauge_in_two_sources() -> None:
    """Values of one gauge in two sources are joined where they do not overlap; one may fill the other's gaps."""
    first, second = record("A", [1, 2, np.nan]), record("A", [9, 3, 4], start="2031-06-04T02:00")
    result, _ = bring_to_step([first, second], network("A"))
    assert result.depth[:, 0].tolist() == [1, 2, 9, 3, 4]


def test_a_gauge_in_two_sources_at_one_time() -> None:
    """Two values of one gauge at one time are refused: gauge, time, both sources."""
    found = complaints(record("A", np.ones(24)), record("A", [24.0], "1d"), gauges=network("A"))
    assert found == [
        (
            "gauge A: found values in source 1 (1h) and in source 2 (1d) for 24 of the same steps, the first ending at "
            "2031-06-04T01:00:00; expected one source for a gauge and time; remove it from one of them"
        )
    ]


def test_clocks_are_brought_together() -> None:
    """All sources come to the first one's clock: 01:00 UTC is 03:00 at +02:00."""
    utc = record("B", [7.0], zone="+00:00")
    result, _ = bring_to_step([record("A", [1, 2, 3], zone="+02:00"), utc], network("A", "B"))
    assert (result.zone, result.depth[2].tolist()) == ("+02:00", [3.0, 7.0])


def test_grid_phase_of_the_first_source() -> None:
    """The first source that has the common step sets the bounds: hours end at half past, days at the reading hour."""
    half = record("A", [1, 2], start="2031-06-04T00:30")
    result, _ = bring_to_step(
        [half, record("B", [1] * 12, "10min", start="2031-06-04T00:30")], network("A", "B"), common="1h"
    )
    assert (times(result)[0], result.depth[:, 1].tolist()) == (("2031-06-04T00:30", "2031-06-04T01:30"), [6.0, 6.0])
    morning = record("D", [5.0], "1d", start="2031-06-04T08:00")
    result, _ = bring_to_step([record("A", np.ones(48)), morning], network("A", "D"), common="1d")
    assert result.day_phase == 28800
    np.testing.assert_array_equal(result.depth, [[np.nan, np.nan], [24, 5], [np.nan, np.nan]])


def test_grid_phase_without_a_source_of_the_step() -> None:
    """Without a source of the common step, bounds count from midnight."""
    result, _ = bring_to_step([record("A", np.ones(10), start="2031-06-04T02:00")], network("A"), common="6h")
    assert times(result) == [("2031-06-04T00:00", "2031-06-04T06:00"), ("2031-06-04T06:00", "2031-06-04T12:00")]
    np.testing.assert_array_equal(result.depth[:, 0], [np.nan, 6.0])


def test_mixed_reading_hours() -> None:
    """Daily gauges read at different hours are warned of, by hour; the record's day is the calendar day."""
    sources = [
        record("R", np.ones(72)),
        record("AB", [[1, 1]], "1d", start="2031-06-04T07:00"),
        record("C", [1.0], "1d", start="2031-06-04T08:00"),
    ]
    result, notes = bring_to_step(sources, network("A", "B", "C", "R"))
    assert result.day_phase == 0
    assert [(note.code, note.level, note.text) for note in notes] == [
        (
            "mixed-reading-hours",
            "warning",
            "Daily gauges are read at different hours: 07:00 A, B; 08:00 C. Days are taken from midnight to midnight.",
        )
    ]
    result, notes = bring_to_step(sources[:2], network("A", "B", "R"))
    assert (result.day_phase, notes) == (7 * 3600, ())


# what cannot be brought together


def test_gauges_without_rain_and_rain_without_gauge() -> None:
    """Rain of unknown gauges and gauges without rain are listed together, near names named."""
    rain = record("A", [1.0])
    rain = replace(rain, gauges=("W-01",), recorders=frozenset({"W-01"}))
    assert complaints(rain, gauges=network("W01", "X")) == [
        (
            "gauge W-01: found rain values, but no such gauge in the network; expected a gauge with a position; add it "
            "to the gauges, or correct its id in the rainfall file; did you mean 'W01'?"
        ),
        (
            "gauge W01: found no rain values in any source; expected a column or rows of its own, if only of missing "
            "values; add them, or exclude the gauge; did you mean 'W-01'?"
        ),
        (
            "gauge X: found no rain values in any source; expected a column or rows of its own, if only of missing "
            "values; add them, or exclude the gauge"
        ),
    ]


def test_zones_given_and_not_given() -> None:
    """A source with a zone beside one without is refused."""
    assert complaints(record("A", [1.0], zone="+02:00"), record("B", [1.0]), gauges=network("A", "B")) == [
        (
            "time zones: found +02:00 for source 1 (1h), no zone for source 2 (1h); expected a zone for every "
            "source, or for none; declare timezone for each"
        )
    ]


def test_sources_are_called_by_their_files() -> None:
    """Messages name the file of a source beside its number."""
    with pytest.raises(
        DataError, match=r"found \+02:00 for source 1 \(1h, a\.csv\), no zone for source 2 \(1h, b\.csv\)"
    ):
        bring_to_step(
            [record("A", [1.0], zone="+02:00"), record("B", [1.0])], network("A", "B"), names=["a.csv", "b.csv"]
        )


def test_notes_of_the_sources() -> None:
    """What the reading of every source had to remark comes once, without that of gauges that are left out."""
    told = [Note(code="x", text=f"Gauge {gauge}.", gauge=gauge) for gauge in "ABC"] + [Note(code="y", text="All.")]
    sources = [replace(record("AB", [[1, 1]]), notes=tuple(told[:2])), replace(record("C", [1]), notes=tuple(told[2:]))]
    result, notes = bring_to_step(sources, network("A", "C"), exclude=["B"])
    assert (notes, result.notes) == ((told[0], told[2], told[3]), ())
    totals = replace(storm_totals("C", [[8]], "May"), notes=(told[2],))
    assert bring_to_step([totals], network("C"))[1] == (told[2],)


def test_steps_that_do_not_fit() -> None:
    """A step that neither divides nor is a multiple of the common one is refused, with one that would fit."""
    assert complaints(record("A", [1.0], "2h"), record("B", [1.0], "3h"), gauges=network("A", "B")) == [
        (
            "source 2 (3h): found steps of 3h beside the common step 2h; expected a common step that divides it or "
            "is a multiple of it; set [step] common to one that fits every source, such as '1h'"
        )
    ]


@pytest.mark.parametrize(
    ("start", "common", "fits"),
    [("2031-06-04T08:30", "1h", "30min"), ("2031-06-04T08:00", "1d", "8h"), ("2031-06-04T08:01", "1h", "1min")],
)
def test_intervals_off_the_bounds(start: str, common: str, fits: str) -> None:
    """A day read at another time than the common steps end is refused, with a step that fits; and that step works."""
    sources = [
        record("R", np.ones(48), common) if common == "1h" else record("R", [1.0, 1.0], "1d"),
        record("D", [9.0], "1d", start=start),
    ]
    gauges = network("R", "D")
    [line] = complaints(*sources, gauges=gauges)
    assert line.startswith(
        f"source 2 (1d): found an interval from {start}:00 to 2031-06-05T{start[11:]}:00; expected intervals that "
    )
    assert line.endswith(f"set [step] common = '{fits}', or correct the source's times")
    result, _ = bring_to_step(sources, gauges, common=fits)
    assert np.nansum(result.depth[:, 1]) == pytest.approx(9.0, abs=1e-9)


def test_unknown_common_step() -> None:
    """A common step that is none is refused, and so is a job without rain."""
    with pytest.raises(JobError, match=r"^\[step\] common: found 'hourly'; expected a number with min, h or d, or 1mo"):
        bring_to_step([record("A", [1.0])], network("A"), common="hourly")
    with pytest.raises(JobError, match=r"^rainfall: found no source; expected at least one$"):
        bring_to_step([], network("A"))


# times of service


def test_out_of_service() -> None:
    """Outside its time of service a gauge is not installed; values there are not used, and said so; it is no gap."""
    gauges = network("A", "B", opened=["2031-06-04T02:00", "NaT"], closed=["NaT", "2031-06-04T03:00"])
    result, notes = bring_to_step([record("AB", [[np.nan, 1.0], [5.0, 1.0], [1.0, 1.0], [1.0, np.nan]])], gauges)
    assert labels(result) == [
        ["not installed", "observed"],
        ["not installed", "observed"],
        ["observed", "observed"],
        ["observed", "not installed"],
    ]
    assert [(note.code, note.gauge, note.text) for note in notes] == [
        (
            "value-out-of-service",
            "A",
            (
                "Gauge A has values for 1 steps outside its time of service, the first ending at 2031-06-04T02:00:00; "
                "they are not used."
            ),
        )
    ]


def test_total_that_reaches_out_of_service() -> None:
    """A daily total that reaches outside the gauge's time of service is not used: its steps in service are missing."""
    gauges = network("R", "D", opened=["NaT", "2031-06-04T12:00"])
    result, notes = bring_to_step([record("R", np.ones(48)), record("D", [24.0, 48.0], "1d")], gauges)
    assert [row[1] for row in labels(result)] == ["not installed"] * 12 + ["missing"] * 12 + ["spread"] * 24
    assert [total.depth for total in result.totals] == [48.0]
    assert [note.code for note in notes] == ["value-out-of-service"]


# storm totals


def test_storm_totals_alone() -> None:
    """Totals-only sources alone stay storm totals."""
    result, notes = bring_to_step(
        [storm_totals("A", [[1], [2]], "May", "June"), storm_totals("B", [[3]], "June")], network("A", "B")
    )
    assert (result.step, result.labels, notes) == ("storm", ("May", "June"), ())
    np.testing.assert_array_equal(result.depth, [[1, np.nan], [2, 3]])


def test_storm_totals_beside_a_recorder() -> None:
    """With the storms' times, totals are spread over them, in any order of the storms."""
    bounds = [START + np.timedelta64(k, "h") for k in (0, 2, 4)]
    result, _ = bring_to_step(
        [record("R", [1, 3, 1, 1]), storm_totals("S", [[8], [20]], "late", "early")],
        network("R", "S"),
        storm_times={"early": (bounds[0], bounds[1]), "late": (bounds[1], bounds[2])},
    )
    np.testing.assert_allclose(result.depth[:, 1], [5.0, 15.0, 4.0, 4.0])


def test_storm_totals_without_times() -> None:
    """Without the storms' times, totals beside a recorder are refused."""
    with pytest.raises(
        JobError, match=r"^storm May: found totals in source 2 \(storm\), but no start and end; expected a \["
    ):
        bring_to_step([record("R", [1.0]), storm_totals("S", [[8]], "May")], network("R", "S"))


# laws


@settings(deadline=None)
@given(networks(at_least=2, at_most=8), st.data())
def test_totals_are_kept(gauges: GaugeNetwork, data: st.DataObject) -> None:
    """Whatever gauges are daily and whatever falls, every daily total is kept to 1e-9 mm; recorders are untouched."""
    n = len(gauges)
    split = data.draw(st.integers(1, n - 1))
    rain = st.one_of(st.just(0.0), st.just(np.nan), st.floats(0.01, 100))
    hourly = np.array(data.draw(st.lists(rain, min_size=48 * split, max_size=48 * split))).reshape(48, split)
    daily = np.array(data.draw(st.lists(rain, min_size=2 * (n - split), max_size=2 * (n - split)))).reshape(
        2, n - split
    )
    fine = replace(record("A" * split, hourly), gauges=gauges.ids[:split])
    coarse = replace(record("A" * (n - split), daily, "1d"), gauges=gauges.ids[split:])
    result, _ = bring_to_step([coarse, fine], gauges, common="1h")
    np.testing.assert_array_equal(result.depth[:, :split], hourly)
    np.testing.assert_allclose(result.depth[:, split:].reshape(2, 24, -1).sum(axis=1), daily, atol=1e-9, rtol=0)
    assert (np.isnan(result.depth) == np.isin(result.status, [int(Status.MISSING)])).all()


@settings(deadline=None)
@given(networks(at_least=1, at_most=5), st.sampled_from(["2h", "3h", "1d"]), st.data())
def test_summing_loses_nothing(gauges: GaugeNetwork, common: str, data: st.DataObject) -> None:
    """Complete days hold the same rain at every common step."""
    n = len(gauges)
    depth = np.array(data.draw(st.lists(st.floats(0, 100), min_size=48 * n, max_size=48 * n))).reshape(48, n)
    result, _ = bring_to_step([replace(record("A" * n, depth), gauges=gauges.ids)], gauges, common=common)
    np.testing.assert_allclose(result.depth.sum(axis=0), depth.sum(axis=0), rtol=1e-12, atol=1e-12)

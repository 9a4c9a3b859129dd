"""Every warning of the package appears where it should, and not where it should not."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely

from basinrain.averaging import averaging_method
from basinrain.basin_depths import average_storm
from basinrain.basins import Basins
from basinrain.cautions import network_cautions, record_cautions, screening_cautions, storm_cautions
from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, complete
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.screening import Finding, Screening
from basinrain.storms import Storm

NAN = float("nan")


def square(side: float = 10e3, **more: npt.NDArray[np.float64]) -> Basins:
    return Basins(ids=("all",), polygons=np.array([shapely.box(0, 0, side, side)]), crs="local", **more)


def at(*places: tuple[float, float], elevation: list[float] | None = None) -> GaugeNetwork:
    x, y = np.array(places, dtype=float).T
    ids = tuple("ABCDEFG"[: len(places)])
    return GaugeNetwork(ids=ids, x=x, y=y, crs="local", elevation=np.array(elevation or []))


def codes(network: GaugeNetwork, basins: Basins) -> list[str]:
    return [note.code for note in network_cautions(network, basins)]


def test_gauges_inside() -> None:
    """Two inside raise nothing; one is named; none is named; a gauge on the boundary is inside."""
    assert codes(at((2e3, 2e3), (8e3, 8e3)), square()) == []
    assert codes(at((2e3, 2e3), (18e3, 8e3)), square()) == ["one-gauge-inside"]
    assert codes(at((10e3, 5e3), (18e3, 8e3)), square()) == ["one-gauge-inside"]
    assert codes(at((12e3, 5e3), (18e3, 8e3)), square()) == ["no-gauge-inside"]


def test_far_gauge() -> None:
    """The nearest gauge 15.5 km from the centre of a 100 km² basin is farther than 10 km: said with both figures."""
    notes = list(network_cautions(at((20.5e3, 5e3), (30e3, 5e3)), square()))
    assert [note.code for note in notes] == ["no-gauge-inside", "far-gauge"]
    assert "A, is 15.5 km away, farther than the square root of the basin's area (10.0 km)" in notes[1].text


def test_elevations_missing_the_basins_range() -> None:
    """Gauges at 100 and 240 m in a basin from 100 to 900 m leave the half above 500 m empty; 520 m would do."""
    range_known = square(elevations=np.array([[100.0, 900.0]]))
    places = ((2e3, 2e3), (8e3, 8e3))
    notes = list(network_cautions(at(*places, elevation=[100.0, 240.0]), range_known))
    assert [note.code for note in notes] == ["elevation-missed"]
    assert (
        "from 100 to 900 m, its gauges from 100 to 240 m: the half of its range above 500 m has no gauge"
        in notes[0].text
    )
    assert codes(at(*places, elevation=[100.0, 520.0]), range_known) == []
    assert codes(at(*places, elevation=[700.0, 820.0]), range_known) == ["elevation-missed"]
    assert codes(at(*places, elevation=[100.0, 240.0]), square()) == []
    assert codes(at(*places, elevation=[NAN, NAN]), range_known) == []


def record_of(depth: list[list[float]], network: GaugeNetwork) -> RainRecord:
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, len(depth) + 1) * np.timedelta64(3600, "s")
    return RainRecord.from_depths(network.ids, ends - 3600, ends, depth, step="1h")


def test_network_that_changes() -> None:
    """A gauge out of service for part of the record is named."""
    network = at((2e3, 2e3), (8e3, 8e3))
    record = record_of([[1, NAN], [1, 2]], network)
    status = record.status.copy()
    status[0, 1] = Status.NOT_INSTALLED
    changed = RainRecord(record.gauges, record.starts, record.ends, record.depth, status, step="1h")
    assert list(record_cautions(record)) == []
    (note,) = record_cautions(changed)
    assert (note.code, "B not in service throughout" in note.text) == ("network-changed", True)


def storm_notes(
    depth: list[list[float]], network: GaugeNetwork, methods: tuple[str, ...], depth_unit: str = "mm"
) -> list[Note]:
    completed = complete(
        record_of(depth, network), network, InfillOptions(method="station-average", scale="step", min_donors=1)
    )
    basins = square()
    depths = {m: average_storm(completed, averaging_method(m)(network, basins)) for m in methods}
    return list(storm_cautions("Q", network, basins, depths, depth_unit=depth_unit))


def test_one_gauge_over_half_of_the_weight() -> None:
    """A gauge at 2 km and one at 12 km share a 10 km square as 70 to 30: the first dominates."""
    (note,) = storm_notes([[5, 5]], at((2e3, 5e3), (12e3, 5e3)), ("thiessen",))
    assert (note.code, note.gauge, note.basin) == ("one-gauge-dominates", "A", "all")
    assert note.text == "Gauge A has over half of the weight in basin all: 70 % by thiessen."
    assert storm_notes([[5, 5]], at((2.5e3, 5e3), (7.5e3, 5e3)), ("thiessen",)) == []


def test_much_of_the_mean_on_infilled_values() -> None:
    """One of two gauges silent at one of two equal steps: 25 % infilled, which is not over; at both: 50 %, which is."""
    network = at((2.5e3, 5e3), (7.5e3, 5e3))
    assert storm_notes([[5, 5], [5, NAN]], network, ("thiessen",)) == []
    (note,) = storm_notes([[5, NAN], [5, NAN]], network, ("thiessen",))
    assert (note.code, "50 % by thiessen" in note.text) == ("much-infilled", True)
    assert note.text == "Much of the mean of basin all rests on infilled values: 50 % by thiessen."


def test_methods_apart() -> None:
    """Arithmetic 20, Thiessen .6·10 + .4·30 = 18: 2 mm or 11 % of 19 apart. Equal depths are not apart."""
    network = at((2e3, 5e3), (10e3, 5e3))
    notes = storm_notes([[10, 30]], network, ("arithmetic", "thiessen"))
    apart = [note for note in notes if note.code == "methods-apart"]
    assert [note.text for note in apart] == ["The methods give basin all from 18.0 to 20.0 mm, 2.0 mm or 11 % apart."]
    inches = [
        n.text for n in storm_notes([[10, 30]], network, ("arithmetic", "thiessen"), "in") if n.code == "methods-apart"
    ]
    assert inches == ["The methods give basin all from 0.71 to 0.79 in, 0.08 in or 11 % apart."]
    assert "methods-apart" not in [n.code for n in storm_notes([[9, 9]], network, ("arithmetic", "thiessen"))]


def test_weights_rebuilt_is_said() -> None:
    """A step at which a gauge stays without a value is counted."""
    network = at((2.5e3, 5e3), (7.5e3, 5e3))
    completed = complete(
        record_of([[5, 5], [5, NAN]], network),
        network,
        InfillOptions(method="station-average", scale="step", min_donors=2),
    )
    depths = average_storm(completed, averaging_method("thiessen")(network, square()))
    notes = list(storm_cautions("Q", network, square(), {"thiessen": depths}))
    assert [note.code for note in notes] == ["weights-rebuilt"]
    assert notes[0].text.startswith("Gauges without a value even after infill (steps): B (1); where others have")


def test_a_basin_without_a_number_raises_no_false_warning() -> None:
    """The arithmetic mean without a gauge inside has no number; nothing is said of its weights."""
    network = at((12e3, 5e3), (18e3, 5e3))
    assert [n.code for n in storm_notes([[5, 5]], network, ("arithmetic",))] == []
    assert pytest.approx(1.0) == averaging_method("thiessen")(network, square())(np.array([True, True])).weights.sum()


def test_open_findings_warn_of_the_storms_that_they_touch() -> None:
    """What is settled, a remark, or beside the storm is no warning; what touches it by an hour is."""
    hour = np.datetime64("2031-05-04", "s") + np.arange(30) * np.timedelta64(3600, "s")

    def found(gauge: str, first: int, last: int, **more: str) -> Finding:
        times = {"start": hour[first], "end": hour[last]} if last else {}
        return Finding(check="zero-run", gauge=gauge, evidence="No rain.", action="Look.", **times, **more)  # type: ignore[arg-type]

    findings = (
        found("A", 0, 10),
        found("B", 9, 11),
        found("C", 20, 25),
        found("D", 12, 14, state="accepted"),
        found("E", 12, 14, severity="remark"),
        found("F", 0, 0),
    )
    storm = Storm("Quill", 10, 20, hour[10], hour[20])
    notes = list(screening_cautions(Screening(findings=findings), [storm]))
    assert [(note.code, note.gauge, note.level) for note in notes] == [
        ("screening", "B", "warning"),
        ("screening", "F", "warning"),
        ("screening-elsewhere", "", "info"),
    ]
    assert notes[-1].text.startswith("Screening found 2 other doubtful or erroneous stretches")
    assert list(screening_cautions(Screening(findings=findings[3:5]), [storm])) == []

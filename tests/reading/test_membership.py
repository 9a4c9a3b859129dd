"""Gauges of the sources and gauges of the network."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from rainfiles import labels, read

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.reading.membership import check_membership, without_gauges
from basinrain.reading.step import bring_to_step


def network(*ids: str) -> GaugeNetwork:
    return GaugeNetwork(ids=ids, x=np.arange(0, 1000.0 * len(ids), 1000.0), y=np.zeros(len(ids)), crs="local")


def rain(*gauges: str, zone: str = "") -> RainRecord:
    """Return 1 mm of one hour at every gauge."""
    ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    starts = np.array(["2031-05-04T00"], dtype="datetime64[s]")
    return RainRecord.from_depths(gauges, starts, ends, np.ones((1, len(gauges))), step="1h", zone=zone)


def advice(rain_gauges: tuple[str, ...], gauges: tuple[str, ...]) -> dict[str, str]:
    """Return which gauge each unmatched one is said to have meant."""
    with pytest.raises(DataError, match=r"expected a") as caught:
        check_membership([rain(*rain_gauges)], network(*gauges))
    return {problem.gauge: problem.remedy.partition("did you mean ")[2] for problem in caught.value.problems}


@pytest.mark.parametrize(
    ("layout", "text"),
    [
        ("wide", "time,A,B,C\n2031-05-04 01:00,1,7,3\n2031-05-04 02:00,2,8,4\n"),
        (
            "long",
            (
                "gauge,time,depth\nB,2031-05-04 01:00,7\nB,2031-05-04 02:00,8\nA,2031-05-04 01:00,1\n"
                "A,2031-05-04 02:00,2\nC,2031-05-04 01:00,3\nC,2031-05-04 02:00,4\n"
            ),
        ),
    ],
)
def test_excluded_gauges_of_a_file_do_not_matter(tmp_path: Path, layout: str, text: str) -> None:
    """A gauge that the job excludes may have a column, or rows, beside the others'."""
    source = read(tmp_path, text, layout=layout)
    result, _ = bring_to_step([source], network("C", "A"), exclude=["B", "Z"])
    assert (result.gauges, result.recorders) == (("C", "A"), frozenset({"A", "C"}))
    np.testing.assert_array_equal(result.depth, [[3, 1], [4, 2]])
    with pytest.raises(DataError, match=r"^gauge B: found rain values, but no such gauge in the network;"):
        bring_to_step([source], network("C", "A"))


def test_totals_of_excluded_gauges_go_with_them(tmp_path: Path) -> None:
    """An accumulation of an excluded gauge is not spread."""
    text = "time,A,B\n2031-05-04 01:00,1,0\n2031-05-04 02:00,2,\n2031-05-04 03:00,2,9S\n"
    source = read(tmp_path, text, accumulated="S")
    result, notes = bring_to_step([source], network("A"), exclude=("B",))
    assert (labels(result), result.totals, notes) == ([["observed"]] * 3, (), ())


def test_a_source_of_excluded_gauges_only_is_no_source() -> None:
    """It gives neither the clock nor a clash of clocks, and the other sources keep their number in messages."""
    left = without_gauges({1: rain("A"), 2: rain("B", zone="+02:00"), 3: rain("C", "A")}, {"A"})
    assert {number: record.gauges for number, record in left.items()} == {2: ("B",), 3: ("C",)}
    assert left[3].recorders == frozenset({"C"})
    result, _ = bring_to_step([rain("A"), rain("B", zone="+02:00")], network("B"), exclude=["A"])
    assert (result.gauges, result.zone) == (("B",), "+02:00")
    with pytest.raises(DataError, match=r"^gauge B: found values in source 2 \(1h\) and in source 3 \(1h\) for 1 of"):
        bring_to_step([rain("A"), rain("B"), rain("B")], network("B"), exclude=["A"])


def test_all_gauges_excluded_from_the_rain() -> None:
    """Nothing left is not taken for nothing wrong."""
    with pytest.raises(DataError, match=r"^gauge B: found no rain values in any source;"):
        bring_to_step([rain("A")], network("B"), exclude=["A"])


@pytest.mark.parametrize(
    ("rain_gauges", "gauges", "meant"),
    [
        # R12 is as near by its letters, but has rain of its own.
        (("R1", "R12"), ("R01", "R12"), {"R1": "'R01'?", "R01": "'R1'?"}),
        (("R1",), ("R12", "R01"), {"R1": "'R01'?", "R12": "'R1'?", "R01": "'R1'?"}),
        (("r07 ",), ("R7",), {"r07 ": "'R7'?", "R7": "'r07 '?"}),
        (("R10",), ("R100", "r010"), {"R10": "'r010'?", "R100": "'R10'?", "r010": "'R10'?"}),
        (("W01", "W-01"), ("W01",), {"W-01": "'W01'?"}),
        (("Alder",), ("Zinc",), {"Alder": "", "Zinc": ""}),
    ],
)
def test_the_gauge_that_was_meant(rain_gauges: tuple[str, ...], gauges: tuple[str, ...], meant: dict[str, str]) -> None:
    """Advice goes first to a gauge without a partner, and to one that differs in capitals or leading zeros only."""
    assert advice(rain_gauges, gauges) == meant

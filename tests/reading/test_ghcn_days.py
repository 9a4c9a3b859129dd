"""Daily values and totals of several days of GHCN-Daily stations."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from ghcnfiles import ONE, TWO, block_of, days, faults_of, month, record_of

from basinrain.reading.ghcn_days import ELEMENTS, MISSING


def spans(*lines: str, folder: Path) -> list[tuple[str, int]]:
    """Return the last date and the days of every total over several days."""
    block = block_of(folder, *lines)
    return [(str(end - np.timedelta64(1, "D"))[:10], n) for (_, end), n in block.spans.items()]


def test_constants_of_the_format() -> None:
    """The elements are those of the published table that hold precipitation, and the missing value is its."""
    text = (Path(__file__).parent.parent / "data" / "published" / "ghcn_daily_flags.csv").read_text(encoding="utf-8")
    assert all(f"\nELEMENT,{element}," in text for element in ELEMENTS)
    assert f"\nMISSING,{MISSING}," in text


def test_days_between_first_and_last(tmp_path: Path) -> None:
    """The block goes from the first value to the last; what no line holds between them is missing and no gap."""
    block = block_of(tmp_path, month("PRCP", {30: "10"}), month("PRCP", {2: "20"}, when="203107"))
    assert [str(end)[:10] for end in block.ends[[0, -1]]] == ["2031-05-31", "2031-07-03"]
    assert np.flatnonzero(~np.isnan(block.depth[:, 0])).tolist() == [0, 33]
    assert block.lines[[0, 1, 2, -1]].tolist() == [1, 1, 0, 2]
    assert block.present is not None
    assert block.present.all()


def test_a_gauge_is_present_from_its_first_day_to_its_last(tmp_path: Path) -> None:
    """Before a station's first line and after its last one the file says nothing of it."""
    lines = [
        month("PRCP", {10: "1"}),
        month("PRCP", {10: "1"}, when="203107"),
        month("PRCP", {1: "1"}, station=TWO, when="203106"),
    ]
    block = block_of(tmp_path, *lines)
    assert block.present is not None
    assert block.present.sum(axis=0).tolist() == [62, 30]
    assert str(block.ends[block.present[:, 1]][0])[:10] == "2031-06-02"


def test_no_value_at_all(tmp_path: Path) -> None:
    """A station that never reported is missing on every day of its lines."""
    block = block_of(tmp_path, month("PRCP", {}, when="203106"))
    assert block.depth.shape == (30, 1)
    assert np.isnan(block.depth).all()


def test_total_with_its_days(tmp_path: Path) -> None:
    """MDPR with DAPR 3 is a total over its own day and the two before it."""
    lines = [month("PRCP", {2: "0", 7: "5"}), month("MDPR", {5: "450"}), month("DAPR", {5: "3"})]
    [total] = record_of(block_of(tmp_path, *lines)).totals
    assert (total.gauge, str(total.start), str(total.end), total.depth) == (
        ONE, "2031-05-03T00:00:00", "2031-05-06T00:00:00", 45.0
    )  # fmt: skip


def test_total_before_the_first_day(tmp_path: Path) -> None:
    """A total that stands first in the file has its days all the same, also those of the month before."""
    lines = [month("MDPR", {2: "450"}), month("DAPR", {2: "4"})]
    block = block_of(tmp_path, *lines)
    assert (str(block.ends[0])[:10], len(block.ends)) == ("2031-04-30", 4)
    [total] = record_of(block).totals
    assert (str(total.start), str(total.end)) == ("2031-04-29T00:00:00", "2031-05-03T00:00:00")


def test_total_of_one_day(tmp_path: Path) -> None:
    """MDPR with DAPR 1 is the value of its day, with its flag."""
    lines = [month("MDPR", {5: "450", 6: "0", 7: "0T"}), month("DAPR", {5: "1", 6: "1", 7: "1"})]
    block = block_of(tmp_path, *lines)
    assert (days(block), block.spans) == ({5: (45.0, "observed"), 6: (0.0, "zero"), 7: (0.0, "trace")}, {})


def test_trace_over_days(tmp_path: Path) -> None:
    """A trace over three days is a total of 0 over them."""
    lines = [month("PRCP", {2: "4"}), month("MDPR", {5: "0T"}), month("DAPR", {5: "3"})]
    [total] = record_of(block_of(tmp_path, *lines)).totals
    assert total.depth == 0.0


@pytest.mark.parametrize(
    ("prcp", "expected"),
    [
        ({2: "0"}, [("2031-05-05", 3)]),  # back to the value of the 2nd
        ({2: "7 G"}, [("2031-05-05", 3)]),  # the gauge was read, though the value failed
        ({1: "0", 2: "0", 3: "0"}, [("2031-05-05", 2)]),
    ],
)
def test_total_without_its_days(tmp_path: Path, prcp: dict[int, str], expected: list[tuple[str, int]]) -> None:
    """MDPR without DAPR is a total over the missing days directly before it and its own."""
    assert spans(month("PRCP", prcp), month("MDPR", {5: "450"}), folder=tmp_path) == expected


def test_total_after_a_total(tmp_path: Path) -> None:
    """Two totals without DAPR follow each other: the second one begins where the first one ends."""
    found = spans(month("PRCP", {1: "0"}), month("MDPR", {4: "450", 9: "30"}), folder=tmp_path)
    assert found == [("2031-05-04", 3), ("2031-05-09", 5)]


@pytest.mark.parametrize(
    "lines",
    [
        [month("MDPR", {5: "450"})],  # nothing before it
        [month("PRCP", {4: "0"}), month("MDPR", {5: "450"})],  # the day before is known, so that it is no such total
        [month("PRCP", {3: "0"}, when="203104"), month("MDPR", {5: "450"})],  # 27 days of April and 5 of May
        [month("PRCP", {2: "0"}), month("MDPR", {5: "450"}), month("DAPR", {5: "3 L"})],  # its length failed a check
        [month("PRCP", {2: "0"}), month("MDPR", {5: "450 X"}), month("DAPR", {5: "3"})],  # it failed a check itself
    ],
)
def test_total_over_nobody_knows_how_many_days(tmp_path: Path, lines: list[str]) -> None:
    """A total whose days are not known is rejected, and the days before it stay missing."""
    block = block_of(tmp_path, *lines)
    status = days(block)
    assert (status[5], block.spans) == ((None, "rejected"), {})
    assert np.isfinite(block.depth).sum() == sum("PRCP" in line for line in lines)


def test_thirty_one_days_are_the_most_that_are_assumed(tmp_path: Path) -> None:
    """Without DAPR, 31 days are a total, and 32 are not."""
    total = month("MDPR", {5: "450"})
    assert spans(month("PRCP", {4: "0"}, when="203104"), total, folder=tmp_path) == [("2031-05-05", 31)]
    assert spans(month("PRCP", {3: "0"}, when="203104"), total, folder=tmp_path) == []


@pytest.mark.parametrize("failed", [3, 5])
def test_rejected_value_within_a_total(tmp_path: Path, failed: int) -> None:
    """A daily value that failed a check gives way to the total over its day."""
    lines = [month("PRCP", {2: "0", failed: "99 S"}), month("MDPR", {5: "450"}), month("DAPR", {5: "3"})]
    [total] = record_of(block_of(tmp_path, *lines)).totals
    assert total.depth == 45.0


def test_daily_value_beside_a_rejected_total(tmp_path: Path) -> None:
    """A total that failed a check does not stand against the value of its day."""
    block = block_of(tmp_path, month("PRCP", {5: "20"}), month("MDPR", {5: "450 X"}))
    assert days(block) == {5: (2.0, "observed")}


@pytest.mark.parametrize(
    ("prcp", "mdpr", "dapr", "found"),
    [
        ({2: "0", 4: "0"}, {5: "450"}, {5: "3"}, " of 3 days beside the value of 2031-05-04"),
        ({2: "0", 5: "9"}, {5: "450"}, {5: "3"}, " of 3 days beside the value of 2031-05-05"),
        ({2: "0", 5: "9"}, {5: "450"}, {}, " of 3 days beside the value of 2031-05-05"),
        ({4: "0", 5: "9"}, {5: "450"}, {}, " beside the value of 2031-05-05"),
        ({}, {4: "20", 5: "450"}, {4: "2", 5: "3"}, " of 3 days beside the value of 2031-05-04"),
    ],
)
def test_totals_that_contradict(
    tmp_path: Path, prcp: dict[int, str], mdpr: dict[int, str], dapr: dict[int, str], found: str
) -> None:
    """Another value in the days of a total is a contradiction, which the file must settle."""
    [fault] = faults_of(tmp_path, month("PRCP", prcp), month("MDPR", mdpr), month("DAPR", dapr))
    assert fault == (
        f"2: gauge {ONE}: MDPR of 2031-05-05: found a total{found}; expected no other value in the days of a "
        "total; correct the file, or write -9999 for one of the two"
    )


def test_values_that_cannot_be(tmp_path: Path) -> None:
    """Negative depths, missing codes without their sign and impossible numbers of days are listed together."""
    lines = [
        month("PRCP", {1: "-1", 2: "9999", 3: "-8888 X"}),
        month("MDPR", {5: "9999"}),
        month("DAPR", {5: "0", 6: "367", 7: "0 L"}),
    ]
    code = "expected tenths of mm; it looks like a missing code; if it is one, write -9999"
    assert faults_of(tmp_path, *lines) == [
        (
            f"1: gauge {ONE}: PRCP of 2031-05-01: found '-1'; expected tenths of mm, 0 or more; correct it, or write "
            "-9999 for missing"
        ),
        f"1: gauge {ONE}: PRCP of 2031-05-02: found '9999'; {code}",
        f"2: gauge {ONE}: MDPR of 2031-05-05: found '9999'; {code}",
        f"3: gauge {ONE}: DAPR of 2031-05-05: found '0'; expected a number of days, 1 to 366",
        f"3: gauge {ONE}: DAPR of 2031-05-06: found '367'; expected a number of days, 1 to 366",
    ]

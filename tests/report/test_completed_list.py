from __future__ import annotations

import numpy as np
from report.small_run import make_run

from basinrain.infill import Completed
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.report import limits
from basinrain.report.completed_list import completed_table, left_table
from basinrain.report.words import NARROW_SPACE

COMPLETED = make_run().storms[0].completed


def _plain(row: tuple[str, ...]) -> list[str]:
    return [cell.replace(NARROW_SPACE, " ") for cell in row]


def test_gauges_by_hand() -> None:
    """B: one of six hours, 7 of 12 mm infilled, one estimate. C: all six by one estimate. F: nothing, six left."""
    rows = {row[0]: _plain(row) for row in completed_table(COMPLETED, depth_unit="mm").rows}
    assert rows["A"] == ["A", "6", "6", "0", "0.0 %", "0", "0", "12.0", "0.0 %"]
    assert rows["B"] == ["B", "6", "5", "1", "16.7 %", "1", "0", "12.0", "58.3 %"]
    assert rows["C"] == ["C", "6", "0", "6", "100.0 %", "1", "0", "15.0", "100.0 %"]
    assert rows["F"] == ["F", "6", "0", "0", "0.0 %", "0", "6", "–", "–"]


def test_inches() -> None:
    """12 mm are 0.47 in."""
    assert completed_table(COMPLETED, depth_unit="in").rows[0][7] == "0.47"


def test_what_was_left_is_told_with_the_reason() -> None:
    """The infill's own sentences; other notes are not repeated."""
    notes = (
        Note(code="not-infilled", text="Gauge F stays without a depth: no donor.", gauge="F"),
        Note(code="spread-evenly", text="Spread evenly.", gauge="C"),
    )
    table = left_table(Completed(COMPLETED.record, COMPLETED.estimates, notes))
    assert table is not None
    assert table.rows == [("F", "Gauge F stays without a depth: no donor.")]
    assert left_table(COMPLETED) is None


def test_many_lines_are_shortened() -> None:
    """70 gauges left: 60 lines and a word on the rest; the same for the table of gauges."""
    ids = tuple(f"G{k:02d}" for k in range(70))
    ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    record = RainRecord.from_depths(ids, ends - 3600, ends, np.full((1, 70), np.nan), step="1h")
    notes = tuple(Note(code="not-infilled", text="No donor.", gauge=g) for g in ids)
    completed = Completed(record, (), notes)
    left = left_table(completed)
    assert left is not None
    assert left.notes == ("10 more lines are in record.json.",)
    table = completed_table(completed, depth_unit="mm")
    assert len(table.rows) == limits.GAUGES
    assert "infilled.csv" in table.notes[-1]

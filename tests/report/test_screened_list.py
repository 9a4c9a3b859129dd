from __future__ import annotations

import numpy as np

from basinrain.rainfall import RainRecord, Status
from basinrain.report import limits
from basinrain.report.screened_list import completeness_table, record_facts
from basinrain.report.words import NARROW_SPACE

ENDS = np.datetime64("2031-05-04", "s") + np.arange(1, 6) * np.timedelta64(3600, "s")


def _record(n: int = 2) -> RainRecord:
    """Five hours: A has four values and a gap; B came in the second hour, and one hour was rejected; others are dry."""
    status = np.zeros((5, n), dtype=np.uint8)
    status[2, 0] = Status.MISSING
    if n > 1:
        status[0, 1], status[4, 1] = Status.NOT_INSTALLED, Status.REJECTED
    depth = np.where(status == 0, 1.0, np.nan)
    ids = tuple("AB") if n == 2 else tuple(f"G{k:03d}" for k in range(n))
    return RainRecord(ids, ENDS - np.timedelta64(3600, "s"), ENDS, depth, status, step="1h", zone="+02:00")


def _plain(row: tuple[str, ...]) -> list[str]:
    return [cell.replace(NARROW_SPACE, " ") for cell in row]


def test_the_record_in_short() -> None:
    """Span, step and share of own values: 7 of 10."""
    facts = dict(record_facts(_record()))
    assert facts["Record"] == "2031-05-04 00:00 to 2031-05-04 05:00, UTC+02:00"
    assert facts["Step"] == "1 h; 5 steps"
    assert facts["Own values"].startswith("70.0")


def test_completeness_by_hand() -> None:
    """A: 4 of 5, one missing, 20 %. B: in service for four, three of its own, one rejected."""
    rows = [_plain(row) for row in completeness_table(_record()).rows]
    assert rows[0] == ["A", "2031-05-04 01:00", "2031-05-04 05:00", "5", "4", "1", "0", "0", "20.0 %"]
    assert rows[1] == ["B", "2031-05-04 02:00", "2031-05-04 04:00", "4", "3", "0", "1", "0", "0.0 %"]


def test_a_gauge_never_in_service_has_dashes() -> None:
    """No share of nothing, and no first value."""
    status = np.full((5, 1), Status.NOT_INSTALLED, dtype=np.uint8)
    depth = np.full((5, 1), np.nan)
    record = RainRecord(("A",), ENDS - np.timedelta64(3600, "s"), ENDS, depth, status, step="1h")
    assert completeness_table(record).rows[0] == ("A", "–", "–", "0", "0", "0", "0", "0", "–")


def test_a_large_network_is_shortened_to_the_worst() -> None:
    """Of 100 gauges 60 are listed, those with gaps among them, and the file is named."""
    table = completeness_table(_record(100))
    assert len(table.rows) == limits.GAUGES
    assert {"G000", "G001"} <= {row[0] for row in table.rows}
    assert "All are in completeness.csv." in table.notes[-1]


def test_records_without_times_or_steps() -> None:
    """Storm totals have no span; an empty record says so."""
    nat = np.array(["NaT"], dtype="datetime64[s]")
    status = np.zeros((1, 1), dtype=np.uint8)
    totals = RainRecord(("A",), nat, nat, np.ones((1, 1)), status, step="storm", labels=("Quill",))
    assert ("Record", "1 storm total without times") in record_facts(totals)
    assert ("Record", "no steps") in record_facts(_record().window(0, 0))

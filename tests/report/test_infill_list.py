from __future__ import annotations

import pytest
from report.small_run import make_run

from basinrain.report import limits
from basinrain.report.infill_list import estimate_tables, infilled_shares
from basinrain.report.words import NARROW_SPACE
from basinrain.results import StormRun


def test_every_estimate_with_its_donors(run: StormRun) -> None:
    """B's third hour ends at 09:00; C's is a storm total, which ends nowhere else than the storm."""
    table = estimate_tables(run)[0]
    assert list(table.rows) == [
        ("B", "step", "2031-05-04 09:00", "7.0", "station-average", "A 0.500, D 0.500"),
        ("C", "storm", "–", "15.0", "station-average", "A 0.500, D 0.500"),
    ]


def test_many_estimates_are_summed_by_gauge(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """Beyond the limit there is a line a gauge, and the file with every single one is named."""
    monkeypatch.setattr(limits, "ESTIMATES", 1)
    table = estimate_tables(run)[0]
    assert [row[:3] for row in table.rows] == [("B", "step", "1"), ("C", "storm", "1")]
    assert table.rows[0][5:] == ("7.0", "station-average", "A 0.500, D 0.500")
    assert table.notes[0].startswith("Every single estimate is in infilled.csv.")


def test_shares_of_the_means(run: StormRun) -> None:
    """West by arithmetic: 7/2 of 12 mm is 29.2 %; east: C's 15/2 of 16.5 is 45.5 %."""
    table = infilled_shares(run)
    assert table is not None
    assert [row[2].replace(NARROW_SPACE, " ") for row in table.rows[:2]] == ["29.2 %", "45.5 %"]


def test_nothing_infilled_is_no_table() -> None:
    """A run without estimates has neither."""
    run = make_run(one_step=True)
    assert estimate_tables(run) == []
    assert infilled_shares(run) is None

from __future__ import annotations

from decimal import Decimal

import pytest
from report.small_run import make_run

from basinrain.report import limits
from basinrain.report.timing import storm_times
from basinrain.results import StormRun


def test_a_single_total_has_no_hyetograph_and_says_so() -> None:
    """No figure, no table, one sentence."""
    run = make_run(one_step=True)
    times = storm_times(run, run.storms[0], 1)
    assert times.sentences == ("This storm is one total without steps: it has no hyetograph.",)
    assert (times.pictures, times.tables) == ((), ())


@pytest.mark.parametrize("unit", ["mm", "in"])
def test_printed_hyetographs_add_up_to_their_printed_totals(unit: str) -> None:
    """Every column of the table sums to its last line."""
    run = make_run(depth_unit=unit)
    table = storm_times(run, run.storms[0], 1).tables[1]
    assert len(table.rows) == 6
    for column in (1, 2, 3):
        assert sum(Decimal(row[column]) for row in table.rows) == Decimal(table.foot[0][column])


def test_hyetograph_by_hand(run: StormRun) -> None:
    """West by arithmetic is the mean of A and B: 0, 1.5, 6.5, 3.5, 0.5, 0 mm; times are ends of steps."""
    table = storm_times(run, run.storms[0], 1).tables[1]
    assert [row[1] for row in table.rows] == ["0.0", "1.5", "6.5", "3.5", "0.5", "0.0"]
    assert table.rows[0][0] == "2031-05-04 07:00"
    assert table.foot[0][1] == "12.0"
    assert table.heads[0] == "step ending, UTC+02:00"


def test_peaks_by_hand(run: StormRun) -> None:
    """West: peak 6.5 at 09:00; A's own peak is 6, B's 7, mean 6.5: ratio 1. East: C 7, D 8: 7.5 at the same hour."""
    table = storm_times(run, run.storms[0], 1).tables[0]
    assert table.rows[0] == ("west", "6.5", "2031-05-04 09:00", "basin mean", "6.5", "6.5", "1.00")
    assert table.rows[1][1] == "7.5"


def test_a_gauges_pattern_times_the_total() -> None:
    """D fell 1, 3, 8, 5, 1, 0 of 18 mm; west's 12 mm follow it and peak at 12 * 8 / 18 = 5.3, not at 6.5."""
    run = make_run(pattern="D")
    times = storm_times(run, run.storms[0], 1)
    assert "The pattern of gauge D times every hyetograph" in " ".join(times.sentences)
    assert times.tables[0].rows[0][:5] == ("west", "5.3", "2031-05-04 09:00", "D", "6.5")
    assert times.tables[1].foot[0][1] == "12.0"


def test_the_nearest_recorder_is_named_for_each_basin() -> None:
    """A is nearest to west's centre (5, 5) of A and B, but B has a gap: A. East's centre is nearest to D."""
    run = make_run(pattern="nearest-recorder")
    rows = storm_times(run, run.storms[0], 1).tables[0].rows
    assert [row[3] for row in rows[:2]] == ["A", "D"]


def test_a_long_storm_points_to_the_file(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """Beyond the limit the steps are not printed, and the sentence says where they are."""
    monkeypatch.setattr(limits, "STEPS", 5)
    times = storm_times(run, run.storms[0], 1)
    assert len(times.tables) == 1
    assert times.sentences[-1] == "The 6 steps are in hyetographs.csv."


def test_one_figure_a_basin(run: StormRun) -> None:
    """Two basins and their union."""
    assert [p.name for p in storm_times(run, run.storms[0], 3).pictures] == [f"hyetograph-3-{k}" for k in (1, 2, 3)]

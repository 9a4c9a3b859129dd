from __future__ import annotations

from dataclasses import replace
from decimal import Decimal

import numpy as np
import pytest
from report.small_run import make_run

from basinrain.report import limits
from basinrain.report.shares import weight_tables
from basinrain.report.words import NARROW_SPACE
from basinrain.results import StormRun


def _cell(text: str) -> str:
    return text.replace(NARROW_SPACE, " ")


def test_contributions_of_the_arithmetic_mean_by_hand(run: StormRun) -> None:
    """West is the mean of A and B; B's third hour is half A, half D.

    A: 12/2 + 6/2/2 = 7.5; B: 5/2 = 2.5; D: 8/2/2 = 2.0; together 12.
    """
    table = weight_tables(run, run.storms[0])[0]
    rows = {row[0]: row for row in table.rows}
    assert [_cell(rows[g][5]) for g in "ABD"] == ["7.5 (62.5 %)", "2.5 (20.8 %)", "2.0 (16.7 %)"]
    assert [rows[g][1] for g in "ABD"] == ["0.500", "0.500", "0.000"]
    assert _cell(table.foot[0][5]) == "12.0 (100.0 %)"
    assert table.foot[0][1:4] == ("1.000", "1.000", "1.000")


def test_largest_differences_come_first(run: StormRun) -> None:
    """The column of differences falls."""
    for table in weight_tables(run, run.storms[0]):
        differences = [float(row[4]) for row in table.rows]
        assert differences == sorted(differences, reverse=True)


def test_an_infilled_gauge_has_weight_and_contributes_nothing(run: StormRun) -> None:
    """C never reported: its weight in east is a half, its contribution 0."""
    east = {row[0]: row for row in weight_tables(run, run.storms[0])[1].rows}
    assert east["C"][1] == "0.500"
    assert _cell(east["C"][5]) == "0.0 (0.0 %)"


@pytest.mark.parametrize("unit", ["mm", "in"])
def test_printed_contributions_add_up_to_the_printed_mean(unit: str) -> None:
    """In every basin, by every method, to the last digit."""
    run = make_run(depth_unit=unit)
    for table in weight_tables(run, run.storms[0]):
        for column in (5, 6, 7):
            parts = sum(Decimal(row[column].split(" (")[0]) for row in table.rows)
            assert parts == Decimal(table.foot[0][column].split(" (")[0])


def test_slight_gauges_share_a_line(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """With a limit of 0.2 only A, B and D stay in west; C and E share a line and the sums stay."""
    monkeypatch.setattr(limits, "LISTED_WEIGHT", 0.2)
    table = weight_tables(run, run.storms[0])[0]
    assert {row[0] for row in table.rows} == {"A", "B", "D", "2 others, together"}
    assert table.rows[-1][0] == "2 others, together"
    assert table.rows[-1][4] == "–"
    assert table.foot[0][1:4] == ("1.000", "1.000", "1.000")


def test_a_method_without_a_number_has_dashes(run: StormRun) -> None:
    """Where the arithmetic mean has no number, its columns hold none."""
    depths = run.storms[0].depths["arithmetic"]
    weights, depth, given = depths.table.weights.copy(), depths.depth.copy(), depths.contribution.copy()
    weights[0], depth[:, 0], given[0] = np.nan, np.nan, np.nan
    silent = replace(depths, depth=depth, contribution=given, table=replace(depths.table, weights=weights))
    result = replace(run.storms[0], depths={**run.storms[0].depths, "arithmetic": silent})
    table = weight_tables(replace(run, storms=(result,)), result)[0]
    assert {row[1] for row in table.rows} == {"–"}
    assert {row[5] for row in table.rows} == {"–"}
    assert (table.foot[0][1], table.foot[0][5]) == ("–", "–")


def test_a_dry_storm_has_no_shares() -> None:
    """Nothing fell: contributions are 0.0 and a share of nothing is not printed."""
    run = make_run()
    dry = {
        name: replace(d, depth=d.depth * 0, contribution=d.contribution * 0) for name, d in run.storms[0].depths.items()
    }
    result = replace(run.storms[0], depths=dry)
    table = weight_tables(replace(run, storms=(result,)), result)[0]
    assert {row[5] for row in table.rows} == {"0.0"}
    assert table.foot[0][5] == "0.0"

from __future__ import annotations

import numpy as np
from report.screen_pieces import make_monthly, make_screen_run

from basinrain.report import limits
from basinrain.report.consistency_list import curve_sentence, double_mass_table, homogeneity_table
from basinrain.screening.homogeneity import homogeneity_of

SCREENING = make_screen_run().screening


def test_the_broken_gauge_is_first_and_judged_in_words() -> None:
    """C read a third too little until 2015; the others keep their proportion."""
    table = double_mass_table(SCREENING.double_mass)
    assert table is not None
    assert table.rows[0][0] == "C"
    assert table.rows[0][3:5] == ("365", "2015")
    assert [row[-1] for row in table.rows] == ["breaks"] + ["no break"] * 5
    assert curve_sentence(SCREENING.double_mass) == "6 curves were looked at; 1 breaks at the level of 1 %."


def test_statistics_stand_with_their_critical_values() -> None:
    """Four tests; C is rejected by all of them and suspect, in words."""
    table = homogeneity_table(SCREENING.homogeneity)
    assert table is not None
    row = table.rows[0]
    assert row[0] == "C"
    assert all(cell.endswith(") rejects") for cell in row[3:7])
    assert row[7:9] == ("4", "suspect")
    assert {cells[8] for cells in table.rows[1:]} <= {"useful", "doubtful", "suspect"}


def test_numbers_by_hand() -> None:
    """The cell of a test is its statistic, and in brackets its critical value at 1 %."""
    one = next(t for t in SCREENING.homogeneity if t.gauge == "A")
    table = homogeneity_table([one])
    assert table is not None
    test = one.tests[0]
    assert table.rows[0][3] == f"{test.statistic:.2f} ({test.critical[0.01]:.2f})"
    assert table.rows[0][2] == "ratios"


def test_a_short_series_has_statistics_and_no_grade() -> None:
    """Below the table of critical values nothing is judged."""
    years = np.arange(2001, 2009)
    table = homogeneity_table([homogeneity_of(years, np.array(800.0 + years % 3, dtype=np.float64), gauge="A")])
    assert table is not None
    assert table.rows[0][8] == "no grade"
    assert "(" not in table.rows[0][3]


def test_nothing_to_show() -> None:
    """No curve, no test: no table, and a sentence instead."""
    assert double_mass_table([]) is None
    assert homogeneity_table([]) is None
    assert curve_sentence([]) == "No gauge has years and neighbours enough for a double-mass curve."


def test_many_gauges_are_shortened() -> None:
    """70 gauges: 60 lines, the worst first, and the file."""
    ids = tuple(f"G{k:02d}" for k in range(70))
    screening = make_screen_run(make_monthly(ids)).screening
    for table in (double_mass_table(screening.double_mass), homogeneity_table(screening.homogeneity)):
        assert table is not None
        assert len(table.rows) == limits.GAUGES
        assert table.rows[0][0] == "G02"
        assert "of 70 gauges" in table.notes[-1]

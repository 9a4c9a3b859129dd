from __future__ import annotations

from pathlib import Path

import numpy as np
from report.series_run import four_days, four_years, make_series_run

from basinrain.report.words import DASH, NARROW_SPACE
from basinrain.report.years_list import YEARS, months_table, years_sentence, years_table


def test_the_rule_is_stated() -> None:
    """What a water year is, when its total counts, and how many do."""
    assert years_sentence(four_years()).replace(NARROW_SPACE, " ") == (
        "A water year begins with October and has the name of the year in which it ends; its total counts if 95 % of "
        "its time or more has a number, and is not scaled up for the rest. The same holds for months. In basin union "
        "3 of 5 water years and 48 of 48 months are complete by thiessen ('infill-then-reweight'); period_totals.csv "
        "has them all, with calendar years."
    )


def test_incomplete_years_are_dashes_not_zero() -> None:
    """Nine months of 2027 and three of 2031; the mean below is of the others."""
    table = years_table(four_years())
    assert table is not None
    assert table.rows[0] == ("2027", *[DASH] * 6, f"74.8{NARROW_SPACE}%")
    assert table.rows[-1][1:7] == (DASH,) * 6
    means = [float(cell) for cell in table.foot[0][1:7]]
    years = np.array([[float(cell) for cell in row[1:7]] for row in table.rows[1:4]])
    np.testing.assert_allclose(means, years.mean(axis=0), atol=0.11)
    assert table.foot[1] == ("years", *["3"] * 6, "")


def test_no_complete_year_no_table() -> None:
    """Four days are no year and no month."""
    assert years_table(four_days()) is None
    assert months_table(four_days()) is None


def test_months_by_hand(tmp_path: Path) -> None:
    """Two Januaries of 10 and 30 mm, one February of 5, and a March without a number."""
    depth = np.full((13, 3), np.nan)
    depth[[0, 1, 12]] = [[10.0], [5.0], [30.0]]
    run = make_series_run(tmp_path, depth, first="2027-01", step="1mo", gaps=["reweight"], methods=["thiessen"])
    table = months_table(run)
    assert table is not None
    assert table.rows[0][:4] == ("thiessen", "20.0", "5.0", DASH)
    assert table.foot[0][:4] == ("months", "2", "1", "0")


def test_a_long_record_is_shortened(tmp_path: Path) -> None:
    """Of 71 calendar years, 72 water years are touched and the last 60 listed."""
    run = make_series_run(
        tmp_path, np.ones((71 * 12, 3)), first="1931-01", step="1mo", gaps=["reweight"], methods=["thiessen"]
    )
    table = years_table(run)
    assert table is not None
    assert len(table.rows) == YEARS
    assert table.rows[-2][0] == "2001"
    assert table.foot[1][1] == "70"
    assert table.notes[1] == "Shown: the last 60 of 72 years; mean and years are of all that are complete."

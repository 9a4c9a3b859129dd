from __future__ import annotations

from pathlib import Path

import numpy as np
from report.series_run import four_days, make_series_run, widened

from basinrain.report.greatest_list import greatest_sentence, greatest_tables
from basinrain.report.words import DASH


def _plain(row: tuple[str, ...]) -> list[str]:
    return [str(cell).replace('<span class="unbroken">', "").replace("</span>", "") for cell in row]


def test_depths_by_hand() -> None:
    """25.75 mm on the third day; 40.75 in three days; five are longer than the record."""
    kinds, series, basins = greatest_tables(four_days())
    one, two, three, five, _ = [_plain(row) for row in kinds.rows]
    assert one == ["1 day", "25.8", "2027-01-04 00:00", "4", "0", "25.8", "2027-01-04 00:00", "4", "0"]
    assert two[5:8] == ["25.8", "2027-01-05 00:00", "2"]
    assert three[1] == "40.8"
    assert five[:4] == ["5 days", DASH, DASH, "0"]
    assert series.rows[0] == ("1 day", "25.8", "26.5")
    assert basins.rows[1][:2] == ("east", "31.5")


def test_nothing_is_multiplied() -> None:
    """The page says that both are as they were found."""
    assert "none is multiplied to make up for the clock, or for the record's step" in greatest_sentence(four_days())


def test_steps_of_months_have_no_durations(tmp_path: Path) -> None:
    """They are not of one length."""
    run = make_series_run(tmp_path, np.ones((5, 3)), first="2027-01", step="1mo", gaps=["reweight"])
    assert greatest_tables(run) == []
    assert greatest_sentence(run) == "No greatest depths were sought: the record's steps are not of one length."


def test_of_many_basins_those_with_the_greatest_depths() -> None:
    """Every second basin is east, which has more than west."""
    table = greatest_tables(widened(four_days(), 100))[-1]
    assert [row[0] for row in table.rows] == [*(f"B{k:04d}" for k in range(1, 25, 2)), "union"]
    assert table.notes == ("The 12 basins with the greatest depths in 3 days; 88 more are in greatest_depths.csv.",)


def test_many_durations_are_thinned(tmp_path: Path) -> None:
    """Ten durations of hours; nine columns, the first and the last among them."""
    run = make_series_run(tmp_path, np.ones((24, 3)), first="2027-01-01T00:00", step="1h", gaps=["reweight"])
    table = greatest_tables(run)[-1]
    assert len(table.heads) == 10
    assert (table.heads[1], table.heads[-1]) == ("1 h", "10 days")
    assert table.notes == ("Shown: 9 of 10 durations.",)

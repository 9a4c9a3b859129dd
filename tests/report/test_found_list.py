from __future__ import annotations

from pathlib import Path

import numpy as np
from report.series_run import four_days, make_series_run

from basinrain.report.found_list import LISTED, found_sentences, found_tables, incomplete_table
from basinrain.report.words import DASH, NARROW_SPACE

N = np.nan


def _plain(row: tuple[str, ...]) -> list[str]:
    return [str(cell).replace('<span class="unbroken">', "").replace("</span>", "") for cell in row]


def test_two_storms_by_hand() -> None:
    """The second is the larger; 15 mm two days before leave 13.5 in the index, which is not spun up."""
    ranked, series = found_tables(four_days())
    first, second = [_plain(row) for row in ranked.rows]
    assert first == [
        "1", "2027-01-03 00:00", "2027-01-04 00:00", "24", "25.8", "25.8", f"57.5{NARROW_SPACE}%", DASH, DASH, DASH,
        "≥ 13.5",
    ]  # fmt: skip
    assert second[4] == "15.0*"
    assert "*: the record begins or ends within the dry gap of the storm, which may be longer." in ranked.notes
    assert any("fewer than the 44 days" in note and "reckoned from zero" in note for note in ranked.notes)
    assert series.rows == [("1: 2027-01-03", "25.8", "26.5"), ("2: 2027-01-01", "15.0", "15.0")]


def test_how_they_were_found() -> None:
    """The series, the wet depth, the dry time, and what a step of a day does to it."""
    text = " ".join(found_sentences(four_days()))
    assert text.startswith("Storms were sought in the series of basin union by thiessen ('infill').")
    assert "The record's step of 1 day is longer than that: any dry step separates" in text
    assert text.endswith("2 storms were found; ranked by all that fell in them. All are complete.")


def test_an_index_that_is_spun_up_stands_alone(tmp_path: Path) -> None:
    """Sixty days of a millimetre before the storm: 0.9 a day from 1 mm tends to 10."""
    depth = np.ones((70, 3))
    depth[64] = 30.0
    run = make_series_run(
        tmp_path, depth, gaps=["reweight"], methods=["thiessen"], settings=["storms.wet_depth=2", "storms.dry_gap=1d"]
    )
    (table,) = found_tables(run)
    row = _plain(table.rows[0])
    assert row[1] == "2027-03-06 00:00"
    assert row[-4:] == ["5.0", "10.0", "30.0", "10.0"]
    assert not any("≥" in note for note in table.notes)


def test_storms_that_are_not_complete_stand_apart(tmp_path: Path) -> None:
    """No gauge reports on the day after 9 mm: that storm has no rank, and would be the first."""
    depth = np.array([0, 9, N, 0, 0, 4, 0])[:, None] * np.ones(3)
    run = make_series_run(tmp_path, depth, gaps=["reweight"], methods=["thiessen"], basins=1)
    table = incomplete_table(run)
    assert table is not None
    assert [_plain(row) for row in table.rows] == [
        ["2027-01-02 00:00", "2027-01-03 00:00", "9.0", "9.0", "0", "1", "1"]
    ]
    assert "1 storm is not complete: a step without a number lies in or near them" in " ".join(found_sentences(run))
    assert [_plain(row)[4] for row in found_tables(run)[0].rows] == ["4.0"]


def test_the_result_of_the_test_is_told(tmp_path: Path) -> None:
    """The gap, its coefficient of variation, that of the next shorter one, and how many spells."""
    hours = [hour for k in range(31) for hour in [1, 0, 1] + [0] * (11 + k)]
    depth = np.repeat(np.array(hours, dtype=float)[:, None], 3, axis=1)
    run = make_series_run(
        tmp_path,
        depth,
        first="2027-01-01T00:00",
        step="1h",
        gaps=["reweight"],
        methods=["thiessen"],
        settings=["storms.dry_gap=estimated"],
    )
    text = " ".join(found_sentences(run))
    assert "separated by a dry time of 2 h or more, which was found by a test." in text
    assert "Restrepo-Posada and Eagleson 1982" in text
    assert "of variation of the 30 dry spells of at least 2 h is 0.35, of those of at least 1 h 1.06" in text


def test_ranked_by_a_duration(tmp_path: Path) -> None:
    """A column more, with the depth that ranks."""
    depth = [[0, 0, 0], [5, 5, 5], [5, 5, 5], [0, 0, 0], [8, 8, 8], [0, 0, 0]]
    run = make_series_run(tmp_path, depth, gaps=["reweight"], methods=["thiessen"], settings=["storms.rank=1d"])
    (table,) = found_tables(run)
    assert "in 1 day" in table.heads
    assert [_plain(row)[4:6] for row in table.rows] == [["8.0", "8.0"], ["5.0", "10.0"]]
    assert "ranked by the greatest depth in 1 day" in " ".join(found_sentences(run))


def test_no_storm(tmp_path: Path) -> None:
    """A dry record has none, and steps of months are not searched."""
    dry = make_series_run(tmp_path / "dry", np.zeros((9, 3)), gaps=["reweight"])
    assert found_sentences(dry)[-1] == "No step of the series is wet: there is no storm."
    assert found_tables(dry) == []
    assert incomplete_table(dry) is None
    months = make_series_run(tmp_path / "mo", np.ones((5, 3)), first="2027-01", step="1mo", gaps=["reweight"])
    assert found_sentences(months) == [
        "No storms were sought: the record's steps are not of one length that divides a day."
    ]


def test_many_storms_are_shortened(tmp_path: Path) -> None:
    """Of 30 asked for, 20 are listed."""
    depth = np.tile([[5.0], [0.0]], (30, 3))
    run = make_series_run(tmp_path, depth, gaps=["reweight"], methods=["thiessen"], settings=["storms.count=30"])
    (table,) = found_tables(run)
    assert len(table.rows) == LISTED
    assert "Shown: 20 of 30. All are in storms_found.csv." in table.notes

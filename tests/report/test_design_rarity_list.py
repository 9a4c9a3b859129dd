from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import pytest
from report.design_run import bare, make_storms, two_storms

from basinrain.report.design_rarity_list import rarity_facts, rarity_meaning, rarity_shown

COMMON = "more frequent than 1 in 2 a year (the table's most frequent)"


def plain(row: tuple[str, ...]) -> list[str]:
    """Return the cells of a row without markup."""
    return [str(cell).replace('<span class="unbroken">', "").replace("</span>", "") for cell in row]


def test_a_job_without_storms_has_nothing_here() -> None:
    """No fact, no sentence, no table."""
    assert [*rarity_facts(bare()), *rarity_meaning(bare()), *rarity_shown(bare())] == []


def test_how_rare_by_hand() -> None:
    """48 mm in 6 h, two fifths from 40 mm at 2 years to 60 mm at 10 in the reduced variate: 1 in 3.6."""
    quill = rarity_shown(two_storms())[0]
    areas, gauges = quill.tables
    between = -math.log(-math.log(0.5)) * 0.6 - math.log(-math.log(0.9)) * 0.4
    assert 1 / (1 - math.exp(-math.exp(-between))) == pytest.approx(3.59, abs=0.005)
    words = "between 1 in 2 and 1 in 10 a year, about 1 in 3.6"
    assert plain(areas.rows[3]) == ["union", "6 h*", "48.0", "2031-05-04 06:00", "48.0", words]
    assert plain(areas.rows[0]) == ["union", "1 h*", "8.0", "2031-05-04 01:00", "8.0", COMMON]
    assert plain(gauges.rows[3]) == ["Alder", "6 h*", "48.0", "2031-05-04 06:00", "48.0", words]
    assert {row[0] for row in areas.rows} == {"union", "west", "east"}


def test_marked_durations_have_their_remark() -> None:
    """Sums of few steps read low: the first and the last of them are told in full."""
    notes = rarity_shown(two_storms())[0].tables[0].notes
    assert notes[1].startswith("* 1 h: the sum of 1 step of the record: reads low")
    assert "; 6 h: the sum of 6 steps of the record" in notes[1]
    assert notes[2] == "The remarks between are in storm_rarity.csv."


def test_durations_that_cannot_be_compared_are_told(tmp_path: Path) -> None:
    """Half an hour is shorter than the record's step."""
    run = make_storms(
        tmp_path,
        "Quill",
        design__rarity={"durations": ["30min", "6h"], "average": "thiessen"},
        design__depths__extrapolate=True,
    )
    notes = rarity_shown(run)[0].tables[0].notes
    assert any(note.startswith("Not compared: 30 min: ") for note in notes)


def test_what_is_said_of_every_storm_stands_once() -> None:
    """The first sentence stays with its storm; nothing is lost, nothing is told twice."""
    run = two_storms()
    meaning = rarity_meaning(run)
    for found, shown in zip(run.rarities, rarity_shown(run), strict=True):
        assert shown.sentences[0] == found.sentences[0]
        assert set(shown.sentences) | set(meaning) == set(found.sentences)
        assert not set(shown.sentences) & set(meaning)


def test_one_storm_keeps_all_its_sentences() -> None:
    """There is no other to share them with."""
    run = replace(two_storms(), rarities=two_storms().rarities[:1])
    assert rarity_meaning(run) == []
    assert rarity_shown(run)[0].sentences == run.rarities[0].sentences


def test_the_figure_is_of_the_rarest_area() -> None:
    """Of the first point of interest where several are as rare; each figure with a name of its own."""
    run = two_storms()
    first, second = rarity_shown(run)
    assert first.picture is not None
    assert second.picture is not None
    assert (first.picture.name, second.picture.name) == ("rarity-1", "rarity-2")
    assert "over union by duration" in first.picture.caption
    found = run.rarities[0]
    east = tuple(row for row in found.rows if row.place == "east" and row.minutes == 720)
    (shown,) = rarity_shown(replace(run, rarities=(replace(found, rarest=east),)))
    assert shown.picture is not None
    assert "over east by duration" in shown.picture.caption


def test_what_was_compared_with_what(tmp_path: Path) -> None:
    """Storms, average and infill; of an uplift that it is left out."""
    uplift = {"factor": 1.5, "source": "Quill Climate Note (invented)", "horizon": "2070"}
    run = make_storms(tmp_path, "Quill", design__uplift=uplift)
    assert rarity_facts(run) == [
        ("Storms", "Quill"),
        ("Average", "thiessen"),
        ("Infill", "inverse-distance at the scale of the step"),
        ("Compared with", "the depths of the design without the uplift, which is for a climate to come"),
    ]
    # As rare as without it.
    assert rarity_shown(run)[0].tables[0].rows == rarity_shown(two_storms())[0].tables[0].rows


def test_many_areas_are_shortened() -> None:
    """As many as eight of six durations, the rarest among them; the others are counted."""
    run = two_storms()
    found = run.rarities[0]
    places = [f"B{k:02d}" for k in range(20)]
    union = [row for row in found.rows if row.place == "union"]
    rows = tuple(replace(row, place=place) for place in places for row in union)
    rarest = (next(row for row in rows if row.place == "B15"),)
    many = replace(found, rows=rows, rarest=rarest, areal=replace(found.areal, names=tuple(places)))
    # The figure is of an area that the ladder has.
    ladder = found.areal.ladder[:1].repeat(20, axis=0)
    many = replace(many, areal=replace(many.areal, ladder=ladder))
    (shown,) = rarity_shown(replace(run, rarities=(many,)))
    assert list(dict.fromkeys(row[0] for row in shown.tables[0].rows)) == [*places[:7], "B15"]
    assert shown.tables[0].notes[-1] == "12 more areas are in storm_rarity.csv."

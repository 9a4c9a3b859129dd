from __future__ import annotations

from report.small_run import make_run

from basinrain.notes import Note
from basinrain.report.overview import note_groups, storms_asked, what_was_asked
from basinrain.results import StormRun


def test_many_notes_of_a_kind_are_shortened_and_counted() -> None:
    """Of 20 notes the first six stand in full, the others by their basins."""
    notes = [Note(code="far-gauge", text=f"Far from {k}.", basin=f"b{k}") for k in range(20)]
    (group,) = note_groups(notes)
    assert (group.title, group.count, len(group.texts)) == ("Far gauge", 20, 6)
    assert group.rest.startswith("14 more of this kind, concerning basins b6, b7,")
    assert group.rest.endswith("b19; all are in record.json.")


def test_a_note_that_repeats_word_for_word_stands_once() -> None:
    """The same sentence about the same storm is said once; another storm's is another note."""
    notes = [Note(code="a", text="X.", storm=s) for s in ("Quill", "Quill", "Sedge")]
    assert note_groups(notes)[0].texts == ("Quill: X.", "Sedge: X.")


def test_kinds_keep_their_order() -> None:
    """The first kind raised is the first shown."""
    notes = [Note(code=c, text=c) for c in ("b", "a", "b2", "a")]
    assert [group.title for group in note_groups(notes)] == ["B", "A", "B2"]


def test_the_job_in_a_few_lines(run: StormRun) -> None:
    """Two squares of 100 km² and five of six gauges inside."""
    asked = dict(what_was_asked(run))
    assert asked["Basins"] == "2 basins, and their union; 200.0 km²"
    assert asked["Gauges"] == "6, of which 5 inside the basins"
    assert asked["Averages"] == "arithmetic, thiessen, idw"
    assert asked["Units"] == "depths in mm, areas in km², volumes in m³"
    assert asked["Step"] == "1 h"


def test_windows_are_in_the_records_clock(run: StormRun) -> None:
    """Start and end are those of the window; the note names the clock."""
    table = storms_asked(run)
    assert list(table.rows) == [("Quill", "2031-05-04 06:00", "2031-05-04 12:00", "6", "basin mean")]
    assert table.notes[0] == "Times are in UTC+02:00."


def test_a_total_without_times_says_so() -> None:
    """No window is made up for it."""
    assert list(storms_asked(make_run(one_step=True)).rows) == [("Quill", "–", "–", "1", "one total: no times")]


def test_a_gauge_pattern_is_named() -> None:
    """What times the hyetographs stands beside the storm."""
    assert storms_asked(make_run(pattern="D")).rows[0][-1] == "gauge D"

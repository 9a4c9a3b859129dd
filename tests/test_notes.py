"""Notes are said once, and name the storms that they concern."""

from __future__ import annotations

from basinrain.notes import Note, once


def dry(storm: str = "", **fields: str) -> Note:
    return Note(code="dry", text="It was dry.", storm=storm, **fields)  # type: ignore[arg-type]


def test_what_holds_in_every_storm_names_none() -> None:
    """A note of both storms loses its storm, in the place where it was first said."""
    other = Note(code="other", text="Something else.")
    assert once([dry("Quill"), other, dry("Reed")], ["Quill", "Reed"]) == (dry(), other)


def test_what_holds_in_some_storms_names_them() -> None:
    """A note of two storms of three names the two, in the order in which they were said."""
    (note,) = once([dry("Sedge"), dry("Quill")], ["Quill", "Reed", "Sedge"])
    assert note.storm == "Sedge, Quill"
    assert str(note) == "Sedge, Quill: It was dry."


def test_the_only_storm_of_a_job_keeps_its_name() -> None:
    """With one storm there is nothing to say once for all."""
    assert once([dry("Quill"), dry("Quill")], ["Quill"]) == (dry("Quill"),)


def test_notes_of_the_whole_run_stay_without_a_storm() -> None:
    """A note without a storm, said again, is said once; said of one storm too, it names that one."""
    assert once([dry(), dry()], ["Quill", "Reed"]) == (dry(),)
    assert once([dry(), dry("Reed")], ["Quill", "Reed"]) == (dry("Reed"),)
    assert once([], ["Quill", "Reed"]) == ()


def test_notes_that_differ_in_anything_else_are_two() -> None:
    """Basin, gauge, method, level and text tell notes apart."""
    notes = [dry("Quill"), dry("Reed", basin="west"), dry("Reed", gauge="A"), dry("Reed", level="info")]
    assert [note.storm for note in once(notes, ["Quill", "Reed"])] == ["Quill", "Reed", "Reed", "Reed"]

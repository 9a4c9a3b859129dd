"""An output folder is whole at every moment, and nothing that is not ours is ever lost."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from basinrain.errors import WriteError
from basinrain.writing.folder import RECORD, check_folder, whole_folder


def earlier_output(folder: Path, text: str = "first") -> None:
    with whole_folder(folder) as built:
        (built / "a.csv").write_text(text)
        (built / RECORD).write_text(json.dumps({"files": ["a.csv"]}))


def test_the_folder_appears_only_when_everything_is_there(tmp_path: Path) -> None:
    """While the block runs the place is empty; after it, it holds everything and nothing is left beside it."""
    place = tmp_path / "deep" / "out"
    with whole_folder(place) as built:
        (built / "a.csv").write_text("x")
        assert not place.exists()
    assert [path.name for path in place.iterdir()] == ["a.csv"]
    assert [path.name for path in place.parent.iterdir()] == ["out"]


def test_a_run_that_fails_leaves_the_earlier_output(tmp_path: Path) -> None:
    """An error inside the block changes nothing."""
    place = tmp_path / "out"
    earlier_output(place)

    def fail() -> None:
        with whole_folder(place) as built:
            (built / "a.csv").write_text("second")
            raise RuntimeError("midway")

    with pytest.raises(RuntimeError, match="midway"):
        fail()
    assert (place / "a.csv").read_text() == "first"
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


def test_a_file_of_the_earlier_run_does_not_survive_in_the_new_one(tmp_path: Path) -> None:
    """The folder is replaced as a whole."""
    place = tmp_path / "out"
    earlier_output(place)
    check_folder(place, [])
    with whole_folder(place) as built:
        (built / "b.csv").write_text("x")
    assert [path.name for path in place.iterdir()] == ["b.csv"]


def test_killed_at_any_moment_the_earlier_output_is_whole(tmp_path: Path) -> None:
    """A writer that replaces the folder without end is killed again and again; what is left is always whole."""
    place = tmp_path / "out"
    earlier_output(place, "0" * 50_000)
    script = (
        "import sys, json\nfrom pathlib import Path\nfrom basinrain.writing.folder import whole_folder, check_folder\n"
        "place = Path(sys.argv[1])\ncheck_folder(place, [])\nprint('go', flush=True)\nk = 1\n"
        "while True:\n    with whole_folder(place) as built:\n"
        "        (built / 'a.csv').write_text(str(k % 10) * 50_000)\n"
        "        (built / 'record.json').write_text(json.dumps({'files': ['a.csv']}))\n    k += 1\n"
    )
    seen = set()
    for attempt in range(8):
        with subprocess.Popen([sys.executable, "-c", script, str(place)], stdout=subprocess.PIPE, text=True) as child:
            assert child.stdout is not None
            assert child.stdout.readline() == "go\n"
            time.sleep(0.01 + 0.007 * attempt)
            child.send_signal(signal.SIGKILL)
        check_folder(place, [])
        text = (place / "a.csv").read_text()
        assert len(text) == 50_000
        assert len(set(text)) == 1
        assert sorted(path.name for path in place.iterdir()) == ["a.csv", "record.json"]
        seen.add(text[0])
    assert seen != {"0"}


def test_an_output_moved_aside_by_a_killed_run_comes_back(tmp_path: Path) -> None:
    """Killed between its two renames, a run leaves the earlier output under another name; the next run puts it back."""
    place = tmp_path / "out"
    earlier_output(place)
    place.rename(tmp_path / ".out.earlier")
    check_folder(place, [])
    assert (place / "a.csv").read_text() == "first"
    assert not (tmp_path / ".out.earlier").exists()


def test_an_earlier_output_is_not_lost_to_a_folder_made_in_its_place(tmp_path: Path) -> None:
    """Killed between its renames, and somebody makes a folder of that name: both are left alone; refused."""
    place, aside = tmp_path / "out", tmp_path / ".out.earlier"
    earlier_output(place)
    place.rename(aside)
    place.mkdir()
    (place / "notes.txt").write_text("mine")
    with pytest.raises(WriteError, match="no earlier run wrote: notes"):
        check_folder(place, [])
    assert ((aside / "a.csv").read_text(), (place / "notes.txt").read_text()) == ("first", "mine")


def test_what_comes_to_lie_there_during_the_run_is_kept(tmp_path: Path) -> None:
    """A file put into the folder while the run computes is not replaced; the API checks as the command line does."""
    place = tmp_path / "out"
    earlier_output(place)

    def run() -> None:
        with whole_folder(place) as built:
            (built / "a.csv").write_text("second")
            (place / "thesis.txt").write_text("years of work")

    with pytest.raises(WriteError, match=r"no earlier run wrote: thesis\.txt"):
        run()
    assert (place / "thesis.txt").read_text() == "years of work"
    assert (place / "a.csv").read_text() == "first"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["out"]


def test_a_failed_last_step_puts_the_earlier_output_back(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """When the new folder cannot be moved into place, the earlier one returns to it."""
    place = tmp_path / "out"
    earlier_output(place)
    real = Path.rename

    def rename(self: Path, target: Path) -> Path:
        if self.name.startswith(".out.") and self.name != ".out.earlier":
            raise OSError(5, "Input/output error")
        return real(self, target)

    monkeypatch.setattr(Path, "rename", rename)
    with pytest.raises(WriteError, match="found input/output error"):
        earlier_output(place, "second")
    assert (place / "a.csv").read_text() == "first"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["out"]


def test_an_interrupted_run_leaves_nothing(tmp_path: Path) -> None:
    """Ctrl-C leaves neither the temporary folder nor a parent that was made for it."""

    def run() -> None:
        with whole_folder(tmp_path / "results" / "storm"):
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run()
    assert list(tmp_path.iterdir()) == []


def test_what_is_not_ours_is_never_replaced(tmp_path: Path) -> None:
    """A folder with a stranger's file is refused and named."""
    place = tmp_path / "out"
    earlier_output(place)
    (place / "notes.txt").write_text("mine")
    with pytest.raises(
        WriteError, match=r"found files that no earlier run wrote: notes\.txt; expected an empty folder"
    ):
        check_folder(place, [])
    place_of_others = tmp_path / "others"
    place_of_others.mkdir()
    (place_of_others / "record.json").write_text("[]")
    with pytest.raises(WriteError, match=r"no earlier run wrote: record\.json"):
        check_folder(place_of_others, [])


def test_inputs_files_and_forbidden_places_are_refused(tmp_path: Path) -> None:
    """A folder that holds an input, is a file, or cannot be written is refused before anything is computed."""
    (tmp_path / "rain.csv").write_text("x")
    with pytest.raises(WriteError, match=r"found the input rain\.csv inside it; expected a folder without inputs"):
        check_folder(tmp_path, [tmp_path / "rain.csv"])
    with pytest.raises(WriteError, match="found a file; expected a folder"):
        check_folder(tmp_path / "rain.csv", [])
    with pytest.raises(
        WriteError, match=r"found the file .*rain\.csv on the way to it; expected a folder that can be made"
    ):
        check_folder(tmp_path / "rain.csv" / "out", [])


def test_no_right_to_write_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Said before anything is computed (through the system's answer, since root may write everywhere)."""
    monkeypatch.setattr(os, "access", lambda *_: False)
    with pytest.raises(WriteError, match="no right to write in"):
        check_folder(tmp_path / "out", [])


def test_a_full_disk_leaves_the_earlier_output(tmp_path: Path) -> None:
    """An error of the system while writing becomes one clear line, and the earlier output stays."""
    place = tmp_path / "out"
    earlier_output(place)

    def fail() -> None:
        with whole_folder(place) as built:
            (built / "a.csv").write_text("second")
            raise OSError(28, "No space left on device")

    with pytest.raises(WriteError, match="found no space left on device"):
        fail()
    assert (place / "a.csv").read_text() == "first"

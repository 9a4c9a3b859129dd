"""What is finished stays, and nothing but what was computed for this job comes out of a store."""

from __future__ import annotations

import json
import os
import resource
import shutil
from collections import namedtuple
from pathlib import Path

import numpy as np
import pytest
from chunked import BASINS, DAY, KEY, STEPS, small_setup, small_source, small_store, stored_bytes

from basinrain.errors import WriteError
from basinrain.series.engine import SeriesPart
from basinrain.series_store import SeriesStore

SERIES = small_setup().series
CHUNKS = STEPS // DAY


def parts_of(k: int) -> dict[tuple[str, str], SeriesPart]:
    """Return numbers that tell chunk and series."""
    parts = {}
    for n, name in enumerate(SERIES):
        shape = (DAY, BASINS)
        depth = np.full(shape, 100.0 * k + n) + np.arange(BASINS, dtype=float)
        depth[0, 0] = np.nan
        share = np.full(shape, 1 / (1 + n + k), dtype=np.float32)
        parts[name] = SeriesPart(depth, share, np.full(shape, n + k, dtype=np.uint8))
    return parts


def fill(store: SeriesStore) -> bytes:
    """Put all missing chunks, last first, and return the store's bytes."""
    for k in reversed(store.missing_chunks):
        store.put(k, parts_of(k))
    return stored_bytes(store)


@pytest.fixture
def work(tmp_path: Path) -> Path:
    """Return a folder for the series, not there yet."""
    return tmp_path / "deep" / "work"


@pytest.fixture
def whole(work: Path) -> bytes:
    """Complete a store in the folder, close it, and return its bytes."""
    with small_store(work) as store:
        return fill(store)


def test_in_memory_and_in_a_folder_are_the_same_bytes(whole: bytes) -> None:
    """The same chunks give the same arrays, and each value stands where it belongs."""
    with small_store() as store:
        assert fill(store) == whole
        depth = store.depth("infill", "thiessen")
        assert np.isnan(depth[::DAY, 0]).all()
        assert (depth[:, 1] == np.repeat(100.0 * np.arange(CHUNKS), DAY) + 2 + 1).all()
        assert store.observed_share("infill", "thiessen").dtype == np.float32
        assert store.flags("reweight", "arithmetic").dtype == np.uint8


def test_arrays_cannot_be_written_to(work: Path, whole: bytes) -> None:
    """What comes out of a store is read-only, mapped from its files or not."""
    with small_store(work) as on_disk, small_store() as in_memory:
        fill(in_memory)
        for store in (on_disk, in_memory):
            with pytest.raises(ValueError, match="read-only"):
                store.depth(*SERIES[0])[0, 0] = 1.0
        assert isinstance(on_disk.depth(*SERIES[0]), np.memmap)


def test_the_files_are_ordinary_arrays(work: Path, whole: bytes) -> None:
    """Anything that reads .npy files reads them."""
    assert np.load(work / "series-0.depth.npy").shape == (STEPS, BASINS)
    assert np.load(work / "series-3.flags.npy")[-1, 0] == 3 + CHUNKS - 1


def test_finished_chunks_are_there_when_it_goes_on(work: Path, whole: bytes) -> None:
    """Three chunks put before the store was closed are not missing after, and the rest makes it whole."""
    shutil.rmtree(work)
    with small_store(work) as store:
        assert store.missing_chunks == tuple(range(CHUNKS))
        for k in (7, 2, 5):
            store.put(k, parts_of(k))
        assert (store.is_done(2), store.is_done(3)) == (True, False)
    with small_store(work) as store:
        assert set(range(CHUNKS)) - set(store.missing_chunks) == {2, 5, 7}
        assert fill(store) == whole


@pytest.mark.parametrize(
    "other",
    [
        {"key": "another job"},
        {"n_basins": BASINS - 1},
        {"series": SERIES[::-1]},
        {"borders": [0, STEPS]},
        {"n_steps": DAY, "borders": [0, DAY]},
    ],
    ids=lambda other: next(iter(other)),
)
def test_another_job_begins_anew(work: Path, whole: bytes, other: dict[str, object]) -> None:
    """With any other key, shape, order of series or border nothing of the earlier store is taken."""
    same = {
        "key": KEY,
        "n_steps": STEPS,
        "n_basins": BASINS,
        "series": SERIES,
        "borders": small_source().borders,
    }
    with SeriesStore.open(work, **(same | other)) as store:  # type: ignore[arg-type]
        assert len(store.missing_chunks) == len(store.borders) - 1
    # Nor is it there again for the first job.
    with small_store(work) as store:
        assert len(store.missing_chunks) == CHUNKS


def test_arrays_wait_for_the_last_chunk(work: Path) -> None:
    """As long as a chunk is missing no array comes out, so that no unset value is taken for a number."""
    for folder in (None, work):
        with small_store(folder) as store:
            for k in range(1, CHUNKS):
                store.put(k, parts_of(k))
            with pytest.raises(ValueError, match=f"1 of {CHUNKS} chunks are missing"):
                store.depth(*SERIES[0])


def test_parts_of_another_shape_are_refused() -> None:
    """A chunk with a series too few, or with rows of another chunk, is not kept."""
    with small_store() as store:
        with pytest.raises(ValueError, match=r"chunk 0: found .*; expected \(24, 3\) of each of"):
            store.put(0, {SERIES[0]: parts_of(0)[SERIES[0]]})
        short = {name: SeriesPart(p.depth[1:], p.observed_share, p.flags) for name, p in parts_of(0).items()}
        with pytest.raises(ValueError, match=r"chunk 0: found .*\(23, 3\)"):
            store.put(0, short)
        assert store.missing_chunks == tuple(range(CHUNKS))


def test_borders_must_divide_the_steps() -> None:
    """Borders that do not rise from 0 to the number of steps are refused."""
    for borders in ([0, 24], [1, STEPS], [0, 48, 24, STEPS]):
        with pytest.raises(ValueError, match=f"do not divide {STEPS} steps"):
            SeriesStore.open(None, key=KEY, n_steps=STEPS, n_basins=1, series=SERIES, borders=borders)


def test_nothing_at_all_is_a_store_too(work: Path) -> None:
    """A record without steps, or without basins, is complete at once or when its empty chunks are there."""
    with SeriesStore.open(work, key=KEY, n_steps=0, n_basins=2, series=SERIES, borders=[0]) as store:
        assert store.missing_chunks == ()
        assert store.depth(*SERIES[0]).shape == (0, 2)
    with SeriesStore.open(work, key=KEY, n_steps=2, n_basins=0, series=SERIES, borders=[0, 2]) as store:
        empty = SeriesPart(np.empty((2, 0)), np.empty((2, 0), np.float32), np.empty((2, 0), np.uint8))
        store.put(0, dict.fromkeys(SERIES, empty))
        assert store.flags(*SERIES[0]).shape == (2, 0)


def test_a_truncated_array_costs_only_the_chunks_that_it_lost(work: Path, whole: bytes) -> None:
    """Cut in the middle of the fourth chunk, the first three are kept, and the rest is computed again."""
    path = work / "series-1.depth.npy"
    head = path.stat().st_size - STEPS * BASINS * 8
    os.truncate(path, head + (3 * DAY + 5) * BASINS * 8)
    with small_store(work) as store:
        assert store.missing_chunks == tuple(range(3, CHUNKS))
        assert fill(store) == whole


def test_a_changed_value_costs_its_chunk(work: Path, whole: bytes) -> None:
    """A byte that differs from what was written is noticed by the checksum, whichever array it is in."""
    for name, size, k in (
        ("series-0.depth.npy", 8, 2),
        ("series-2.observed_share.npy", 4, 6),
        ("series-3.flags.npy", 1, 9),
    ):
        with (work / name).open("r+b") as file:
            file.seek(-(STEPS - k * DAY) * BASINS * size, os.SEEK_END)
            byte = file.read(1)[0]
            file.seek(-1, os.SEEK_CUR)
            file.write(bytes([byte ^ 1]))
    with small_store(work) as store:
        assert store.missing_chunks == (2, 6, 9)
        assert fill(store) == whole


@pytest.mark.parametrize("text", ["", "{", "[]", '{"key": "a job"}'])
def test_a_corrupted_manifest_begins_anew(work: Path, whole: bytes, text: str) -> None:
    """A store whose description cannot be read is not guessed at."""
    (work / "series.json").write_text(text)
    with small_store(work) as store:
        assert len(store.missing_chunks) == CHUNKS
        assert fill(store) == whole


@pytest.mark.parametrize("text", ["", "[1, 2", "[]", "null", "[1, 2, 3]"])
def test_a_corrupted_mark_costs_its_chunk(work: Path, whole: bytes, text: str) -> None:
    """A mark that cannot be read, or that has other checksums, is no mark."""
    (work / "done-4.json").write_text(text)
    with small_store(work) as store:
        assert store.missing_chunks == (4,)


@pytest.mark.parametrize("name", ["series-0.depth.npy", "series-3.flags.npy"])
def test_a_lost_or_foreign_array_begins_anew(work: Path, whole: bytes, name: str) -> None:
    """Without one of its arrays, or with an array of another shape in its place, nothing of the store is taken."""
    (work / name).unlink()
    with small_store(work) as store:
        assert len(store.missing_chunks) == CHUNKS
    np.save(work / name, np.zeros((STEPS + 1, BASINS)))
    with small_store(work) as store:
        assert len(store.missing_chunks) == CHUNKS
        assert fill(store) == whole


def test_files_left_by_a_kill_are_no_strangers(work: Path, whole: bytes) -> None:
    """A mark or a manifest that was being written when the run was killed does not matter."""
    for name in ("done-3.json.new", "series.json.new"):
        (work / name).write_text("[1")
    with small_store(work) as store:
        assert stored_bytes(store) == whole
    with small_store(work, key="another job") as store:
        assert len(store.missing_chunks) == CHUNKS
        store.remove()
    work.mkdir()
    (work / "series.json.new").write_text("{")
    with small_store(work) as store:
        assert fill(store) == whole


def test_a_folder_with_other_files_is_refused_and_left_alone(work: Path) -> None:
    """Files that are no store's are named, and none is touched."""
    work.mkdir(parents=True)
    (work / "rain.csv").write_text("time,A\n")
    with pytest.raises(WriteError, match=r"work: series under way: found files that are not .*: rain.csv; expected an"):
        small_store(work)
    assert [path.name for path in work.iterdir()] == ["rain.csv"]


def test_other_files_beside_a_store_are_refused(work: Path, whole: bytes) -> None:
    """A store into which something else was put is not worked in; the first five are named."""
    for n in range(7):
        (work / f"note{n}.txt").touch()
    with pytest.raises(WriteError, match=r"note0.txt, note1.txt, note2.txt, note3.txt, note4.txt \.\.\.; expected"):
        small_store(work, key="another job")
    for path in work.glob("note*"):
        path.unlink()
    with small_store(work) as store:
        assert stored_bytes(store) == whole


def test_files_with_the_names_of_a_store_without_its_manifest_are_not_deleted(work: Path) -> None:
    """Arrays that lie in a folder without the description of a store are somebody's."""
    work.mkdir(parents=True)
    np.save(work / "series-0.depth.npy", np.zeros(3))
    with pytest.raises(WriteError, match=r"found files that are not of a series under way: series-0.depth.npy"):
        small_store(work)
    assert np.load(work / "series-0.depth.npy").shape == (3,)


def test_one_run_at_a_time_works_in_a_folder(work: Path) -> None:
    """A second store in the same folder says which process holds the first, and does no harm."""
    with small_store(work) as store:
        store.put(0, parts_of(0))
        with pytest.raises(WriteError, match=rf"found in use by another run \(process {os.getpid()}\)"):
            small_store(work, key="another job")
        store.put(1, parts_of(1))
    with small_store(work) as store:
        assert store.missing_chunks == tuple(range(2, CHUNKS))


def test_a_full_disk_is_an_error_at_the_chunk(work: Path) -> None:
    """A device without room ends the run in one line that says what stays; with room again the run goes on."""
    with small_store(work) as store:
        store.put(0, parts_of(0))
        path = work / "series-2.depth.npy"
        path.rename(work.parent / "aside")
        path.symlink_to("/dev/full")
        with pytest.raises(
            WriteError,
            match=r"work: series under way: found no space left on device; .*; 1 of 12 chunks are finished and",
        ):
            store.put(1, parts_of(1))
        assert not store.is_done(1)
        path.unlink()
        (work.parent / "aside").rename(path)
    with small_store(work) as store:
        assert store.missing_chunks == tuple(range(1, CHUNKS))


def test_a_file_that_may_not_grow_is_an_error_at_the_chunk(work: Path) -> None:
    """A quota, here the process's limit for files, stops the chunk that meets it and none before."""
    with small_store(work) as store:
        soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
        resource.setrlimit(resource.RLIMIT_FSIZE, (128 + 5 * DAY * BASINS * 8 + 100, hard))
        try:
            for k in range(5):
                store.put(k, parts_of(k))
            with pytest.raises(WriteError, match=r"found file too large; .*; 5 of 12 chunks are finished and stay"):
                store.put(5, parts_of(5))
        finally:
            resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
    with small_store(work) as store:
        assert store.missing_chunks == tuple(range(5, CHUNKS))


def test_too_little_room_is_said_before_any_work(work: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The missing chunks' size is compared with what is free: 13 bytes a value of four series."""
    usage = namedtuple("usage", "total used free")  # noqa: PYI024 - as the standard library has it
    needed = STEPS * BASINS * 4 * 13
    monkeypatch.setattr(shutil, "disk_usage", lambda _: usage(0, 0, needed - 1))
    with pytest.raises(
        WriteError, match=rf"found {(needed - 1) / 1e9:.3g} GB free; expected {needed / 1e9:.3g} GB for"
    ):
        small_store(work)
    monkeypatch.setattr(shutil, "disk_usage", lambda _: usage(0, 0, needed))
    with small_store(work) as store:
        store.put(0, parts_of(0))
    # What is finished needs no room.
    monkeypatch.setattr(shutil, "disk_usage", lambda _: usage(0, 0, needed * 11 // 12))
    with small_store(work) as store:
        assert store.is_done(0)


def test_a_folder_that_goes_away_is_an_error_at_the_chunk(work: Path) -> None:
    """Chunks are not written into a folder that somebody deleted or moved."""
    with small_store(work) as store:
        store.put(0, parts_of(0))
        work.rename(work.parent / "moved")
        with pytest.raises(WriteError, match=r"found the folder or a file in it gone; run again; 1 of 12"):
            store.put(1, parts_of(1))
        assert not work.exists()
    with small_store(work.parent / "moved") as store:
        assert store.missing_chunks == tuple(range(1, CHUNKS))


def test_an_array_that_was_cut_after_the_last_chunk_is_not_read(work: Path) -> None:
    """A complete store whose file is shorter than its description gives an error, not the rows that are left."""
    with small_store(work) as store:
        fill(store)
        os.truncate(work / "series-0.depth.npy", 500)
        with pytest.raises(WriteError, match=r"found series-0\.depth\.npy cut short; run again; 12 of 12"):
            store.depth(*SERIES[0])


@pytest.mark.parametrize("what", ["file", "under a file"])
def test_a_folder_that_cannot_be_made_is_said(tmp_path: Path, what: str) -> None:
    """A file in the way, of the folder or of its parent, is one clear line."""
    (tmp_path / "file").touch()
    folder = tmp_path / "file" if what == "file" else tmp_path / "file" / "work"
    with pytest.raises(
        WriteError, match=r"series under way: found (file exists|not a directory); expected a folder that"
    ):
        small_store(folder)


def test_removing_leaves_nothing_but_what_is_not_its_own(work: Path, whole: bytes) -> None:
    """The folder goes with the store, unless something else has come to lie in it."""
    small_store(work).remove()
    assert not work.exists()
    store = small_store(work)
    (work / "note.txt").touch()
    store.remove()
    assert [path.name for path in work.iterdir()] == ["note.txt"]


def test_a_store_in_memory_is_freed(whole: bytes) -> None:
    """Removing one in memory lets its arrays go; closing keeps them."""
    store = small_store()
    fill(store)
    store.close()
    assert stored_bytes(store) == whole
    store.remove()
    with pytest.raises(IndexError):
        store.depth(*SERIES[0])


def test_the_manifest_says_what_it_is(work: Path, whole: bytes) -> None:
    """Whoever finds the folder can see what it is, and of which series."""
    manifest = json.loads((work / "series.json").read_text())
    assert (manifest["what"], manifest["series"][0]) == ("series under way, by chunks", list(SERIES[0]))

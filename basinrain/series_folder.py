"""The arrays of series under way in files of one folder, with a mark for every chunk that is finished."""

from __future__ import annotations

import io
import json
import re
import shutil
import zlib
from collections.abc import Iterator, Mapping
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any, BinaryIO, Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problem, WriteError
from basinrain.folder_lock import FolderLock
from basinrain.series.engine import SeriesPart

__all__ = ["KINDS", "Series", "SeriesFolder", "StoreLayout"]

Series = tuple[str, str]
"""A policy for gaps and an averaging method."""

KINDS: Final = {"depth": "<f8", "observed_share": "<f4", "flags": "|u1"}
"""The arrays of a series, as :class:`~basinrain.series.engine.SeriesPart` has them, with their types in files."""

_BYTES: Final = sum(np.dtype(code).itemsize for code in KINDS.values())
_MANIFEST: Final = "series.json"
_LOCK: Final = "series.lock"
_OWN: Final = re.compile(
    rf"done-\d+\.json|series-\d+\.(?:{'|'.join(KINDS)})\.npy|series\.json|(?:done-\d+|series)\.json\.new|series\.lock"
)
"""Names of the files of a store; whatever else lies in its folder is not touched, and the folder is refused."""

_BLOCK: Final = 16 << 20
"""Bytes read at a time when finished chunks are looked at again."""


@dataclass(frozen=True)
class StoreLayout:
    """What must be equal for the chunks of one run to serve another.

    Parameters
    ----------
    key
        Stands for everything that decides the results.
    n_steps, n_basins
        The shape of every array.
    series
        Policies and methods.
    borders
        The first step of every chunk, and ``n_steps`` last.

    Raises
    ------
    ValueError
        The borders do not divide the steps.

    Examples
    --------
    >>> layout = StoreLayout("a job", 3, 1, (("reweight", "idw"),), (0, 2, 3))
    >>> layout.n_chunks, layout.empty("flags").shape
    (2, (3, 1))
    """

    key: str
    n_steps: int
    n_basins: int
    series: tuple[Series, ...]
    borders: tuple[int, ...]

    def __post_init__(self) -> None:
        if self.borders[0] != 0 or self.borders[-1] != self.n_steps or (np.diff(self.borders) <= 0).any():
            message = f"the borders {self.borders} do not divide {self.n_steps} steps"
            raise ValueError(message)

    @property
    def n_chunks(self) -> int:
        """How many chunks there are."""
        return len(self.borders) - 1

    @property
    def manifest(self) -> dict[str, Any]:
        """All of it, as JSON has it."""
        return {
            "what": "series under way, by chunks",
            "key": self.key,
            "steps": self.n_steps,
            "basins": self.n_basins,
            "series": [list(name) for name in self.series],
            "borders": list(self.borders),
        }

    def rows(self, k: int) -> int:
        """Return how many steps a chunk has."""
        return self.borders[k + 1] - self.borders[k]

    def empty(self, kind: str) -> npt.NDArray[Any]:
        """Return an array of one of :data:`KINDS`, whose values are not set."""
        return np.empty((self.n_steps, self.n_basins), dtype=KINDS[kind])


class SeriesFolder:
    """Arrays in files, and what is finished of them.

    Parameters
    ----------
    folder
        Made where it is not there; held until :meth:`close`.
    layout
        A store with another layout, or one that cannot be read, is begun anew.

    Attributes
    ----------
    done : set of int
        The chunks that are finished.

    Raises
    ------
    WriteError
        As :meth:`basinrain.series_store.SeriesStore.open`.

    Examples
    --------
    >>> from tempfile import mkdtemp
    >>> held = SeriesFolder(Path(mkdtemp()) / "work", StoreLayout("a job", 2, 1, (("reweight", "idw"),), (0, 2)))
    >>> part = SeriesPart(np.array([[1.0], [2.0]]), np.ones((2, 1), np.float32), np.zeros((2, 1), np.uint8))
    >>> held.put(0, {("reweight", "idw"): part})
    >>> held.done, held.array(0, "depth").ravel()
    ({0}, memmap([1., 2.]))
    >>> held.close(remove=True)
    """

    def __init__(self, folder: Path, layout: StoreLayout) -> None:
        self.layout = layout
        self.done: set[int] = set()
        self._folder = folder
        self._files = [
            (name, kind, folder / f"series-{n}.{kind}.npy") for n, name in enumerate(layout.series) for kind in KINDS
        ]
        self._heads = {kind: _head(kind, layout) for kind in KINDS}
        with self._clear_errors():
            folder.mkdir(parents=True, exist_ok=True)
            self._refuse_strangers()
            self._lock = FolderLock(folder / _LOCK)
            try:
                if self._is_ours():
                    self.done.update(k for k in range(layout.n_chunks) if self._is_whole(k))
                else:
                    self._begin()
                self._require_room()
            except BaseException:
                self._lock.release()
                raise

    def put(self, k: int, parts: Mapping[Series, SeriesPart]) -> None:
        """Write a chunk, then its mark."""
        with self._clear_errors():
            checks = []
            for name, kind, path in self._files:
                values = np.ascontiguousarray(getattr(parts[name], kind), dtype=KINDS[kind])
                data = values.reshape(-1).view(np.uint8).data
                # Not made anew where it is gone: then the other chunks are gone too.
                with path.open("r+b", buffering=0) as file:
                    file.seek(self._offset(kind, self.layout.borders[k]))
                    _write(file, data)
                checks.append(zlib.crc32(data))
            _write_whole(self._mark(k), checks)
        self.done.add(k)

    def array(self, n: int, kind: str) -> npt.NDArray[Any]:
        """Return an array of the n-th series, mapped read-only."""
        if not self.layout.n_steps * self.layout.n_basins:
            return self.layout.empty(kind)
        path = self._folder / f"series-{n}.{kind}.npy"
        with self._clear_errors():
            try:
                values: npt.NDArray[Any] = np.load(path, mmap_mode="r")
            except ValueError as error:
                raise self._refused(f"{path.name} cut short", remedy="run again") from error
        return values

    def close(self, *, remove: bool = False) -> None:
        """Let go of the folder; with ``remove`` delete the store's files, and the folder where it is empty then."""
        if remove:
            with self._clear_errors():
                self._clear()
        self._lock.release(remove=remove)
        if remove:
            # Where something else has come to lie in it, it stays.
            with suppress(OSError):
                self._folder.rmdir()

    def _is_ours(self) -> bool:
        """Whether the folder has a store of this layout, whose arrays are there."""
        try:
            same = json.loads((self._folder / _MANIFEST).read_text(encoding="utf-8")) == self.layout.manifest
        except (FileNotFoundError, ValueError):
            return False
        return same and all(path.is_file() and self._has_head(path, kind) for _, kind, path in self._files)

    def _has_head(self, path: Path, kind: str) -> bool:
        with path.open("rb") as file:
            return file.read(len(self._heads[kind])) == self._heads[kind]

    def _is_whole(self, k: int) -> bool:
        """Whether a chunk has a mark and its values are still those of which the mark was made."""
        try:
            checks = json.loads(self._mark(k).read_text(encoding="utf-8"))
        except (FileNotFoundError, ValueError):
            return False
        first, stop = self.layout.borders[k : k + 2]
        found = []
        for _, kind, path in self._files:
            with path.open("rb", buffering=0) as file:
                file.seek(self._offset(kind, first))
                found.append(_checksum(file, self._offset(kind, stop) - self._offset(kind, first)))
        return bool(checks == found)

    def _begin(self) -> None:
        self._clear()
        _write_whole(self._folder / _MANIFEST, self.layout.manifest)
        for _, kind, path in self._files:
            with path.open("xb") as file:
                file.write(self._heads[kind])

    def _clear(self) -> None:
        """Delete the store's files by name: marks, arrays, manifest, so that no mark outlives its values."""
        for path in sorted(self._folder.iterdir()):
            if _OWN.fullmatch(path.name) and path.name != _LOCK:
                path.unlink()

    def _refuse_strangers(self) -> None:
        names = sorted(path.name for path in self._folder.iterdir())
        strangers = [name for name in names if not _OWN.fullmatch(name)]
        if _MANIFEST not in names and set(names) - {_LOCK, f"{_MANIFEST}.new"}:
            strangers = names
        if strangers:
            named = ", ".join(strangers[:5]) + (" ..." if len(strangers) > 5 else "")
            raise self._refused(
                f"files that are not of a series under way: {named}",
                expected="an empty folder or one of an earlier run",
                remedy="move them away or name another folder",
            )

    def _require_room(self) -> None:
        """Refuse a disk that has too little room, before hours are spent on it."""
        steps = sum(self.layout.rows(k) for k in range(self.layout.n_chunks) if k not in self.done)
        needed = steps * self.layout.n_basins * len(self.layout.series) * _BYTES
        free = shutil.disk_usage(self._folder).free
        if needed > free:
            raise self._refused(
                f"{free / 1e9:.3g} GB free",
                expected=f"{needed / 1e9:.3g} GB for the series",
                remedy="make room or name a folder on another disk",
            )

    def _offset(self, kind: str, step: int) -> int:
        return len(self._heads[kind]) + step * self.layout.n_basins * np.dtype(KINDS[kind]).itemsize

    def _mark(self, k: int) -> Path:
        return self._folder / f"done-{k}.json"

    def _refused(self, found: str, *, expected: str = "", remedy: str) -> WriteError:
        if self.done:
            remedy += f"; {len(self.done)} of {self.layout.n_chunks} chunks are finished and stay"
        return WriteError(
            Problem(item="series under way", found=found, expected=expected, remedy=remedy, file=str(self._folder))
        )

    @contextmanager
    def _clear_errors(self) -> Iterator[None]:
        try:
            yield
        except FileNotFoundError as error:
            raise self._refused("the folder or a file in it gone", remedy="run again") from error
        except OSError as error:
            found = (error.strerror or str(error)).lower()
            remedy = "see to it, or name another folder"
            raise self._refused(found, expected="a folder that can be written", remedy=remedy) from error


def _head(kind: str, layout: StoreLayout) -> bytes:
    """Return how the file of an array begins."""
    head = io.BytesIO()
    shape = (layout.n_steps, layout.n_basins)
    np.lib.format.write_array_header_1_0(head, {"descr": KINDS[kind], "fortran_order": False, "shape": shape})
    return head.getvalue()


def _write(file: io.RawIOBase | BinaryIO, data: memoryview) -> None:
    """Write all of it; a full disk is an error here, or where the file is closed, and not later."""
    while len(data):
        written = file.write(data)
        data = data[written or 0 :]


def _write_whole(path: Path, content: object) -> None:
    """Write a JSON file that is there whole or not at all."""
    new = path.with_name(f"{path.name}.new")
    with new.open("wb", buffering=0) as file:
        _write(file, memoryview(json.dumps(content).encode("utf-8")))
    new.replace(path)


def _checksum(file: io.RawIOBase | BinaryIO, size: int) -> int:
    """Return the checksum of the next bytes, or -1 where the file ends before."""
    check = 0
    while size:
        block = file.read(min(size, _BLOCK))
        if not block:
            return -1
        check = zlib.crc32(block, check)
        size -= len(block)
    return check

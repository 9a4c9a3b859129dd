"""An output folder that is whole at every moment: built beside its place, then moved there."""

from __future__ import annotations

import json
import os
import secrets
import shutil
from collections.abc import Iterable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from basinrain.errors import Problem, WriteError

__all__ = ["RECORD", "check_folder", "whole_folder"]

RECORD = "record.json"
"""The file by which a folder is known as an earlier output, with the list of what belongs to it."""


def check_folder(folder: Path, inputs: Iterable[Path]) -> None:
    """Refuse a folder that results must not replace.

    Parameters
    ----------
    folder
        Where the results are to go; it need not exist.
    inputs
        Files that the run reads.

    Raises
    ------
    WriteError
        It is a file, holds an input, holds something that is not from an earlier run, or cannot be written.
    """
    place = folder.resolve()
    if place.exists() and not place.is_dir():
        raise _refused(folder, "a file", "a folder", "name another output folder")
    for path in inputs:
        if path.resolve().is_relative_to(place):
            raise _refused(folder, f"the input {path.name} inside it", "a folder without inputs", "name another one")
    _restore(place)
    _refuse_strangers(folder, place)
    parent = next(p for p in place.parents if p.exists())
    if not parent.is_dir():
        raise _refused(folder, f"the file {parent} on the way to it", "a folder that can be made", "name another one")
    if not os.access(parent, os.W_OK | os.X_OK):
        raise _refused(folder, f"no right to write in {parent}", "a folder that can be written", "name another one")
    if place.exists() and not os.access(place, os.W_OK | os.X_OK):
        raise _refused(folder, "no right to write there", "a folder that can be written", "name another one")


def _refused(folder: Path, found: str, expected: str, remedy: str) -> WriteError:
    return WriteError(Problem(item="output folder", found=found, expected=expected, remedy=remedy, file=str(folder)))


def _refuse_strangers(folder: Path, place: Path) -> None:
    if not place.exists():
        return
    strangers = sorted({path.name for path in place.iterdir()} - _own_files(place))
    if strangers:
        named = ", ".join(strangers[:5]) + (" ..." if len(strangers) > 5 else "")
        raise _refused(
            folder,
            f"files that no earlier run wrote: {named}",
            "an empty folder or an earlier output",
            "move them away or name another output folder",
        )


def _own_files(place: Path) -> set[str]:
    try:
        content = json.loads((place / RECORD).read_text(encoding="utf-8"))
        return {RECORD, *content["files"]}
    except (OSError, ValueError, KeyError, TypeError):
        return set()


def _earlier(place: Path) -> Path:
    return place.with_name(f".{place.name}.earlier")


def _restore(place: Path) -> None:
    """Put an earlier output back that a killed run had moved aside, or clear it where the new one had arrived."""
    earlier = _earlier(place)
    if earlier.exists():
        if not place.exists():
            earlier.rename(place)
        elif (place / RECORD).exists():
            shutil.rmtree(earlier, ignore_errors=True)


@contextmanager
def whole_folder(folder: Path) -> Iterator[Path]:
    """Give a temporary folder beside ``folder``; move it into place when the block ends well.

    A run that fails leaves the earlier folder as it was and nothing beside it. A run that is killed leaves the earlier
    folder whole, at worst under the name ``.<name>.earlier`` from which the next run puts it back.

    Raises
    ------
    WriteError
        The folder cannot be made, written or moved.
    """
    place = folder.resolve()
    built = place.with_name(f".{place.name}.{os.getpid()}.{secrets.token_hex(4)}")
    alone = not place.parent.exists()
    try:
        _restore(place)
        _refuse_strangers(folder, place)
        built.mkdir(parents=True)
        yield built
        earlier = _earlier(place)
        # Looked at again: the run took its time, and what came to lie there meanwhile is not ours.
        _refuse_strangers(folder, place)
        moved = place.exists()
        if moved:
            place.rename(earlier)
        try:
            built.rename(place)
        except OSError:
            if moved and not place.exists():
                earlier.rename(place)
            raise
        shutil.rmtree(earlier, ignore_errors=True)
    except OSError as error:
        raise _refused(folder, (error.strerror or str(error)).lower(), "a folder that can be written", "") from error
    finally:
        shutil.rmtree(built, ignore_errors=True)
        if alone:
            # Made for a result that did not come; a folder with something in it stays.
            with suppress(OSError):
                place.parent.rmdir()

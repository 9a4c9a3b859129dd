"""Names of files that any basin's id can have, on any system."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence
from typing import Final

__all__ = ["file_stems"]

_LONGEST: Final = 160
"""Bytes; systems take 255, of which a suffix and a number take some."""
_DEVICES: Final = frozenset({"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(10))})
"""What some systems take for a device, whatever the suffix."""


def file_stems(ids: Sequence[str], *, taken: Iterable[str] = ()) -> list[str]:
    """Return a name for the file of every id, without the suffix, no two alike.

    Letters and digits of any script, ``-``, ``_`` and dots within stay; everything else becomes ``_``. Names that
    differ in case only, or in how a letter is encoded, count as alike: the later gets a number. An id that can stay as
    it is does so.

    Parameters
    ----------
    ids
        The ids, repeated ones too.
    taken
        Names that are in use.

    Returns
    -------
    list of str
        One per id, in order.

    Examples
    --------
    >>> file_stems(["Upper", "upper", "a/b", "a_b", "..", "con", ""])
    ['Upper', 'upper-2', 'a_b-2', 'a_b', '__', 'con_', '_']
    >>> file_stems(["index"], taken=["index"])
    ['index-2']
    """
    used = {_alike(name) for name in taken}
    safe = [_safe(basin) for basin in ids]
    stems = [""] * len(safe)
    for changed in (False, True):
        for at, stem in enumerate(safe):
            if (stem != ids[at]) == changed:
                stems[at] = _free(stem, used)
                used.add(_alike(stems[at]))
    return stems


def _safe(text: str) -> str:
    text = "".join(sign if sign.isalnum() or sign in "-_." else "_" for sign in unicodedata.normalize("NFC", text))
    inner = text.strip(".")
    before = len(text) - len(text.lstrip("."))
    text = "_" * before + inner + "_" * (len(text) - before - len(inner))
    while len(text.encode()) > _LONGEST:
        text = text[:-1]
    if text.split(".")[0].casefold() in _DEVICES:
        head, dot, tail = text.partition(".")
        text = f"{head}_{dot}{tail}"
    return text or "_"


def _free(stem: str, used: set[str]) -> str:
    name, number = stem, 1
    while _alike(name) in used:
        number += 1
        name = f"{stem}-{number}"
    return name


def _alike(name: str) -> str:
    return unicodedata.normalize("NFKC", unicodedata.normalize("NFKC", name).casefold())

"""Notes: what the user must know about a result besides its numbers."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Literal

__all__ = ["Note", "once"]


@dataclass(frozen=True, kw_only=True)
class Note:
    """One remark that travels with the results to every output.

    Parameters
    ----------
    code
        A short fixed word for programs, in kebab case: ``"gap-over-peak"``.
    text
        One plain sentence for people, with the numbers that it rests on.
    level
        ``"warning"`` where the result may mislead if the remark is overlooked, else ``"info"``.
    storm, basin, gauge, method
        What it concerns; empty when it concerns the whole run.

    Examples
    --------
    >>> str(Note(code="one-gauge-inside", text="Only gauge W03 lies inside basin Upper.", basin="Upper"))
    'Only gauge W03 lies inside basin Upper.'
    """

    code: str
    text: str
    level: Literal["warning", "info"] = "warning"
    storm: str = ""
    basin: str = ""
    gauge: str = ""
    method: str = ""

    def __str__(self) -> str:
        return f"{self.storm}: {self.text}" if self.storm else self.text


def once(notes: Iterable[Note], storms: Sequence[str]) -> tuple[Note, ...]:
    """Return the notes with what is said of several storms said once.

    Parameters
    ----------
    notes
        Notes of a run, in order.
    storms
        Names of the run's storms. A note of all of them (two or more) loses its storm; a note of some names them.

    Examples
    --------
    >>> both = [Note(code="dry", text="It was dry.", storm=name) for name in ("Quill", "Reed")]
    >>> [str(note) for note in once(both, ["Quill", "Reed"])]
    ['It was dry.']
    >>> [str(note) for note in once(both, ["Quill", "Reed", "Sedge"])]
    ['Quill, Reed: It was dry.']
    """
    where: dict[Note, list[str]] = {}
    for note in notes:
        names = where.setdefault(replace(note, storm=""), [])
        if note.storm not in names:
            names.append(note.storm)
    everywhere = set(storms) if len(storms) > 1 else None
    return tuple(
        replace(note, storm="" if set(names) == everywhere else ", ".join(name for name in names if name))
        for note, names in where.items()
    )

"""The head of the report: what was asked, and what the reader must be warned of."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final

import numpy as np
import shapely

from basinrain.basins import UNION
from basinrain.notes import Note
from basinrain.report.table import Table
from basinrain.report.words import area_text, counted, step_text, unit_text, unit_word, when_text, zone_text
from basinrain.results import StormRun
from basinrain.results_common import GaugedRun, Run
from basinrain.storms import MEAN, NEAREST_RECORDER
from basinrain.units import area_factor, volume_unit_for

__all__ = ["NoteGroup", "note_groups", "storms_asked", "units_asked", "what_was_asked", "where_asked"]

_LISTED: Final = 6
_NAMED: Final = 40
_TOUCH: Final = 1e-3


@dataclass(frozen=True)
class NoteGroup:
    """Notes of one kind.

    Parameters
    ----------
    title
        The kind, in words.
    count
        How many there are.
    texts
        The first of them, each once.
    rest
        What is said of the others; empty when all are listed.
    """

    title: str
    count: int
    texts: tuple[str, ...]
    rest: str


def note_groups(notes: Iterable[Note]) -> list[NoteGroup]:
    """Group notes by their kind, in the order in which the kinds first appear.

    Examples
    --------
    >>> groups = note_groups([Note(code="far-gauge", text="A is far."), Note(code="far-gauge", text="B is far.")])
    >>> groups[0].title, groups[0].count, groups[0].texts, groups[0].rest
    ('Far gauge', 2, ('A is far.', 'B is far.'), '')
    """
    kinds: dict[str, dict[str, Note]] = {}
    for note in notes:
        kinds.setdefault(note.code, {}).setdefault(str(note), note)
    groups = []
    for code, by_text in kinds.items():
        texts = tuple(by_text)
        # One more line is shorter than the sentence about it.
        shown = texts if len(texts) <= _LISTED + 1 else texts[:_LISTED]
        others = [by_text[text] for text in texts[len(shown) :]]
        groups.append(NoteGroup(code.replace("-", " ").capitalize(), len(texts), shown, _rest(others)))
    return groups


def _rest(notes: list[Note]) -> str:
    if not notes:
        return ""
    where = list(dict.fromkeys(note.basin for note in notes if note.basin))
    named = ", ".join(where[:_NAMED]) + (f" and {len(where) - _NAMED} more" if len(where) > _NAMED else "")
    concerns = f", concerning {'basin' if len(where) == 1 else 'basins'} {named}" if where else ""
    return f"{len(notes)} more of this kind{concerns}; all are in record.json."


def what_was_asked(run: StormRun) -> list[tuple[str, str]]:
    """Return the job in a few lines, each a name and a text."""
    lines = [*where_asked(run), ("Averages", ", ".join(run.methods))]
    infill = run.settings.get("infill", {})
    if "method" in infill:
        scale = infill.get("scale")
        lines.append(("Infill", str(infill["method"]) + (f" at the scale of the {scale}" if scale else "")))
    lines.append(("Units", units_asked(run)))
    lines.append(("Step", "storm totals only" if run.record.step == "storm" else step_text(run.record.step)))
    return lines


def where_asked(run: GaugedRun) -> list[tuple[str, str]]:
    """Return basins and gauges in two lines, each a name and a text."""
    basins = [b for b, basin in enumerate(run.basins.ids) if basin != UNION]
    union = (
        shapely.union_all(run.basins.polygons[basins]) if len(basins) == len(run.basins) else run.basins.polygons[-1]
    )
    area = union.area / area_factor(run.area_unit)
    inside = int(np.count_nonzero(shapely.dwithin(shapely.points(run.network.x, run.network.y), union, _TOUCH)))
    union_words = ", and their union" if UNION in run.basins.ids else ""
    return [
        ("Basins", f"{counted(len(basins), 'basin')}{union_words}; {area_text(area)} {unit_text(run.area_unit)}"),
        ("Gauges", f"{len(run.network)}, of which {inside} inside the {'basins' if len(basins) > 1 else 'basin'}"),
    ]


def units_asked(run: Run) -> str:
    """Return the units of depths, areas and volumes."""
    volume_unit = unit_text(volume_unit_for(run.depth_unit))
    return f"depths in {unit_word(run.depth_unit)}, areas in {unit_text(run.area_unit)}, volumes in {volume_unit}"


def storms_asked(run: StormRun) -> Table:
    """Return the storms with their windows and what times their hyetographs."""
    rows = []
    for result in run.storms:
        storm, record = result.storm, result.completed.record
        pattern = {MEAN: "basin mean", NEAREST_RECORDER: "nearest recording gauge"}.get(
            storm.pattern, f"gauge {storm.pattern}"
        )
        steps = len(record)
        rows.append(
            (
                storm.name,
                when_text(storm.start),
                when_text(storm.end),
                str(steps),
                pattern if steps > 1 else "one total: no times",
            )
        )
    return Table(
        caption="Storms",
        heads=("storm", "start", "end", "steps", "timed by"),
        align="tttnt",
        rows=rows,
        notes=(
            f"Times are in {zone_text(run.record.zone)}.",
            "A window holds what fell after its start and up to its end.",
        ),
    )

"""How the network changed during a record: sentences and a table."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from basinrain.report.table import Table
from basinrain.report.words import DASH, counted, unbroken, when_text, zone_text
from basinrain.results_series import SeriesRun
from basinrain.series.network_changes import CLOSES, OPENS, RETURNS, SILENT

__all__ = ["CHANGES", "changes_sentence", "changes_table"]

CHANGES: Final = 30
"""Lines of changes."""

_NAMED: Final = 6
"""Gauges that are named where several change together."""


def changes_sentence(run: SeriesRun) -> str:
    """Return how often gauges came and went."""
    silence = _silence(run)
    if not run.changes:
        silent = f", or was silent for {silence}," if silence else ""
        return f"No gauge came into service or went out of it{silent} during the record."
    opened, closed = (sum(change.change == word for change in run.changes) for word in (OPENS, CLOSES))
    gauges = len({change.gauge for change in run.changes if change.change not in (OPENS, CLOSES)})
    silent = f"; {counted(gauges, 'gauge was', 'gauges were')} silent for {silence}" if silence else ""
    return (
        f"Gauges came into service {_times(opened)} and went out of it {_times(closed)} within the record{silent}. "
        "Means before and after a change are not of the same gauges."
    )


def _times(n: int) -> str:
    return "once" if n == 1 else "never" if n == 0 else f"{n} times"


def _silence(run: SeriesRun) -> str:
    """Return how long a silence is that counts as a change; empty where none does."""
    longest = run.setup.infill.longest_gap
    return "" if longest == float("inf") else f"more than {longest:g} day{'' if longest == 1 else 's'}"


def changes_table(run: SeriesRun) -> Table | None:
    """Return the changes in time, a silence in one line, gauges that changed together in one; None without any.

    Of many lines those that last stand before silences.
    """
    if not run.changes:
        return None
    stretches = _together(_stretches(run))
    order = sorted(range(len(stretches)), key=lambda k: (stretches[k].change == SILENT, k))
    shown = [stretches[k] for k in sorted(order[:CHANGES])]
    notes = [f"Times are in {zone_text(run.record.zone)}."]
    silence = _silence(run)
    notes.append(f"Gauges from then on: in service{f', and not silent for {silence}' if silence else ''}.")
    if len(shown) < len(stretches):
        notes.append(
            f"Shown: {len(shown)} of {len(stretches)} lines, gauges that come into service or go out of it first. All "
            "are in network_changes.csv."
        )
    return Table(
        caption="Changes of the network",
        heads=("from", "until", "gauges", "change", "gauges from then on"),
        align="ttttn",
        rows=[
            (
                unbroken(when_text(one.start)),
                unbroken(when_text(one.end)),
                one.gauge,
                "silent for long" if one.change == SILENT else one.change,
                str(one.gauges) if one.gauges is not None else DASH,
            )
            for one in shown
        ],
        notes=tuple(notes),
    )


@dataclass(frozen=True)
class _Stretch:
    """A change that lasts, or a silence with its end, NaT where it lasts or is not known."""

    start: np.datetime64
    end: np.datetime64
    gauge: str
    change: str
    gauges: int | None


def _stretches(run: SeriesRun) -> list[_Stretch]:
    """Return the changes in time, each silence with the change that ends it."""
    never = np.datetime64("NaT", "s")
    found: list[_Stretch] = []
    silent: dict[str, int] = {}
    for one in run.changes:
        if one.change != SILENT and one.gauge in silent:
            k = silent.pop(one.gauge)
            found[k] = replace(found[k], end=one.time)
            if one.change == RETURNS:
                continue
        if one.change == RETURNS:
            # Silent since the record began, or since it came into service.
            found.append(_Stretch(never, one.time, one.gauge, SILENT, None))
            continue
        if one.change == SILENT:
            silent[one.gauge] = len(found)
        found.append(_Stretch(one.time, never, one.gauge, one.change, one.gauges))
    return found


def _together(stretches: list[_Stretch]) -> list[_Stretch]:
    """Return the stretches with those that are alike in one, whose gauge names some of them."""
    alike: dict[tuple[str, str, str], list[_Stretch]] = {}
    for one in stretches:
        alike.setdefault((str(one.start), str(one.end), one.change), []).append(one)
    joined = []
    for several in alike.values():
        named = ", ".join(one.gauge for one in several[:_NAMED])
        more = len(several) - _NAMED
        joined.append(replace(several[0], gauge=f"{named} and {more} more" if more > 0 else named))
    return joined

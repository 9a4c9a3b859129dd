"""How the network changed during a record: sentences and a table."""

from __future__ import annotations

from typing import Final

from basinrain.report.table import Table
from basinrain.report.words import counted, when_text, zone_text
from basinrain.results_series import SeriesRun
from basinrain.series.network_changes import CLOSES, OPENS

__all__ = ["CHANGES", "changes_sentence", "changes_table"]

CHANGES: Final = 40
"""Changes of a network that are listed."""


def changes_sentence(run: SeriesRun) -> str:
    """Return how often gauges came and went."""
    if not run.changes:
        return (
            "No gauge came into service, went out of it, or fell silent for longer than may be infilled "
            f"({_longest(run)}), during the record."
        )
    opened, closed = (sum(change.change == word for change in run.changes) for word in (OPENS, CLOSES))
    silent = len({change.gauge for change in run.changes if change.change not in (OPENS, CLOSES)})
    return (
        f"Gauges came into service {_times(opened)} and went out of it {_times(closed)} within the record; "
        f"{counted(silent, 'gauge was', 'gauges were')} silent for longer than may be infilled ({_longest(run)}). Means "
        "before and after a change are not of the same gauges."
    )


def _times(n: int) -> str:
    return "once" if n == 1 else "never" if n == 0 else f"{n} times"


def _longest(run: SeriesRun) -> str:
    longest = run.setup.infill.longest_gap
    return "a gap of any length" if longest == float("inf") else f"{longest:g} day{'' if longest == 1 else 's'}"


def changes_table(run: SeriesRun) -> Table | None:
    """Return the changes in time, of many those that last before silences; None where there is none."""
    if not run.changes:
        return None
    order = sorted(range(len(run.changes)), key=lambda k: (run.changes[k].change not in (OPENS, CLOSES), k))
    shown = [run.changes[k] for k in sorted(order[:CHANGES])]
    notes = [f"Times are in {zone_text(run.record.zone)}."]
    notes.append("Gauges from then on: in service, and not silent for longer than may be infilled.")
    if len(shown) < len(run.changes):
        notes.append(
            f"Shown: {len(shown)} of {len(run.changes)}, gauges that come into service or go out of it first. All are "
            "in network_changes.csv."
        )
    return Table(
        caption="Changes of the network",
        heads=("time", "gauge", "change", "gauges from then on"),
        align="tttn",
        rows=[(when_text(one.time), one.gauge, one.change, str(one.gauges)) for one in shown],
        notes=tuple(notes),
    )

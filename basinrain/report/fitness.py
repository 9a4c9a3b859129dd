"""The section of the storm report on whether the record is fit to use, in short."""

from __future__ import annotations

from dataclasses import dataclass

from basinrain.report.edit_list import edit_table
from basinrain.report.findings_list import check_counts, settled_table
from basinrain.report.table import Table
from basinrain.report.words import counted, zone_text
from basinrain.results import Run

__all__ = ["Fitness", "fitness"]


@dataclass(frozen=True)
class Fitness:
    """What the section says: sentences, then tables."""

    sentences: tuple[str, ...]
    tables: tuple[Table, ...]


def fitness(run: Run) -> Fitness:
    """Return what screening found in a run's record and what the job says of it, with the whole edit log.

    Parameters
    ----------
    run
        Any run.
    """
    screening = run.screening
    found = screening.findings
    made = counted(len(screening.checks_run), "check was", "checks were")
    sentences = [
        f"{made} made, {len(screening.checks_skipped)} could not be; basinrain screen tells of them at length."
    ]
    tables: list[Table] = []
    if found:
        weighty = [f for f in found if f.severity != "remark"]
        if any(f.state == "open" for f in weighty):
            sentences.append("Open findings that touch what was computed stand under Warnings, with their evidence.")
        tables.append(check_counts(found))
        settled = settled_table(weighty)
        if settled is not None:
            sentences.append(f"Times are in {zone_text(run.record.zone)}, depths in the evidence in mm.")
            tables.append(settled)
    else:
        sentences.append("No check found anything.")
    edits = edit_table(run.edit_rows, depth_unit=run.depth_unit)
    if edits is not None:
        tables.append(edits)
    else:
        sentences.append("The job edits nothing.")
    return Fitness(tuple(sentences), tuple(tables))

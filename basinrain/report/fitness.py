"""The section of a report on whether the record is fit to use, in short."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from basinrain.report.edit_list import edit_table
from basinrain.report.findings_list import check_counts, settled_table
from basinrain.report.table import Table
from basinrain.report.words import counted, zone_text
from basinrain.results_common import GaugedRun
from basinrain.results_series import SeriesRun

__all__ = ["Fitness", "fitness"]

_NOT_SCREENED: Final = (
    "The record was not screened: it was read chunk by chunk, and the checks look at a record as a whole. Screen it "
    "with basinrain screen, some years at a time where it is too large."
)


@dataclass(frozen=True)
class Fitness:
    """What the section says: sentences, then tables."""

    sentences: tuple[str, ...]
    tables: tuple[Table, ...]


def fitness(run: GaugedRun) -> Fitness:
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
    if isinstance(run, SeriesRun) and not len(run.record):
        sentences = [_NOT_SCREENED]
    elif found:
        weighty = [f for f in found if f.severity != "remark"]
        still = sum(f.state == "open" for f in weighty)
        if still and isinstance(run, SeriesRun):
            sentences.append(
                f"{counted(still, 'open finding')} that may matter {'is' if still == 1 else 'are'} in the record that "
                "was averaged: findings.csv has the evidence."
            )
        elif still:
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

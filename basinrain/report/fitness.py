"""The section of the storm report on whether the record is fit to use, in short."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from basinrain.rainfall import RainRecord
from basinrain.report.edit_list import edit_table
from basinrain.report.findings_list import count_table, short_table
from basinrain.report.table import Table
from basinrain.report.words import counted
from basinrain.results import Run
from basinrain.screening import Finding

__all__ = ["Fitness", "fitness"]

_MOST: Final = 20


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
        tables.append(count_table(found))
        weighty = [f for f in found if f.severity != "remark"]
        tables += _tables("Open", [f for f in weighty if f.state == "open"], run.record)
        tables += _tables("Rejected by the job", [f for f in found if f.state == "rejected"], run.record)
        tables += _tables("Accepted by the job", [f for f in found if f.state == "accepted"], run.record)
    else:
        sentences.append("No check found anything.")
    edits = edit_table(run.edit_rows, depth_unit=run.depth_unit)
    if edits is not None:
        tables.append(edits)
    else:
        sentences.append("The job edits nothing.")
    return Fitness(tuple(sentences), tuple(tables))


def _tables(what: str, findings: Sequence[Finding], record: RainRecord) -> list[Table]:
    return [short_table(what, findings, record, most=_MOST)] if findings else []

"""What was screened: the record's span and what there is of every gauge; the checks that were made, and those not."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.rainfall import RainRecord, Status
from basinrain.report import limits
from basinrain.report.table import Row, Table
from basinrain.report.words import counted, percent_text, step_text, when_text, zone_text
from basinrain.screening import CHECKS, Screening
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS

__all__ = ["check_tables", "completeness_table", "record_facts"]

_CONSISTENCY: Final = {
    DOUBLE_MASS_BREAK: (
        "Breaks of the double-mass curve: annual totals of a gauge against the mean of its neighbours, significant at "
        "1 %."
    ),
    INHOMOGENEOUS: "Records that two or more of four tests of homogeneity reject at 1 %.",
}


def record_facts(record: RainRecord) -> list[tuple[str, str]]:
    """Return the span, the step and the size of a record, each a name and a text."""
    n = len(record)
    facts = [("Gauges", str(len(record.gauges)))]
    if not n:
        return [*facts, ("Record", "no steps")]
    if np.isnat(record.ends).any():
        return [*facts, ("Record", f"{counted(n, 'storm total')} without times")]
    own = float(record.reporting.mean()) if record.gauges else float("nan")
    return [
        *facts,
        ("Record", f"{when_text(record.starts[0])} to {when_text(record.ends[-1])}, {zone_text(record.zone)}"),
        ("Step", f"{step_text(record.step)}; {counted(n, 'step')}"),
        ("Own values", f"{percent_text(own)} of all steps at all gauges"),
    ]


def completeness_table(record: RainRecord) -> Table:
    """Return what there is of every gauge, those with the smallest share of their own values first where many.

    Parameters
    ----------
    record
        As the checks saw it.
    """
    own = record.reporting
    absent = record.status == Status.NOT_INSTALLED
    in_service = (~absent).sum(axis=0)
    counts = {
        status: (record.status == status).sum(axis=0)
        for status in (Status.MISSING, Status.REJECTED, Status.ACCUMULATED)
    }
    share = np.divide(
        own.sum(axis=0), in_service, out=np.full(len(record.gauges), np.nan), where=in_service > 0, dtype=float
    )
    listed = list(range(len(record.gauges)))
    if len(listed) > limits.GAUGES:
        order = sorted(listed, key=lambda g: (np.nan_to_num(share[g], nan=-1.0), record.gauges[g]))
        listed = sorted(order[: limits.GAUGES])
    rows: list[Row] = []
    for g in listed:
        steps = np.flatnonzero(own[:, g])
        first, last = (record.ends[steps[0]], record.ends[steps[-1]]) if len(steps) else (np.datetime64("NaT"),) * 2
        missing = float(counts[Status.MISSING][g] / in_service[g]) if in_service[g] else float("nan")
        rows.append(
            (
                record.gauges[g],
                when_text(first),
                when_text(last),
                str(in_service[g]),
                str(len(steps)),
                *(str(count[g]) for count in counts.values()),
                percent_text(missing),
            )
        )
    notes = [f"First and last value: ends of steps, {zone_text(record.zone)}."]
    notes.append("Several steps only: steps whose depth is known as part of a longer total.")
    if len(listed) < len(record.gauges):
        notes.append(
            f"Shown: the {len(listed)} of {len(record.gauges)} gauges with the fewest values of their own. All are in "
            "completeness.csv."
        )
    return Table(
        caption="What there is of every gauge, in steps",
        heads=(
            "gauge",
            "first value",
            "last value",
            "in service",
            "own values",
            "missing",
            "rejected",
            "several steps only",
            "share missing",
        ),
        align="tttnnnnnn",
        rows=rows,
        notes=tuple(notes),
    )


def check_tables(screening: Screening) -> list[Table]:
    """Return the checks that were made with what they look for, and those that could not be, with why."""
    found: dict[str, int] = {}
    for finding in screening.findings:
        found[finding.check] = found.get(finding.check, 0) + 1
    tables = []
    if screening.checks_run:
        tables.append(
            Table(
                caption="Checks made",
                heads=("check", "what it looks for", "findings"),
                align="ttn",
                rows=[(name, _about(name), str(found.get(name, 0))) for name in screening.checks_run],
                notes=("How each works, its thresholds and how often it is right: docs/methods.md.",),
            )
        )
    if screening.checks_skipped:
        tables.append(
            Table(
                caption="Checks that could not be made",
                heads=("check", "what it looks for", "why not"),
                align="ttt",
                rows=[(name, _about(name), reason) for name, reason in screening.checks_skipped.items()],
                notes=("A check may have been made at some gauges and not at others.",),
            )
        )
    return tables


def _about(name: str) -> str:
    return CHECKS[name].about if name in CHECKS else _CONSISTENCY.get(name, "")

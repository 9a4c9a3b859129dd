"""What was screened: the record's span and what there is of every gauge."""

from __future__ import annotations

import numpy as np

from basinrain.rainfall import RainRecord, Status
from basinrain.report import limits
from basinrain.report.table import Row, Table
from basinrain.report.words import counted, percent_text, step_text, when_text, zone_text

__all__ = ["completeness_table", "record_facts"]


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

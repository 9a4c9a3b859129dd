"""The completed record: how much was infilled at every gauge, and what was left."""

from __future__ import annotations

import numpy as np

from basinrain.infill import Completed
from basinrain.rainfall import Status
from basinrain.report import limits
from basinrain.report.table import Row, Table
from basinrain.report.words import counted, depth_decimals, number_text, percent_text, unit_word
from basinrain.units import depth_factor

__all__ = ["completed_table", "left_table"]

_LEFT = (Status.MISSING, Status.REJECTED, Status.ACCUMULATED)


def completed_table(completed: Completed, *, depth_unit: str) -> Table:
    """Return how much of every gauge's record was infilled, those with most first where there are many.

    Parameters
    ----------
    completed
        The whole record after infill.
    depth_unit
        ``"mm"`` or ``"in"``.
    """
    record = completed.record
    mm = depth_factor(depth_unit)
    filled = record.status == Status.INFILLED
    left = np.isin(record.status, [int(status) for status in _LEFT])
    in_service = (record.status != Status.NOT_INSTALLED).sum(axis=0)
    estimates = dict.fromkeys(record.gauges, 0)
    for estimate in completed.estimates:
        estimates[estimate.gauge] += 1
    share = np.divide(
        filled.sum(axis=0), in_service, out=np.full(len(record.gauges), np.nan), where=in_service > 0, dtype=float
    )
    listed = list(range(len(record.gauges)))
    if len(listed) > limits.GAUGES:
        most = sorted(listed, key=lambda g: (-np.nan_to_num(share[g]), -int(left[:, g].sum()), record.gauges[g]))
        listed = sorted(most[: limits.GAUGES])
    rows: list[Row] = []
    for g in listed:
        depth = record.depth[:, g]
        known = ~np.isnan(depth)
        total = float(depth[known].sum())
        infilled = float(depth[filled[:, g]].sum())
        rows.append(
            (
                record.gauges[g],
                str(in_service[g]),
                str(int(record.reporting[:, g].sum())),
                str(int(filled[:, g].sum())),
                percent_text(float(share[g])),
                str(estimates[record.gauges[g]]),
                str(int(left[:, g].sum())),
                number_text(total / mm if known.any() else float("nan"), depth_decimals(depth_unit), grouped=True),
                percent_text(infilled / total if total > 0 else float("nan")),
            )
        )
    notes = ["Steps, but for the last two columns. An estimate is one depth of a step, a day or a storm."]
    notes.append("The depth is the sum of what is known after infill, and the share of it that was infilled.")
    if len(listed) < len(record.gauges):
        notes.append(
            f"Shown: the {len(listed)} of {len(record.gauges)} gauges with most infilled. Every estimate is in "
            "infilled.csv."
        )
    return Table(
        caption=f"The completed record; depths in {unit_word(depth_unit)}",
        heads=(
            "gauge",
            "in service",
            "own values",
            "infilled",
            "share infilled",
            "estimates",
            "left without",
            "depth",
            "on infilled values",
        ),
        align="tnnnnnnnn",
        rows=rows,
        notes=tuple(notes),
    )


def left_table(completed: Completed) -> Table | None:
    """Return what stayed without a depth and why, in the words of the infill; None where nothing did."""
    told = [note for note in completed.notes if note.code == "not-infilled"]
    if not told:
        return None
    shown = told[: limits.GAUGES]
    more = len(told) - len(shown)
    return Table(
        caption="Left without a depth",
        heads=("gauge", "what and why"),
        align="tt",
        rows=[(note.gauge, note.text) for note in shown],
        notes=(f"{counted(more, 'more line is', 'more lines are')} in record.json.",) if more else (),
    )

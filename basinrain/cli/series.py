"""``basinrain series``: the whole record per basin and step, its means, storms and warnings."""

from __future__ import annotations

from typing import Any

import numpy as np
from rich.table import Table

from basinrain.cli.running import console, show_warnings
from basinrain.jobfile import Job
from basinrain.report.words import depth_decimals, number_text
from basinrain.results_series import SeriesRun
from basinrain.series.events import TOTAL
from basinrain.series_job import run_series
from basinrain.tables import time_text
from basinrain.units import depth_factor
from basinrain.writing.series_files import check_formats

__all__ = ["compute", "show"]

_ROWS = 16
"""More rows than this are printed for the union, or the last basin, alone; the files have all."""


def compute(job: Job, **options: Any) -> SeriesRun:  # noqa: ANN401 - as run_series takes them
    """Run the job, once it is known that its series can be written."""
    check_formats(job.series.formats)
    return run_series(job, **options)


def show(run: SeriesRun) -> None:
    """Print the means by policy and method, the largest storms and the warnings."""
    page = console()
    digits, mm = depth_decimals(run.depth_unit), depth_factor(run.depth_unit)
    zone = run.record.zone
    means = run.series_means
    # Without a year the depth of the record says more than a dash.
    yearly = bool(means["mean_annual_of_steps"].notna().any())
    page.print(
        f"{len(run.starts):,} steps of {run.record.step}, {time_text(run.starts[0], zone)} to "
        f"{time_text(run.ends[-1], zone)}: {'mean annual depth' if yearly else 'depth of the record'}, {run.depth_unit}"
    )
    table = Table(show_edge=False, pad_edge=False)
    for heading in ("basin", "method", "gaps"):
        table.add_column(heading, no_wrap=True)
    for heading in (
        *(("of years", "years", "of steps") if yearly else ("depth",)),
        "differs %",
        "observed %",
        "missing",
    ):
        table.add_column(heading, justify="right")
    shown = set(run.basins.ids[-1:] if len(means) > _ROWS else run.basins.ids)
    for row in means.to_dict("records"):
        if row["basin"] in shown:
            kinds = ("mean_annual", "mean_annual_of_steps") if yearly else ("depth",)
            words = [number_text(row[kind], digits) for kind in kinds]
            table.add_row(
                row["basin"],
                row["method"],
                row["gaps"],
                *((words[0], str(row["years"]), words[1]) if yearly else words),
                number_text(row["difference_percent"], 1),
                number_text(100 * row["observed_share"], 0),
                f"{row['steps_missing']:,}",
            )
    page.print(table)
    if len(shown) < len(run.basins):
        page.print(f"{len(run.basins) - len(shown)} more basins stand in series_means.csv")
    page.print()
    _show_storms(run, digits, mm)
    show_warnings(page, run.warnings)


def _show_storms(run: SeriesRun, digits: int, mm: float) -> None:
    page, found = console(), run.storms
    if not found.taken:
        return
    gap = found.dry_gap / np.timedelta64(1, "h")
    page.print(
        f"Largest storms of {found.basin} by {found.ranking.by} ({found.method}, {found.gaps}; dry gap {gap:g} h)"
    )
    table = Table(show_edge=False, pad_edge=False)
    for heading in ("", "start", "end"):
        table.add_column(heading, no_wrap=True)
    by = () if found.ranking.by == TOTAL else (f"in {found.ranking.by}",)
    for heading in (f"depth {run.depth_unit}", *by, "peak step", "5 d before", "30 d before"):
        table.add_column(heading, justify="right")
    for k, ranked in enumerate(found.taken):
        before = [np.nan] * 3 if found.before is None else (found.before.depth[k] / mm).tolist()
        table.add_row(
            str(ranked.rank),
            time_text(ranked.event.start, run.record.zone),
            time_text(ranked.event.end, run.record.zone),
            number_text(ranked.event.total / mm, digits),
            *(number_text(ranked.depth / mm, digits) for _ in by),
            number_text(ranked.event.peak / mm, digits),
            number_text(before[0], digits),
            number_text(before[2], digits),
        )
    page.print(table)
    page.print()

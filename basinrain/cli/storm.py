"""``basinrain storm``: run the job, write the results, show the main figures."""

from __future__ import annotations

import sys
from pathlib import Path

import click
import numpy as np
from rich.console import Console
from rich.table import Table

from basinrain.basin_depths import spread_across_methods
from basinrain.job import run_storm
from basinrain.jobfile import read_job
from basinrain.notes import Note
from basinrain.report.words import depth_decimals, number_text
from basinrain.results import StormRun
from basinrain.tables import share_infilled
from basinrain.units import area_factor, depth_factor
from basinrain.writing import check_folder, record_text, write_run
from basinrain.writing.folder import RECORD

__all__ = ["storm_command"]

_SHOWN = 3
"""Warnings of one kind that are printed; a page of them would not be read."""


def storm_command(
    job_file: Path, *, output: Path | None, settings: tuple[str, ...], as_json: bool, quiet: bool
) -> None:
    """Run the storms of a job; nothing is written unless everything worked."""
    job = read_job(job_file, settings)
    folder = (output if output is not None else job.path(job.job.output)) / "storm"
    check_folder(folder, [job_file, *job.inputs])
    progress = Console(stderr=True)
    show = progress.is_terminal and not quiet
    if show:
        with progress.status("reading") as status:
            run = run_storm(job, progress=status.update)
    else:
        run = run_storm(job)
    write_run(run, folder)
    if as_json:
        files = sorted(path.name for path in folder.iterdir() if path.name != RECORD)
        sys.stdout.write(record_text(run, files))
    elif not quiet:
        _show(run, folder)


def _show(run: StormRun, folder: Path) -> None:
    console = Console(width=None if sys.stdout.isatty() else 110, highlight=False, markup=False, emoji=False)
    digits = depth_decimals(run.depth_unit)
    for result in run.storms:
        console.print(f"{result.storm.name}: basin means in {run.depth_unit}")
        table = Table(show_edge=False, pad_edge=False)
        table.add_column("basin")
        for heading in (f"area {run.area_unit}", *run.methods, "spread", "spread %", "infilled %"):
            table.add_column(heading, justify="right")
        mm = depth_factor(run.depth_unit)
        shares = [share_infilled(result, method) for method in run.methods]
        for b, basin in enumerate(run.basins.ids):
            totals = [float(result.depths[method].total[b]) for method in run.methods]
            _, _, apart, percent = spread_across_methods(totals)
            table.add_row(
                basin,
                number_text(run.basins.areas[b] / area_factor(run.area_unit), 1),
                *(number_text(total / mm, digits) for total in totals),
                number_text(apart / mm, digits),
                number_text(percent, 1),
                number_text(100 * max((float(s[b]) for s in shares if not np.isnan(s[b])), default=np.nan), 0),
            )
        console.print(table)
        console.print()
    by_code: dict[str, list[Note]] = {}
    for note in run.warnings:
        by_code.setdefault(note.code, []).append(note)
    for notes in by_code.values():
        for note in notes[:_SHOWN]:
            console.print(f"Warning: {note}", soft_wrap=True)
        if len(notes) > _SHOWN:
            console.print(f"Warning: {len(notes) - _SHOWN} more of this kind stand in report.html", soft_wrap=True)
    console.print(
        "For a qualified engineer's judgement; local codes and licensed practice govern design.", soft_wrap=True
    )
    click.echo(f"Written to {folder}: report.html, record.json and the CSV files")

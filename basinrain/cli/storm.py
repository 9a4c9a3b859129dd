"""``basinrain storm``: run the job, write the results, show the main figures."""

from __future__ import annotations

import sys
from pathlib import Path

import click
from rich.console import Console
from rich.table import Table

from basinrain.job import run_storm
from basinrain.jobfile import read_job
from basinrain.results import StormRun
from basinrain.writing import check_folder, record_text, write_run
from basinrain.writing.folder import RECORD

__all__ = ["storm_command"]


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
    digits = 2 if run.depth_unit == "in" else 1
    for result in run.storms:
        name = result.storm.name
        means = run.basin_means[run.basin_means["storm"] == name]
        spread = run.spread[run.spread["storm"] == name].set_index("basin")
        console.print(f"{name}: basin means in {run.depth_unit}")
        table = Table(show_edge=False, pad_edge=False)
        table.add_column("basin")
        for heading in (f"area {run.area_unit}", *run.methods, "spread", "spread %", "infilled %"):
            table.add_column(heading, justify="right")
        for basin, rows in means.groupby("basin", sort=False):
            by_method = rows.set_index("method")
            apart = spread.loc[basin]
            table.add_row(
                str(basin),
                f"{rows['area'].iloc[0]:.1f}",
                *(_number(by_method.loc[m, "depth"], digits) for m in run.methods),
                _number(apart["spread"], digits),
                _number(apart["spread_percent"], 1),
                _number(100 * rows["share_infilled"].max(), 0),
            )
        console.print(table)
        console.print()
    for note in run.warnings:
        console.print(f"Warning: {note}", soft_wrap=True)
    console.print("For a qualified engineer's judgement; local codes and licensed practice govern design.", soft_wrap=True)
    click.echo(f"Written to {folder}: report.html, record.json and the CSV files")


def _number(value: object, digits: int) -> str:
    number = float(value)  # type: ignore[arg-type]
    return "–" if number != number else f"{number:.{digits}f}"

"""What every command that runs a job does: read it, look at the output folder, show progress, write, print."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any, TypeVar

import click
from rich.console import Console

from basinrain.cli.progress import Progress
from basinrain.jobfile import read_job
from basinrain.jobfile.tables import BasinsJob
from basinrain.notes import Note
from basinrain.results_common import Run
from basinrain.results_series import SeriesRun
from basinrain.writing import check_folder, record_text, write_run
from basinrain.writing.folder import RECORD

__all__ = ["console", "run_command", "show_end", "show_warnings"]

_SHOWN = 3
"""Warnings of one kind that are printed; a page of them would not be read."""

_R = TypeVar("_R", bound=Run)


def run_command(
    command: str,
    compute: Callable[..., _R],
    show: Callable[[_R], None],
    job_file: Path,
    *,
    output: Path | None,
    settings: tuple[str, ...],
    as_json: bool,
    quiet: bool,
    counted: bool = False,
    read: Callable[[Path, tuple[str, ...]], BasinsJob] = read_job,
) -> None:
    """Run a command on a job; nothing is written unless everything worked.

    Parameters
    ----------
    command
        Its name, and that of the folder of its results.
    compute
        Makes the run of a job, :func:`basinrain.run_storm` or one like it.
    show
        Prints the run's main figures.
    job_file, output, settings, as_json, quiet
        As the command line has them.
    counted
        Whether ``compute`` takes ``counted``, which it tells of the steps that are done, and ``work``, the folder for
        what is finished of an interrupted run.
    read
        Reads the job.
    """
    job = read(job_file, settings)
    folder = (output if output is not None else job.path(job.job.output)) / command
    check_folder(folder, [job_file, *job.inputs])
    try:
        # The line of progress is gone before anything else is printed.
        with Progress(quiet=quiet) as progress:
            work = folder.with_name(f".{command}.unfinished")
            further: dict[str, Any] = {"counted": progress.steps, "work": work} if counted else {}
            run = compute(job, progress=progress, **further)
            progress("writing")
            write_run(run, folder)
    except KeyboardInterrupt:
        if not counted:
            raise
        click.echo("Stopped; the parts that are finished are kept: run it again to go on from them.", err=True)
        sys.exit(130)
    if as_json:
        files = sorted(path.name for path in folder.iterdir() if path.name != RECORD)
        sys.stdout.write(record_text(run, files))
    elif not quiet:
        show(run)
        show_end(folder, "the files of series and tables" if isinstance(run, SeriesRun) else "the CSV files")
    if isinstance(run, SeriesRun):
        run.store.remove()


def console() -> Console:
    """Return the page that is printed to: as wide as the terminal, else 110 columns."""
    return Console(width=None if sys.stdout.isatty() else 110, highlight=False, markup=False, emoji=False)


def show_warnings(page: Console, warnings: Iterable[Note]) -> None:
    """Print the warnings, the first few of each kind."""
    by_code: dict[str, list[Note]] = {}
    for note in warnings:
        by_code.setdefault(note.code, []).append(note)
    for notes in by_code.values():
        for note in notes[:_SHOWN]:
            page.print(f"Warning: {note}", soft_wrap=True)
        if (more := len(notes) - _SHOWN) > 0:
            stand = "stands" if more == 1 else "stand"
            page.print(f"Warning: {more} more of this kind {stand} in report.html", soft_wrap=True)


def show_end(folder: Path, files: str = "the CSV files") -> None:
    """Print the caution and where the results are."""
    console().print(
        "For a qualified engineer's judgement; local codes and licensed practice govern design.", soft_wrap=True
    )
    click.echo(f"Written to {folder}: report.html, record.json and {files}")

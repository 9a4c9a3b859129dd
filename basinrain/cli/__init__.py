"""The command line: every command reads a job, calls :mod:`basinrain.job` and shows the result. No hydrology here."""

from __future__ import annotations

import sys
from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import Any

import click

__all__ = ["main"]


def _clear_errors(command: Callable[..., None]) -> Callable[..., None]:
    """Print an expected failure as one line a problem; leave with 1, for wrong usage with 2, for Ctrl-C with 130."""

    @wraps(command)
    def run(*args: Any, **kwargs: Any) -> None:  # noqa: ANN401 - click passes what the options say
        from basinrain.errors import BasinRainError, SettingError

        try:
            command(*args, **kwargs)
        except BasinRainError as error:
            click.echo(str(error), err=True)
            sys.exit(2 if isinstance(error, SettingError) else 1)
        except KeyboardInterrupt:
            click.echo("Stopped; nothing was written.", err=True)
            sys.exit(130)

    return run


def _of_job(command: Callable[..., None]) -> Callable[..., None]:
    """Give a command the argument and the options of every command that runs a job."""
    for decorate in (
        click.option("--quiet", is_flag=True, help="Print nothing but errors."),
        click.option(
            "--json", "as_json", is_flag=True, help="Print one JSON document with all results, and nothing else."
        ),
        click.option(
            "--set",
            "settings",
            multiple=True,
            metavar="TABLE.KEY=VALUE",
            help="Change the job; may be given more than once.",
        ),
        click.option(
            "--output",
            type=click.Path(path_type=Path),
            help="Folder for the results in place of the job's; they go to a folder in it that has the command's name.",
        ),
        click.argument("job", type=click.Path(path_type=Path)),
    ):
        command = decorate(command)
    return command


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="basinrain")
def main() -> None:
    """Areal rainfall from rain gauges: gaps infilled, basin means three ways, every gauge's weight shown.

    Results are for use by a qualified hydrologist or engineer; local codes and licensed practice govern design.
    """


@main.command()
@_of_job
@_clear_errors
def storm(job: Path, **options: Any) -> None:  # noqa: ANN401 - click passes what the options say
    """Storm totals per basin from JOB, a TOML file: tables, weights compared, report."""
    from basinrain.cli.running import run_command
    from basinrain.cli.storm import show
    from basinrain.job import run_storm

    run_command("storm", run_storm, show, job, **options)


@main.command()
@_of_job
@_clear_errors
def screen(job: Path, **options: Any) -> None:  # noqa: ANN401 - click passes what the options say
    """Whether the record of JOB is fit to use: findings, each with its evidence; nothing is changed."""
    from basinrain.cli.running import run_command
    from basinrain.cli.screen import show
    from basinrain.job import run_screen

    run_command("screen", run_screen, show, job, **options)


@main.command()
@_of_job
@_clear_errors
def infill(job: Path, **options: Any) -> None:  # noqa: ANN401 - click passes what the options say
    """Which infill method works on the network of JOB, every gauge left out in turn; and the completed record."""
    from basinrain.cli.infill import show
    from basinrain.cli.running import run_command
    from basinrain.job import run_infill

    run_command("infill", run_infill, show, job, **options)


@main.command()
@_of_job
@_clear_errors
def series(job: Path, **options: Any) -> None:  # noqa: ANN401 - click passes what the options say
    """Average the whole record of JOB over its basins, step by step, while gauges come and go."""
    from basinrain.cli.running import run_command
    from basinrain.cli.series import compute, show

    run_command("series", compute, show, job, counted=True, **options)


@main.command()
@_of_job
@_clear_errors
def design(job: Path, **options: Any) -> None:  # noqa: ANN401 - click passes what the options say
    """Design storms of JOB: point depths, areal reduction, hyetographs of every basin; how rare a storm was."""
    from basinrain.cli.design import compute, show
    from basinrain.cli.running import run_command
    from basinrain.jobfile import read_design_job

    run_command("design", compute, show, job, read=read_design_job, **options)


@main.command()
@click.argument("folder", type=click.Path(path_type=Path))
@_clear_errors
def start(folder: Path) -> None:
    """Make FOLDER with a commented job and sample data, ready to run."""
    from basinrain.cli.start import start_command

    start_command(folder)

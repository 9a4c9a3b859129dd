"""``basinrain screen``: screen the job's record, write what was found, show the findings."""

from __future__ import annotations

from pathlib import Path

from basinrain.cli.running import console, run_command, show_warnings
from basinrain.job import run_screen
from basinrain.results import ScreenRun
from basinrain.screening import SEVERITIES, Finding

__all__ = ["screen_command"]

_SHOWN = 40
"""Findings that are printed; all of them stand in the files."""


def screen_command(
    job_file: Path, *, output: Path | None, settings: tuple[str, ...], as_json: bool, quiet: bool
) -> None:
    """Screen the record of a job; nothing is written unless everything worked."""
    run_command(
        "screen",
        lambda job, progress: run_screen(job, progress=progress),
        _show,
        job_file,
        output=output,
        settings=settings,
        as_json=as_json,
        quiet=quiet,
    )


def _show(run: ScreenRun) -> None:
    page = console()
    findings = sorted(run.screening.findings, key=lambda found: -SEVERITIES.index(found.severity))
    counts = ", ".join(
        f"{sum(found.severity == severity for found in findings)} {severity}" for severity in reversed(SEVERITIES)
    )
    page.print(f"{len(findings)} findings: {counts}" if findings else "No findings.")
    for found in findings[:_SHOWN]:
        page.print(f"{found.severity} ({found.state}): {_where(found)}{found.evidence}", soft_wrap=True)
        page.print(f'    {found.action} To name it in the job: "{found.key}"', soft_wrap=True)
    if len(findings) > _SHOWN:
        page.print(f"{len(findings) - _SHOWN} more stand in findings.csv", soft_wrap=True)
    for check, reason in run.screening.checks_skipped.items():
        page.print(f"Not checked: {check}: {reason}", soft_wrap=True)
    if run.edit_rows:
        page.print(f"{len(run.edit_rows)} edits of the job were made before the checks", soft_wrap=True)
    show_warnings(page, run.warnings)


def _where(found: Finding) -> str:
    return f"{found.check}: gauge {found.gauge}: " if found.gauge else f"{found.check}: "

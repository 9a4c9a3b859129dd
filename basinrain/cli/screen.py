"""``basinrain screen``: screen the job's record, write what was found, show the findings."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Console

from basinrain.cli.running import console, show_warnings
from basinrain.results import ScreenRun
from basinrain.screening import SEVERITIES, Finding

__all__ = ["show"]

_SHOWN = 12
"""Findings of one check that are printed; all of them stand in the files."""


def show(run: ScreenRun) -> None:
    """Print what is not settled, by severity and check, and what could not be checked."""
    page = console()
    findings = run.screening.findings
    page.print(_counts(findings), soft_wrap=True)
    unsettled = [found for found in findings if found.state == "open"]
    for severity in reversed(SEVERITIES):
        here = [found for found in unsettled if found.severity == severity]
        for check in dict.fromkeys(found.check for found in here):
            _show_check(page, [found for found in here if found.check == check])
    page.print()
    for check, reason in run.screening.checks_skipped.items():
        page.print(f"Not checked: {check}: {reason}", soft_wrap=True)
    if run.edits:
        page.print(f"Edits made before the checks: {len(run.edits)}, listed in edits.csv", soft_wrap=True)
    show_warnings(page, run.warnings)


def _show_check(page: Console, findings: list[Finding]) -> None:
    """Print the unsettled findings of one check; of remarks the first, which stands for the others."""
    first = findings[0]
    page.print()
    page.print(f"{first.severity}: {first.check}", soft_wrap=True)
    shown = _SHOWN if first.severity != "remark" else 1
    for found in findings[:shown]:
        page.print(f'  "{found.key}"', soft_wrap=True)
        page.print(f"    {found.evidence} {found.action}", soft_wrap=True)
    rest = findings[shown:]
    if rest:
        gauges = ", ".join(dict.fromkeys(found.gauge or "the network" for found in rest))
        page.print(f"  {len(rest)} more, at {gauges}: findings.csv", soft_wrap=True)


def _counts(findings: Sequence[Finding]) -> str:
    if not findings:
        return "Nothing was found."
    parts = []
    for severity in reversed(SEVERITIES):
        states = [found.state for found in findings if found.severity == severity]
        settled = ", ".join(f"{states.count(state)} {state}" for state in ("rejected", "accepted") if state in states)
        parts.append(f"{len(states)} {severity}" + (f" ({settled})" if settled else ""))
    return "Found: " + ", ".join(parts) + ". A finding changes nothing by itself; in quotes what a job names it by."

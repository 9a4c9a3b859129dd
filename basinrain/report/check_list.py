"""The checks that were made, with what they look for and find, and those that could not be."""

from __future__ import annotations

from typing import Final

from basinrain.report.table import Table
from basinrain.screening import CHECKS, Screening
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS
from basinrain.screening.double_mass import PERSISTENCE

__all__ = ["about", "check_tables"]

_LIMITS: Final = {
    DOUBLE_MASS_BREAK: f"{2 * PERSISTENCE} years, {PERSISTENCE} on either side of the break; probability 0.01.",
    INHOMOGENEOUS: "20 years; two or more tests that reject at 1 %, doubtful; three or four, suspect.",
}

_CONSISTENCY: Final = {
    DOUBLE_MASS_BREAK: (
        "Breaks of the double-mass curve: annual totals of a gauge against the mean of its neighbours, significant at "
        "1 %."
    ),
    INHOMOGENEOUS: "Records that two or more of four tests of homogeneity reject at 1 %.",
}


def about(name: str) -> str:
    """Return in a sentence what a check looks for; nothing for one that is not in the registry.

    Examples
    --------
    >>> about("zero-run")
    'Long runs without rain while the neighbours had much.'
    >>> about("no-such-check")
    ''
    """
    return CHECKS[name].about if name in CHECKS else _CONSISTENCY.get(name, "")


def _limits(name: str) -> str:
    return CHECKS[name].limits if name in CHECKS else _LIMITS.get(name, "")


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
                heads=("check", "what it looks for", "findings", "thresholds"),
                align="ttnt",
                rows=[(name, about(name), str(found.get(name, 0)), _limits(name)) for name in screening.checks_run],
                notes=("How each works: docs/methods.md; how often it is right: docs/verification.md.",),
            )
        )
    if screening.checks_skipped:
        tables.append(
            Table(
                caption="Checks that could not be made",
                heads=("check", "what it looks for", "why not"),
                align="ttt",
                rows=[(name, about(name), reason) for name, reason in screening.checks_skipped.items()],
                notes=("A check may have been made at some gauges and not at others.",),
            )
        )
    return tables

"""Findings on single days that a finding on the whole stretch explains."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace
from typing import Final

from basinrain.screening.findings import SEVERITIES, Finding
from basinrain.screening.rejection import rejected_findings

__all__ = ["without_explained"]

_DAYS: Final = ("greatest-depths", "spatial-outlier", "zero-among-wet", "unflagged-accumulation")
_EXPLAINS: Final = {
    "missing-code": _DAYS,
    "stuck-values": _DAYS,
    "unit-mixup": (*_DAYS, "zero-run"),
    "shifted-record": _DAYS,
    "duplicated-stretch": _DAYS,
    "one-record-two-gauges": _DAYS,
    "zero-run": ("zero-among-wet", "unflagged-accumulation"),
    "unflagged-accumulation": ("zero-among-wet", "spatial-outlier"),
    "greatest-depths": ("spatial-outlier",),
}
"""By check, those whose findings are its consequence where they lie in its stretch; transitive."""


def without_explained(findings: Sequence[Finding], accept: Sequence[str] = ()) -> tuple[Finding, ...]:
    """Return findings without those that one on the whole stretch explains; it says how many there were.

    Days of a record that runs a day late look like zeros among wet days, and what is advised for those would take good
    rain away. What a finding explains is settled with it: rejected, its values are gone; corrected by an edit, they are
    screened anew. Accepted, its values stand as they are, and what is odd about single days is listed again.

    Parameters
    ----------
    findings
        As the checks found them.
    accept
        The job's entries. A finding that one names explains nothing.

    Returns
    -------
    tuple of Finding
        In the same order. A finding goes where its stretch lies in that of one of the same gauge that explains its
        check and weighs as much or more.

    Examples
    --------
    >>> import numpy as np
    >>> day = np.datetime64("2031-05-04", "s") + np.arange(9) * np.timedelta64(86400, "s")
    >>> late = Finding(
    ...     check="shifted-record", gauge="A", start=day[0], end=day[8], evidence="A day late.", action="Shift it."
    ... )
    >>> zero = Finding(
    ...     check="zero-among-wet", gauge="A", start=day[2], end=day[3], evidence="No rain.", action="Reject it."
    ... )
    >>> [finding.evidence for finding in without_explained([zero, late])]
    ['A day late. 1 finding on single days follows from it (1 zero-among-wet), listed only where this is accepted.']
    >>> len(without_explained([zero, late], accept=["shifted-record A"]))
    2
    """
    # What an entry names is the same in either list.
    stands = {id_of(finding) for finding in rejected_findings(findings, accept)}
    by_gauge: dict[str, list[Finding]] = {}
    for finding in findings:
        if finding.check in _EXPLAINS and id_of(finding) not in stands:
            by_gauge.setdefault(finding.gauge, []).append(finding)
    explained: dict[tuple[str, str], Counter[str]] = {}
    kept = []
    for finding in findings:
        mains = [main for main in by_gauge.get(finding.gauge, ()) if _explains(main, finding)]
        if not mains:
            kept.append(finding)
            continue
        # The relation is transitive, so that one of them is explained by no other.
        top = next(main for main in mains if not any(_explains(other, main) for other in mains))
        explained.setdefault(id_of(top), Counter())[finding.check] += 1
    return tuple(_telling(finding, explained.get(id_of(finding))) for finding in kept)


def id_of(finding: Finding) -> tuple[str, str]:
    """Return what tells findings apart: two may have one key and different ends."""
    return finding.key, str(finding.end)


def _explains(main: Finding, finding: Finding) -> bool:
    within = main.whole_record or (main.start <= finding.start and finding.end <= main.end)
    weighs = SEVERITIES.index(main.severity) >= SEVERITIES.index(finding.severity)
    return bool(finding.check in _EXPLAINS.get(main.check, ()) and weighs and within)


def _follow(n: int) -> str:
    return f"{n} findings on single days follow from it" if n > 1 else "1 finding on single days follows from it"


def _telling(finding: Finding, explained: Counter[str] | None) -> Finding:
    if not explained:
        return finding
    listed = ", ".join(f"{count} {check}" for check, count in sorted(explained.items()))
    return replace(
        finding,
        evidence=f"{finding.evidence} {_follow(explained.total())} ({listed}), listed only where this is accepted.",
    )

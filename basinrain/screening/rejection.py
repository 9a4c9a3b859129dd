"""What the job says about findings: which are accepted, and which reject the values that they are about."""

from __future__ import annotations

import difflib
from collections.abc import Sequence
from dataclasses import replace
from typing import Final

import numpy as np

from basinrain.errors import JobError, Problems
from basinrain.rainfall import RainRecord, Status
from basinrain.screening.findings import Finding

__all__ = ["apply_rejections", "settle_findings"]

_LISTED: Final = 5


def settle_findings(
    findings: Sequence[Finding], *, reject: Sequence[str] = (), accept: Sequence[str] = ()
) -> tuple[Finding, ...]:
    """Return the findings with what the job decides about each.

    Parameters
    ----------
    findings
        As found.
    reject, accept
        Entries: a finding's key or its leading words, so that ``"stuck-values"``, ``"stuck-values W03"`` and
        ``"stuck-values W03 2031-05-04T06:00"`` mean all findings of a check, those at one gauge, and one.

    Returns
    -------
    tuple of Finding
        In the same order, each ``"rejected"``, ``"accepted"`` or, where no entry names it, as it was.

    Raises
    ------
    JobError
        An entry names no finding, a finding is both rejected and accepted, or a finding about the network as a whole is
        to be rejected; all of it together.

    Examples
    --------
    >>> findings = [
    ...     Finding(check="stuck-values", gauge=gauge, evidence="0.4 mm at 14 steps.", action="Reject them.")
    ...     for gauge in ("W03", "W04")
    ... ]
    >>> [finding.state for finding in settle_findings(findings, reject=["stuck-values W03"])]
    ['rejected', 'open']
    >>> settle_findings(findings, accept=["stuck-value W03"])
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [screening] accept 'stuck-value W03': found no such finding; expected the key of a \
finding or its leading words; the nearest: stuck-values W03, stuck-values W04
    """
    problems = Problems()
    keys = [finding.key.split() for finding in findings]
    named: dict[str, dict[int, str]] = {"reject": {}, "accept": {}}
    for option, entries in (("reject", reject), ("accept", accept)):
        for entry in entries:
            words = entry.split()
            matched = [k for k, key in enumerate(keys) if words and key[: len(words)] == words]
            if not matched:
                problems.add(
                    item=f"[screening] {option} '{entry}'",
                    found="no such finding",
                    expected="the key of a finding or its leading words",
                    remedy=_nearest(words, findings),
                )
            for k in matched:
                named[option].setdefault(k, entry)
    for k, entry in named["reject"].items():
        if k in named["accept"]:
            problems.add(
                item=f"[screening] finding '{findings[k].key}'",
                found=f"reject '{entry}' and accept '{named['accept'][k]}'",
                expected="one of the two",
                remedy="name what differs by gauge and time",
                gauge=findings[k].gauge,
            )
        if not findings[k].gauge:
            problems.add(
                item=f"[screening] reject '{entry}'",
                found="a finding about the network as a whole",
                expected="one about a gauge, whose values can be left out",
                remedy="accept it, or correct the input",
            )
    problems.raise_as(JobError)
    return tuple(
        replace(finding, state="rejected")
        if k in named["reject"]
        else replace(finding, state="accepted")
        if k in named["accept"]
        else finding
        for k, finding in enumerate(findings)
    )


def apply_rejections(record: RainRecord, findings: Sequence[Finding]) -> RainRecord:
    """Return the record without the values that rejected findings are about.

    Parameters
    ----------
    record
        At the common step; it is not changed.
    findings
        Those whose state is ``"rejected"`` count. Their gauges must be the record's.

    Returns
    -------
    RainRecord
        The gauge's own values at the steps wholly in ``(start, end]``, or in its whole record, have no depth and the
        status ``rejected``; what was missing stays missing. A total over several steps of which one is rejected is
        rejected whole, since what is left of it is not known.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04", "s") + np.arange(1, 4) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[0.4], [0.4], [np.nan]], step="1h")
    >>> stuck = Finding(
    ...     check="stuck-values",
    ...     gauge="A",
    ...     start=ends[0],
    ...     end=ends[2],
    ...     evidence="0.4 mm.",
    ...     action="Reject it.",
    ...     state="rejected",
    ... )
    >>> [Status(code).label for code in apply_rejections(record, [stuck]).status[:, 0]]
    ['observed', 'rejected', 'missing']
    """
    rejected = [finding for finding in findings if finding.state == "rejected"]
    if not rejected:
        return record
    taken = np.zeros(record.depth.shape, dtype=bool)
    timed = not np.isnat(record.ends).any()
    for finding in rejected:
        first, stop = 0, len(record)
        if not np.isnat(finding.start):
            first = int(np.searchsorted(record.starts, finding.start)) if timed else stop
        if not np.isnat(finding.end):
            stop = int(np.searchsorted(record.ends, finding.end, "right")) if timed else first
        taken[first:stop, record.gauges.index(finding.gauge)] = True
    taken &= record.reporting | (record.status == Status.ACCUMULATED)
    kept = []
    column = {gauge: g for g, gauge in enumerate(record.gauges)}
    for total, first, stop in zip(record.totals, *record.steps_of(record.totals), strict=True):
        # A total of a gauge that is no column stands for nothing here.
        g = column.get(total.gauge)
        if g is None or not taken[first:stop, g].any():
            kept.append(total)
        else:
            taken[first:stop, g] = True
    depth = np.where(taken, np.nan, record.depth)
    status = np.where(taken, np.uint8(Status.REJECTED), record.status)
    return replace(record, depth=depth, status=status, totals=tuple(kept))


def _nearest(words: list[str], findings: Sequence[Finding]) -> str:
    """Return the advice that lists findings with keys like the words."""
    if not findings:
        return "screening found nothing"
    keys = list(dict.fromkeys(finding.key for finding in findings))
    near = difflib.get_close_matches(" ".join(words), keys, n=_LISTED, cutoff=0.6)
    if near:
        return "the nearest: " + ", ".join(near)
    more = f" and {len(keys) - _LISTED} more" if len(keys) > _LISTED else ""
    return "there are: " + ", ".join(keys[:_LISTED]) + more

"""What the job says about findings: which are accepted, and which reject the values that they are about."""

from __future__ import annotations

import difflib
from collections.abc import Collection, Sequence
from dataclasses import replace
from typing import Final

import numpy as np

from basinrain.errors import JobError, Problems
from basinrain.rainfall import RainRecord, Status
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS
from basinrain.screening.findings import Finding, State

__all__ = ["apply_rejections", "rejected_findings", "settle_findings"]

_LISTED: Final = 5
_FIRST: Final = np.datetime64("-9999-01-01", "s")
_LAST: Final = np.datetime64("9999-01-01", "s")


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
        ``"stuck-values W03 2031-05-04T06:00"`` mean all findings of a check, those at one gauge, and one. Of the time a
        leading part will do: ``"2031"``, ``"2031-05"``, ``"2031-05-04"``.

    Returns
    -------
    tuple of Finding
        In the same order, each ``"rejected"``, ``"accepted"`` or, where no entry names it, as it was. A finding whose
        stretch lies wholly in what is rejected of its gauge is rejected with it, also where an entry accepts it among
        others: its values are gone.

    Raises
    ------
    JobError
        An entry names no finding, or none but those of another entry of its list, a finding is both rejected and
        accepted, an entry accepts only findings whose values
        are gone, or a finding is to be rejected that has no values of its own: about the network as a whole, or about
        years that do not go together; all of it together.

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
    named: dict[str, dict[int, str]] = {"reject": {}, "accept": {}}
    for option, entries in (("reject", reject), ("accept", accept)):
        of_entries = [[k for k, finding in enumerate(findings) if _names(entry, finding)] for entry in entries]
        for e, f in _covered(entries, of_entries):
            problems.add(
                item=f"[screening] {option} '{entries[e]}'",
                found=f"only findings that '{entries[f]}' in the same list names",
                expected="entries that do not overlap",
                remedy="remove one of the two",
            )
        for entry, matched in zip(entries, of_entries, strict=True):
            if not matched:
                problems.add(
                    item=f"[screening] {option} '{entry}'",
                    found="no such finding",
                    expected="the key of a finding or its leading words",
                    remedy=_nearest(entry.split(), findings),
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
        if (why := _unfit(findings[k])) is not None:
            found, remedy = why
            problems.add(
                item=f"[screening] reject '{entry}'",
                found=found,
                expected="one about values that can be left out",
                remedy=remedy,
                gauge=findings[k].gauge,
            )
    rejected = _with_rejected(findings, [k for k in named["reject"] if _unfit(findings[k]) is None])
    for entry in dict.fromkeys(accept):
        matched = [k for k, finding in enumerate(findings) if _names(entry, finding)]
        # What is both rejected and accepted by name is told above.
        if matched and not set(matched) & named["reject"].keys() and rejected.issuperset(matched):
            only = f"'{findings[matched[0]].key}'" if len(matched) == 1 else f"{len(matched)} findings"
            problems.add(
                item=f"[screening] accept '{entry}'",
                found=f"{only} wholly within what other findings reject of the gauge",
                expected="a finding whose values are kept",
                remedy="remove the entry, or reject less by naming gauge and time",
                gauge=findings[matched[0]].gauge,
            )
    problems.raise_as(JobError)

    def state(k: int) -> State:
        if k in rejected:
            return "rejected"
        return "accepted" if k in named["accept"] else findings[k].state

    return tuple(replace(finding, state=state(k)) for k, finding in enumerate(findings))


def rejected_findings(findings: Sequence[Finding], reject: Sequence[str]) -> tuple[Finding, ...]:
    """Return the findings that entries reject, as ``"rejected"``; entries that do not fit name none here.

    :func:`settle_findings` reports such entries. This is for the record that further findings are looked for in, before
    it can be known whether an entry means one of those.

    Examples
    --------
    >>> stuck = Finding(check="stuck-values", gauge="W03", evidence="0.4 mm at 14 steps.", action="Reject them.")
    >>> [finding.key for finding in rejected_findings([stuck], ["stuck-values W03", "double-mass-break W04"])]
    ['stuck-values W03']
    """
    return tuple(
        replace(finding, state="rejected")
        for finding in findings
        if _unfit(finding) is None and any(_names(entry, finding) for entry in reject)
    )


def _names(entry: str, finding: Finding) -> bool:
    """Return whether an entry is the finding's key, its leading words, or these with a leading part of the time."""
    words, key = entry.split(), finding.key.split()
    if not words or words[:-1] != key[: len(words) - 1] or len(words) > len(key):
        return False
    last, whole = words[-1], key[len(words) - 1]
    if last == whole:
        return True
    of_time = len(words) == len(key) and not finding.whole_record
    return of_time and whole.startswith(last) and whole[len(last)] in "-T:"


def _covered(entries: Sequence[str], named: Sequence[Sequence[int]]) -> list[tuple[int, int]]:
    """Return the positions of entries all of whose findings another names, and of the first that does.

    Of two that name the same findings the one with more words counts as covered, of equal ones the later.
    """
    # The widest first: only what comes before an entry can cover it.
    ranked = sorted(range(len(entries)), key=lambda e: (-len(named[e]), len(entries[e].split()), e))
    covered = []
    for n, e in enumerate(ranked):
        by = next((f for f in ranked[:n] if named[e] and set(named[e]) <= set(named[f])), None)
        if by is not None:
            covered.append((e, by))
    return sorted(covered)


def _unfit(finding: Finding) -> tuple[str, str] | None:
    """Return what a finding is that cannot be rejected, and what to do about it; None where it can be."""
    if not finding.gauge:
        return "a finding about the network as a whole", "accept it, or correct the input"
    if finding.check == DOUBLE_MASS_BREAK:
        return (
            "a break between two parts of a record, of which neither is known to be wrong",
            'correct the older part by an [[edit]] with action = "scale", or accept the finding',
        )
    if finding.check == INHOMOGENEOUS:
        return (
            "a finding about a gauge's whole record",
            "accept it, correct a part by an [[edit]], or leave the gauge out by [gauges] exclude",
        )
    return None


def _with_rejected(findings: Sequence[Finding], rejected: Collection[int]) -> set[int]:
    """Return the positions of those rejected, and of those of their gauges that lie wholly in their stretches."""
    gone: dict[str, list[tuple[np.datetime64, np.datetime64]]] = {}
    for start, end, k in sorted((*_stretch(findings[k]), k) for k in rejected):
        stretches = gone.setdefault(findings[k].gauge, [])
        if stretches and start <= stretches[-1][1]:
            stretches[-1] = stretches[-1][0], max(end, stretches[-1][1])
        else:
            stretches.append((start, end))

    def lost(finding: Finding) -> bool:
        first, last = _stretch(finding)
        within = any(start <= first and last <= end for start, end in gone.get(finding.gauge, ()))
        return within and _unfit(finding) is None

    return {k for k, finding in enumerate(findings) if k in rejected or lost(finding)}


def _stretch(finding: Finding) -> tuple[np.datetime64, np.datetime64]:
    """Return start and end, the ends of time where they are open."""
    return (
        _FIRST if np.isnat(finding.start) else finding.start.astype("datetime64[s]"),
        _LAST if np.isnat(finding.end) else finding.end.astype("datetime64[s]"),
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

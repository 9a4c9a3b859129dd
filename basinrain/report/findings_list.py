"""What screening found: the open findings by severity and check, what to write into the job, and what it settled."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Final

from markupsafe import Markup

from basinrain.report.check_list import about
from basinrain.report.job_lines import edit_text, needs_edit, screening_text
from basinrain.report.table import Row, Table
from basinrain.report.words import counted, unbroken, when_text
from basinrain.screening import Finding
from basinrain.screening.findings import SEVERITIES, Severity

__all__ = ["MOST_FINDINGS", "FoundSection", "check_counts", "count_table", "finding_sections", "settled_table"]

MOST_FINDINGS: Final = 25
"""Findings of one check that are printed, and settled ones; the rest is in the file."""

_MEANING: Final[dict[Severity, str]] = {
    "erroneous": "cannot be right",
    "doubtful": "may be wrong",
    "remark": "worth knowing",
}
_PLURAL: Final[dict[Severity, str]] = {"erroneous": "Erroneous", "doubtful": "Doubtful", "remark": "Remarks"}
_STATES: Final = ("open", "accepted", "rejected")
_MOST_GAUGES: Final = 12
_ISO: Final = re.compile(r"(\d{4}-\d\d-\d\d)T(\d\d:\d\d)(:00)?(?!\d)")


@dataclass(frozen=True)
class FoundSection:
    """The open findings of one severity: a title, a table a check, and what the job may say of them."""

    title: str
    tables: tuple[Table, ...]
    entries: str
    edits: tuple[str, ...]
    rest: str


def count_table(findings: Sequence[Finding]) -> Table:
    """Return how many findings there are, by severity and state."""
    rows = [
        (
            f"{severity} ({_MEANING[severity]})",
            *(str(sum(f.severity == severity and f.state == state for f in findings)) for state in _STATES),
            str(sum(f.severity == severity for f in findings)),
        )
        for severity in reversed(SEVERITIES)
    ]
    return Table(
        caption="Findings by severity and by what the job says of them",
        heads=("severity", *_STATES, "all"),
        align="tnnnn",
        rows=rows,
        notes=("Open: the job says nothing of it, and the values are used as they are.",),
    )


def check_counts(findings: Sequence[Finding]) -> Table:
    """Return how many findings there are of every check and state, the heaviest first, and at which gauges."""
    rows: list[Row] = []
    for severity in reversed(SEVERITIES):
        for check, ours in _by_check(f for f in findings if f.severity == severity):
            gauges = list(dict.fromkeys(f.gauge or "the network" for f in ours))
            named = ", ".join(gauges[:_MOST_GAUGES])
            more = len(gauges) - _MOST_GAUGES
            states = (str(sum(f.state == state for f in ours)) for state in _STATES)
            rows.append((severity, check, *states, f"{named} and {more} more" if more > 0 else named))
    return Table(
        caption="Findings by check and by what the job says of them",
        heads=("severity", "check", *_STATES, "gauges"),
        align="ttnnnt",
        rows=rows,
        notes=("Open: the job says nothing of it, and the values are used as they are. All are in findings.csv.",),
    )


def finding_sections(findings: Sequence[Finding], *, depth_unit: str) -> list[FoundSection]:
    """Return one section a severity of which any finding is open, the heaviest first.

    Parameters
    ----------
    findings
        With their states.
    depth_unit
        The job's, in which it says the depth of an edit.
    """
    sections = []
    for severity in reversed(SEVERITIES):
        still = [f for f in findings if f.severity == severity and f.state == "open"]
        if not still:
            continue
        tables: list[Table] = []
        shown: list[Finding] = []
        by_check = _by_check(still)
        for check, ours in by_check:
            settled = sum(f.check == check and f.state != "open" for f in findings)
            tables.append(_check_table(check, ours, settled))
            shown += ours[:MOST_FINDINGS]
        whole = {f.check for f in still} - {f.check for f in findings if f.state != "open" or f.severity != "remark"}
        printed = set(map(id, shown))
        listed = [f for _, ours in by_check for f in ours if f.check in whole or id(f) in printed]
        edits = [edit_text(f.edit, depth_unit=depth_unit) for f in shown if f.edit is not None and needs_edit(f)]
        more = len(still) - len(listed)
        sections.append(
            FoundSection(
                title=f"{_PLURAL[severity]}: {counted(len(still), 'open finding')}, {_MEANING[severity]}",
                tables=tuple(tables),
                entries=screening_text(listed, sorted(whole)),
                edits=tuple(edits) if severity != "remark" else (),
                rest=f"The keys of {more} more are in findings.csv." if more else "",
            )
        )
    return sections


def _by_check(findings: Iterator[Finding] | Sequence[Finding]) -> list[tuple[str, list[Finding]]]:
    """Return the findings by check in the order given, those of a check by gauge and time."""
    groups: dict[str, list[Finding]] = {}
    for finding in findings:
        groups.setdefault(finding.check, []).append(finding)
    return [(check, sorted(ours, key=_place)) for check, ours in groups.items()]


def _place(finding: Finding) -> tuple[str, str]:
    return finding.gauge, "" if finding.whole_record else str(finding.start)


def _check_table(check: str, findings: Sequence[Finding], settled: int) -> Table:
    rows = _joined(findings)
    shown = rows[:MOST_FINDINGS]
    actions = {f.action for f in findings}
    one = len(actions) == 1
    lead = [about(check), f"Suggested: {_lower(_readable(actions.pop()))}" if one else ""]
    caption = f"{check}: {counted(len(findings), 'finding')}" + (f", {settled} more settled" if settled else "")
    return Table(
        caption=caption,
        lead=" ".join(part for part in lead if part),
        heads=("gauge", "from", "to", "evidence", *(() if one else ("suggested",)), "named by"),
        align="ttttt" if one else "tttttt",
        widths=(8, 10, 10, 53, 19) if one else (8, 10, 10, 34, 19, 19),
        rows=[
            (
                _gauges(ours),
                *_stretch(ours[0]),
                _evidence(ours[0]),
                *(() if one else (_readable(ours[0].action),)),
                _code(ours[0].key if len(ours) == 1 else f"{check} …"),
            )
            for ours in shown
        ],
        notes=(f"Shown: {len(shown)} of {len(rows)}. All are in findings.csv.",) if len(shown) < len(rows) else (),
    )


def settled_table(findings: Sequence[Finding]) -> Table | None:
    """Return what the job has rejected and accepted, equal ones in one line; None where it has settled nothing.

    Parameters
    ----------
    findings
        With their states; open ones are left out.
    """
    settled = [f for f in findings if f.state != "open"]
    if not settled:
        return None
    rows: list[Row] = []
    for state in ("rejected", "accepted"):
        for severity in reversed(SEVERITIES):
            for check, ours in _by_check(f for f in settled if f.state == state and f.severity == severity):
                rows += [(state, check, *_in_short(group)) for group in _of_a_gauge(ours)]
    shown = rows[:MOST_FINDINGS]
    notes = ["Where there are several, from the first to the last, with the evidence of the first."]
    if len(shown) < len(rows):
        notes.append(f"Shown: {len(shown)} of {len(rows)} lines.")
    return Table(
        caption=f"Settled by the job: {counted(len(settled), 'finding')}",
        heads=("the job", "check", "gauge", "findings", "from", "to", "evidence"),
        align="tttnttt",
        widths=(9, 15, 9, 8, 10, 10, 39),
        rows=shown,
        notes=(*notes, "All are in findings.csv."),
    )


def _of_a_gauge(findings: Sequence[Finding]) -> list[list[Finding]]:
    """Return the findings of one check by gauge; those of whole records that say the same together."""
    groups: dict[tuple[str, str], list[Finding]] = {}
    for f in findings:
        groups.setdefault(("", f.evidence) if f.whole_record else (f.gauge, ""), []).append(f)
    return list(groups.values())


def _in_short(findings: Sequence[Finding]) -> Row:
    first = findings[0]
    last = when_text(max(f.end for f in findings)) if not first.whole_record else ""
    return _gauges(findings), str(len(findings)), _stretch(first)[0], last, _evidence(first)


def _joined(findings: Sequence[Finding]) -> list[list[Finding]]:
    """Return the findings one by one; remarks that say the same of the same stretch at several gauges together."""
    groups: dict[tuple[str, ...], list[Finding]] = {}
    for f in findings:
        same = (str(f.start), str(f.end), f.evidence, f.action, *f.others)
        groups.setdefault(same if f.severity == "remark" else (f.key, str(len(groups))), []).append(f)
    return list(groups.values())


def _gauges(findings: Sequence[Finding]) -> str:
    return ", ".join(dict.fromkeys(f.gauge or "the network" for f in findings))


def _stretch(finding: Finding) -> tuple[str, str]:
    if finding.whole_record:
        return "whole record", ""
    return when_text(finding.start), when_text(finding.end)


def _evidence(finding: Finding) -> str:
    text = _readable(finding.evidence)
    # Neighbours are named by the nearest few in the evidence itself; elsewhere nothing else tells who is meant.
    named = any(_named(gauge, finding.evidence) for gauge in finding.others)
    return text if named or not finding.others else f"{text} Others concerned: {', '.join(finding.others)}."


def _named(gauge: str, text: str) -> bool:
    return re.search(rf"(?<!\w){re.escape(gauge)}(?!\w)", text) is not None


def _readable(text: str) -> str:
    """Return a sentence with its times as the tables print them."""
    return _ISO.sub(r"\1 \2", text)


def _lower(text: str) -> str:
    return text[:1].lower() + text[1:]


def _code(key: str) -> Markup:
    # The line may end between the words, not within a time.
    return Markup("<code>{}</code>").format(Markup(" ").join(_word(word) for word in key.split(" ")))


def _word(word: str) -> str:
    return unbroken(word) if _ISO.fullmatch(word) else word

"""What screening found: by severity, then gauge, with what to write into the job about each."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Final

import numpy as np
from markupsafe import Markup

from basinrain.rainfall import RainRecord
from basinrain.report.table import Row, Table
from basinrain.report.words import counted, unbroken, when_text, zone_text
from basinrain.screening import Finding
from basinrain.screening.edits import Edit
from basinrain.screening.findings import SEVERITIES, Severity
from basinrain.units import depth_factor

__all__ = ["MOST_FINDINGS", "count_table", "edit_text", "finding_tables", "paste_text", "short_table"]

MOST_FINDINGS: Final = 60
"""Findings of one severity that are printed; the rest is in the file."""

_MEANING: Final[dict[Severity, str]] = {
    "erroneous": "cannot be right",
    "doubtful": "may be wrong",
    "remark": "worth knowing",
}
_PLURAL: Final[dict[Severity, str]] = {"erroneous": "Erroneous", "doubtful": "Doubtful", "remark": "Remarks"}
_STATES: Final = ("open", "accepted", "rejected")


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


def finding_tables(findings: Sequence[Finding], record: RainRecord, *, depth_unit: str) -> list[Table]:
    """Return one table a severity that occurs, the heaviest first; by gauge, then time.

    Parameters
    ----------
    findings
        With their states.
    record
        The record that was screened: its clock, and its span for edits that leave a side open.
    depth_unit
        The job's, in which it says the depth of an edit.
    """
    tables = []
    for severity in reversed(SEVERITIES):
        ours = [f for f in findings if f.severity == severity]
        if not ours:
            continue
        # What the job has not settled first, as that is what a reader must decide on.
        shown = sorted(ours, key=lambda f: f.state != "open")[:MOST_FINDINGS]
        shown.sort(key=lambda f: (f.gauge, "" if f.whole_record else str(f.start)))
        rows: list[Row] = [
            (
                f.gauge or "the network",
                _when(f),
                _with_others(f),
                f.action,
                f.state,
                _code(paste_text(f, record, depth_unit=depth_unit)) if f.state == "open" else "in the job",
            )
            for f in shown
        ]
        notes = [f"Times are in {zone_text(record.zone)}; depths in the evidence are in mm unless it says otherwise."]
        if len(shown) < len(ours):
            notes.append(f"Shown: {len(shown)} of {len(ours)}, open ones first. All are in findings.csv.")
        tables.append(
            Table(
                caption=f"{_PLURAL[severity]}: {counted(len(ours), 'finding')}, {_MEANING[severity]}",
                heads=("gauge", "when", "evidence", "suggested", "state", "for the job"),
                align="tttttt",
                rows=rows,
                notes=tuple(notes),
            )
        )
    return tables


def short_table(what: str, findings: Sequence[Finding], record: RainRecord, *, most: int) -> Table:
    """Return findings with their evidence only, the heaviest first.

    Parameters
    ----------
    what
        The caption's first words: ``"Open"``.
    findings
        One at least.
    record
        For its clock.
    most
        How many are listed.
    """
    ordered = sorted(
        findings, key=lambda f: (-SEVERITIES.index(f.severity), f.gauge, "" if f.whole_record else str(f.start))
    )
    shown = ordered[:most]
    notes = [f"Times are in {zone_text(record.zone)}; depths in the evidence are in mm unless it says otherwise."]
    if len(shown) < len(ordered):
        notes.append(f"Shown: {len(shown)} of {len(ordered)}. All are in findings.csv.")
    return Table(
        caption=f"{what}: {counted(len(findings), 'finding')}",
        heads=("gauge", "severity", "when", "evidence"),
        align="tttt",
        rows=[(f.gauge or "the network", f.severity, _when(f), _with_others(f)) for f in shown],
        notes=tuple(notes),
    )


def _when(finding: Finding) -> str:
    if finding.whole_record:
        return "whole record"
    return unbroken(when_text(finding.start)) + " to " + unbroken(when_text(finding.end))


def _with_others(finding: Finding) -> str:
    text = f"{finding.check}: {finding.evidence}"
    named = [gauge for gauge in finding.others if gauge not in finding.evidence]
    return f"{text} Others concerned: {', '.join(named)}." if named else text


def _code(text: str) -> Markup:
    return Markup("<code>{}</code>").format(text)


def paste_text(finding: Finding, record: RainRecord, *, depth_unit: str) -> str:
    r"""Return what the job says to carry out the suggestion: an edit where there is one, else an entry of ``reject``.

    A remark, and what the network as a whole is about, can only be accepted.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [999.0]], step="1h")
    >>> finding = Finding(check="missing-code", gauge="A", evidence="999 mm once.", action="Reject it.")
    >>> paste_text(finding, record, depth_unit="mm")
    '[screening]\nreject = ["missing-code A"]'
    """
    if finding.edit is not None:
        return edit_text(finding.edit, record, depth_unit=depth_unit)
    key = "reject" if finding.gauge and finding.severity != "remark" else "accept"
    return f"[screening]\n{key} = [{_text(finding.key.strip())}]"


def edit_text(edit: Edit, record: RainRecord, *, depth_unit: str) -> str:
    """Return an edit as a job file says it; a side that it leaves open is the record's.

    Who decides on it, and when, is left for that person to write.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [2.0]], step="1h")
    >>> edit = Edit(gauge="A", action="scale", value=0.1, reason="Ten times too much.", by="J. Marrow")
    >>> print(edit_text(edit, record, depth_unit="mm"))
    [[edit]]
    gauge = "A"
    from = 2031-05-04T00:00:00
    to = 2031-05-04T02:00:00
    action = "scale"
    value = 0.1
    reason = "Ten times too much."
    by = ""
    date = ""
    """
    start = record.starts[0] if np.isnat(edit.start) and len(record) else edit.start
    end = record.ends[-1] if np.isnat(edit.end) and len(record) else edit.end
    lines = [
        "[[edit]]",
        f"gauge = {_text(edit.gauge)}",
        f"from = {start}",
        f"to = {end}",
        f"action = {_text(edit.action)}",
    ]
    value = edit.value
    if edit.action == "set" and isinstance(value, float):
        value /= depth_factor(depth_unit)
    if value is not None:
        lines.append(f"value = {_text(value)}")
    lines += [f"reason = {_text(edit.reason)}", 'by = ""', 'date = ""']
    return "\n".join(lines)


def _text(value: object) -> str:
    # A string of JSON is a basic string of TOML too, but for the lone surrogates that no file holds.
    return json.dumps(value, ensure_ascii=False)

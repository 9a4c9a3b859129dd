"""What to write into a job about findings: entries of ``reject`` and ``accept``, and edits."""

from __future__ import annotations

import json
from collections.abc import Sequence

import numpy as np

from basinrain.screening import Finding
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS
from basinrain.screening.edits import Edit
from basinrain.units import depth_factor

__all__ = ["edit_text", "needs_edit", "screening_text"]


def needs_edit(finding: Finding) -> bool:
    """Return whether the suggestion is an edit that no entry of ``reject`` is equal to.

    A rejection of the finding's own stretch is one; that of a part of it, of another gauge, or a changed value is not.

    Examples
    --------
    >>> scale = Edit(gauge="A", action="scale", value=25.4, reason="inches", by="J. Marrow", date="2031-06-01")
    >>> needs_edit(Finding(check="unit-mixup", gauge="A", evidence="Too little.", action="Scale it.", edit=scale))
    True
    >>> needs_edit(Finding(check="spatial-outlier", gauge="A", evidence="Too much.", action="Look at it."))
    False
    """
    return finding.edit is not None and not _rejects_it(finding)


def _rejects_it(finding: Finding) -> bool:
    edit = finding.edit
    if edit is None or edit.action != "reject":
        return False
    stretch = np.array([edit.start, edit.end]), np.array([finding.start, finding.end])
    return edit.gauge == finding.gauge and np.array_equal(*stretch, equal_nan=True)


def screening_text(findings: Sequence[Finding], whole: Sequence[str] = ()) -> str:
    r"""Return the entries of ``[screening]`` for findings, one a line; nothing where all of them take an edit.

    Where the suggestion is to reject the values, the entry rejects them. Where it is to look first, the entry is a
    comment, so that pasting it does nothing. Remarks, and what the network as a whole is about, can only be accepted.

    Parameters
    ----------
    findings
        Open ones.
    whole
        Checks all of whose findings are open remarks: one word accepts them.

    Examples
    --------
    >>> finding = Finding(check="spatial-outlier", gauge="A", evidence="120 mm.", action="Look at it.")
    >>> print(screening_text([finding]))
    [screening]
    reject = [
        # Look at these first, then reject or accept them:
        # "spatial-outlier A",
    ]
    >>> short = Finding(check="short-record", gauge="A", severity="remark", evidence="12 years.", action="Say so.")
    >>> print(screening_text([short], whole=["short-record"]))
    [screening]
    accept = [
        "short-record",
    ]
    >>> years = Finding(check="inhomogeneous", gauge="A", evidence="4 of 4 tests.", action="Compare.")
    >>> print(screening_text([years]))
    [screening]
    accept = [
        # Look at these first, then accept them:
        # "inhomogeneous A",
    ]
    """
    accepted = [f for f in findings if not f.gauge or f.severity == "remark"]
    decided = [f for f in findings if f.gauge and f.severity != "remark" and not needs_edit(f)]
    # Of decades that do not fit, no entry can take the values away.
    years = [f for f in decided if f.check in {DOUBLE_MASS_BREAK, INHOMOGENEOUS}]
    rest = [f for f in decided if f not in years]
    lines: list[str] = []
    if rest:
        looked = [f for f in rest if not _rejects_it(f)]
        lines += ["reject = [", *(f"    {_text(f.key)}," for f in rest if _rejects_it(f))]
        if looked:
            lines.append("    # Look at these first, then reject or accept them:")
            lines += [f"    # {_text(f.key)}," for f in looked]
        lines.append("]")
    if accepted or years:
        entries = dict.fromkeys(f.check if f.check in whole else f.key for f in accepted)
        lines += ["accept = [", *(f"    {_text(entry)}," for entry in entries)]
        if years:
            lines.append("    # Look at these first, then accept them:")
            lines += [f"    # {_text(f.key)}," for f in years]
        lines.append("]")
    return "\n".join(["[screening]", *lines]) if lines else ""


def edit_text(edit: Edit, *, depth_unit: str) -> str:
    """Return an edit as a job file says it; a side that it leaves open is left out.

    Who decides on it, and when, is left for that person to write.

    Examples
    --------
    >>> edit = Edit(gauge="A", action="scale", value=0.1, reason="Too much.", by="J. Marrow", date="2031-06-01")
    >>> print(edit_text(edit, depth_unit="mm"))
    [[edit]]
    gauge = "A"
    action = "scale"
    value = 0.1
    reason = "Too much."
    by = ""
    date = ""
    """
    sides = [("from", edit.start), ("to", edit.end)]
    lines = [
        "[[edit]]",
        f"gauge = {_text(edit.gauge)}",
        *(f"{key} = {time}" for key, time in sides if not np.isnat(time)),
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

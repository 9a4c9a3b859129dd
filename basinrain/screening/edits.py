"""The edit log: what a person decides to change in the rain record, with the reason, before anything is computed."""

from __future__ import annotations

import datetime as dt
import math
import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Final, Literal, get_args

import numpy as np

from basinrain.errors import JobError, Problems, unknown
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.screening.editing import Outcome, carry_out

__all__ = ["SUGGESTED", "Action", "Edit", "apply_edits", "edit_row", "spread_edits"]

Action = Literal["reject", "set", "shift", "scale"]

SUGGESTED: Final = "suggested by screening"
"""The author of an edit that a finding suggests; whoever takes it into a job puts their own name there."""

_NEVER: Final = np.datetime64("NaT", "s")
_DURATION: Final = re.compile(r"(?P<sign>[+-]?)(?P<number>[1-9][0-9]{0,5})\s*(?P<unit>min|h|d)")
_SECONDS: Final = {"min": 60, "h": 3600, "d": 86400}


@dataclass(frozen=True, kw_only=True)
class Edit:
    """One change to a gauge's values over a stretch of time, as a job's ``[[edit]]`` states it.

    Parameters
    ----------
    gauge
        The gauge's id.
    start, end
        The stretch ``(start, end]`` in the record's clock; it takes whole steps, so that neither edge may lie within a
        step that has a value. NaT leaves that side open: NaT in both is the gauge's whole record.
    action
        ``"reject"``: the values are no longer used. ``"set"``: the one step gets the depth ``value``. ``"shift"``: the
        values move by ``value`` in time. ``"scale"``: depths are multiplied by ``value``.
    value
        mm to set, 0 or more; a factor above 0 to scale by; a duration to shift by, such as ``"1h"`` (later) or
        ``"-1d"`` (earlier); None to reject.
    reason, by
        Why, and who decided; neither may be empty, since an edit that nobody can explain cannot be defended.
    date
        When it was decided, ``"2031-05-04"``; empty only in an edit that screening suggests, which nobody has decided.
    number
        Its place among the job's edits, from 1, for messages; 0 where it has none.

    Raises
    ------
    JobError
        Something is missing, superfluous or makes no sense; all of it together.

    Examples
    --------
    >>> edit = Edit(
    ...     gauge="W03",
    ...     start=np.datetime64("2031-05-04T06:00"),
    ...     end=np.datetime64("2031-05-04T12:00"),
    ...     action="scale",
    ...     value=0.1,
    ...     reason="logger set to 0.1 mm, file in mm",
    ...     by="J. Marrow",
    ...     date="2031-06-01",
    ... )
    >>> edit.item
    'edit (gauge W03)'
    >>> Edit(gauge="W03", action="shift", reason="clock an hour slow", by="", date="2031-06-01", number=2)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [[edit]] 2 (gauge W03): value: found none; expected a duration such as "1h" (later) or \
"-1d" (earlier)
    [[edit]] 2 (gauge W03): by: found nothing; expected who decided on it
    """

    gauge: str
    start: np.datetime64 = _NEVER
    end: np.datetime64 = _NEVER
    action: Action
    value: float | str | None = None
    reason: str
    by: str
    date: str = ""
    number: int = field(default=0)

    def __post_init__(self) -> None:
        for name in ("start", "end"):
            object.__setattr__(self, name, np.datetime64(getattr(self, name), "s"))
        problems = Problems()

        def wrong(what: str, found: str, expected: str, remedy: str = "") -> None:
            problems.add(item=f"{self.item}: {what}", found=found, expected=expected, remedy=remedy, gauge=self.gauge)

        if not self.gauge.strip():
            wrong("gauge", "an empty id", "a gauge's id")
        if self.start >= self.end:
            wrong("from, to", f"{self.start} to {self.end}", "a start before the end")
        if self.action not in get_args(Action):
            told = unknown("action", self.action, get_args(Action))
            wrong(told.item, told.found, told.expected, told.remedy)
        else:
            expected = _value_problem(self.action, self.value)
            if expected:
                wrong("value", "none" if self.value is None else repr(self.value), expected)
        if not self.reason.strip():
            wrong("reason", "nothing", "why the values are changed")
        if not self.by.strip():
            wrong("by", "nothing", "who decided on it")
        if not _is_date(self.date) and (self.date or self.by != SUGGESTED):
            wrong("date", f"'{self.date}'" if self.date else "nothing", "a date such as 2031-05-04")
        problems.raise_as(JobError)

    @property
    def item(self) -> str:
        """What messages call it: ``"[[edit]] 2 (gauge W03)"``."""
        return f"[[edit]] {self.number} (gauge {self.gauge})" if self.number else f"edit (gauge {self.gauge})"

    @property
    def seconds(self) -> int:
        """How far a shift moves the values, in seconds, later above 0; 0 for the other actions."""
        match = _DURATION.fullmatch(str(self.value).strip()) if self.action == "shift" else None
        if match is None:
            return 0
        length = int(match["number"]) * _SECONDS[match["unit"]]
        return -length if match["sign"] == "-" else length


def apply_edits(
    records: Sequence[RainRecord], edits: Sequence[Edit]
) -> tuple[list[RainRecord], list[dict[str, str | float | int | None]]]:
    """Return the sources' records with the edits carried out, and the edit log with what every edit did.

    Parameters
    ----------
    records
        One a source, before they are brought to the common step; they are not changed.
    edits
        Their times are in the clock of the first source that has times. Those that reject come first, then those that
        set and scale, then those that shift, all of which leave their places before any arrives: the order in which
        edits are given does not matter.

    Returns
    -------
    records : list of RainRecord
        Rejected values have no depth and the status ``rejected``. What is set, shifted or scaled is ``adjusted``, but a
        zero stays a zero, and missing stays missing. Steps that a shift leaves are missing; where it reaches beyond the
        record, steps are added. A total over several steps is rejected, shifted or scaled as a whole. Storm totals
        have no times: an edit without times is of all storms of its gauge.
    rows : list of dict
        One an edit, in their order: ``gauge``, ``from`` and ``to`` (empty where open), ``action``, ``value`` (mm, a
        factor or a duration; None), ``reason``, ``by``, ``date``, ``steps_changed``, and the sum of the depths acted on
        in mm, ``depth_before`` and ``depth_after``; None where nothing is known, as after a rejection.

    Raises
    ------
    JobError
        A gauge is in no source, an edit matches no step or no value, two edits of a gauge overlap, a step is to be set
        where there are several, a shift is no whole number of steps or ends on steps that have values of their own, a
        total, or a step with a value, lies across the edge of an edit; all of it together.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04", "s") + np.arange(1, 5) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[2.0], [0.0], [4.0], [np.nan]], step="1h")
    >>> log = {"reason": "slow clock", "by": "J. M.", "date": "2031-06-01"}
    >>> edit = Edit(gauge="A", start=ends[0], end=ends[3], action="shift", value="1h", **log)
    >>> (edited,), (row,) = apply_edits([record], [edit])
    >>> edited.depth[:, 0]
    array([ 2., nan,  0.,  4.])
    >>> record.depth[:, 0]
    array([ 2.,  0.,  4., nan])
    >>> row["steps_changed"], row["depth_before"], row["depth_after"]
    (2, 4.0, 4.0)
    """
    edited, outcomes = carry_out(records, _numbered(edits))
    return edited, [edit_row(edit, outcome) for edit, outcome in zip(edits, outcomes, strict=True)]


def spread_edits(record: RainRecord, edits: Sequence[Edit]) -> tuple[Note, ...]:
    """Return a note for every edit whose depths are spread over finer steps, where no status tells of it any more.

    Parameters
    ----------
    record
        At the common step, in the clock of the edits.
    edits
        Those that reject leave nothing to spread.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04", "s") + np.arange(1, 3) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[2.0], [3.0]], step="1h")
    >>> record = replace(record, status=np.full((2, 1), np.uint8(Status.SPREAD)))
    >>> log = {"reason": "wrong unit", "by": "J. M.", "date": "2031-06-01"}
    >>> edit = Edit(gauge="A", action="scale", value=0.1, **log, number=1)
    >>> print(*spread_edits(record, [edit]))
    [[edit]] 1 (gauge A) changes totals over longer times than the step: their 2 steps of A read 'spread', not \
'adjusted'.
    """
    notes = []
    for edit in edits:
        if edit.action == "reject" or edit.gauge not in record.gauges:
            continue
        moved = np.timedelta64(edit.seconds, "s")
        # A side that is open (NaT) leaves no step out.
        inside = ~(record.starts < edit.start + moved) & ~(record.ends > edit.end + moved)
        n = np.count_nonzero(inside & (record.status[:, record.gauges.index(edit.gauge)] == Status.SPREAD))
        if n:
            text = (
                f"{edit.item} changes totals over longer times than the step: their {n} step{'s' if n > 1 else ''} "
                f"of {edit.gauge} read 'spread', not 'adjusted'."
            )
            notes.append(Note(code="edit-spread", text=text, level="info", gauge=edit.gauge))
    return tuple(notes)


def _numbered(edits: Sequence[Edit]) -> list[Edit]:
    return [replace(edit, number=edit.number or place) for place, edit in enumerate(edits, 1)]


def edit_row(edit: Edit, outcome: Outcome | None = None) -> dict[str, str | float | int | None]:
    """Return an edit and what it did as plain values; what it did is None where that was not counted."""
    start, end = ("" if np.isnat(time) else str(time) for time in (edit.start, edit.end))
    return {
        "gauge": edit.gauge,
        "from": start,
        "to": end,
        "action": edit.action,
        "value": edit.value,
        "reason": edit.reason,
        "by": edit.by,
        "date": edit.date,
        "steps_changed": None if outcome is None else outcome.steps,
        "depth_before": None if outcome is None else outcome.before,
        "depth_after": None if outcome is None else outcome.after,
    }


def _value_problem(action: Action, value: object) -> str:
    """Return what was expected of the value, "" where it is right."""
    number = value if isinstance(value, int | float) and not isinstance(value, bool) else math.nan
    match action:
        case "reject":
            return "" if value is None else "no value, since rejected values are not replaced"
        case "set":
            return "" if 0 <= number < math.inf else "a depth of 0 or more"
        case "scale":
            return "" if 0 < number < math.inf else "a factor above 0"
        case "shift":
            right = isinstance(value, str) and _DURATION.fullmatch(value.strip())
            return "" if right else 'a duration such as "1h" (later) or "-1d" (earlier)'


def _is_date(text: str) -> bool:
    try:
        dt.date.fromisoformat(text)
    except ValueError:
        return False
    return True

"""Carries out the edit log on the sources' records."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problems, nearest_name
from basinrain.rainfall import REPORTING, KnownTotal, RainRecord, Status

if TYPE_CHECKING:
    from basinrain.screening.edits import Edit

__all__ = ["Outcome", "carry_out"]

_VALUED: Final = [int(status) for status in REPORTING | {Status.ACCUMULATED}]
_ORDER: Final = {"reject": 0, "set": 1, "scale": 1, "shift": 2}


class Outcome(NamedTuple):
    """What an edit did: steps that it changed, and the sum in mm of the depths acted on before and after."""

    steps: int
    before: float | None
    after: float | None


@dataclass
class _Source:
    """A source's record while it is edited."""

    record: RainRecord
    number: int
    shift: np.timedelta64
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    totals: list[KnownTotal]

    def finished(self) -> RainRecord:
        return replace(self.record, depth=self.depth, status=self.status, totals=tuple(self.totals))


class _Part(NamedTuple):
    """What an edit meets in one source: the steps first to stop of a column, those with values, and whole totals."""

    source: _Source
    column: int
    first: int
    stop: int
    valued: npt.NDArray[np.int64]
    totals: list[KnownTotal]

    @property
    def depth(self) -> float:
        """mm, of the values and of the totals that have no depth at their steps."""
        own = float(np.nansum(self.source.depth[self.valued, self.column]))
        steps = zip(*self.source.record.steps_of(self.totals), strict=True)
        waiting = [
            total.depth
            for total, (a, b) in zip(self.totals, steps, strict=True)
            if (self.source.status[a:b, self.column] == Status.ACCUMULATED).all()
        ]
        return own + sum(waiting)


def carry_out(records: Sequence[RainRecord], edits: Sequence[Edit]) -> tuple[list[RainRecord], list[Outcome]]:
    """Return the records with the edits carried out, and what each did.

    The rules: :func:`basinrain.screening.edits.apply_edits`.

    Parameters
    ----------
    records
        One a source; they are not changed.
    edits
        Numbered, for messages.

    Raises
    ------
    JobError
        Everything that is wrong with them together.

    Examples
    --------
    >>> carry_out([], [])
    ([], [])
    """
    problems = Problems()
    clock = next((record.zone for record in records if record.step != "storm"), "")
    sources = [
        _Source(record, k, _ahead(record.zone, clock), record.depth.copy(), record.status.copy(), list(record.totals))
        for k, record in enumerate(records, 1)
    ]
    _report_overlaps(edits, problems)
    met = [_parts(edit, sources, problems) for edit in edits]
    outcomes: list[Outcome] = [Outcome(0, None, None)] * len(edits)
    shifts: list[_Shift] = []
    for k in sorted(range(len(edits)), key=lambda k: _ORDER[edits[k].action]):
        if met[k]:
            outcomes[k] = _act(edits[k], met[k], shifts, problems)
    _arrive(shifts, problems)
    problems.raise_as(JobError)
    return [source.finished() for source in sources], outcomes


def _ahead(zone: str, clock: str) -> np.timedelta64:
    """Return how far a source's clock is ahead of the one of the edits."""
    if not (zone and clock):
        return np.timedelta64(0, "s")
    ours, theirs = (dt.datetime.fromisoformat(f"2000-01-01T00:00{name}").utcoffset() for name in (clock, zone))
    return np.timedelta64((theirs or dt.timedelta()) - (ours or dt.timedelta()), "s")


def _report_overlaps(edits: Sequence[Edit], problems: Problems) -> None:
    for k, edit in enumerate(edits):
        for earlier in edits[:k]:
            # A side that is open (NaT) is never on the wrong side of anything.
            apart = edit.start >= earlier.end or earlier.start >= edit.end
            if edit.gauge == earlier.gauge and not apart:
                problems.add(
                    item=edit.item,
                    found=f"{_span(edit)}, which overlaps {earlier.item}, {_span(earlier)}",
                    expected="one edit for a gauge and time",
                    remedy="change their times, or join them",
                    gauge=edit.gauge,
                )


def _span(edit: Edit) -> str:
    if np.isnat(edit.start) and np.isnat(edit.end):
        return "the whole record"
    start = "the beginning" if np.isnat(edit.start) else str(edit.start)
    return f"{start} to {'the end' if np.isnat(edit.end) else edit.end}"


def _parts(edit: Edit, sources: Sequence[_Source], problems: Problems) -> list[_Part]:
    """Return what the edit meets; nothing where that is a problem, which is reported."""
    having = [source for source in sources if edit.gauge in source.record.gauges]
    if not having:
        known = dict.fromkeys(gauge for source in sources for gauge in source.record.gauges)
        problems.add(
            item=edit.item,
            found="a gauge that no source of rainfall has",
            expected="a gauge of the rainfall files",
            remedy=nearest_name(edit.gauge, known),
            gauge=edit.gauge,
        )
        return []
    before = len(problems)
    parts = [part for source in having if (part := _part(edit, source, problems)) is not None]
    if len(problems) > before:
        return []
    if not parts:
        problems.add(
            item=edit.item,
            found=f"no step of the gauge that lies wholly in {_span(edit)}",
            expected="; ".join(_extent(source) for source in having),
            remedy="correct from and to",
            gauge=edit.gauge,
        )
        return []
    if edit.action != "set" and not any(len(part.valued) for part in parts):
        problems.add(
            item=edit.item,
            found=f"no value of the gauge in {_span(edit)}",
            expected=f"values to {edit.action}",
            remedy="correct from and to, or remove the edit",
            gauge=edit.gauge,
        )
        return []
    return parts


def _extent(source: _Source) -> str:
    record = source.record
    if not len(record) or np.isnat(record.ends[0]):
        return f"source {source.number} without times, which an edit without from and to meets"
    first, last = record.starts[0] - source.shift, record.ends[-1] - source.shift
    return f"steps of {record.step} from {first} to {last}"


def _part(edit: Edit, source: _Source, problems: Problems) -> _Part | None:
    record, column = source.record, source.record.gauges.index(edit.gauge)
    first, stop = 0, len(record)
    start, end = edit.start + source.shift, edit.end + source.shift
    if not np.isnat(start):
        first = int(np.searchsorted(record.starts, start)) if not np.isnat(record.starts).any() else stop
    if not np.isnat(end):
        stop = int(np.searchsorted(record.ends, end, "right")) if not np.isnat(record.ends).any() else first
    whole = []
    for total in source.totals:
        if total.gauge != edit.gauge or total.end <= start or total.start >= end:
            continue
        if total.start < start or total.end > end:
            problems.add(
                item=edit.item,
                found=f"a total of {total.depth:g} mm over {total.start - source.shift} to {total.end - source.shift} "
                f"that lies across the edge of {_span(edit)}",
                expected="a total wholly inside or outside",
                remedy="widen the times to hold it, or narrow them",
                gauge=edit.gauge,
            )
        else:
            whole.append(total)
    if first >= stop:
        return None
    valued = first + np.flatnonzero(np.isin(source.status[first:stop, column], _VALUED))
    return _Part(source, column, first, stop, valued, whole)


def _act(edit: Edit, parts: list[_Part], shifts: list[_Shift], problems: Problems) -> Outcome:
    """Carry out an edit; a shift leaves its places and waits in ``shifts``."""
    known = any(len(part.valued) for part in parts)
    before = sum(part.depth for part in parts) if known else None
    steps = sum(len(part.valued) for part in parts)
    match edit.action:
        case "reject":
            for source, column, _, _, valued, totals in parts:
                source.depth[valued, column], source.status[valued, column] = np.nan, Status.REJECTED
                source.totals = [total for total in source.totals if total not in totals]
            return Outcome(steps, before, None)
        case "set":
            return _set(edit, parts, before, problems)
        case "scale":
            factor, after = float(edit.value or 0), 0.0
            for part in parts:
                wet = part.valued[part.source.depth[part.valued, part.column] > 0]
                part.source.depth[wet, part.column] *= factor
                part.source.status[wet, part.column] = Status.ADJUSTED
                scaled = {total: replace(total, depth=total.depth * factor) for total in part.totals}
                part.source.totals = [scaled.get(total, total) for total in part.source.totals]
                after += part._replace(totals=list(scaled.values())).depth
            return Outcome(steps, before, after)
        case "shift":
            _leave(edit, [part for part in parts if len(part.valued)], shifts, problems)
            return Outcome(steps, before, before)


def _set(edit: Edit, parts: list[_Part], before: float | None, problems: Problems) -> Outcome:
    n = sum(part.stop - part.first for part in parts)
    source, column, first, *_, totals = parts[0]
    if n > 1:
        problems.add(
            item=edit.item,
            found=f"{n} steps of the gauge in {_span(edit)}",
            expected="one step to set",
            remedy=f"narrow it to one, such as {source.record.starts[first] - source.shift} to "
            f"{source.record.ends[first] - source.shift}, and give every step its own edit",
            gauge=edit.gauge,
        )
        return Outcome(0, before, None)
    value = float(edit.value or 0)
    source.depth[first, column], source.status[first, column] = value, Status.ADJUSTED
    source.totals = [total for total in source.totals if total not in totals]
    return Outcome(1, before, value)


class _Shift(NamedTuple):
    """Values that have left their steps: where from, what they are, and the totals among them, moved."""

    edit: Edit
    source: _Source
    column: int
    starts: npt.NDArray[np.datetime64]
    ends: npt.NDArray[np.datetime64]
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    totals: list[KnownTotal]


def _leave(edit: Edit, parts: list[_Part], shifts: list[_Shift], problems: Problems) -> None:
    by = np.timedelta64(edit.seconds, "s")
    for source, column, _, _, valued, totals in parts:
        record = source.record
        length = record.ends - record.starts
        if np.isnat(length).any() or (length != length[0]).any() or by % length[0]:
            problems.add(
                item=edit.item,
                found=f"a shift by {edit.value} of a record with steps of {record.step}",
                expected="a whole number of its steps, all of one length",
                gauge=edit.gauge,
            )
            continue
        moved = [replace(total, start=total.start + by, end=total.end + by) for total in totals]
        depth, status = source.depth[valued, column], source.status[valued, column]
        status = np.where(depth > 0, np.uint8(Status.ADJUSTED), status)
        starts, ends = record.starts[valued] + by, record.ends[valued] + by
        shifts.append(_Shift(edit, source, column, starts, ends, depth, status, moved))
        source.depth[valued, column], source.status[valued, column] = np.nan, Status.MISSING
        source.totals = [total for total in source.totals if total not in totals]


def _arrive(shifts: list[_Shift], problems: Problems) -> None:
    for edit, source, column, starts, ends, depth, status, totals in shifts:
        _extend(source, starts, ends)
        at = np.searchsorted(source.record.ends, ends)
        taken = np.flatnonzero(np.isin(source.status[at, column], _VALUED))
        if len(taken):
            steps = f"{len(taken)} {'steps' if len(taken) > 1 else 'step'} with values of their own"
            problems.add(
                item=edit.item,
                found=f"values that would move to {steps}, the first ending at {ends[taken[0]] - source.shift}",
                expected="none there",
                remedy="reject those first with an edit, or widen from and to so that they move too",
                gauge=edit.gauge,
            )
            continue
        source.depth[at, column], source.status[at, column] = depth, status
        source.totals += totals


def _extend(source: _Source, starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> None:
    """Add the steps that the source's record does not have, without values."""
    new = ~np.isin(ends, source.record.ends)
    if not new.any():
        return
    record = source.record
    shape = (np.count_nonzero(new), len(record.gauges))
    order = np.argsort(np.r_[record.ends, ends[new]], kind="stable")
    source.depth = np.r_[source.depth, np.full(shape, np.nan)][order]
    source.status = np.r_[source.status, np.full(shape, Status.MISSING, dtype=np.uint8)][order]
    source.record = replace(
        record,
        starts=np.r_[record.starts, starts[new]][order],
        ends=np.r_[record.ends, ends[new]][order],
        depth=source.depth,
        status=source.status,
    )

"""Carries out the edit log on the sources' records."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problems
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.screening.matches import OF_STORMS, VALUED, Match, Source, ahead, matches_of, span_text

if TYPE_CHECKING:
    from basinrain.screening.edits import Edit

__all__ = ["Outcome", "carry_out"]

_ORDER: Final = {"reject": 0, "set": 1, "scale": 1, "shift": 2}


class Outcome(NamedTuple):
    """What an edit did: steps that it changed, and the sum in mm of the depths acted on before and after."""

    steps: int
    before: float | None
    after: float | None


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
    if not edits:
        return list(records), []
    problems = Problems()
    clock = next((record.zone for record in records if record.step != "storm"), "")
    sources = [
        Source(record, k, ahead(record.zone, clock), record.depth.copy(), record.status.copy(), list(record.totals))
        for k, record in enumerate(records, 1)
    ]
    _report_overlaps(edits, problems)
    met = [matches_of(edit, sources, problems) for edit in edits]
    outcomes: list[Outcome] = [Outcome(0, None, None)] * len(edits)
    shifts: list[_Shift] = []
    for k in sorted(range(len(edits)), key=lambda k: _ORDER[edits[k].action]):
        if met[k]:
            outcomes[k] = _act(edits[k], met[k], shifts, problems)
    _arrive(shifts, problems)
    problems.raise_as(JobError)
    return [source.finished() for source in sources], outcomes


def _report_overlaps(edits: Sequence[Edit], problems: Problems) -> None:
    """Name every edit that overlaps another of its gauge; not every pair, of which there may be millions."""
    reaching: dict[str, int] = {}
    pairs = []
    for k in sorted(range(len(edits)), key=lambda k: (_ends_of(edits[k])[0], k)):
        edit = edits[k]
        farthest = reaching.setdefault(edit.gauge, k)
        if farthest == k:
            continue
        start, end = _ends_of(edit)
        until = _ends_of(edits[farthest])[1]
        if start < until:
            pairs.append((max(k, farthest), min(k, farthest)))
        if end > until:
            reaching[edit.gauge] = k
    for later, earlier in sorted(pairs):
        problems.add(
            item=edits[later].item,
            found=f"{span_text(edits[later])}, which overlaps {edits[earlier].item}, {span_text(edits[earlier])}",
            expected="one edit for a gauge and time",
            remedy="change their times, or join them",
            gauge=edits[later].gauge,
        )


def _ends_of(edit: Edit) -> tuple[float, float]:
    """Return start and end in seconds, the ends of time where a side is open."""
    return (
        -np.inf if np.isnat(edit.start) else float(edit.start.astype(np.int64)),
        np.inf if np.isnat(edit.end) else float(edit.end.astype(np.int64)),
    )


def _act(edit: Edit, parts: list[Match], shifts: list[_Shift], problems: Problems) -> Outcome:
    """Carry out an edit; a shift leaves its places and waits in ``shifts``."""
    known = any(len(part.valued) for part in parts)
    before = sum(part.depth for part in parts) if known else None
    steps = sum(len(part.valued) for part in parts)
    match edit.action:
        case "reject":
            for source, column, _, _, valued, totals in parts:
                source.depth[valued, column], source.status[valued, column] = np.nan, Status.REJECTED
                source.drop(totals)
            return Outcome(steps, before, None)
        case "set":
            return _set(edit, parts, before, problems)
        case "scale":
            factor, after = float(edit.value or 0), 0.0
            for part in parts:
                wet = part.valued[part.source.depth[part.valued, part.column] > 0]
                part.source.depth[wet, part.column] *= factor
                part.source.status[wet, part.column] = Status.ADJUSTED
                for k in part.totals:
                    total = part.source.record.totals[k]
                    part.source.totals[k] = replace(total, depth=total.depth * factor)
                after += part.depth
            return Outcome(steps, before, after)
        case "shift":
            _leave(edit, [part for part in parts if len(part.valued)], shifts, problems)
            return Outcome(steps, before, before)


def _set(edit: Edit, parts: list[Match], before: float | None, problems: Problems) -> Outcome:
    n = sum(part.stop - part.first for part in parts)
    source, column, first, *_, totals = parts[0]
    if n > 1:
        step = (
            f"narrow it to one, such as {source.record.starts[first] - source.shift} to "
            f"{source.record.ends[first] - source.shift}, and give every step its own edit"
        )
        problems.add(
            item=edit.item,
            found=f"{n} {'steps' if source.timed else 'storm totals'} of the gauge in {span_text(edit)}",
            expected="one step to set",
            remedy=step if source.timed else OF_STORMS,
            gauge=edit.gauge,
        )
        return Outcome(0, before, None)
    value = float(edit.value or 0)
    source.depth[first, column], source.status[first, column] = value, Status.ADJUSTED
    source.drop(totals)
    return Outcome(1, before, value)


class _Shift(NamedTuple):
    """Values that have left their steps: where from, what they are, and the totals among them, moved."""

    edit: Edit
    source: Source
    column: int
    starts: npt.NDArray[np.datetime64]
    ends: npt.NDArray[np.datetime64]
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    totals: list[KnownTotal]


def _leave(edit: Edit, parts: list[Match], shifts: list[_Shift], problems: Problems) -> None:
    by = np.timedelta64(edit.seconds, "s")
    for source, column, _, _, valued, totals in parts:
        record = source.record
        if source.length is None or by % source.length:
            if not source.timed:
                remedy = "remove the edit: storm totals have no times"
            elif source.length is None:
                remedy = "correct the times in the file, whose steps are not of one length, or reject the values"
            else:
                remedy = f"shift by a multiple of {record.step}, or correct the times in the file"
            problems.add(
                item=edit.item,
                found=f"a shift by {edit.value} of a record with steps of {record.step}",
                expected="a whole number of its steps, all of one length",
                remedy=remedy,
                gauge=edit.gauge,
            )
            continue
        left = [record.totals[k] for k in totals]
        moved = [replace(total, start=total.start + by, end=total.end + by) for total in left]
        depth, status = source.depth[valued, column], source.status[valued, column]
        status = np.where(depth > 0, np.uint8(Status.ADJUSTED), status)
        starts, ends = record.starts[valued] + by, record.ends[valued] + by
        shifts.append(_Shift(edit, source, column, starts, ends, depth, status, moved))
        source.depth[valued, column], source.status[valued, column] = np.nan, Status.MISSING
        source.drop(totals)


def _arrive(shifts: list[_Shift], problems: Problems) -> None:
    for edit, source, column, starts, ends, depth, status, totals in shifts:
        _extend(source, starts, ends)
        at = np.searchsorted(source.record.ends, ends)
        taken = np.flatnonzero(np.isin(source.status[at, column], VALUED))
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


def _extend(source: Source, starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> None:
    """Add the steps that the source's record does not have, without values."""
    at = np.minimum(np.searchsorted(source.record.ends, ends), len(source.record) - 1)
    new = source.record.ends[at] != ends
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

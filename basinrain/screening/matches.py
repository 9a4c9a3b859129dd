"""What an edit meets in the sources' records: the steps and the totals that are meant, and why there may be none."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems, nearest_name
from basinrain.rainfall import REPORTING, KnownTotal, RainRecord, Status

if TYPE_CHECKING:
    from basinrain.screening.edits import Edit

__all__ = ["OF_STORMS", "VALUED", "Match", "Source", "ahead", "matches_of", "span_text"]

_OWN: Final = [int(status) for status in REPORTING]

VALUED: Final = [*_OWN, int(Status.ACCUMULATED)]
"""Statuses of steps that have something to edit."""

OF_STORMS: Final = "scale and reject act on all storms of the gauge; correct a single total in the file"
"""What to do about an edit that does not fit totals without times."""

_NO_TOTALS: Final = (np.empty(0, np.int64), np.empty(0, "datetime64[s]"), np.empty(0, "datetime64[s]"))


@dataclass
class Source:
    """A source's record while it is edited.

    Parameters
    ----------
    record
        As read; steps may be added to it.
    number
        The source's place in the job, from 1.
    shift
        How far its clock is ahead of the one of the edits.
    depth, status : array, shape (n_steps, n_gauges)
        mm, and a :class:`~basinrain.rainfall.Status`; they are changed.
    totals
        The record's, in its order, None in the place of one that is gone; shifted ones come after.
    """

    record: RainRecord
    number: int
    shift: np.timedelta64
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    totals: list[KnownTotal | None]

    @cached_property
    def timed(self) -> bool:
        """Whether steps have times, as storm totals need not."""
        return not np.isnat(self.record.ends).any()

    @cached_property
    def length(self) -> np.timedelta64 | None:
        """The length of every step; None where they differ, or have no times."""
        lengths = self.record.ends - self.record.starts
        return lengths[0] if len(lengths) and (lengths == lengths[0]).all() else None

    @cached_property
    def spans(self) -> dict[str, tuple[npt.NDArray[np.int64], npt.NDArray[np.datetime64], npt.NDArray[np.datetime64]]]:
        """Places, starts and ends of the record's totals, by gauge."""
        places: dict[str, list[int]] = {}
        for k, total in enumerate(self.record.totals):
            places.setdefault(total.gauge, []).append(k)
        spans = {}
        for gauge, at in places.items():
            starts, ends = ([getattr(self.record.totals[k], name) for k in at] for name in ("start", "end"))
            spans[gauge] = (np.array(at), np.array(starts, "datetime64[s]"), np.array(ends, "datetime64[s]"))
        return spans

    def drop(self, totals: Sequence[int]) -> None:
        """Take away the totals at these places."""
        for k in totals:
            self.totals[k] = None

    def finished(self) -> RainRecord:
        """Return the record as edited."""
        left = tuple(total for total in self.totals if total is not None)
        return replace(self.record, depth=self.depth, status=self.status, totals=left)


class Match(NamedTuple):
    """What an edit meets in one source.

    Parameters
    ----------
    source
        The source.
    column
        The gauge's.
    first, stop
        The steps that lie wholly in the edit's stretch, ``stop`` not included.
    valued : array of int
        Those of them that have a value or are part of an accumulation.
    totals
        Places of the totals that lie wholly in it.
    """

    source: Source
    column: int
    first: int
    stop: int
    valued: npt.NDArray[np.int64]
    totals: list[int]

    @property
    def depth(self) -> float:
        """mm, of the values and of the totals that have no depth at their steps."""
        own = float(np.nansum(self.source.depth[self.valued, self.column]))
        totals = [total for k in self.totals if (total := self.source.totals[k]) is not None]
        waiting = [
            total.depth
            for total, a, b in zip(totals, *self.source.record.steps_of(totals), strict=True)
            if (self.source.status[a:b, self.column] == Status.ACCUMULATED).all()
        ]
        return own + sum(waiting)


def span_text(edit: Edit) -> str:
    """Return an edit's stretch in words.

    Examples
    --------
    >>> from basinrain.screening import Edit
    >>> log = {"gauge": "A", "action": "reject", "reason": "ice", "by": "J. M.", "date": "2031-06-01"}
    >>> span_text(Edit(**log)), span_text(Edit(end=np.datetime64("2031-05-04"), **log))
    ('the whole record', 'the beginning to 2031-05-04T00:00:00')
    """
    if np.isnat(edit.start) and np.isnat(edit.end):
        return "the whole record"
    start = "the beginning" if np.isnat(edit.start) else str(edit.start)
    return f"{start} to {'the end' if np.isnat(edit.end) else edit.end}"


def matches_of(edit: Edit, sources: Sequence[Source], problems: Problems) -> list[Match]:
    """Return what an edit meets; nothing where that is a problem, which is reported.

    Parameters
    ----------
    edit
        Its times are in the clock of the edits.
    sources
        All of them; those without the gauge are passed over.
    problems
        Takes what is wrong: no such gauge, no step or no value in the stretch, a total or a step with a value across
        its edge, times for storm totals.

    Examples
    --------
    >>> from basinrain.screening import Edit
    >>> ends = np.datetime64("2031-05-04", "s") + np.arange(1, 4) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[2.0], [np.nan], [4.0]], step="1h")
    >>> source = Source(record, 1, ahead("", ""), record.depth.copy(), record.status.copy(), [])
    >>> log = {"gauge": "A", "action": "reject", "reason": "ice", "by": "J. M.", "date": "2031-06-01"}
    >>> (met,) = matches_of(Edit(start=ends[0], **log), [source], Problems())
    >>> met.first, met.stop, met.valued, met.depth
    (1, 3, array([2]), 4.0)
    """
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
    parts = [part for source in having if (part := _match(edit, source, problems)) is not None]
    if len(problems) > before:
        return []
    if not parts and not any(source.timed for source in having):
        problems.add(
            item=edit.item,
            found=f"times, {span_text(edit)}, for a gauge of storm totals, which have none",
            expected="no from and to",
            remedy=OF_STORMS,
            gauge=edit.gauge,
        )
        return []
    if not parts:
        problems.add(
            item=edit.item,
            found=f"no step of the gauge that lies wholly in {span_text(edit)}",
            expected="; ".join(_extent(source) for source in having if source.timed),
            remedy="correct from and to",
            gauge=edit.gauge,
        )
        return []
    if edit.action != "set" and not any(len(part.valued) for part in parts):
        problems.add(
            item=edit.item,
            found=f"no value of the gauge in {span_text(edit)}",
            expected=f"values to {edit.action}",
            remedy="correct from and to, or remove the edit",
            gauge=edit.gauge,
        )
        return []
    return parts


def _extent(source: Source) -> str:
    record = source.record
    if not len(record):
        return f"source {source.number}, which has no steps"
    first, last = record.starts[0] - source.shift, record.ends[-1] - source.shift
    return f"steps of {record.step} from {first} to {last}"


def _match(edit: Edit, source: Source, problems: Problems) -> Match | None:
    record, column = source.record, source.record.gauges.index(edit.gauge)
    first, stop = 0, len(record)
    start, end = edit.start + source.shift, edit.end + source.shift
    if not np.isnat(start):
        first = int(np.searchsorted(record.starts, start)) if source.timed else stop
    if not np.isnat(end):
        stop = int(np.searchsorted(record.ends, end, "right")) if source.timed else first
    if source.timed:
        _report_cuts(edit, source, column, problems)
    whole = []
    at, starts, ends = source.spans.get(edit.gauge, _NO_TOTALS)
    # A side that is open (NaT) is never on the wrong side of anything.
    for k in at[~((ends <= start) | (starts >= end))].tolist():
        total = source.record.totals[k]
        if total.start < start or total.end > end:
            problems.add(
                item=edit.item,
                found=f"a total of {total.depth:g} mm over {total.start - source.shift} to {total.end - source.shift} "
                f"that lies across the edge of {span_text(edit)}",
                expected="a total wholly inside or outside",
                remedy="widen the times to hold it, or narrow them",
                gauge=edit.gauge,
            )
        else:
            whole.append(k)
    if first >= stop:
        return None
    valued = first + np.flatnonzero(np.isin(source.status[first:stop, column], VALUED))
    return Match(source, column, first, stop, valued, whole)


def _report_cuts(edit: Edit, source: Source, column: int, problems: Problems) -> None:
    """Report the steps with a value that lie across an edge of the edit: nobody means a part of a step."""
    record = source.record
    edges = [edge + source.shift for edge in (edit.start, edit.end) if not np.isnat(edge)]
    # The step that holds an edge is the first that ends after it.
    for t in dict.fromkeys(np.searchsorted(record.ends, np.array(edges, dtype="datetime64[s]"), "right").tolist()):
        if t == len(record) or not any(record.starts[t] < edge < record.ends[t] for edge in edges):
            continue
        # An accumulation is told as a total.
        if source.status[t, column] in _OWN:
            first, last = record.starts[t] - source.shift, record.ends[t] - source.shift
            problems.add(
                item=edit.item,
                found=f"the step {first} to {last}, which has a value and lies across the edge of {span_text(edit)}",
                expected="steps wholly inside or outside",
                remedy=f"move that edge to {first} or {last}",
                gauge=edit.gauge,
            )


def ahead(zone: str, clock: str) -> np.timedelta64:
    """Return how far a source's clock is ahead of the one of the edits; 0 where either is not known.

    Examples
    --------
    >>> ahead("+02:00", "+01:00")
    np.timedelta64(3600,'s')
    """
    if not (zone and clock):
        return np.timedelta64(0, "s")
    ours, theirs = (dt.datetime.fromisoformat(f"2000-01-01T00:00{name}").utcoffset() for name in (clock, zone))
    return np.timedelta64((theirs or dt.timedelta()) - (ours or dt.timedelta()), "s")

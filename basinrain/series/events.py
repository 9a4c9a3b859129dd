"""Events of a series: storms separated by a dry gap, and which of them are the largest."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem, Problems
from basinrain.notes import Note
from basinrain.series.steps import check_between, check_steps, constant_step, in_words, steps_in
from basinrain.series_check import WET_DEPTH

__all__ = ["TOTAL", "Event", "RankedEvent", "Ranking", "find_events", "rank_events"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]
Cut = Literal["", "start", "end", "both"]

TOTAL: Final = "total"
"""Says that events are compared by all that fell in them."""


@dataclass(frozen=True, kw_only=True)
class Event:
    """A storm of a series: from its first wet step to its last.

    Parameters
    ----------
    first, stop
        Steps of the series, ``first`` included, ``stop`` not; both ends are wet steps.
    start, end
        The event is ``(start, end]``.
    total
        mm, of all its steps, those below the wet depth included; NaN where it is :attr:`incomplete`.
    present
        mm, of those of its steps that have a number: the total where it is complete, else less than that or equal.
    wet_steps
        Steps with at least the wet depth.
    peak, peak_end
        mm, the greatest depth of one step among those that have a number, and the end of that step, the first where
        several are equal.
    missing_inside
        Steps of the event without a number. Had they been dry, it might have been several storms.
    missing_beside
        Steps without a number outside, but nearer to the event than the dry gap: rain in them would be of this event.
    cut
        ``"start"``, ``"end"`` or ``"both"`` where the series begins or ends so near that the dry gap does not fit
        between: the event may be longer than the series shows, and its total is that of the series. Else empty.

    Examples
    --------
    >>> hour = np.timedelta64(3600, "s")
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 6) * hour
    >>> depth = np.array([0.0, 2.0, np.nan, 3.0, 0.0])
    >>> (event,) = find_events(ends - hour, ends, depth, dry_gap=hour)
    >>> event.duration, event.total, event.present, event.incomplete, event.cut
    (np.timedelta64(10800,'s'), nan, 5.0, True, '')
    """

    first: int
    stop: int
    start: np.datetime64
    end: np.datetime64
    total: float
    present: float
    wet_steps: int
    peak: float
    peak_end: np.datetime64
    missing_inside: int
    missing_beside: int
    cut: Cut

    @property
    def duration(self) -> np.timedelta64:
        """From the start of the first wet step to the end of the last."""
        return self.end - self.start

    @property
    def incomplete(self) -> bool:
        """Whether a step without a number lies in the event, or nearer to it than the dry gap."""
        return self.missing_inside + self.missing_beside > 0


def find_events(
    starts: Times, ends: Times, depth: Floats, *, dry_gap: np.timedelta64, wet_depth: float = WET_DEPTH
) -> list[Event]:
    """Return the storms of a series, in order.

    A step is wet with at least ``wet_depth`` and dry below it. Two wet steps belong to different events where an
    unbroken stretch of dry steps of at least ``dry_gap`` lies between them. A step without a number is neither dry
    nor wet: it breaks the stretch, and so does not separate; and an event that holds one, or has one nearer than the
    dry gap, is incomplete, since that step may have been part of it. What lies before and after the series is not
    known either; an event so near is marked as cut.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``, and the next begins where it ends. Steps may differ in length.
    depth : array of float, shape (n,)
        mm, of one basin; NaN where it is missing.
    dry_gap
        The least dry time between storms, above 0. A gap of just this length separates.
    wet_depth
        mm in a step, above 0.

    Returns
    -------
    list of Event
        Empty where no step is wet. Every wet step is in one of them.

    Raises
    ------
    DataError
        The series is none: shapes, times that do not follow each other, depths below 0.
    JobError
        ``dry_gap`` or ``wet_depth`` is not above 0.

    Examples
    --------
    Six dry hours make two storms; what falls below 0.1 mm in an hour inside a storm counts, outside it does not.

    >>> depth = np.array([0, 3, 0.05, 4, 0, 0, 0, 0, 0.05, 0, 5, 0], dtype=float)
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 13) * np.timedelta64(3600, "s")
    >>> for event in find_events(ends - 3600, ends, depth, dry_gap=np.timedelta64(6, "h")):
    ...     print(event.start, event.end, event.total, event.cut)
    2031-05-04T01:00:00 2031-05-04T04:00:00 7.05 start
    2031-05-04T10:00:00 2031-05-04T11:00:00 5.0 end
    >>> find_events(ends - 3600, ends, np.zeros(12), dry_gap=np.timedelta64(6, "h"))
    []
    """
    begin, end, values = check_steps(starts, ends, depth, basins=False)
    gap = _positive(dry_gap, item="dry gap")
    check_between(wet_depth, 0, np.inf, item="wet_depth", closed=False)
    wet = values >= wet_depth
    missing = np.isnan(values)
    places = np.flatnonzero(wet)
    if not len(places):
        return []
    first, last = _clusters(begin, end, places, missing, gap)
    known = np.where(missing, 0.0, values)
    holes = np.concatenate([[0], np.cumsum(missing)])
    # Steps any part of which lies nearer than the dry gap.
    reach_first = np.searchsorted(end, begin[first] - gap, side="right")
    reach_stop = np.searchsorted(begin, end[last] + gap, side="left")
    inside = holes[last + 1] - holes[first]
    beside = holes[reach_stop] - holes[reach_first] - inside
    events = []
    for k in range(len(first)):
        a, b = int(first[k]), int(last[k]) + 1
        present = float(known[a:b].sum())
        peak = a + int(known[a:b].argmax())
        incomplete = inside[k] + beside[k] > 0
        events.append(
            Event(
                first=a,
                stop=b,
                start=begin[a],
                end=end[b - 1],
                total=float("nan") if incomplete else present,
                present=present,
                wet_steps=int(wet[a:b].sum()),
                peak=float(known[peak]),
                peak_end=end[peak],
                missing_inside=int(inside[k]),
                missing_beside=int(beside[k]),
                cut=_cut(at_start=begin[a] - begin[0] < gap, at_end=end[-1] - end[b - 1] < gap),
            )
        )
    return events


def _positive(length: np.timedelta64, *, item: str) -> np.timedelta64:
    seconds: np.timedelta64 = length.astype("timedelta64[s]")
    if not seconds > np.timedelta64(0, "s"):
        raise JobError(Problem(item=item, found=str(length), expected="a length of time of one second or more"))
    return seconds


def _clusters(begin: Times, end: Times, wet: Ints, missing: Bools, gap: np.timedelta64) -> tuple[Ints, Ints]:
    """Return the first and last steps of the wet clusters that a known dry stretch of at least ``gap`` separates."""
    # The wet and the missing steps end a dry stretch; one that is long enough may lie anywhere between two wet steps.
    broken = missing.copy()
    broken[wet] = True
    breaks = np.flatnonzero(broken)
    long = begin[breaks[1:]] - end[breaks[:-1]] >= gap
    dry = np.concatenate([[0], np.cumsum(long)])
    at = np.searchsorted(breaks, wet)
    apart = np.flatnonzero(np.diff(dry[at])) + 1
    return wet[np.concatenate([[0], apart])], wet[np.concatenate([apart - 1, [len(wet) - 1]])]


def _cut(*, at_start: bool, at_end: bool) -> Cut:
    if at_start and at_end:
        return "both"
    return "start" if at_start else "end" if at_end else ""


@dataclass(frozen=True, kw_only=True)
class RankedEvent:
    """An event with the depth by which it is compared.

    Parameters
    ----------
    event
        The event.
    rank
        1 for the largest; None where the event is incomplete, which has no rank.
    depth
        mm, the total or the greatest depth in the duration; NaN where the event is incomplete.
    present
        mm, the same of what is there: equal to ``depth`` where the event is complete. Else more may have fallen, and
        with missing steps inside it may have been several storms.
    start, end
        The window ``(start, end]`` in which ``present`` fell, the event itself where it is compared by its total.
    """

    event: Event
    rank: int | None
    depth: float
    present: float
    start: np.datetime64
    end: np.datetime64


@dataclass(frozen=True)
class Ranking:
    """Events by size.

    Parameters
    ----------
    complete
        Largest first, equal ones in order of time, with ranks from 1.
    incomplete
        Those that a step without a number is part of, or may be; they have no rank. Ordered in the same way by the
        depth that is there.
    by
        What was compared, in words: ``"total"`` or a duration such as ``"24h"``.
    """

    complete: tuple[RankedEvent, ...]
    incomplete: tuple[RankedEvent, ...]
    by: str

    def notes(self, count: int) -> tuple[Note, ...]:
        """Return what must be said when the ``count`` largest complete events are taken.

        Returns
        -------
        tuple of Note
            ``"incomplete-storms"`` where there are incomplete events: a warning where what is there of one of them
            already reaches the smallest that was taken (or fewer than ``count`` are complete), else for information.
            ``"cut-storms"`` where one of the events taken is cut by the ends of the series.

        Examples
        --------
        >>> hour = np.timedelta64(3600, "s")
        >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 8) * hour
        >>> depth = np.array([0.0, 2.0, 0.0, 0.0, 3.0, np.nan, 0.0])
        >>> events = find_events(ends - hour, ends, depth, dry_gap=hour)
        >>> [note.code for note in rank_events(events, ends - hour, ends, depth, by="total").notes(1)]
        ['incomplete-storms']
        """
        found = []
        taken = self.complete[:count]
        if self.incomplete:
            least = taken[-1].present if len(taken) == count else 0.0
            above = [ranked for ranked in self.incomplete if ranked.present >= least]
            number = len(self.incomplete)
            told = (
                f"{number} of {number + len(self.complete)} storms hold steps without a number, or have some nearer "
                "than the dry gap; their depth is not known and they are not ranked."
            )
            if above:
                spans = ", ".join(f"{_minute(r.event.start)} to {_minute(r.event.end)}" for r in above[:5])
                more = f" and {len(above) - 5} more" if len(above) > 5 else ""
                told += f" By what is there of them these would be among the {count} largest: {spans}{more}."
            found.append(Note(code="incomplete-storms", text=told, level="warning" if above else "info"))
        cut = [ranked for ranked in taken if ranked.event.cut]
        if cut:
            spans = ", ".join(f"{_minute(r.event.start)} to {_minute(r.event.end)}" for r in cut)
            text = f"The series begins or ends within the dry gap of these storms, which may be longer: {spans}."
            found.append(Note(code="cut-storms", text=text))
        return tuple(found)


def rank_events(
    events: Sequence[Event],
    starts: Times,
    ends: Times,
    depth: Floats,
    *,
    by: Literal["total"] | np.timedelta64 = "total",
) -> Ranking:
    """Return events by size, the largest first.

    Parameters
    ----------
    events
        Of this series, from :func:`find_events`.
    starts, ends : array of datetime64, shape (n,)
        The steps of the series.
    depth : array of float, shape (n,)
        mm; NaN where it is missing.
    by
        ``"total"``, or a duration: the greatest depth in any window of so long, sliding by one step. Only what fell in
        the event itself counts, so an event that is shorter than the duration is compared by its total, and a window
        never takes rain of the next storm.

    Returns
    -------
    Ranking
        Complete and incomplete events apart. Equal events are in order of time.

    Raises
    ------
    DataError
        The series is none.
    JobError
        ``by`` is neither, or a duration that is no whole number of steps.
    MethodError
        A duration is asked for and the steps differ in length.

    Examples
    --------
    The second storm is the larger in an hour, the first in all.

    >>> hour = np.timedelta64(3600, "s")
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 8) * hour
    >>> depth = np.array([0.0, 3.0, 3.0, 0.0, 5.0, 0.0, 0.0])
    >>> events = find_events(ends - hour, ends, depth, dry_gap=hour)
    >>> [(ranked.depth, str(ranked.end)) for ranked in rank_events(events, ends - hour, ends, depth).complete]
    [(6.0, '2031-05-04T03:00:00'), (5.0, '2031-05-04T05:00:00')]
    >>> [ranked.depth for ranked in rank_events(events, ends - hour, ends, depth, by=hour).complete]
    [5.0, 3.0]
    """
    begin, end, values = check_steps(starts, ends, depth, basins=False)
    if isinstance(by, str):
        if by != TOTAL:
            raise JobError(Problem(item="rank of storms", found=f"'{by}'", expected=f"'{TOTAL}' or a duration"))
        words, m = TOTAL, None
    else:
        step = constant_step(begin, end, wanted_for="rank of storms by duration")
        problems = Problems()
        (m,) = steps_in([by], step, item="duration", problems=problems)
        problems.raise_as(JobError)
        words = in_words(m * step)
    known = np.where(np.isnan(values), 0.0, values)
    sized: list[tuple[float, int, int, Event]] = []
    for event in events:
        first, stop, present = event.first, event.stop, event.present
        if m is not None and m < stop - first:
            # Of one event only: its own rain, few steps; nothing is subtracted.
            windows = np.lib.stride_tricks.sliding_window_view(known[first:stop], m).sum(axis=1)
            place = int(np.argmax(windows >= windows.max() * (1 - 1e-12)))
            first, stop, present = first + place, first + place + m, float(windows[place])
        sized.append((present, first, stop, event))
    # Sums of the same depths in another order may differ in the last digit; that is no difference in size.
    order = sorted(sized, key=lambda entry: (-round(entry[0], 9), entry[3].first))

    def ranked(entry: tuple[float, int, int, Event], rank: int | None) -> RankedEvent:
        present, first, stop, event = entry
        return RankedEvent(
            event=event,
            rank=rank,
            depth=float("nan") if rank is None else present,
            present=present,
            start=begin[first],
            end=end[stop - 1],
        )

    complete = [entry for entry in order if not entry[3].incomplete]
    incomplete = [entry for entry in order if entry[3].incomplete]
    return Ranking(
        tuple(ranked(entry, k) for k, entry in enumerate(complete, 1)),
        tuple(ranked(entry, None) for entry in incomplete),
        words,
    )


def _minute(when: np.datetime64) -> str:
    return str(when.astype("datetime64[m]"))

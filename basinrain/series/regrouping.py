"""Series brought to a coarser step and to another clock, some steps at a time."""

from __future__ import annotations

import zoneinfo
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.clocks import clock_name, clock_seconds, parse_zone, standard_offset
from basinrain.errors import DataError, JobError, Problem, Problems
from basinrain.intervals import DAY, interval_of, parse_interval
from basinrain.notes import Note
from basinrain.series.flags import Flag
from basinrain.series.series_source import Rows, SeriesSource, copied

__all__ = ["Regrouping", "regroup"]

Bools = npt.NDArray[np.bool_]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]

_HELD: Final = 1 << 20
"""Values of the record's own step that are looked at together; a single step of many basins may be more."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Regrouping:
    """Which steps of a record make up each step of what is written, and the times of these.

    Parameters
    ----------
    starts, ends : array of datetime64[s], shape (n_out,)
        The intervals ``(start, end]`` of what is written, in the clock ``zone``.
    zone : str
        A fixed offset from UTC such as ``"+02:00"``; empty where the record's clock is not known.
    n_steps : int
        Steps of the record.
    parts : int
        How many steps of the record one step has.
    first : array of int, shape (n_out,)
        The first step of the record in each; the others follow it.
    whole : array of bool, shape (n_out,)
        Whether the record has all of them; where not, there is no number.
    notes : tuple of Note
        ``steps-left-out`` where steps at an end of the record do not fill a step.
    """

    starts: Times
    ends: Times
    zone: str
    n_steps: int
    parts: int
    first: Ints
    whole: Bools
    notes: tuple[Note, ...] = field(default=())

    def __len__(self) -> int:
        return len(self.ends)

    def source(self, source: SeriesSource) -> SeriesSource:
        """Return the series at the new step; nothing is computed before a part of it is asked for.

        Depths are summed in the order of time; a step without a number leaves the sum without one. The observed share
        is the mean of the steps' own. Marks are those of any step; where there is no number the mark is "missing"
        alone.

        Parameters
        ----------
        source : SeriesSource
            Series at the record's step.

        Returns
        -------
        SeriesSource
            Each part is computed from about a million values at a time, however many steps are summed.

        Raises
        ------
        DataError
            The source has another number of steps than the record.
        """
        if source.n_steps != self.n_steps:
            raise DataError(Problem(item="series", found=f"{source.n_steps} steps", expected=f"{self.n_steps}"))
        return source if self.parts == 1 else _Regrouped(source, self)


def regroup(
    starts: Times,
    ends: Times,
    *,
    step: str | None = None,
    zone: str = "",
    timezone: str | None = None,
    day_phase: int = 0,
) -> Regrouping:
    """Return how a record's steps are grouped into longer ones on the clock of a zone.

    Steps shorter than a day are counted from midnight of the clock in which they are written. Days begin at that
    midnight, too, unless the record has days of its own, by its ``day_phase`` or by a step of a day: these stay where
    they are. Several days are counted from the first whole day of the record.

    Parameters
    ----------
    starts, ends : array of datetime64[s], shape (n_steps,)
        The record's intervals ``(start, end]``, in order; steps may be absent.
    step : str, optional
        The step to write, ``"6h"``; the record's own by default.
    zone : str
        The record's clock, a fixed offset such as ``"+02:00"``; empty where it is not known.
    timezone : str, optional
        The clock to write: ``"UTC"``, an offset, or an IANA name for that zone's standard time; the record's own by
        default.
    day_phase : int
        Seconds after midnight of the record's clock at which its rainfall day begins.

    Returns
    -------
    Regrouping
        Steps at either end that the record does not fill are left out, and a note says so.

    Raises
    ------
    JobError
        The record's clock is not known and another is asked for; the step is shorter than the record's, not a multiple
        of it, neither divides a day nor is made of whole days, or its bounds cut the record's steps; the record has no
        whole step. All that can be found together.

    Examples
    --------
    Hours from 22:00 to 11:00 at +02:00 hold one step of six hours in UTC, 00:00 to 06:00:

    >>> ends = np.datetime64("2031-05-03T22:00:00") + 3600 * np.arange(1, 14)
    >>> grouped = regroup(ends - 3600, ends, step="6h", zone="+02:00", timezone="UTC")
    >>> grouped.ends, grouped.first, grouped.zone
    (array(['2031-05-04T06:00:00'], dtype='datetime64[s]'), array([4]), '+00:00')
    >>> print(grouped.notes[0])
    4 steps at the beginning and 3 at the end of the record do not fill a step of 6h: they are left out of the series.
    >>> regroup(ends - 3600, ends, step="90min", timezone="UTC")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [series] timezone: found 'UTC', and a record whose clock is not known; expected a \
record whose clock is known; give the timezone of the [[rainfall]], or leave this out
    [series] step: found '90min'; expected a multiple of the record's step of 1h
    """
    problems = Problems()
    starts, ends = np.asarray(starts, dtype="datetime64[s]"), np.asarray(ends, dtype="datetime64[s]")
    if not len(ends) or np.isnat(ends).any() or np.isnat(starts).any():
        raise JobError(Problem(item="[series]", found="a record without times", expected="a record with steps in time"))
    shift = _shift(problems, starts, zone, timezone)
    lengths = np.unique((ends - starts).astype(np.int64))
    seconds = _step_seconds(problems, step, lengths)
    problems.raise_as(JobError)
    written = clock_name(clock_seconds(zone) + shift) if zone else ""
    if seconds is None:
        moved = np.timedelta64(shift, "s")
        return Regrouping(
            starts=starts + moved,
            ends=ends + moved,
            zone=written,
            n_steps=len(ends),
            parts=1,
            first=np.arange(len(ends)),
            whole=np.ones(len(ends), dtype=bool),
        )
    own = int(lengths[0])
    begin, end = starts.astype(np.int64) + shift, ends.astype(np.int64) + shift
    phase = int(begin[0]) if own % DAY == 0 else day_phase + shift if day_phase else 0
    origin = _origin(int(begin[0]), seconds, phase)
    return _grouped(begin - origin, end - origin, origin, seconds=seconds, own=own, zone=written)


def _shift(problems: Problems, starts: Times, zone: str, timezone: str | None) -> int:
    """Return the seconds to add to the record's times; 0 where it cannot be told, which is a problem."""
    if timezone is None:
        return 0
    item = "[series] timezone"
    try:
        asked = parse_zone(timezone)
    except JobError as error:
        for fault in error.problems:
            problems.add(item=item, found=fault.found, expected=fault.expected, remedy=fault.remedy)
        return 0
    if not zone:
        problems.add(
            item=item,
            found=f"'{timezone}', and a record whose clock is not known",
            expected="a record whose clock is known",
            remedy="give the timezone of the [[rainfall]], or leave this out",
        )
        return 0
    offset = standard_offset(asked, starts) if isinstance(asked, zoneinfo.ZoneInfo) else asked
    if offset % 60:
        problems.add(
            item=item,
            found=f"'{timezone}', which was {offset} seconds off UTC when the record began",
            expected="whole minutes",
            remedy="give an offset such as '+02:00'",
        )
    return offset - clock_seconds(zone)


def _step_seconds(problems: Problems, step: str | None, lengths: Ints) -> int | None:
    """Return the length of the step to write; None where it is the record's own."""
    if step is None:
        return None
    item = "[series] step"
    try:
        seconds = parse_interval(step, item=item).seconds
    except JobError as error:
        problems.extend(error)
        return None
    found = f"'{step}'"
    if seconds is None:
        if lengths[0] < 28 * DAY:
            problems.add(item=item, found=found, expected="a step of fixed length: minutes, hours or days")
        return None
    if len(lengths) > 1:
        problems.add(
            item=item,
            found=f"{found}, and a record whose steps differ in length",
            expected="no other step than the record's",
            remedy="leave it out",
        )
        return None
    own = int(lengths[0])
    if seconds == own:
        return None
    label = interval_of(own).label if own % 60 == 0 else f"{own} s"
    if seconds < own:
        problems.add(
            item=item,
            found=f"{found}, shorter than the record's step of {label}",
            expected=f"{label} or a multiple of it",
            remedy="depths are summed, never divided",
        )
    elif seconds % own:
        problems.add(item=item, found=found, expected=f"a multiple of the record's step of {label}")
    elif DAY % seconds and seconds % DAY:
        problems.add(
            item=item,
            found=found,
            expected="a step that divides a day, or whole days",
            remedy="else it would begin at another hour every day",
        )
    return seconds


def _origin(begin: int, seconds: int, phase: int) -> int:
    """Return a time at which a step begins, in seconds; ``phase`` is where days do."""
    if seconds < DAY:
        return begin // DAY * DAY
    return begin + (phase - begin) % DAY


def _grouped(begin: Ints, end: Ints, origin: int, *, seconds: int, own: int, zone: str) -> Regrouping:
    """Return the groups of steps whose times count from a bound of the steps to write."""
    label = interval_of(seconds).label
    group = begin // seconds
    cut = np.flatnonzero(group != (end - 1) // seconds)
    if len(cut):
        at = (origin + begin[cut[0]]).astype("datetime64[s]")
        raise JobError(
            Problem(
                item="[series] step",
                found=f"'{label}', whose bounds cut the record's step that begins at {at}{zone}",
                expected="bounds between the record's steps",
                remedy="choose another step or timezone",
            )
        )
    parts = seconds // own
    names = np.arange(group[0], group[-1] + 1)
    first = np.searchsorted(group, names)
    whole = np.diff(first, append=len(group)) == parts
    if not whole.any():
        raise JobError(
            Problem(
                item="[series] step",
                found=f"'{label}', of which the record fills none",
                expected="a step that the record is longer than",
            )
        )
    kept = slice(int(np.argmax(whole)), len(whole) - int(np.argmax(whole[::-1])))
    early, late = int(first[kept][0]), len(group) - int(first[kept][-1]) - parts
    starts = origin + names[kept] * seconds
    return Regrouping(
        starts=starts.astype("datetime64[s]"),
        ends=(starts + seconds).astype("datetime64[s]"),
        zone=zone,
        n_steps=len(group),
        parts=parts,
        first=first[kept].astype(np.int64),
        whole=whole[kept],
        notes=_left_out(early, late, label),
    )


def _left_out(early: int, late: int, label: str) -> tuple[Note, ...]:
    if not early + late:
        return ()
    where = [f"{n} {end}" for n, end in ((early, "at the beginning"), (late, "at the end")) if n]
    one = early + late == 1
    where[0] = where[0].replace(" ", " step " if where[0].startswith("1 ") else " steps ", 1)
    return (
        Note(
            code="steps-left-out",
            text=f"{' and '.join(where)} of the record {'does' if one else 'do'} not fill a step of {label}: "
            f"{'it is' if one else 'they are'} left out of the series.",
            level="info",
        ),
    )


class _Regrouped:
    """The series of a source, regrouped when asked for."""

    def __init__(self, source: SeriesSource, grouping: Regrouping) -> None:
        self._source, self._grouping = source, grouping
        self.n_steps = len(grouping)
        self.series = source.series

    def depth(self, gaps: str, method: str, /) -> Rows:
        return _Combined(self._source.depth(gaps, method), self._grouping, _SUM)

    def observed_share(self, gaps: str, method: str, /) -> Rows:
        return _Combined(self._source.observed_share(gaps, method), self._grouping, _MEAN)

    def flags(self, gaps: str, method: str, /) -> Rows:
        return _Combined(self._source.flags(gaps, method), self._grouping, _MARKS)


@dataclass(frozen=True, kw_only=True)
class _How:
    """How the values of a group's steps become one."""

    absent: float
    working: npt.DTypeLike
    add: Callable[..., Any]
    finish: Callable[[npt.NDArray[Any], int], npt.NDArray[Any]]


def _missing_alone(marks: npt.NDArray[Any], _: int) -> npt.NDArray[Any]:
    marks[marks & Flag.MISSING > 0] = Flag.MISSING
    return marks


_SUM: Final = _How(absent=np.nan, working=np.float64, add=np.add, finish=lambda total, _: total)
_MEAN: Final = replace(_SUM, finish=lambda total, parts: (total / parts).astype(np.float32))
_MARKS: Final = _How(absent=float(Flag.MISSING), working=np.uint8, add=np.bitwise_or, finish=_missing_alone)


class _Combined:
    """Values of a step and basin combined over the steps of each group."""

    def __init__(self, rows: Rows, grouping: Regrouping, how: _How) -> None:
        self._rows, self._grouping, self._how = rows, grouping, how

    @property
    def shape(self) -> tuple[int, ...]:
        return len(self._grouping), self._rows.shape[1]

    def __getitem__(self, part: tuple[slice, slice], /) -> npt.NDArray[Any]:
        steps = range(len(self._grouping))[part[0]]
        width = len(range(self.shape[1])[part[1]])
        result = np.full((len(steps), width), self._how.absent, dtype=self._how.working)
        together = max(1, _HELD // max(1, self._grouping.parts * width))
        for at in range(0, len(steps), together):
            groups = np.arange(steps.start + at, steps.start + min(at + together, len(steps)))
            there = self._grouping.whole[groups]
            if there.any():
                result[at : at + len(groups)][there] = self._total(self._grouping.first[groups[there]], width, part[1])
        return self._how.finish(result, self._grouping.parts)

    def _total(self, first: Ints, width: int, basins: slice) -> npt.NDArray[Any]:
        """Return the values of some groups, step after step in the order of time, so that no part changes another."""
        total = np.zeros((len(first), width), dtype=self._how.working)
        for values in self._steps(first, width, basins):
            total = self._how.add(total, values)
        return total

    def _steps(self, first: Ints, width: int, basins: slice) -> Iterator[npt.NDArray[Any]]:
        parts = self._grouping.parts
        # One group may be more than is held at a time; several together never are.
        held = parts if len(first) > 1 else max(1, _HELD // max(1, width))
        for begin in range(0, parts, held):
            stop = min(begin + held, parts)
            block = copied(self._rows, slice(int(first[0]) + begin, int(first[-1]) + stop), basins)
            for step in range(begin, stop):
                yield block[first - first[0] + step - begin]

"""Time stamps of rainfall files.

Every interval is ``(start, end]``. A stamp with a time of day ends its interval, unless the source says that it starts
it; a bare date or month names that day or month. Stamps are ISO 8601, or of a declared format.
"""

from __future__ import annotations

import datetime as dt
import re
import zoneinfo
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Literal, NamedTuple

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.clocks import clock_name, clock_seconds, parse_zone, standard_offset
from basinrain.errors import JobError, Problem
from basinrain.intervals import DAY, Interval

__all__ = ["StampFault", "StampRules", "Stamps", "read_stamps"]

_ISO: Final = re.compile(
    r"(?P<month>[0-9]{4}-[0-9]{2})"
    r"(?:(?P<day>-[0-9]{2})"
    r"(?:[T ](?P<time>[0-9]{2}:[0-9]{2}(?::[0-9]{2})?)(?:\.0+)?\s?(?P<offset>Z|[+-][0-9]{2}:?[0-9]{2})?)?)?"
)
_FORMS: Final = "2031-05-04 08:00, 2031-05-04T08:00:00+02:00, 2031-05-04 or 2031-05"
_BAD, _MONTH, _DATE, _FULL = 0, 1, 2, 3
_KIND: Final = {_MONTH: "a bare month", _DATE: "a bare date", _FULL: "a date with a time of day"}
_RULE: Final = 0.8
"""When more than this share of the stamps is wrong in one way, the interval is, and they are told in one line."""
_LISTED: Final = 3
"""So many stamps that are none are told one by one all the same."""


class StampFault(NamedTuple):
    """What is wrong with a stamp, in the words of a problem; ``row`` is its place."""

    row: int
    found: str
    expected: str
    remedy: str


@dataclass(frozen=True, kw_only=True)
class StampRules:
    """How the stamps of a source are to be understood.

    Parameters
    ----------
    interval
        The source's step.
    stamp
        Which bound of its interval a stamp with a time of day is.
    timezone
        The declared zone, or None.
    read_hour
        Seconds after midnight at which daily gauges are read, or None.
    date_means
        What a bare date of a daily value names.
    time_format
        A strptime format; None for ISO 8601.
    """

    interval: Interval
    stamp: Literal["end", "start"] = "end"
    timezone: str | None = None
    read_hour: int | None = None
    date_means: Literal["calendar-day", "ends", "starts"] = "calendar-day"
    time_format: str | None = None


class Stamps(NamedTuple):
    """Interval ends in the record's clock (NaT where faulty), the clock's name, and the faults by row."""

    ends: npt.NDArray[np.datetime64]
    zone: str
    faults: list[StampFault]


class _Parsed(NamedTuple):
    """Naive times, the kind of every stamp, and its own offset from UTC in seconds (NaN without)."""

    times: npt.NDArray[np.datetime64]
    kind: npt.NDArray[np.int8]
    offset: npt.NDArray[np.float64]


def read_stamps(texts: Sequence[str], rules: StampRules, *, zone: str | None = None) -> Stamps:
    """Return the ends of the intervals that stamps belong to.

    Parameters
    ----------
    texts
        The stamps.
    rules
        How to understand them.
    zone
        The clock that earlier files of the source settled, ``""`` where they have none; None when this is the first.

    Returns
    -------
    Stamps
        The clock is the declared zone's; an IANA zone's is its standard time, into which local stamps are converted,
        bare dates and reading hours being taken as standard time. Without a declared zone it is the first stamp's own
        offset, else ``""``.

    Raises
    ------
    JobError
        The zone or the format is not understood.

    Examples
    --------
    >>> hourly = StampRules(interval=Interval("1h", 3600), timezone="Europe/Vienna")
    >>> stamps = read_stamps(["2031-07-01 12:00", "2031-03-30 02:30"], hourly)
    >>> stamps.ends, stamps.zone
    (array(['2031-07-01T11:00:00',                 'NaT'],
          dtype='datetime64[s]'), '+01:00')
    >>> stamps.faults[0].found
    "'2031-03-30 02:30', which the clocks of Europe/Vienna skip"
    >>> read_stamps(["2031-05"], StampRules(interval=Interval("1mo", None))).ends
    array(['2031-06-01T00:00:00'], dtype='datetime64[s]')
    """
    cells = list(texts)
    parsed = _parse_iso(cells) if rules.time_format is None else _parse_format(cells, rules.time_format)
    remedy = "correct the stamp, or declare its form in time_format"
    bad = parsed.kind == _BAD
    expected = f"a time such as {rules.time_format or _FORMS}"
    if bad.sum() > _LISTED:
        faults = _alike(bad, cells, expected, remedy)
    else:
        faults = [StampFault(int(row), f"'{cells[row]}'", expected, remedy) for row in np.flatnonzero(bad)]
    faults += _mixed(parsed, cells, rules, zone)
    local, clock = _to_clock(parsed, cells, rules, zone, faults)
    ends = _interval_ends(local, parsed.kind, cells, rules, faults)
    ends[[fault.row for fault in faults]] = np.datetime64("NaT")
    ends[bad] = np.datetime64("NaT")
    first_of_row = {fault.row: fault for fault in reversed(faults)}
    return Stamps(ends, clock, sorted(first_of_row.values()))


def _parse_iso(cells: list[str]) -> _Parsed:
    n = len(cells)
    kind, offset = np.zeros(n, dtype=np.int8), np.full(n, np.nan)
    plain = [""] * n
    next_day = np.zeros(n, dtype=bool)
    offsets: dict[str, float] = {"Z": 0.0}
    for row, cell in enumerate(cells):
        match = _ISO.fullmatch(cell)
        if match is None:
            continue
        month, day, time, own = match.groups()
        kind[row] = _FULL if time else _DATE if day else _MONTH
        if time and time.startswith("24:") and time.strip("24:0") == "":
            # ISO 8601-1:2004 and 24-hour tables: 24:00 is the end of that day.
            next_day[row], time = True, "00:00"
        plain[row] = f"{month}{day or '-01'}T{time or '00:00'}"
        if own:
            if own not in offsets:
                offsets[own] = _seconds_of(own)
                if np.isnan(offsets[own]):
                    kind[row] = _BAD
            offset[row] = offsets[own]
    times = np.full(n, "NaT", dtype="datetime64[s]")
    good = np.flatnonzero(kind)
    times[good] = _to_datetime64([plain[row] for row in good], "ISO8601")
    times[next_day] += np.timedelta64(DAY, "s")
    kind[np.isnat(times)] = _BAD
    return _Parsed(times, kind, offset)


def _seconds_of(offset: str) -> float:
    try:
        return clock_seconds(offset)
    except JobError:
        return np.nan


def _to_datetime64(texts: list[str], form: str) -> npt.NDArray[np.datetime64]:
    return pd.to_datetime(pd.Series(texts, dtype=str), format=form, errors="coerce").to_numpy(dtype="datetime64[s]")


def _parse_format(cells: list[str], form: str) -> _Parsed:
    aware = "%z" in form
    try:
        parsed = pd.to_datetime(pd.Series(cells, dtype=str), format=form, errors="coerce", utc=aware)
    except ValueError as error:
        raise JobError(
            Problem(item="time_format", found=f"'{form}'", expected="a strptime format", remedy=str(error))
        ) from None
    if aware:
        parsed = parsed.dt.tz_localize(None)
    times = parsed.to_numpy(dtype="datetime64[s]")
    with_time = re.search(r"%[HIMScXTR]", form) is not None
    with_day = re.search(r"%[djcxDFe]", form) is not None
    kind = np.where(np.isnat(times), _BAD, _FULL if with_time else _DATE if with_day else _MONTH).astype(np.int8)
    offset = np.full(len(cells), np.nan)
    if aware:
        # The times are UTC already; adding a stamp's own offset gives what is written.
        offset = np.array([_own_offset(c, form) if k else np.nan for c, k in zip(cells, kind, strict=True)])
        times = times + np.where(np.isnan(offset), 0, offset).astype("timedelta64[s]")
    return _Parsed(times, kind, offset)


def _own_offset(cell: str, form: str) -> float:
    ahead = dt.datetime.strptime(cell, form).utcoffset()
    return np.nan if ahead is None else ahead.total_seconds()


def _mixed(parsed: _Parsed, cells: list[str], rules: StampRules, zone: str | None) -> list[StampFault]:
    """Stamps of a kind that the others are not, or with an offset where others have none."""
    faults = []
    kinds = [kind for kind in (_MONTH, _DATE, _FULL) if (parsed.kind == kind).any()]
    if len(kinds) > 1:
        common = max(kinds, key=lambda kind: int((parsed.kind == kind).sum()))
        faults += [
            StampFault(int(row), f"'{cells[row]}'", f"{_KIND[common]}, as the other stamps are", "write all alike")
            for row in np.flatnonzero((parsed.kind != common) & (parsed.kind != _BAD))
        ]
    full = parsed.kind == _FULL
    aware = full & ~np.isnan(parsed.offset)
    naive = full & ~aware
    if rules.timezone is None and zone is not None:
        odd, state = (aware, "no offset") if not zone else (naive, "an offset from UTC")
    elif aware.any() and naive.any():
        odd, state = (aware, "no offset") if aware.sum() < naive.sum() else (naive, "an offset from UTC")
    else:
        return faults
    faults += [
        StampFault(int(row), f"'{cells[row]}'", f"{state}, as the other stamps have", "write all stamps alike")
        for row in np.flatnonzero(odd)
    ]
    return faults


def _to_clock(
    parsed: _Parsed, cells: list[str], rules: StampRules, zone: str | None, faults: list[StampFault]
) -> tuple[npt.NDArray[np.datetime64], str]:
    """Return the times in the record's clock, and its name."""
    local = parsed.times.copy()
    declared = None if rules.timezone is None else parse_zone(rules.timezone)
    aware = ~np.isnan(parsed.offset)
    if zone is not None:
        clock = zone
    elif isinstance(declared, zoneinfo.ZoneInfo):
        clock = clock_name(standard_offset(declared, local))
    elif declared is not None:
        clock = clock_name(declared)
    else:
        clock = clock_name(int(parsed.offset[aware][0])) if aware.any() else ""
    if not clock:
        return local, clock
    ahead = clock_seconds(clock)
    local[aware] += (ahead - parsed.offset[aware]).astype("timedelta64[s]")
    naive = (parsed.kind == _FULL) & ~aware
    if isinstance(declared, zoneinfo.ZoneInfo) and naive.any():
        local[naive] = _from_legal_time(local, np.flatnonzero(naive), declared, ahead=ahead, cells=cells, faults=faults)
    return local, clock


def _from_legal_time(
    times: npt.NDArray[np.datetime64],
    rows: npt.NDArray[np.int64],
    zone: zoneinfo.ZoneInfo,
    *,
    ahead: int,
    cells: list[str],
    faults: list[StampFault],
) -> npt.NDArray[np.datetime64]:
    legal = pd.DatetimeIndex(times[rows])
    shown = legal.tz_localize(zone, ambiguous="NaT", nonexistent="shift_forward")
    twice = np.isnat(shown.tz_convert(None).to_numpy())
    known = legal.tz_localize(zone, ambiguous="NaT", nonexistent="NaT").tz_convert(None)
    utc: npt.NDArray[np.datetime64] = known.to_numpy(dtype="datetime64[s]")
    for place in np.flatnonzero(np.isnat(utc)):
        how = f"which the clocks of {zone.key} {'show twice' if twice[place] else 'skip'}"
        faults.append(
            StampFault(
                int(rows[place]),
                f"'{cells[rows[place]]}', {how}",
                "a time that exists once",
                f"give the stamps in standard time, with timezone = '{clock_name(ahead)}'",
            )
        )
    return np.asarray(utc + np.timedelta64(ahead, "s"))


def _interval_ends(
    local: npt.NDArray[np.datetime64],
    kind: npt.NDArray[np.int8],
    cells: list[str],
    rules: StampRules,
    faults: list[StampFault],
) -> npt.NDArray[np.datetime64]:
    seconds = rules.interval.seconds
    if seconds is None:
        return _month_ends(local, kind, cells, rules, faults)
    step, hour = np.timedelta64(seconds, "s"), np.timedelta64(rules.read_hour or 0, "s")
    after = rules.stamp == "start"
    ends = local + step if after else local.copy()
    if rules.interval.whole_days:
        date = kind == _DATE
        if rules.date_means == "calendar-day":
            ends[date] = local[date] + (step if after else np.timedelta64(DAY, "s"))
        else:
            ends[date] = local[date] + hour + (step if rules.date_means == "starts" else np.timedelta64(0, "s"))
        wrong = kind == _MONTH
        if rules.read_hour is not None:
            time_of_day = local - local.astype("datetime64[D]")
            odd = (kind == _FULL) & (time_of_day != hour)
            faults += _alike(odd, cells, "a bare date, or the reading hour", "correct read_hour, or interval")
            ends[odd] = np.datetime64("NaT")
        expected = "a date"
    else:
        wrong = (kind == _MONTH) | (kind == _DATE)
        expected = "a date with a time of day"
    faults += _alike(wrong, cells, f"{expected}, as the interval is {rules.interval.label}", "correct interval")
    ends[wrong] = np.datetime64("NaT")
    return ends


def _month_ends(
    local: npt.NDArray[np.datetime64],
    kind: npt.NDArray[np.int8],
    cells: list[str],
    rules: StampRules,
    faults: list[StampFault],
) -> npt.NDArray[np.datetime64]:
    month = local.astype("datetime64[M]")
    full, date = kind == _FULL, kind == _DATE
    wrong = full & (month != local)
    faults += _alike(wrong, cells, "the first moment of a month, or a bare month", "correct interval")
    # A date that comes again is left to the check of the order; a month may be called by its first and its last day.
    later = date & (pd.Series(month).duplicated() & ~pd.Series(local).duplicated()).to_numpy()
    later &= 2 * later.sum() > date.sum()
    faults += _alike(later, cells, "one date for a month, as the interval is 1mo", "correct interval")
    named = ~full if rules.stamp == "end" else np.ones(len(local), dtype=bool)
    ends = np.where(named, month + 1, month).astype("datetime64[s]")
    ends[wrong | later] = np.datetime64("NaT")
    return ends


def _alike(wrong: npt.NDArray[np.bool_], cells: list[str], expected: str, remedy: str) -> list[StampFault]:
    """Return a fault for every wrong stamp, or one for all where it is the rule that is wrong for them."""
    rows = np.flatnonzero(wrong).tolist()
    if len(rows) > max(1, _RULE * len(cells)):
        found = f"'{cells[rows[0]]}', and {len(rows) - 1} more stamps like it"
        return [StampFault(rows[0], found, expected, remedy)]
    return [StampFault(row, f"'{cells[row]}'", expected, remedy) for row in rows]

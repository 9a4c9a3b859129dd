"""Times that a job states, in the clock of its record."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import datetime, timedelta
from typing import Final

import numpy as np

from basinrain.errors import JobError, Problem
from basinrain.jobfile.fields import is_month
from basinrain.jobfile.tables import EditTable, RainfallTable, StormTable

__all__ = ["edit_window_times", "rainfall_day_start", "storm_window_times"]

_NEVER: Final = np.datetime64("NaT", "s")

Window = tuple[np.datetime64 | None, np.datetime64 | None]


def rainfall_day_start(sources: Sequence[RainfallTable]) -> np.timedelta64:
    """Return when the rainfall day that a bare date names begins, from midnight of that date.

    Midnight, unless every source is read daily at one hour: then the day of a date is the files' own, which ends or
    starts at the reading hour.

    Parameters
    ----------
    sources
        The job's ``[[rainfall]]`` tables.

    Examples
    --------
    >>> daily = RainfallTable(file="d.csv", unit="mm", interval="1d", read_hour="07:00", date_means="ends")
    >>> rainfall_day_start([daily]).astype(int) / 3600  # the day of the 9th begins on the 8th at 07:00
    np.float64(-17.0)
    >>> hourly = RainfallTable(file="h.csv", unit="mm", interval="1h")
    >>> rainfall_day_start([daily, hourly]).astype(int)
    np.int64(0)
    """
    readings = {(source.read_hour, source.date_means) for source in sources if _is_daily(source)}
    midnight = np.timedelta64(0, "s")
    if len(readings) != 1 or not all(_is_daily(source) for source in sources):
        return midnight
    ((hour, means),) = readings
    if hour is None or means not in {"ends", "starts"}:
        return midnight
    hours, _, minutes = str(hour).partition(":")
    at = np.timedelta64(3600 * int(hours) + 60 * int(minutes or 0), "s")
    return at - np.timedelta64(86400, "s") if means == "ends" else at


def _is_daily(source: RainfallTable) -> bool:
    match = re.fullmatch(r"(\d+)\s*(min|h|d)", (source.interval or "").strip())
    return match is not None and int(match[1]) * {"min": 1, "h": 60, "d": 1440}[match[2]] == 1440


def storm_window_times(table: StormTable, zone: str, *, day_start: np.timedelta64) -> Window:
    """Return a storm's start and end in the record's clock; None where the job states none.

    Parameters
    ----------
    table
        The storm. A bare date names its whole day, a bare month its whole month.
    zone
        The record's clock, a fixed offset; empty where the files do not say.
    day_start
        When the day of a date begins, from midnight (:func:`rainfall_day_start`).

    Raises
    ------
    JobError
        A time has an offset, and the record's clock is not known.

    Examples
    --------
    >>> storm = StormTable(name="Quill", start="2031-05-04T06:00:00Z", end="2031-05-05")
    >>> [str(time) for time in storm_window_times(storm, "+02:00", day_start=np.timedelta64(0, "s"))]
    ['2031-05-04T08:00:00', '2031-05-06T00:00:00']
    """
    item = f"storm {table.name}"
    return (
        _moment(item, table.start, zone, day_start, at_end=False),
        _moment(item, table.end, zone, day_start, at_end=True),
    )


def edit_window_times(
    table: EditTable, number: int, zone: str, *, day_start: np.timedelta64
) -> tuple[np.datetime64, np.datetime64]:
    """Return the start and end of an edit in the clock of the record that it changes.

    Parameters
    ----------
    table
        The edit. A bare date names its whole day, a bare month its whole month; a side that is not given is open, NaT.
    number
        Which ``[[edit]]`` it is, counted from 1.
    zone, day_start
        As for :func:`storm_window_times`: the clock of the first source with times, the day of the gauge's own source.

    Raises
    ------
    JobError
        A time has an offset, and the record's clock is not known.

    Examples
    --------
    >>> edit = EditTable.model_validate(
    ...     {"gauge": "W01", "from": "2031-05-04", "to": "2031-05-04", "action": "reject"}
    ...     | {"reason": "funnel blocked", "by": "site log", "date": "2031-06-01"}
    ... )
    >>> [str(time) for time in edit_window_times(edit, 1, "", day_start=np.timedelta64(0, "s"))]
    ['2031-05-04T00:00:00', '2031-05-05T00:00:00']
    """
    item = f"[[edit]] no. {number}"
    start = _moment(item, table.start, zone, day_start, at_end=False)
    end = _moment(item, table.end, zone, day_start, at_end=True)
    return _NEVER if start is None else start, _NEVER if end is None else end


def _moment(item: str, text: str | None, zone: str, day_start: np.timedelta64, *, at_end: bool) -> np.datetime64 | None:
    if text is None:
        return None
    if is_month(text):
        year, month = divmod(12 * int(text[:4]) + int(text[5:]) - 1 + int(at_end), 12)
        return np.datetime64(f"{year:04d}-{month + 1:02d}-01", "s") + day_start
    when = datetime.fromisoformat(text)
    local = np.datetime64(when.replace(tzinfo=None), "s")
    if "T" not in text and " " not in text:
        return local + day_start + np.timedelta64(int(at_end), "D")
    if when.tzinfo is None:
        return local
    if not zone:
        raise JobError(
            Problem(
                item=item,
                found=f"the time '{text}' with an offset",
                expected="times without one, since the rainfall files state no time zone",
                remedy="give [[rainfall]] timezone, or write the times in the clock of the files",
            )
        )
    clock = datetime.fromisoformat(f"2000-01-01T00:00{zone}").utcoffset() or timedelta(0)
    return local + np.timedelta64(clock - (when.utcoffset() or timedelta(0)), "s")

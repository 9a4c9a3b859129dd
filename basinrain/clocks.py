"""The fixed-offset clock in which a record keeps its times, and the zones from which it comes."""

from __future__ import annotations

import datetime as dt
import re
import zoneinfo
from collections.abc import Mapping
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, JobError, Problem, Problems, nearest_name

__all__ = ["MONTHS", "clock_name", "clock_seconds", "one_clock", "parse_zone", "standard_offset"]

MONTHS: Final = (
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
)
"""In English whatever the locale is."""

_OFFSET: Final = re.compile(r"(?P<sign>[+-])(?P<hours>[01][0-9]):?(?P<minutes>[0-5][0-9])")


def clock_seconds(name: str) -> int:
    """Return the seconds that a clock such as ``"+02:00"`` is ahead of UTC.

    Examples
    --------
    >>> clock_seconds("+02:00"), clock_seconds("-09:30")
    (7200, -34200)
    """
    match = _OFFSET.fullmatch(name)
    if not match:
        raise JobError(Problem(item="clock", found=f"'{name}'", expected="an offset from UTC such as '+02:00'"))
    ahead = int(match["hours"]) * 3600 + int(match["minutes"]) * 60
    return -ahead if match["sign"] == "-" else ahead


def clock_name(seconds: int) -> str:
    """Return the name of the clock that is so many seconds ahead of UTC.

    Examples
    --------
    >>> clock_name(7200), clock_name(0), clock_name(-34200)
    ('+02:00', '+00:00', '-09:30')
    """
    hours, minutes = divmod(abs(seconds) // 60, 60)
    return f"{'-' if seconds < 0 else '+'}{hours:02d}:{minutes:02d}"


def parse_zone(timezone: str) -> int | zoneinfo.ZoneInfo:
    """Return a zone's fixed offset in seconds, or the zone where it is one of the IANA database.

    Raises
    ------
    JobError
        It is neither ``"UTC"``, an offset, nor a name of the IANA time zone database.

    Examples
    --------
    >>> parse_zone("UTC"), parse_zone("+02:00"), parse_zone("Europe/Vienna")
    (0, 7200, zoneinfo.ZoneInfo(key='Europe/Vienna'))
    """
    if timezone in {"UTC", "Z"}:
        return 0
    if _OFFSET.fullmatch(timezone):
        return clock_seconds(timezone)
    try:
        return zoneinfo.ZoneInfo(timezone)
    except (zoneinfo.ZoneInfoNotFoundError, ValueError, OSError):
        raise JobError(
            Problem(
                item="timezone",
                found=f"'{timezone}'",
                expected="'UTC', an offset such as '+02:00', or an IANA name such as 'Europe/Vienna'",
                remedy=_near_zone(timezone),
            )
        ) from None


def standard_offset(zone: zoneinfo.ZoneInfo, times: npt.NDArray[np.datetime64]) -> int:
    """Return the seconds that a zone's standard time is ahead of UTC in the year in which ``times`` begin.

    NaT is passed over; without any time it is the year 2000.

    Examples
    --------
    >>> standard_offset(zoneinfo.ZoneInfo("Europe/Vienna"), np.array(["2031-07-01"], dtype="datetime64[s]"))
    3600
    """
    known = times[~np.isnat(times)]
    year = int(str(known.min())[:4]) if len(known) else 2000
    winter = dt.datetime(year, 1, 1, tzinfo=zone)
    ahead, saving = winter.utcoffset() or dt.timedelta(0), winter.dst() or dt.timedelta(0)
    return int((ahead - saving).total_seconds())


def one_clock(zones: Mapping[int, str], labels: Mapping[int, str]) -> str:
    """Return the clock of the first of several sources, which all must have one or none.

    Parameters
    ----------
    zones
        Clocks by the source's number, ``""`` for none.
    labels
        What messages call the sources.

    Raises
    ------
    DataError
        Some have a clock and others none.

    Examples
    --------
    >>> one_clock({1: "+02:00", 2: "+00:00"}, {1: "source 1", 2: "source 2"})
    '+02:00'
    """
    first = next(iter(zones))
    problems = Problems()
    for number, zone in zones.items():
        if bool(zone) != bool(zones[first]):
            problems.add(
                item="time zones",
                found=f"{zones[first] or 'no zone'} for {labels[first]}, {zone or 'no zone'} for {labels[number]}",
                expected="a zone for every source, or for none",
                remedy="declare timezone for each",
            )
    problems.raise_as(DataError)
    return zones[first]


def _near_zone(timezone: str) -> str:
    advice = nearest_name(timezone, sorted(zoneinfo.available_timezones()))
    return advice if advice.startswith("did you mean") else ""

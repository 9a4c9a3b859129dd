"""The time coordinate of a CF NetCDF file: interval ends in the record's clock."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.clocks import clock_name
from basinrain.errors import Problems
from basinrain.intervals import Interval
from basinrain.reading.stamps import StampRules, read_stamps

__all__ = ["NetcdfTimes", "interval_ends"]

_STANDARD: Final = ("standard", "gregorian", "proleptic_gregorian")
_UNITS: Final = re.compile(
    r"\s*(?P<base>\w+\s+since\s+[0-9]{1,4}-[0-9]{1,2}-[0-9]{1,2}"
    r"(?:(?:T|\s+)[0-9]{1,2}(?::[0-9]{1,2}(?::[0-9]{1,2}(?:\.[0-9]*)?)?)?)?)"
    r"\s*(?:(?P<utc>Z|UTC|GMT)|(?P<sign>[+-])(?P<hours>[0-9]{1,2})(?::?(?P<minutes>[0-9]{2}))?)?\s*",
    re.IGNORECASE,
)


@dataclass(frozen=True, eq=False)
class NetcdfTimes:
    """Interval ends (NaT where faulty), the clock's name, the times as messages show them, and what they call these."""

    ends: npt.NDArray[np.datetime64]
    zone: str
    shown: Sequence[str]
    item: str


def interval_ends(
    file: Any,  # noqa: ANN401 - an open NetCDF file
    name: str,
    rules: StampRules,
    zone: str | None,
    problems: Problems,
) -> NetcdfTimes | None:
    """Return the ends of the intervals of a time variable.

    Parameters
    ----------
    file
        An open NetCDF file.
    name
        The variable.
    rules
        How to understand times; bounds of time, where there are such, outweigh ``stamp``.
    zone
        The clock settled by earlier files; None when this is the first.
    problems
        Takes units and calendars that cannot be used, blank times, and bounds that are not the interval.
    """
    variable = file[name]
    item = f"variable {name}"
    times = _decoded(variable, variable, item, problems)
    if times is None:
        return None
    bounds = _bounds(file, variable, item, problems)
    known = times[0]
    if bounds is not None:
        _check_bounds(bounds, rules.interval, f"variable {variable.bounds}", problems)
        known, rules = bounds[:, 1], replace(rules, stamp="end")
    ahead = times[1]
    if ahead is None and rules.timezone is None and not zone:
        ahead = 0  # CF: a time without an offset is UTC
    suffix = "" if ahead is None else clock_name(ahead)
    texts = ["" if t == "NaT" else t + suffix for t in np.datetime_as_string(known).tolist()]
    ends, clock, faults = read_stamps(texts, rules, zone=zone)
    for fault in faults:
        problems.add(
            item=item,
            found=fault.found,
            expected=fault.expected,
            remedy=fault.remedy,
            line=fault.row + 1,
            time=texts[fault.row],
        )
    return NetcdfTimes(ends, clock, texts, item)


def _decoded(
    values: Any,  # noqa: ANN401 - a NetCDF variable
    described: Any,  # noqa: ANN401 - the same, or the one whose bounds they are
    item: str,
    problems: Problems,
) -> tuple[npt.NDArray[np.datetime64], int | None] | None:
    """Return times in their own clock, NaT where blank, and how many seconds it is ahead of UTC where that is said."""
    import netCDF4

    units = str(getattr(described, "units", ""))
    calendar = str(getattr(described, "calendar", "standard")).lower()
    expected = "units such as 'hours since 2031-05-04 00:00:00'"
    if calendar not in _STANDARD:
        problems.add(
            item=item,
            found=f"calendar '{calendar}'",
            expected="one of: " + ", ".join(_STANDARD),
            remedy="convert the times",
        )
        return None
    match = _UNITS.fullmatch(units)
    if match is None:
        problems.add(item=item, found=f"units '{units}'", expected=expected, remedy="correct the attribute")
        return None
    numbers = np.ma.masked_invalid(values[:])
    blank = np.ma.getmaskarray(numbers)
    try:
        dates = netCDF4.num2date(
            numbers.filled(0), match["base"], calendar, only_use_cftime_datetimes=False, only_use_python_datetimes=True
        )
    except (ValueError, OverflowError, TypeError) as error:
        problems.add(item=item, found=f"units '{units}' ({error})", expected=expected, remedy="correct the attribute")
        return None
    # Numbers of days in floating point are seldom whole seconds.
    exact = np.asarray(dates, dtype="datetime64[us]") + np.timedelta64(500_000, "us")
    times = np.asarray(exact, dtype="datetime64[s]")
    times[blank] = np.datetime64("NaT")
    return times, _offset(match)


def _offset(units: re.Match[str]) -> int | None:
    """Return the seconds ahead of UTC that the units of a time name; None where they do not."""
    if units["utc"]:
        return 0
    if not units["sign"]:
        return None
    seconds = int(units["hours"]) * 3600 + int(units["minutes"] or 0) * 60
    return -seconds if units["sign"] == "-" else seconds


def _bounds(
    file: Any,  # noqa: ANN401 - an open NetCDF file
    variable: Any,  # noqa: ANN401 - a NetCDF variable
    item: str,
    problems: Problems,
) -> npt.NDArray[np.datetime64] | None:
    name = getattr(variable, "bounds", None)
    if name is None:
        return None
    if name not in file.variables or file[name].shape != (len(variable), 2):
        found = f"bounds '{name}', which " + ("is not there" if name not in file.variables else "has another shape")
        problems.add(item=item, found=found, expected="a variable with two bounds for every time")
        return None
    times = _decoded(file[name], variable, f"variable {name}", problems)
    return None if times is None else times[0]


def _check_bounds(bounds: npt.NDArray[np.datetime64], interval: Interval, item: str, problems: Problems) -> None:
    starts, ends = bounds[:, 0], bounds[:, 1]
    if interval.seconds is None:
        month = ends.astype("datetime64[M]")
        fits = (month == ends) & (month - 1 == starts)
    else:
        fits = ends - starts == np.timedelta64(interval.seconds, "s")
    wrong = np.flatnonzero(~fits)
    if not len(wrong):
        return
    row = int(wrong[0])
    more = f", and {len(wrong) - 1} more bounds that do not fit" if len(wrong) > 1 else ""
    problems.add(
        item=item,
        found=f"an interval from {starts[row]} to {ends[row]}{more}",
        expected=f"intervals of {interval.label}, as declared",
        remedy="correct interval, or the bounds",
        line=row + 1,
        time=str(ends[row]),
    )

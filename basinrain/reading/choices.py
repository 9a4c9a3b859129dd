"""The options of a rainfall source, checked before any file is opened."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from typing import Final

from basinrain.errors import JobError, Problem, Problems, nearest_name, unknown
from basinrain.intervals import DAY, FORMS, Interval, interval_of, parse_interval
from basinrain.layouts import (
    COLUMNS,
    FORMAT_LAYOUTS,
    FORMAT_NAMES,
    GHCN,
    GHCN_UNIT,
    LAYOUTS,
    NETCDF_COLUMNS,
    NOT_IN_NETCDF,
    misplaced,
)

__all__ = ["check_choices", "check_numbers", "reading_hour", "source_interval", "time_of_day"]

_CHOICES: Final = {
    "layout": LAYOUTS,
    "stamp": ("end", "start"),
    "date_means": ("calendar-day", "ends", "starts"),
    "gaps": ("refuse", "missing"),
}
_NO_READINGS: Final = ("trace", "presumed-zero", "accumulated")
_HOUR: Final = re.compile(r"(?P<hour>[01]?[0-9]|2[0-3])(?::(?P<minute>[0-5][0-9]))?")


def check_choices(
    layout: str, given: Mapping[str, object], problems: Problems, *, formats: Collection[str] = ("text",)
) -> None:
    """Report options that are none of their choices, or that the layout or the format of a file does not take.

    Parameters
    ----------
    layout
        The source's layout.
    given
        The options that were given, by key; None for one that has its default.
    problems
        Takes what is wrong.
    formats
        Those of the source's files, as of :func:`basinrain.layouts.file_format`.

    Examples
    --------
    >>> problems = Problems()
    >>> check_choices("wide", {"stamp": "middle", "tip": 0.2, "gaps": None}, problems)
    >>> problems.raise_as(JobError)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: stamp: found 'middle'; expected one of: end, start
    tip: found 0.2; expected it with layout 'tips' only; leave it out
    """
    for key, value in {"layout": layout, **given}.items():
        if value is not None and key in _CHOICES and value not in _CHOICES[key]:
            problems.include(unknown(key, value, _CHOICES[key]))
        elif value is not None and (expected := misplaced(key, layout)):
            problems.add(item=key, found=f"{value!r}", expected=expected, remedy="leave it out")
    unit = given.get("unit")
    if layout in GHCN and unit not in {None, GHCN_UNIT}:
        problems.add(
            item="unit",
            found=f"'{unit}'",
            expected=f"'{GHCN_UNIT}', which the format prescribes",
            remedy="leave it out",
        )
    flags = given.get("flags")
    for meaning in flags if layout == "counter" and isinstance(flags, Mapping) else ():
        if meaning in _NO_READINGS:
            problems.add(
                item="flags",
                found=f"'{meaning}'",
                expected="another meaning, as a counter has readings and no depths",
                remedy="declare it 'missing' where the reading does not count",
            )
    _check_formats(layout, given, sorted(formats), problems)
    columns = given.get("columns")
    accepted = NETCDF_COLUMNS if "netcdf" in formats and layout == "wide" else COLUMNS.get(layout)
    for key in columns if accepted and isinstance(columns, Mapping) else ():
        if accepted and key not in accepted:
            problems.add(
                item="columns",
                found=f"'{key}'",
                expected=f"for layout '{layout}' one of: " + ", ".join(accepted),
                remedy=nearest_name(key, accepted),
            )


def _check_formats(layout: str, given: Mapping[str, object], formats: Sequence[str], problems: Problems) -> None:
    for name in formats:
        if layout in LAYOUTS and layout not in FORMAT_LAYOUTS[name]:
            problems.add(
                item="layout",
                found=f"'{layout}' with a {FORMAT_NAMES[name]} file",
                expected=" or ".join(f"'{known}'" for known in FORMAT_LAYOUTS[name]),
                remedy="leave it out" if name == "netcdf" and layout == "long" else "give such data as text",
            )
    for key in NOT_IN_NETCDF if "netcdf" in formats else ():
        if given.get(key) is not None:
            problems.add(
                item=key,
                found=f"{given[key]!r}",
                expected="none with a NetCDF file, whose times and depths are numbers",
                remedy="leave it out",
            )


def check_numbers(problems: Problems, *, above: Mapping[str, float | None], least: Mapping[str, float]) -> None:
    """Report numbers that are not above 0, and numbers that are below 0.

    Examples
    --------
    >>> problems = Problems()
    >>> check_numbers(problems, above={"tip": 0.0, "rollover": None}, least={"jitter": 0.0})
    >>> problems.raise_as(JobError)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: tip: found 0.0; expected a number above 0
    """
    for key, number in above.items():
        if number is not None and not 0 < number < float("inf"):
            problems.add(item=key, found=f"{number}", expected="a number above 0")
    for key, number in least.items():
        if not 0 <= number < float("inf"):
            problems.add(item=key, found=f"{number}", expected="a number of at least 0")


def source_interval(interval: str | None, layout: str) -> Interval | None:
    """Return the step of a source; None for storm totals, which have none.

    Raises
    ------
    JobError
        It is not understood, is not given where the layout needs one, or is given and the layout has none or another.

    Examples
    --------
    >>> source_interval("60min", "wide").label, source_interval(None, "totals"), source_interval(None, "ghcn-dly").label
    ('1h', None, '1d')
    """
    if layout == "totals":
        if interval is None:
            return None
        problem = Problem(
            item="interval", found=f"'{interval}'", expected="none for storm totals", remedy="leave it out"
        )
        raise JobError(problem)
    if layout in GHCN:
        if interval is not None and parse_interval(interval).seconds != DAY:
            expected = "'1d', which the format prescribes"
            raise JobError(Problem(item="interval", found=f"'{interval}'", expected=expected, remedy="leave it out"))
        return interval_of(DAY)
    if interval is None:
        raise JobError(Problem(item="interval", found="none", expected=FORMS, remedy="declare the files' step"))
    return parse_interval(interval)


def reading_hour(hour: str | int | None, date_means: str | None, step: Interval | None) -> int | None:
    """Return the reading hour in seconds after midnight; None where none is given.

    Parameters
    ----------
    hour
        ``"08:00"``, or a whole hour.
    date_means
        What a bare date names; ``"ends"`` and ``"starts"`` need an hour, and an hour needs one of them.
    step
        The source's step, whole days where there is an hour; None where it is not known.

    Raises
    ------
    JobError
        It is no time of day, or does not go with the others.

    Examples
    --------
    >>> reading_hour("06:30", "ends", Interval("1d", DAY))
    23400
    >>> reading_hour("24:30", "ends", Interval("1d", DAY))
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: read_hour: found '24:30'; expected a time of day, such as '08:00' or 8
    """
    if date_means in {"ends", "starts"} and hour is None:
        raise JobError(
            Problem(
                item="read_hour",
                found=f"none beside date_means = '{date_means}'",
                expected="the hour at which the day begins and ends",
                remedy="declare it: read_hour = '08:00'",
            )
        )
    if hour is None:
        return None
    if date_means not in {"ends", "starts"}:
        raise JobError(
            Problem(
                item="date_means",
                found=f"{'none' if date_means is None else repr(date_means)} beside read_hour",
                expected="'ends' (a date names the 24 hours that end at that hour of that date) or 'starts'",
                remedy="declare date_means, or leave out read_hour",
            )
        )
    if step is not None and not step.whole_days:
        raise JobError(
            Problem(
                item="read_hour",
                found=f"it beside the interval {step.label}",
                expected="it with daily values only",
                remedy="leave it out",
            )
        )
    return time_of_day(hour, item="read_hour")


def time_of_day(value: str | int, *, item: str) -> int:
    """Return a time of day in seconds after midnight.

    Parameters
    ----------
    value
        ``"08:00"``, or a whole hour.
    item
        The key that messages name.

    Raises
    ------
    JobError
        It is none.

    Examples
    --------
    >>> time_of_day("06:30", item="reset"), time_of_day(0, item="reset")
    (23400, 0)
    """
    match = _HOUR.fullmatch(str(value).strip())
    if not match:
        raise JobError(Problem(item=item, found=f"'{value}'", expected="a time of day, such as '08:00' or 8"))
    return int(match["hour"]) * 3600 + int(match["minute"] or 0) * 60

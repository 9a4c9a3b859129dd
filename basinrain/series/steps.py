"""The steps of a series: that they follow each other, how long they are, which year holds them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, JobError, MethodError, Problems

__all__ = [
    "DAY",
    "check_between",
    "check_month",
    "check_steps",
    "constant_step",
    "in_words",
    "middles",
    "steps_in",
    "year_starts",
    "years_of",
]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]

DAY: Final = 86_400
"""Seconds."""

_MONTHS: Final = 12
_UNITS: Final = {"d": DAY, "h": 3600, "min": 60, "s": 1}


def in_words(seconds: int) -> str:
    """Return a length of time in the largest unit of which it is a whole number.

    Examples
    --------
    >>> in_words(5400), in_words(86400), in_words(45)
    ('90min', '1d', '45s')
    """
    unit = next(unit for unit in _UNITS if seconds % _UNITS[unit] == 0)
    return f"{seconds // _UNITS[unit]}{unit}"


def check_steps(starts: Times, ends: Times, depth: Floats, *, basins: bool = True) -> tuple[Times, Times, Floats]:
    """Return times in seconds and depths as floats, once they are found to be a series.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``, and the next begins where it ends.
    depth : array of float, shape (n,) or (n, n_basins)
        mm; NaN is missing.
    basins
        Whether several basins are accepted.

    Raises
    ------
    DataError
        No steps, shapes that do not fit, steps without times, of no length, or that do not follow each other; a depth
        below 0 or infinite.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T03"], dtype="datetime64[s]")
    >>> check_steps(ends - 3600, ends, np.array([1.0, -2.0]))
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: step ending 2031-05-04T03:00:00: found a start at 2031-05-04T02:00:00; expected \
2031-05-04T01:00:00, where the step before ends; put missing steps in as NaN
    step ending 2031-05-04T03:00:00: found -2.0 mm; expected a depth of 0 or more, or NaN where it is missing
    """
    begin, end = (np.asarray(times).astype("datetime64[s]") for times in (starts, ends))
    values = np.asarray(depth, dtype=np.float64)
    problems = Problems()
    if values.ndim not in ((1, 2) if basins else (1,)):
        dimensions = "one or two dimensions" if basins else "one dimension, the series of one basin"
        problems.add(item="depth", found=f"{values.ndim} dimensions", expected=dimensions)
    elif not len(end) == len(begin) == len(values):
        problems.add(
            item="series",
            found=f"{len(begin)} starts, {len(end)} ends and {len(values)} rows of depth",
            expected="one of each a step",
        )
    elif not len(end):
        problems.add(item="series", found="no steps", expected="one step at least")
    elif np.isnat(begin).any() or np.isnat(end).any():
        problems.add(item="series", found="steps without times", expected="a start and an end for every step")
    problems.raise_as(DataError)
    for k in np.flatnonzero(end <= begin):
        problems.add(item=f"step ending {end[k]}", found=f"a start at {begin[k]}", expected="a start before its end")
    for k in np.flatnonzero(begin[1:] != end[:-1]) + 1:
        problems.add(
            item=f"step ending {end[k]}",
            found=f"a start at {begin[k]}",
            expected=f"{end[k - 1]}, where the step before ends",
            remedy="put missing steps in as NaN",
        )
    # One pass each over what may be many values; NaN is neither.
    if values.size and not (np.fmin.reduce(values, axis=None) >= 0 and np.fmax.reduce(values, axis=None) < np.inf):
        for place in np.argwhere((values < 0) | np.isinf(values)):
            problems.add(
                item=f"step ending {end[place[0]]}",
                found=f"{values[tuple(place)]} mm",
                expected="a depth of 0 or more, or NaN where it is missing",
            )
    problems.raise_as(DataError)
    return begin, end, values


def constant_step(starts: Times, ends: Times, *, wanted_for: str) -> int:
    """Return the length of a series' steps in seconds.

    Parameters
    ----------
    starts, ends : array of datetime64[s], shape (n,)
        Steps that follow each other, one at least.
    wanted_for
        What needs a constant step, for the message.

    Raises
    ------
    MethodError
        Steps differ in length.

    Examples
    --------
    >>> ends = np.array(["2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    >>> constant_step(np.array(["2031-01-01", "2031-02-01"], dtype="datetime64[s]"), ends, wanted_for="dry gap")
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: dry gap: found steps from 28d to 31d; expected steps of one length; use a series of \
one step
    """
    lengths = (ends - starts).astype(np.int64)
    shortest, longest = int(lengths.min()), int(lengths.max())
    if shortest < longest:
        problems = Problems()
        problems.add(
            item=wanted_for,
            found=f"steps from {in_words(shortest)} to {in_words(longest)}",
            expected="steps of one length",
            remedy="use a series of one step",
        )
        problems.raise_as(MethodError)
    return shortest


def steps_in(lengths: Sequence[np.timedelta64], step: int, *, item: str, problems: Problems) -> list[int]:
    """Return how many steps there are in lengths of time; a problem for each that is not a whole number of them.

    Parameters
    ----------
    lengths
        To be counted in steps.
    step
        Seconds.
    item
        What the lengths are, for the message.
    problems
        Takes the problems.

    Examples
    --------
    >>> problems = Problems()
    >>> steps_in([np.timedelta64(3, "h"), np.timedelta64(90, "m")], 3600, item="duration", problems=problems)
    [3, 1]
    >>> problems.raise_as(JobError)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: duration 90min: found steps of 1h in the series; expected a whole number of steps
    """
    counts = []
    for length in lengths:
        seconds = int(length.astype("timedelta64[s]").astype(np.int64))
        if seconds <= 0:
            problems.add(item=f"{item} {seconds}s", found="no length", expected="more than 0")
        elif seconds % step:
            problems.add(
                item=f"{item} {in_words(seconds)}",
                found=f"steps of {in_words(step)} in the series",
                expected="a whole number of steps",
            )
        counts.append(max(seconds // step, 1))
    return counts


def check_between(value: float, low: float, high: float, *, item: str, closed: bool) -> None:
    """Raise JobError unless ``low < value < high``, or ``value == high`` where that end is ``closed``.

    Examples
    --------
    >>> check_between(0.9, 0, 1, item="recession", closed=False)
    >>> check_between(1.0, 0, 1, item="recession", closed=False)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: recession: found 1.0; expected a number above 0 and below 1
    """
    if not (low < value < high or (closed and value == high)):
        limit = f"and up to {high:g}" if closed else f"and below {high:g}"
        wanted = f"a number above {low:g}" + (f" {limit}" if high < np.inf else "")
        problems = Problems()
        problems.add(item=item, found=f"{value}", expected=wanted)
        problems.raise_as(JobError)


def check_month(month: int, *, item: str) -> None:
    """Raise JobError unless a number is that of a month, 1 to 12.

    Examples
    --------
    >>> check_month(13, item="water_year")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: water_year: found 13; expected the number of a month, 1 to 12
    """
    if month not in range(1, _MONTHS + 1):
        problems = Problems()
        problems.add(item=item, found=f"{month}", expected="the number of a month, 1 to 12")
        problems.raise_as(JobError)


def middles(starts: Times, ends: Times) -> Times:
    """Return the middle of every interval, rounded down to a second; it says which period the interval belongs to.

    Examples
    --------
    >>> day = np.array(["2031-01-31T08:00"], dtype="datetime64[s]")
    >>> middles(day, day + 86400)
    array(['2031-01-31T20:00:00'], dtype='datetime64[s]')
    """
    return np.asarray(starts + (ends - starts) // 2).astype("datetime64[s]")


def years_of(times: Times, *, first_month: int) -> Ints:
    """Return the year that holds each time, for years that begin with a month and are named by the year they end in.

    Examples
    --------
    >>> times = np.array(["2030-09-30T23", "2030-10-01"], dtype="datetime64[s]")
    >>> years_of(times, first_month=10), years_of(times, first_month=1)
    (array([2030, 2031]), array([2030, 2030]))
    """
    months = times.astype("datetime64[M]").astype(np.int64)
    return np.asarray((months - (first_month - 1)) // _MONTHS + 1970 + int(first_month > 1))


def year_starts(years: Ints, *, first_month: int) -> Times:
    """Return when years begin that are named by the year they end in.

    Examples
    --------
    >>> year_starts(np.array([2031]), first_month=10), year_starts(np.array([2031]), first_month=1)
    (array(['2030-10-01T00:00:00'], dtype='datetime64[s]'), array(['2031-01-01T00:00:00'], dtype='datetime64[s]'))
    """
    months = (np.asarray(years) - 1970 - int(first_month > 1)) * _MONTHS + first_month - 1
    return np.asarray(months.astype("datetime64[M]").astype("datetime64[s]"))

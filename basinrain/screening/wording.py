"""How screening says depths and times: in the job's unit, and by the stamps that a file of readings has."""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.units import depth_factor

__all__ = ["DepthUnit", "depth_number", "depth_text", "exact_text", "stamp_text", "steps_text", "time_text"]

DepthUnit = Literal["mm", "in"]

_DAY: Final = 86400
_NAMES: Final = {_DAY: "day", 3600: "hour"}
_DECIMALS: Final = {"mm": 1, "in": 2}
_FIGURES: Final = 7


def depth_number(depth: float, unit: DepthUnit) -> str:
    """Return a depth as people write it, without its unit.

    Parameters
    ----------
    depth
        mm.
    unit
        The unit to say it in.

    Examples
    --------
    >>> depth_number(23.84, "mm"), depth_number(25.4, "in")
    ('23.8', '1.00')
    """
    return f"{depth / depth_factor(unit):.{_DECIMALS[unit]}f}"


def depth_text(depth: float, unit: DepthUnit) -> str:
    """Return a depth with its unit: to 0.1 mm or 0.01 in.

    Examples
    --------
    >>> depth_text(23.84, "mm"), depth_text(25.4, "in")
    ('23.8 mm', '1.00 in')
    """
    return f"{depth_number(depth, unit)} {unit}"


def exact_text(depth: float, unit: DepthUnit) -> str:
    """Return a depth that is told by its very digits, such as one that repeats, with its unit.

    Examples
    --------
    >>> exact_text(0.254, "mm"), exact_text(0.254, "in"), exact_text(3276.7, "mm")
    ('0.254 mm', '0.01 in', '3276.7 mm')
    """
    return f"{depth / depth_factor(unit):.{_FIGURES}g} {unit}"


def time_text(time: np.datetime64) -> str:
    """Return a time to the minute.

    Examples
    --------
    >>> time_text(np.datetime64("2013-11-05T08:00:00"))
    '2013-11-05 08:00'
    """
    return str(np.datetime_as_string(time, unit="m")).replace("T", " ")


def stamp_text(start: np.datetime64, end: np.datetime64) -> str:
    """Return what a file would call an interval: its end to the minute, of a day from midnight or a month its date.

    Examples
    --------
    >>> stamp_text(np.datetime64("2030-07-28T08:00:00"), np.datetime64("2030-07-29T08:00:00"))
    '2030-07-29 08:00'
    >>> stamp_text(np.datetime64("2030-07-28T00:00:00"), np.datetime64("2030-07-29T00:00:00"))
    '2030-07-28'
    >>> stamp_text(np.datetime64("2030-07-01T00:00:00"), np.datetime64("2030-08-01T00:00:00"))
    '2030-07'
    """
    calendar = _calendar_unit(start, end)
    return str(np.datetime_as_string(start, unit=calendar)) if calendar else time_text(end)


def _calendar_unit(start: np.datetime64, end: np.datetime64) -> Literal["D", "M", ""]:
    """Return of which unit of the calendar the interval is one; nothing where of none."""
    units: tuple[Literal["D", "M"], ...] = ("D", "M")
    for unit in units:
        first = start.astype(f"datetime64[{unit}]")
        if start == first and end == first + 1:
            return unit
    return ""


def steps_text(starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> str:
    """Return in words which intervals are meant: by their ends, days from midnight and months by their dates.

    Parameters
    ----------
    starts, ends : array of datetime64[s], shape (n,)
        Intervals on end, one or more. Without times they are only counted.

    Examples
    --------
    >>> ends = np.datetime64("2030-07-29T08:00:00") + np.arange(3) * np.timedelta64(86400, "s")
    >>> steps_text(ends[:1] - 86400, ends[:1])
    'the day that ends 2030-07-29 08:00'
    >>> steps_text(ends - 86400, ends)
    'the 3 days that end 2030-07-29 08:00 to 2030-07-31 08:00'
    >>> steps_text(ends - 8 * 3600 - 86400, ends - 8 * 3600)
    'the 3 days 2030-07-28 to 2030-07-30'
    """
    n = len(ends)
    timed = not np.isnat(ends).any()
    calendar = _calendar_unit(starts[0], ends[0]) if timed else ""
    lengths = np.unique((ends - starts).astype(np.int64))
    name = "month" if calendar == "M" else (_NAMES.get(int(lengths[0])) if len(lengths) == 1 else None) or "step"
    words = f"the {n} {name}s" if n > 1 else f"the {name}"
    if not timed:
        return words
    that = "" if calendar else " that end" if n > 1 else " that ends"
    stamps = [stamp_text(starts[k], ends[k]) for k in ((0, -1) if n > 1 else (0,))]
    return f"{words}{that} {' to '.join(stamps)}"

"""Durations and depths of design tables: what their units and words mean, and how they are said."""

from __future__ import annotations

import re
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem
from basinrain.units import DEPTH_UNITS, depth_factor

__all__ = [
    "DURATION_UNITS",
    "INTENSITY_UNITS",
    "UNITS",
    "depth_words",
    "duration_text",
    "duration_words",
    "in_mm",
    "parse_duration",
]

Floats = npt.NDArray[np.float64]

DURATION_UNITS: Final = MappingProxyType({"min": 1.0, "h": 60.0, "d": 1440.0})
"""Units of durations and how many minutes one of them is."""

_MOST_HOURS: Final = 3 * 1440
_PER_HOUR: Final = "/h"

INTENSITY_UNITS: Final = tuple(f"{unit}{_PER_HOUR}" for unit in DEPTH_UNITS if unit != "kg m-2")
"""Units of intensities."""

UNITS: Final = (*DEPTH_UNITS, *INTENSITY_UNITS)
"""Units of the values of a table of depths; per hour means intensity."""

_WORD: Final = re.compile(
    r"(?P<number>[0-9]+\.?[0-9]*|\.[0-9]+)[\s-]*"
    r"(?:(?P<min>min(?:s|utes?)?)|(?P<h>h(?:rs?|ours?)?)|(?P<d>d(?:ays?)?))?\.?"
)
"""Durations as people write them in files: 1h, 1 hr, 24 hours, 24-hour, 15 mins., 2 days."""


def duration_words(minutes: float) -> str:
    """Return a duration as files and jobs have it: whole hours up to three days, whole days beyond, else minutes.

    See Also
    --------
    duration_text : the same in a sentence or a figure.

    Examples
    --------
    >>> duration_words(90), duration_words(1440), duration_words(5760), duration_words(7.5)
    ('90min', '24h', '4d', '7.5min')
    """
    return "".join(_in_unit(minutes))


def duration_text(minutes: float) -> str:
    """Return a duration as a sentence or a figure has it, in the unit of :func:`duration_words`.

    Examples
    --------
    >>> [duration_text(minutes) for minutes in (7.5, 15, 60, 90, 1440, 4320, 5760)]
    ['7.5 min', '15 min', '1 h', '90 min', '24 h', '72 h', '4 days']
    """
    number, unit = _in_unit(minutes)
    return f"{number} {'days' if unit == 'd' else unit}"


def _in_unit(minutes: float) -> tuple[str, str]:
    if minutes == 0 or minutes % 60:
        return f"{minutes:.6g}", "min"
    if minutes <= _MOST_HOURS or minutes % 1440:
        return f"{minutes / 60:g}", "h"
    return f"{minutes / 1440:g}", "d"


def parse_duration(text: str, *, unit: str | None = None) -> float:
    """Return the minutes of a duration.

    Parameters
    ----------
    text
        A number with ``min``, ``h`` or ``d``, or with the word that it stands for, capitals or not; a number alone
        where ``unit`` is given.
    unit
        The unit of a number alone, one of :data:`DURATION_UNITS`.

    Returns
    -------
    float
        Above 0.

    Raises
    ------
    JobError
        It is no such text, or 0.

    Examples
    --------
    >>> parse_duration("24h"), parse_duration("1.5 hours"), parse_duration("2-day"), parse_duration("45", unit="min")
    (1440.0, 90.0, 2880.0, 45.0)
    >>> parse_duration("45")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: duration: found '45' without a unit; expected a number with min, h or d: 15min, 1h, 2d; \
write the unit, or declare duration_unit
    """
    match = _WORD.fullmatch(text.strip().lower())
    own = next((word for word in DURATION_UNITS if match and match[word]), None)
    if match and (own or unit) and (minutes := float(match["number"]) * DURATION_UNITS[own or str(unit)]) > 0:
        return minutes
    bare = match is not None and float(match["number"]) > 0
    raise JobError(
        Problem(
            item="duration",
            found=f"'{text}'" + (" without a unit" if bare else ""),
            expected="a number with min, h or d: 15min, 1h, 2d",
            remedy="write the unit, or declare duration_unit" if bare else "",
        )
    )


def in_mm(values: Floats, minutes: Floats, unit: str) -> Floats:
    """Return depths in mm of depths or intensities.

    Parameters
    ----------
    values : array of float
        In ``unit``; NaN stays.
    minutes : array of float
        Their durations, in a shape that goes with ``values``.
    unit : str
        One of :data:`UNITS`.

    Returns
    -------
    array of float, the broadcast shape

    Examples
    --------
    >>> in_mm(np.array([2.0, 1.0]), np.array([30.0, 120.0]), "in/h")
    array([25.4, 50.8])
    """
    depth: Floats = values * depth_factor(unit.removesuffix(_PER_HOUR))
    return depth * (minutes / DURATION_UNITS["h"]) if unit.endswith(_PER_HOUR) else depth


def depth_words(mm: float, minutes: float, unit: str = "mm") -> str:
    """Return a depth and its intensity in words, in the unit that a table is in.

    Examples
    --------
    >>> depth_words(50.8, 120.0), depth_words(50.8, 120.0, "in/h")
    ('50.8 mm (25.4 mm/h)', '2 in (1 in/h)')
    """
    depth_unit = unit.removesuffix(_PER_HOUR)
    depth = mm / depth_factor(depth_unit)
    return f"{depth:.6g} {depth_unit} ({depth / minutes * DURATION_UNITS['h']:.6g} {depth_unit}{_PER_HOUR})"

"""Steps of a record in words: ``"5min"``, ``"1h"``, ``"1d"``, ``"1mo"``."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Final

from basinrain.errors import JobError, Problem

__all__ = ["DAY", "FORMS", "Interval", "interval_of", "parse_interval"]

DAY: Final = 86_400
"""Seconds in a day of the record's fixed-offset clock."""

FORMS: Final = "a number with min, h or d, or 1mo: 1min, 5min, 15min, 1h, 6h, 12h, 1d, 1mo"
"""What is accepted, for messages."""

_UNITS: Final = {"min": 60, "h": 3600, "d": DAY}
_WORD: Final = re.compile(r"(?P<number>[1-9][0-9]{0,5})\s*(?P<unit>min|h|d|mo)")
_LONGEST: Final = 31 * DAY


@dataclass(frozen=True)
class Interval:
    """The length of a record's steps.

    Parameters
    ----------
    label
        The shortest word for it: ``"1h"``, whether ``"60min"`` or ``"1h"`` was given.
    seconds
        Its length; None for the calendar month, whose length varies.
    """

    label: str
    seconds: int | None

    @property
    def whole_days(self) -> bool:
        """Whether it is one or several days; a month is not."""
        return self.seconds is not None and self.seconds % DAY == 0


def parse_interval(text: str, *, item: str = "interval") -> Interval:
    """Return the interval that a word means, from one minute to one month.

    Parameters
    ----------
    text
        A number with ``min``, ``h`` or ``d``, or ``1mo``.
    item
        Where it was asked for, for the message.

    Raises
    ------
    JobError
        It is no such word, or longer than a month.

    Examples
    --------
    >>> parse_interval("60min"), parse_interval("1mo")
    (Interval(label='1h', seconds=3600), Interval(label='1mo', seconds=None))
    >>> parse_interval("hourly")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: interval: found 'hourly'; expected a number with min, h or d, or 1mo: 1min, 5min, \
15min, 1h, 6h, 12h, 1d, 1mo
    """
    match = _WORD.fullmatch(text.strip())
    if match:
        number, unit = int(match["number"]), match["unit"]
        if unit == "mo" and number == 1:
            return Interval("1mo", None)
        if unit != "mo" and number * _UNITS[unit] <= _LONGEST:
            return interval_of(number * _UNITS[unit])
    raise JobError(Problem(item=item, found=f"'{text}'", expected=FORMS))


def interval_of(seconds: int) -> Interval:
    """Return the interval of a number of seconds, which must be whole minutes.

    Examples
    --------
    >>> interval_of(5400).label, interval_of(86400).label
    ('90min', '1d')
    """
    unit = next(unit for unit in ("d", "h", "min") if seconds % _UNITS[unit] == 0)
    return Interval(f"{seconds // _UNITS[unit]}{unit}", seconds)

"""How far apart the rows of a file stand, beside the interval that is declared for it.

Hourly rows declared as half-hourly ones would be taken for half-hours with every other one missing: each depth would
count for half its time. So a spacing that is a rule, not a gap, is held against the declared interval.
"""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.intervals import DAY, Interval, interval_of
from basinrain.rainfall import Status
from basinrain.reading.blocks import Block

__all__ = ["check_gauge_spacing", "check_spacing"]

_SHARE: Final = 0.9
"""A spacing of so many rows is the file's rule."""

_FEWEST: Final = 2
_FEWEST_OF_GAUGE: Final = 4
"""So many spacings are needed to speak of a rule; a gauge that reports now and then may repeat one by chance."""

_MONTH_DAYS: Final = (28, 31)


def check_spacing(block: Block, interval: Interval, problems: Problems) -> bool:
    """Report rows of a file, or of a gauge in it, whose spacing shows that the declared interval is not theirs.

    Parameters
    ----------
    block
        One file. Steps over which a value accumulates are no sign of another interval.
    interval
        The declared step.
    problems
        Takes one problem for the file, or one for every gauge whose rows stand farther apart than the file's.

    Returns
    -------
    bool
        Whether the spacing fits.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T01:00:00") + np.arange(4) * np.timedelta64(3600, "s")
    >>> values = np.ones((4, 1)), np.zeros((4, 1), dtype=np.uint8)
    >>> block = Block("rain.csv", ("W01",), ends, np.arange(2, 6), *values, None, {})
    >>> check_spacing(block, Interval("1h", 3600), Problems())
    True
    >>> problems = Problems(file="rain.csv")
    >>> check_spacing(block, Interval("30min", 1800), problems)
    False
    >>> from basinrain.errors import ReadError
    >>> problems.raise_as(ReadError)
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: rain.csv: interval: found rows 1h apart; expected 30min, as declared; correct interval
    """
    kind = "datetime64[M]" if interval.seconds is None else "datetime64[s]"
    times = block.ends.astype(kind).astype(np.int64)
    accumulated = block.status == Status.ACCUMULATED
    spacings = np.diff(times)[~accumulated.any(axis=1)[1:]]
    wider = _wider(spacings, interval, fewest=_FEWEST)
    closer = "" if wider else _closer(np.diff(times), interval)
    if wider or closer:
        problems.add(
            item="interval",
            found=f"rows {wider or closer} apart",
            expected=f"{interval.label}, as declared",
            remedy="correct interval" + ("; [step] common can sum to a longer step" if closer else ""),
            file=block.file,
        )
        return False
    if block.present is None:
        return True
    fits = True
    for g, gauge in enumerate(block.gauges):
        rows = np.flatnonzero(block.present[:, g])
        spacings = np.diff(times[rows])[~accumulated[rows[1:], g]]
        fits &= check_gauge_spacing(gauge, spacings, interval, block.file, problems)
    return fits


def check_gauge_spacing(
    gauge: str, spacings: npt.NDArray[np.int64], interval: Interval, file: str, problems: Problems
) -> bool:
    """Report a gauge whose rows in a long file stand farther apart than the interval; return whether they fit."""
    wider = _wider(spacings, interval, fewest=_FEWEST_OF_GAUGE)
    if wider:
        problems.add(
            item=f"gauge {gauge}",
            found=f"rows {wider} apart",
            expected=f"{interval.label}, as declared",
            remedy="correct interval, or put the gauge into a source of its own",
            file=file,
            gauge=gauge,
        )
    return not wider


def _wider(spacings: npt.NDArray[np.int64], interval: Interval, *, fewest: int) -> str:
    """Return the longer spacing that is the rule, "" where there is none."""
    if len(spacings) < fewest:
        return ""
    unit = interval.seconds or 1
    if interval.seconds is not None and interval.seconds < _MONTH_DAYS[0] * DAY:
        # Months differ in length.
        shortest, longest = (days * DAY for days in _MONTH_DAYS)
        months = (spacings >= shortest) & (spacings <= longest) & (spacings % DAY == 0)
        if months.mean() >= _SHARE and len(np.unique(spacings[months])) > 1:
            return "1mo"
    lengths, counts = np.unique(spacings, return_counts=True)
    usual = int(lengths[counts.argmax()])
    return _words(usual, interval) if usual > unit and counts.max() >= _SHARE * len(spacings) else ""


def _closer(spacings: npt.NDArray[np.int64], interval: Interval) -> str:
    """Return the shorter spacings that are the rule, "" where there are none."""
    close = spacings[spacings < (interval.seconds or 1)]
    if len(spacings) < _FEWEST or len(close) < _SHARE * len(spacings):
        return ""
    lengths, counts = np.unique(close, return_counts=True)
    if counts.max() >= _SHARE * len(close):
        return _words(int(lengths[counts.argmax()]), interval)
    return f"{_words(int(lengths[0]), interval)} to {_words(int(lengths[-1]), interval)}"


def _words(spacing: int, interval: Interval) -> str:
    if interval.seconds is None:
        return f"{spacing}mo"
    return interval_of(spacing).label if spacing % 60 == 0 else f"{spacing} s"

"""The rainfall days of a record, and what every gauge measured on them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.infill.spans import cut_totals, month_of, own_totals, span_starts
from basinrain.rainfall import RainRecord

__all__ = ["Days", "day_totals"]

_DAY: Final = 86400


@dataclass(frozen=True, eq=False)
class Days:
    """Rainfall days, or the steps of a record whose steps are as long or longer.

    Parameters
    ----------
    starts, ends : array of datetime64[s], shape (n_days,)
        Each day is ``(start, end]``; NaT for totals without times.
    months : array of int, shape (n_days,)
        The month that holds the middle, 1 to 12; 0 without times.
    totals : array of float, shape (n_days, n_gauges)
        mm; NaN where a gauge does not know its own total of the day.

    Examples
    --------
    See :func:`day_totals`.
    """

    starts: npt.NDArray[np.datetime64]
    ends: npt.NDArray[np.datetime64]
    months: npt.NDArray[np.int64]
    totals: npt.NDArray[np.float64]


def day_totals(record: RainRecord) -> Days:
    """Return what every gauge measured on every rainfall day of a record.

    Parameters
    ----------
    record : RainRecord
        Its rainfall day begins ``record.day_phase`` seconds after midnight.

    Returns
    -------
    Days
        Days of which the record has all steps; those that it begins or ends in the middle of, or from which times are
        absent, are left out. A total is NaN unless the gauge has its own value at every step of the day, and where the
        day holds part of a depth that the gauge knows only over a longer interval. Where steps are a day or longer they
        are the days.

    Examples
    --------
    B misses the last six hours of 4 May; of 5 May the record has two steps only.

    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 7) * np.timedelta64(6, "h")
    >>> depths = [[1.0, 1.0], [2.0, 0.0], [0.0, 0.0], [3.0, np.nan], [9.0, 9.0], [9.0, 9.0]]
    >>> record = RainRecord.from_depths(("A", "B"), ends - np.timedelta64(6, "h"), ends, depths, step="6h")
    >>> days = day_totals(record)
    >>> days.ends, days.months, days.totals
    (array(['2031-05-05T00:00:00'], dtype='datetime64[s]'), array([5]), array([[ 6., nan]]))
    """
    undated = bool(np.isnat(record.ends).any())
    length = (record.ends - record.starts) / np.timedelta64(1, "s")
    by_day = len(record) > 0 and not undated and bool(np.median(length) < _DAY)
    first = span_starts(record, "day") if by_day else np.arange(len(record))
    stop = np.append(first[1:], len(record))[: len(first)]
    totals, seconds = own_totals(record, first)
    totals[cut_totals(record, np.where(record.reporting, record.depth, 0.0), first, stop)] = np.nan
    starts, ends = record.starts[first], record.ends[stop - 1]
    whole = seconds >= _DAY - 0.5 if by_day else np.ones(len(first), dtype=bool)
    return Days(starts[whole], ends[whole], month_of(starts, ends)[whole], totals[whole])

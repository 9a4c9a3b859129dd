"""The cases that infill methods are scored on: the same for all of them."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.infill.days import Days
from basinrain.infill.leave_one_out.cross_fit import parts_of
from basinrain.infill.spans import month_of
from basinrain.rainfall import MEASURED, RainRecord

__all__ = ["WET_DAY", "WET_STEP", "Cases", "cases_of", "steps_of_cases"]

WET_DAY: Final = 1.0
"""mm: from this depth on a day is wet, at a gauge and in the mean of the gauges."""
WET_STEP: Final = 0.2
"""mm: from this depth on a step under a day is wet at a gauge."""

_DAY: Final = np.timedelta64(86400, "s")
_WEEK: Final = np.timedelta64(7, "D")
_CHUNK: Final = 1 << 20

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Cases:
    """Times at which every gauge that has a value is estimated from the others.

    Parameters
    ----------
    scale : str
        ``"day"`` or ``"step"``.
    wet : float
        mm from which a depth counts as wet.
    ends : array of datetime64[s], shape (n_cases,)
    months, part : array of int, shape (n_cases,)
        Month (0 without times), and part of the record.
    week : array of int, shape (n_cases,), or None
        The week of the record that each lies in; None where steps are longer than a day, or have no times.
    depth
        Gives the depths of some cases, shape (n, n_gauges) in mm, NaN where the gauge has no value.
    n_gauges : int
    storms : tuple of str
        The storm of every case, in a record of storm totals; else empty.

    Examples
    --------
    See :func:`cases_of`.
    """

    scale: str
    wet: float
    ends: npt.NDArray[np.datetime64]
    months: Ints
    part: Ints
    week: Ints | None
    depth: Callable[[slice], Floats]
    n_gauges: int
    storms: tuple[str, ...] = ()

    @property
    def noun(self) -> str:
        """What one time is: a day, a step, or a total without times."""
        if self.scale == "day":
            return "day"
        return "storm total" if np.isnat(self.ends).any() else "step"

    def __len__(self) -> int:
        return len(self.ends)

    def chunks(self) -> Iterator[slice]:
        """Yield the cases in stretches whose depths fit in little memory."""
        size = max(_CHUNK // max(self.n_gauges, 1), 1)
        for first in range(0, len(self), size):
            yield slice(first, min(first + size, len(self)))


def cases_of(record: RainRecord, days: Days) -> tuple[Cases, bool]:
    """Return the cases of the score, and whether the record has finer steps.

    Parameters
    ----------
    record : RainRecord
    days : Days
        Its rainfall days, or its steps where these are a day or longer.

    Returns
    -------
    cases : Cases
        Rainfall days, at steps of a day or shorter, or steps. Wet ones: the mean over the gauges that have a value is
        at least 1 mm, at longer steps above 0. It does not rest on one gauge's own value, so that days on which a
        method brings rain to a dry gauge are among them.
    finer : bool

    Examples
    --------
    The first day is wet in the mean, 1.5 mm, though B is dry.

    >>> from basinrain.infill.days import day_totals
    >>> ends = np.array(["2031-05-05", "2031-05-06"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(
    ...     ("A", "B"), ends - np.timedelta64(86400, "s"), ends, [[3.0, 0.0], [0.4, 0.8]], step="1d"
    ... )
    >>> cases, finer = cases_of(record, day_totals(record))
    >>> cases.scale, cases.ends, cases.depth(slice(None)), finer
    ('day', array(['2031-05-05T00:00:00'], dtype='datetime64[s]'), array([[3., 0.]]), False)
    """
    dated = len(record) > 0 and not np.isnat(record.ends).any()
    length = np.median((record.ends - record.starts).astype(np.int64)) * np.timedelta64(1, "s") if dated else None
    finer = length is not None and bool(length < _DAY)
    by_day = length is not None and bool(length <= _DAY)
    totals = days.totals
    if not finer:
        # At its own step a record's donors are values measured at that step.
        totals = np.where(np.isin(record.status, [int(s) for s in MEASURED]), totals, np.nan)
    here = ~np.isnan(totals)
    mean = np.where(here, totals, 0.0).sum(axis=1) / np.maximum(here.sum(axis=1), 1)
    wet = np.flatnonzero(mean >= WET_DAY * (1 - 1e-9) if by_day else mean > 0)
    cases = Cases(
        scale="day" if by_day else "step",
        wet=WET_DAY,
        ends=days.ends[wet],
        months=days.months[wet],
        part=parts_of(len(totals))[wet],
        week=_weeks(days.ends[wet], record.ends[0]) if by_day else None,
        depth=lambda chunk: totals[wet[chunk]],
        n_gauges=totals.shape[1],
        storms=tuple(record.labels[row] for row in wet) if record.labels else (),
    )
    return cases, finer


def steps_of_cases(record: RainRecord, days: Days, cases: Cases) -> Cases:
    """Return the steps of the days that are cases, dry ones too: what is measured at the step counts.

    Parameters
    ----------
    record, days
        As for :func:`cases_of`, with steps under a day.
    cases
        Those days.

    Examples
    --------
    >>> from basinrain.infill.days import day_totals
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 5) * np.timedelta64(12, "h")
    >>> depths = [[3.0, 0.0], [0.0, 0.0], [0.1, 0.0], [0.0, 0.0]]
    >>> record = RainRecord.from_depths(("A", "B"), ends - np.timedelta64(12, "h"), ends, depths, step="12h")
    >>> days = day_totals(record)
    >>> steps_of_cases(record, days, cases_of(record, days)[0]).depth(slice(None))
    array([[3., 0.],
           [0., 0.]])
    """
    day = np.searchsorted(days.ends, record.ends)
    inside = day < len(days.ends)
    inside[inside] = record.starts[inside] >= days.starts[day[inside]]
    rows = np.flatnonzero(inside & np.isin(days.ends[np.minimum(day, len(days.ends) - 1)], cases.ends))
    measured = [int(s) for s in MEASURED]

    def depth(chunk: slice) -> Floats:
        mine = rows[chunk]
        return np.where(np.isin(record.status[mine], measured), record.depth[mine], np.nan)

    return Cases(
        scale="step",
        wet=WET_STEP,
        ends=record.ends[rows],
        months=month_of(record.starts[rows], record.ends[rows]),
        part=parts_of(len(days.ends))[day[rows]],
        week=_weeks(record.ends[rows], record.ends[0]),
        depth=depth,
        n_gauges=record.depth.shape[1],
    )


def _weeks(ends: npt.NDArray[np.datetime64], origin: np.datetime64) -> Ints:
    return np.asarray((ends - origin) // _WEEK, dtype=np.int64)

"""What fell before a storm: depth in the days before, and an index that forgets."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, MethodError, Problem, Problems
from basinrain.series.steps import DAY, check_between, check_steps, constant_step, in_words

__all__ = [
    "DAYS",
    "FORGOTTEN",
    "RECESSION",
    "AntecedentDepths",
    "AntecedentIndex",
    "antecedent_depths",
    "antecedent_index",
]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]

DAYS: Final = (5, 10, 30)
"""Days before a storm over which depths are summed, unless others are asked for."""

RECESSION: Final = 0.90
"""Part of the index that is left after a day without rain, unless another is asked for."""

FORGOTTEN: Final = 0.01
"""What is left of a day's weight once the state of the index before it no longer matters."""

_NEGLIGIBLE: Final = 1e-17


@dataclass(frozen=True, eq=False, kw_only=True)
class AntecedentDepths:
    """Depths in the days before storms.

    Arrays have a last axis of basins, or none where the series was of one basin without a column.

    Parameters
    ----------
    days : tuple of int
        Lengths of 24 h, the last of which ends with the start of the storm.
    depth : array of float, shape (n_storms, n_days) or (n_storms, n_days, n_basins)
        mm; NaN where a step in these days has no number or lies before the series.
    present : array of float, as ``depth``
        mm, of the steps that have a number; NaN where none has.
    share : array of float, as ``depth``
        Share of the days' time that has a number, 0 to 1.
    """

    days: tuple[int, ...]
    depth: Floats
    present: Floats
    share: Floats


@dataclass(frozen=True, eq=False, kw_only=True)
class AntecedentIndex:
    """Antecedent precipitation index at the starts of storms.

    Arrays have a last axis of basins, or none where the series was of one basin without a column.

    Parameters
    ----------
    recession : float
        Part of the index that is left after a day.
    index : array of float, shape (n_storms,) or (n_storms, n_basins)
        mm; NaN until so many days have a number that what came before them counts less than :data:`FORGOTTEN`.
    from_zero : array of float, as ``index``
        mm, the index of the ``days`` that have a number, as if none had rained before them; the index is no less.
    days : array of int, as ``index``
        Days without a break that have a number, up to the start of the storm; counted as far as they matter.
    unknown : array of float, as ``index``
        Weight that is left of what the index was before these days, ``recession ** days``.
    days_needed : int
        Days from which ``index`` is given: ``recession ** days_needed`` is below :data:`FORGOTTEN`.
    """

    recession: float
    index: Floats
    from_zero: Floats
    days: Ints
    unknown: Floats
    days_needed: int


def antecedent_depths(
    starts: Times, ends: Times, depth: Floats, *, at: Times, days: Sequence[int] = DAYS
) -> AntecedentDepths:
    """Return the depth in the days before each storm.

    A day is the 24 h that end with the start of the storm, or with the same hour of a day before.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``, and the next begins where it ends; all of one length that divides a day.
    depth : array of float, shape (n,) or (n, n_basins)
        mm; NaN where it is missing.
    at : array of datetime64, shape (n_storms,)
        Starts of storms, each the start of a step, or the end of the series.
    days
        Numbers of days, each 1 or more.

    Returns
    -------
    AntecedentDepths

    Raises
    ------
    DataError
        The series is none.
    JobError
        Days below 1; starts that are not between two steps, all of them together.
    MethodError
        Steps differ in length, or do not divide a day.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-01", "s") + np.arange(1, 13) * np.timedelta64(86400, "s")
    >>> depth = np.array([9.0, 0, 0, np.nan, 0, 2, 0, 3, 0, 1, 0, 40])
    >>> found = antecedent_depths(ends - 86400, ends, depth, at=ends[10:11], days=(5, 10, 30))
    >>> found.depth, found.present, found.share.round(2)
    (array([[ 4., nan, nan]]), array([[ 4.,  6., 15.]]), array([[1.  , 0.9 , 0.33]]))
    """
    begin, end, values = check_steps(starts, ends, depth)
    problems = Problems()
    for number in days:
        if number < 1:
            problems.add(item="days before a storm", found=f"{number}", expected="1 or more")
    problems.raise_as(JobError)
    per_day = _steps_a_day(begin, end)
    places = _places(begin, end, at)
    shape = (len(places), len(days), *values.shape[1:])
    present, share = np.full(shape, np.nan), np.zeros(shape)
    for s, place in enumerate(places):
        for d, number in enumerate(days):
            window = values[max(place - number * per_day, 0) : place]
            known = ~np.isnan(window)
            counted = known.sum(axis=0)
            present[s, d] = np.where(counted > 0, window.sum(axis=0, where=known), np.nan)
            share[s, d] = counted / (number * per_day)
    return AntecedentDepths(
        days=tuple(int(number) for number in days),
        depth=np.where(share == 1, present, np.nan),
        present=present,
        share=share,
    )


def antecedent_index(
    starts: Times, ends: Times, depth: Floats, *, at: Times, recession: float = RECESSION
) -> AntecedentIndex:
    """Return the antecedent precipitation index at the start of each storm.

    Day by day the index is what is left of it and what fell, ``A(t) = k A(t - 1) + P(t)`` (Kohler and Linsley 1951;
    from memory). The days end with the start of the storm, whatever its hour: what fell in the last 24 h counts whole,
    nothing of the storm counts. The index is 0 before the first day with a number and again after a day without one,
    and is given once that no longer matters.

    Parameters
    ----------
    starts, ends, depth, at
        As for :func:`antecedent_depths`.
    recession
        ``k``, above 0 and below 1, for one day.

    Returns
    -------
    AntecedentIndex

    Raises
    ------
    DataError
        The series is none.
    JobError
        ``recession`` is not between 0 and 1; starts that are not between two steps, all of them together.
    MethodError
        Steps differ in length, or do not divide a day.

    Examples
    --------
    Twenty mm three days before the last, and ten: 20 x 0.9³ + 10. Five days are too few to know what came before.

    >>> ends = np.datetime64("2031-05-01", "s") + np.arange(1, 6) * np.timedelta64(86400, "s")
    >>> found = antecedent_index(ends - 86400, ends, np.array([0.0, 20, 0, 0, 10]), at=ends[-1:])
    >>> found.from_zero.round(2), found.index, found.days, found.unknown.round(2), found.days_needed
    (array([24.58]), array([nan]), array([5]), array([0.59]), 44)
    """
    begin, end, values = check_steps(starts, ends, depth)
    check_between(recession, 0, 1, item="recession", closed=False)
    per_day = _steps_a_day(begin, end)
    places = _places(begin, end, at)
    needed = math.floor(math.log(FORGOTTEN) / math.log(recession)) + 1
    horizon = max(needed, math.ceil(math.log(_NEGLIGIBLE) / math.log(recession)))
    weights = recession ** np.arange(horizon)
    shape = (len(places), *values.shape[1:])
    from_zero, days = np.zeros(shape), np.zeros(shape, dtype=np.int64)
    for s, place in enumerate(places):
        number = min(place // per_day, horizon)
        back = values[place - number * per_day : place].reshape(number, per_day, *values.shape[1:]).sum(axis=1)[::-1]
        # Days before the last one without a number are as unknown as those before the series.
        unbroken = np.logical_and.accumulate(~np.isnan(back), axis=0)
        days[s] = unbroken.sum(axis=0)
        from_zero[s] = weights[:number] @ np.where(unbroken, back, 0.0)
    unknown = recession ** days.astype(np.float64)
    return AntecedentIndex(
        recession=recession,
        index=np.where(days >= needed, from_zero, np.nan),
        from_zero=from_zero,
        days=days,
        unknown=unknown,
        days_needed=needed,
    )


def _steps_a_day(begin: Times, end: Times) -> int:
    step = constant_step(begin, end, wanted_for="days before a storm")
    if DAY % step:
        raise MethodError(
            Problem(
                item="days before a storm",
                found=f"steps of {in_words(step)}",
                expected="steps that divide a day",
                remedy="use a series of such a step",
            )
        )
    return DAY // step


def _places(begin: Times, end: Times, at: Times) -> Ints:
    times = np.asarray(at).astype("datetime64[s]")
    borders = np.append(begin, end[-1])
    places = np.searchsorted(borders, times)
    problems = Problems()
    for time, place in zip(times, places, strict=True):
        if place == len(borders) or borders[place] != time:
            problems.add(
                item="start of a storm",
                found=str(time),
                expected=f"the start of a step of the series, {borders[0]} to {borders[-1]}",
                time=str(time),
            )
    problems.raise_as(JobError)
    return places

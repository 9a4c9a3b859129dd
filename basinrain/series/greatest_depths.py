"""Greatest depths of a series by duration, in windows that slide and in windows tied to the clock."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problems
from basinrain.series.period_totals import COMPLETE, WATER_YEAR
from basinrain.series.steps import (
    DAY,
    check_between,
    check_month,
    check_steps,
    constant_step,
    in_words,
    steps_in,
    year_starts,
    years_of,
)
from basinrain.series.windows import Windows, greatest_sums

__all__ = ["AnnualGreatest", "AnnualMaxima", "Greatest", "GreatestDepths", "annual_maxima", "greatest_depths"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True, eq=False, kw_only=True)
class Greatest:
    """Greatest depths in one kind of windows, one row a duration.

    Arrays have one column a basin, or none where the series was of one basin without a column.

    Parameters
    ----------
    depth : array of float, shape (n_durations,) or (n_durations, n_basins)
        mm, among windows all of whose steps have a number; NaN where there is none.
    ends : array of datetime64[s], as ``depth``
        The end of that window, the earliest where several are equal; NaT where there is none.
    windows : array of int, shape (n_durations,)
        Windows of the series.
    left_out : array of int, as ``depth``
        Of these, how many do not count since a step in them has no number.
    """

    depth: Floats
    ends: Times
    windows: Ints
    left_out: Ints


@dataclass(frozen=True, eq=False, kw_only=True)
class GreatestDepths:
    """Greatest depths of a series, by duration.

    Parameters
    ----------
    durations : array of timedelta64[s], shape (n_durations,)
        As asked for.
    sliding : Greatest
        Windows that begin at any step.
    aligned : Greatest
        Windows that begin at whole multiples of the duration from the start of the day in which the series begins.
        Never above ``sliding``; nothing is multiplied to make up for that.
    """

    durations: npt.NDArray[np.timedelta64]
    sliding: Greatest
    aligned: Greatest


@dataclass(frozen=True, eq=False, kw_only=True)
class AnnualGreatest:
    """Greatest depths of every year in one kind of windows.

    Arrays have a last axis of basins, or none where the series was of one basin without a column.

    Parameters
    ----------
    depth : array of float, shape (n_durations, n_years) or (n_durations, n_years, n_basins)
        mm; NaN where ``share`` is below the completeness asked for.
    present : array of float, as ``depth``
        mm, among the windows that count whatever their share; the year's maximum is no less. NaN where there is none.
    ends : array of datetime64[s], as ``depth``
        The end of that window, the earliest where several are equal; NaT where there is none.
    share : array of float, as ``depth``
        Windows that count, over those that the whole year would have.
    """

    depth: Floats
    present: Floats
    ends: Times
    share: Floats


@dataclass(frozen=True, eq=False, kw_only=True)
class AnnualMaxima:
    """Annual maximum series, by duration.

    Parameters
    ----------
    durations : array of timedelta64[s], shape (n_durations,)
        As asked for.
    years : array of int, shape (n_years,)
        Every year that the series touches, by the year in which it ends.
    sliding, aligned : AnnualGreatest
        As in :class:`GreatestDepths`. A window belongs to the year that holds its middle.
    """

    durations: npt.NDArray[np.timedelta64]
    years: Ints
    sliding: AnnualGreatest
    aligned: AnnualGreatest


def greatest_depths(
    starts: Times, ends: Times, depth: Floats, *, durations: Sequence[np.timedelta64], day_phase: int = 0
) -> GreatestDepths:
    """Return the greatest depth of a series in every duration, and when it fell.

    Windows are runs of whole steps. A window in which a step has no number does not count, and how many these are is
    told. Windows tied to the clock begin at whole multiples of the duration from the start of the day in which the
    series begins; for durations that divide the day that is at the same times of every day.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``, and the next begins where it ends; all of one length.
    depth : array of float, shape (n,) or (n, n_basins)
        mm; NaN where it is missing.
    durations
        Each a whole number of steps. One that is longer than the series has no windows, and NaN for its depth.
    day_phase
        Seconds after midnight at which the day begins, as in :class:`~basinrain.rainfall.RainRecord`.

    Returns
    -------
    GreatestDepths

    Raises
    ------
    DataError
        The series is none.
    JobError
        No durations, or ones that are no whole number of steps, all of them together; steps that do not begin with the
        day.
    MethodError
        Steps differ in length.

    Notes
    -----
    Sums are built up from sums of shorter windows by doubling, never as differences of running totals, so that a small
    depth after a long record is as exact as at its start, and what is missing leaves no trace beyond its windows.

    Examples
    --------
    Four mm fall astride the even hours: 8 mm in two hours that slide, 5 mm in two hours of the clock.

    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 7) * np.timedelta64(3600, "s")
    >>> depth = np.array([1.0, 4.0, 4.0, 0.0, np.nan, 2.0])
    >>> found = greatest_depths(ends - 3600, ends, depth, durations=[np.timedelta64(2, "h")])
    >>> found.sliding.depth, found.sliding.ends.astype("datetime64[h]"), found.sliding.windows, found.sliding.left_out
    (array([8.]), array(['2031-05-04T03'], dtype='datetime64[h]'), array([5]), array([2]))
    >>> found.aligned.depth, found.aligned.windows, found.aligned.left_out
    (array([5.]), array([3]), array([1]))
    """
    frame = _Frame.of(starts, ends, depth, durations, day_phase)
    total = [windows.count(frame.n_steps) for windows in frame.windows]
    sums, when, counted = frame.greatest([np.array([0, number]) for number in total])
    sliding, aligned = (
        Greatest(
            depth=frame.shaped(sums[kind, :, 0]),
            ends=frame.shaped(when[kind, :, 0]),
            windows=np.array(total).reshape(2, -1)[kind],
            left_out=frame.shaped(np.array(total).reshape(2, -1, 1)[kind] - counted[kind, :, 0]),
        )
        for kind in (0, 1)
    )
    return GreatestDepths(durations=frame.durations, sliding=sliding, aligned=aligned)


def annual_maxima(
    starts: Times,
    ends: Times,
    depth: Floats,
    *,
    durations: Sequence[np.timedelta64],
    day_phase: int = 0,
    water_year: int = WATER_YEAR,
    complete: float = COMPLETE,
) -> AnnualMaxima:
    """Return the greatest depth of every water year in every duration, and when it fell.

    Windows are those of :func:`greatest_depths`; one belongs to the year that holds its middle, so none counts in two
    years and none that crosses from one into the next is lost.

    Parameters
    ----------
    starts, ends, depth, durations, day_phase
        As for :func:`greatest_depths`.
    water_year
        The month with which the year begins, 1 to 12; with 1 it is the calendar year.
    complete
        Share of the year's windows that must have a number for its maximum to count, above 0 and up to 1.

    Returns
    -------
    AnnualMaxima

    Raises
    ------
    DataError, JobError, MethodError
        As :func:`greatest_depths`; JobError also for ``water_year`` and ``complete``.

    Examples
    --------
    A daily series of calendar years, 2031 whole and one month of 2032. Two days that end on the first of January 2031
    would belong to 2031, but the series does not have the first of them.

    >>> ends = np.datetime64("2031-01-01", "s") + np.arange(1, 397) * np.timedelta64(86400, "s")
    >>> depth = np.where(np.arange(396) % 40 == 0, 30.0, 1.0)
    >>> day = np.timedelta64(1, "D")
    >>> found = annual_maxima(ends - day, ends, depth, durations=[day, 2 * day], water_year=1)
    >>> found.years, found.sliding.depth
    (array([2031, 2032]), array([[30., nan],
           [31., nan]]))
    >>> found.sliding.present[:, 1], found.sliding.share.round(3)
    (array([1., 2.]), array([[1.   , 0.085],
           [0.997, 0.085]]))
    """
    check_month(water_year, item="water_year")
    check_between(complete, 0, 1, item="complete", closed=True)
    frame = _Frame.of(starts, ends, depth, durations, day_phase)
    first, last = years_of(frame.middles_of_ends, first_month=water_year)
    years = np.arange(first, last + 1)
    bounds = year_starts(np.arange(first, last + 2), first_month=water_year).astype(np.int64)
    # A window's middle is never before that of the first step, nor after that of the last.
    edges = [np.searchsorted(frame.middles(windows), bounds) for windows in frame.windows]
    sums, when, counted = frame.greatest(edges)
    whole = np.array([frame.windows_between(bounds, windows) for windows in frame.windows])
    whole = whole.reshape(2, len(frame.durations), len(years), 1)
    share = np.divide(counted, whole, out=np.zeros(counted.shape), where=whole > 0)
    sliding, aligned = (
        AnnualGreatest(
            depth=frame.shaped(np.where(share >= complete, sums, np.nan)[kind]),
            present=frame.shaped(sums[kind]),
            ends=frame.shaped(when[kind]),
            share=frame.shaped(share[kind]),
        )
        for kind in (0, 1)
    )
    return AnnualMaxima(durations=frame.durations, years=years, sliding=sliding, aligned=aligned)


@dataclass(frozen=True, eq=False)
class _Frame:
    """A series with the windows asked of it; times in seconds since 1970."""

    values: Floats
    origin: int
    step: int
    windows: tuple[Windows, ...]
    """Those that slide, by duration, and then those tied to the clock."""
    flat: bool

    @classmethod
    def of(
        cls, starts: Times, ends: Times, depth: Floats, durations: Sequence[np.timedelta64], day_phase: int
    ) -> _Frame:
        begin, end, values = check_steps(starts, ends, depth)
        step = constant_step(begin, end, wanted_for="greatest depths")
        problems = Problems()
        counts = steps_in(durations, step, item="duration", problems=problems)
        if not counts:
            problems.add(item="durations", found="none", expected="one at least")
        origin = int(begin[0].astype(np.int64))
        into_day = (origin - day_phase) % DAY
        if into_day % step:
            problems.add(
                item="day_phase",
                found=f"steps of {in_words(step)}, of which the first begins {in_words(into_day)} after the day does",
                expected="a day that begins with a step",
                remedy="give the hour at which the series' days begin",
            )
        problems.raise_as(JobError)
        windows = [Windows(m) for m in counts] + [Windows(m, -(into_day // step) % m, m) for m in counts]
        flat = values.ndim == 1
        return cls(values[:, None] if flat else values, origin, step, tuple(windows), flat)

    @property
    def n_steps(self) -> int:
        return len(self.values)

    @property
    def durations(self) -> npt.NDArray[np.timedelta64]:
        lengths = [windows.length * self.step for windows in self.windows[: len(self.windows) // 2]]
        return np.array(lengths, dtype="timedelta64[s]")

    @property
    def middles_of_ends(self) -> Times:
        """The middles of the first and the last step."""
        return (self.origin + np.array([0, self.n_steps - 1]) * self.step + self.step // 2).astype("datetime64[s]")

    def middles(self, windows: Windows) -> Ints:
        return self.origin + windows.beginnings(self.n_steps) * self.step + windows.length * self.step // 2

    def windows_between(self, bounds: Ints, windows: Windows) -> Ints:
        """Return how many windows have their middle between bounds, if the series went on for ever."""
        middle = self.origin + windows.first * self.step + windows.length * self.step // 2
        return np.diff(-((middle - bounds) // (windows.every * self.step)))

    def greatest(self, edges: list[Ints]) -> tuple[Floats, Times, Ints]:
        """Return greatest sum, its window's end, and windows that count: by kind, duration, stretch and basin."""
        parts = greatest_sums(self.values, self.windows, edges)
        shape = (2, len(self.durations), len(edges[0]) - 1, self.values.shape[1])
        sums = np.array(parts[0], dtype=np.float64).reshape(shape)
        places, counted = (np.array(part, dtype=np.int64).reshape(shape) for part in parts[1:])
        first, every, length = (
            np.array([getattr(windows, name) for windows in self.windows], dtype=np.int64).reshape(2, -1, 1, 1)
            for name in ("first", "every", "length")
        )
        end = (self.origin + (first + places * every + length) * self.step).astype("datetime64[s]")
        return sums, np.where(places < 0, np.datetime64("NaT", "s"), end), counted

    def shaped(self, array: npt.NDArray[Any]) -> npt.NDArray[Any]:
        """Drop the axis of basins where the series came without one."""
        return array[..., 0] if self.flat else array

"""Totals of a series by month, calendar year and water year, with a rule for when a total counts."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal, get_args

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, MethodError, Problem, unknown
from basinrain.series.steps import (
    DAY,
    check_between,
    check_month,
    check_steps,
    in_words,
    middles,
    year_starts,
    years_of,
)

__all__ = ["COMPLETE", "WATER_YEAR", "MeanAnnual", "Period", "PeriodTotals", "mean_annual", "period_totals"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]
Period = Literal["month", "year", "water-year"]

COMPLETE: Final = 0.95
"""Share of its time that must have a number for a total to count, unless another is asked for."""

WATER_YEAR: Final = 10
"""First month of the water year, unless another is asked for."""

_YEAR_SECONDS: Final = 365.2425 * DAY
_LEAST_SECONDS: Final = 365 * DAY
_BLOCK: Final = 8192


@dataclass(frozen=True, eq=False, kw_only=True)
class PeriodTotals:
    """Totals by calendar period; every period that the series touches, in order.

    Arrays of depths have one column a basin, or none where the series was of one basin without a column.

    Parameters
    ----------
    names : tuple of str, length n_periods
        ``"2031-05"`` for a month, ``"2031"`` for a year; a water year has the name of the year in which it ends.
    starts, ends : array of datetime64[s], shape (n_periods,)
        The calendar period.
    total : array of float, shape (n_periods,) or (n_periods, n_basins)
        mm; NaN where ``share`` is below the completeness asked for. It is the sum of the steps that have a number, not
        scaled up for the rest.
    present : array of float, as ``total``
        mm, the sum of the steps that have a number whatever their share; NaN where none has.
    share : array of float, as ``total``
        Share of the period's time with a number, 0 to 1.
    straddling : int
        Steps that lie in two periods and were counted whole in the one that holds their middle.
    """

    names: tuple[str, ...]
    starts: Times
    ends: Times
    total: Floats
    present: Floats
    share: Floats
    straddling: int


def period_totals(
    starts: Times,
    ends: Times,
    depth: Floats,
    *,
    by: Period,
    water_year: int = WATER_YEAR,
    complete: float = COMPLETE,
) -> PeriodTotals:
    """Return the totals of a series by month, calendar year or water year.

    A step belongs to the period that holds its middle, as everywhere in the package: the day that ends at 8:00 of the
    first of May is of April. The time of a month of such days is that of its whole days, 30 of 24 hours for April.
    Steps longer than a day that lie in two periods are refused.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``, and the next begins where it ends. Steps may differ in length.
    depth : array of float, shape (n,) or (n, n_basins)
        mm; NaN where it is missing.
    by
        ``"month"``, ``"year"`` (from January) or ``"water-year"``.
    water_year
        The month with which the water year begins, 1 to 12. With 1 it is the calendar year.
    complete
        Share of its time with a number from which a total counts, above 0 and up to 1.

    Returns
    -------
    PeriodTotals
        A period that the series has only in part is there with its share.

    Raises
    ------
    DataError
        The series is none.
    JobError
        ``by``, ``water_year`` or ``complete`` is not one of those.
    MethodError
        A step of more than a day lies in two periods.

    Examples
    --------
    >>> ends = np.array(["2031-02-01", "2031-03-01", "2031-04-01"], dtype="datetime64[s]")
    >>> starts = np.array(["2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    >>> quarter = period_totals(starts, ends, np.array([80.0, np.nan, 60.0]), by="month")
    >>> quarter.names, quarter.total, quarter.share
    (('2031-01', '2031-02', '2031-03'), array([80., nan, 60.]), array([1., 0., 1.]))
    >>> year = period_totals(starts, ends, np.array([80.0, np.nan, 60.0]), by="water-year")
    >>> year.names, year.starts[0], year.total, year.present, year.share.round(3)
    (('2031',), np.datetime64('2030-10-01T00:00:00'), array([nan]), array([140.]), array([0.17]))
    """
    begin, end, values = check_steps(starts, ends, depth)
    if by not in get_args(Period):
        raise JobError(unknown("period of totals", by, get_args(Period)))
    check_month(water_year, item="water_year")
    check_between(complete, 0, 1, item="complete", closed=True)
    middle = middles(begin, end)
    if by == "month":
        held = middle.astype("datetime64[M]").astype(np.int64)
        numbers = np.arange(held[0], held[-1] + 2)
        bounds = numbers.astype("datetime64[M]").astype("datetime64[s]")
        names = tuple(str(month) for month in numbers[:-1].astype("datetime64[M]"))
    else:
        first_month = water_year if by == "water-year" else 1
        held = years_of(middle, first_month=first_month)
        numbers = np.arange(held[0], held[-1] + 2)
        bounds = year_starts(numbers, first_month=first_month)
        names = tuple(str(year) for year in numbers[:-1])
    at = held - held[0]
    straddling = _straddling(begin, end, bounds[at], bounds[at + 1], by=by)
    lengths = (end - begin).astype(np.int64)
    present, time = _sums(values, lengths, np.searchsorted(held, numbers))
    whole = _whole_time(begin, lengths, bounds)
    # Steps of uneven lengths up to a day may reach a little beyond their period.
    share = np.minimum(time / whole.reshape((-1,) + (1,) * (values.ndim - 1)), 1.0)
    return PeriodTotals(
        names=names,
        starts=bounds[:-1],
        ends=bounds[1:],
        total=np.where(share >= complete, present, np.nan),
        present=np.where(time > 0, present, np.nan),
        share=share,
        straddling=straddling,
    )


def _sums(values: Floats, lengths: Ints, edges: Ints) -> tuple[Floats, Floats]:
    """Return depth and seconds of the steps that have a number, in the stretches between edges."""
    # Stretch by stretch: the series may be larger than memory holds twice.
    present = np.zeros((len(edges) - 1, *values.shape[1:]))
    time = np.zeros_like(present)
    for k in range(len(edges) - 1):
        steps = slice(edges[k], edges[k + 1])
        known = ~np.isnan(values[steps])
        present[k] = np.sum(values[steps], axis=0, where=known)
        time[k] = lengths[steps].astype(np.float64) @ known
    return present, time


def _straddling(begin: Times, end: Times, low: Times, high: Times, *, by: str) -> int:
    across = np.flatnonzero((begin < low) | (end > high))
    lengths = (end - begin).astype(np.int64)
    long = across[lengths[across] > DAY]
    if len(long):
        k = long[0]
        raise MethodError(
            Problem(
                item=f"totals by {by}",
                found=f"{len(long)} steps of more than a day that lie in two of them, the first from {begin[k]} to "
                f"{end[k]} ({in_words(int(lengths[k]))})",
                expected="steps that end with the period, or of a day at most",
                remedy="use a series of a finer step, or leave these totals out",
            )
        )
    return len(across)


def _whole_time(begin: Times, lengths: Ints, bounds: Times) -> Ints:
    """Return the seconds of each period: those of the steps whose middles it would hold if the series went on."""
    if lengths.min() < lengths.max() or lengths[0] > DAY:
        return np.diff(bounds).astype(np.int64)
    step = int(lengths[0])
    middle = int(begin[0].astype(np.int64)) + step // 2
    before = -((middle - bounds.astype(np.int64)) // step)
    return np.diff(before) * step


@dataclass(frozen=True, eq=False, kw_only=True)
class MeanAnnual:
    """Long-term mean annual depth, reckoned in two ways that are told apart.

    Parameters
    ----------
    of_years : array of float, shape () or (n_basins,)
        mm a year: the mean of the totals of the complete years. NaN where no year is complete.
    years : array of int, as ``of_years``
        How many years these are.
    of_steps : array of float, as ``of_years``
        mm a year: the mean depth of all steps that have a number, by their time, scaled to a year of 365.2425 days. Its
        seasons count by what there is of them, so it is no mean annual depth where gaps favour a season. NaN where
        they last less than 365 days.
    share : array of float, as ``of_years``
        Share of the series' time that has a number, on which ``of_steps`` rests.
    """

    of_years: Floats
    years: Ints
    of_steps: Floats
    share: Floats


def mean_annual(
    starts: Times, ends: Times, depth: Floats, *, water_year: int = WATER_YEAR, complete: float = COMPLETE
) -> MeanAnnual:
    """Return the long-term mean annual depth of a series: from its complete water years, and from all its steps.

    Parameters
    ----------
    starts, ends, depth, water_year, complete
        As for :func:`period_totals`; ``water_year=1`` takes calendar years. Where steps of more than a day lie in two
        years, no year is complete.

    Returns
    -------
    MeanAnnual

    Raises
    ------
    DataError, JobError
        As :func:`period_totals`.

    Examples
    --------
    Two calendar years of 600 and 660 mm, and two months of a third with 100 mm each.

    >>> months = np.arange("2031-01", "2033-04", dtype="datetime64[M]").astype("datetime64[s]")
    >>> depth = np.array([50.0] * 12 + [55.0] * 12 + [100.0] * 2)
    >>> mean = mean_annual(months[:-1], months[1:], depth, water_year=1)
    >>> float(mean.of_years), int(mean.years), round(float(mean.of_steps), 3), float(mean.share)
    (630.0, 2, 675.005, 1.0)
    """
    begin, end, values = check_steps(starts, ends, depth)
    try:
        totals = period_totals(starts, ends, depth, by="water-year", water_year=water_year, complete=complete).total
    except MethodError:
        totals = np.empty((0, *values.shape[1:]))
    lengths = (end - begin).astype(np.int64)
    edges = np.append(np.arange(0, len(values), _BLOCK), len(values))
    present, time = (parts.sum(axis=0) for parts in _sums(values, lengths, edges))
    counts = ~np.isnan(totals)
    years = counts.sum(axis=0)
    with np.errstate(invalid="ignore"):
        of_years = np.sum(totals, axis=0, where=counts) / years
        # A few wet days are no year.
        of_steps = np.where(time >= _LEAST_SECONDS, present / time * _YEAR_SECONDS, np.nan)
    return MeanAnnual(
        of_years=np.asarray(of_years),
        years=np.asarray(years),
        of_steps=np.asarray(of_steps),
        share=np.asarray(time / lengths.sum()),
    )

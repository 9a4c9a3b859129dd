"""What is read off one series of all basins: its mean, its totals by month and year, its greatest depths."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any, Final, TypeVar, cast

import numpy as np
import numpy.typing as npt

from basinrain.errors import MethodError
from basinrain.series.greatest_depths import Greatest, GreatestDepths, greatest_depths
from basinrain.series.long_term import LongTerm, long_term
from basinrain.series.period_totals import MeanAnnual, PeriodTotals, mean_annual, period_totals
from basinrain.series.series_source import SeriesSource, copied

__all__ = ["LARGEST", "SeriesSummary", "summarise"]

Times = npt.NDArray[np.datetime64]

LARGEST: Final = 5
"""Largest depths of a basin whose weights are looked at."""

_HELD: Final = 32 << 20
"""Values of a series that are looked at together: whole columns, at least one."""

_BY_BASIN: Final[dict[type, tuple[str, ...]]] = {
    PeriodTotals: ("total", "present", "share"),
    MeanAnnual: ("of_years", "years", "of_steps", "share"),
    GreatestDepths: ("sliding", "aligned"),
    Greatest: ("depth", "ends", "left_out"),
}
"""What has a last axis of basins in each kind of result."""

_T = TypeVar("_T")


@dataclass(frozen=True, eq=False, kw_only=True)
class SeriesSummary:
    """What one series comes to in every basin.

    Parameters
    ----------
    terms
        Its mean, and what that rests on.
    annual
        Its mean annual depth.
    months, years, water_years
        Its totals; without periods where steps of more than a day lie in two of them.
    greatest
        Its greatest depths by duration; None where no duration was asked for.
    largest, largest_depth : array of int and of float, shape (n, n_basins)
        The steps with its largest depths, and these in mm, the largest first, :data:`LARGEST` of them or all there
        are; -1 and 0 where no further depth is above 0.
    """

    terms: LongTerm
    annual: MeanAnnual
    months: PeriodTotals
    years: PeriodTotals
    water_years: PeriodTotals
    greatest: GreatestDepths | None
    largest: npt.NDArray[np.int64]
    largest_depth: npt.NDArray[np.float64]


def summarise(
    stored: SeriesSource,
    gaps: str,
    method: str,
    starts: Times,
    ends: Times,
    *,
    durations: Sequence[np.timedelta64],
    water_year: int,
    complete: float,
    day_phase: int = 0,
) -> SeriesSummary:
    """Read a series off its store, some basins at a time.

    Parameters
    ----------
    stored
        The series.
    gaps, method
        Which of them.
    starts, ends : array of datetime64, shape (n_steps,)
        Its steps.
    durations
        Of the greatest depths; whole numbers of steps.
    water_year, complete
        As for :func:`~basinrain.series.period_totals.period_totals`.
    day_phase
        Seconds after midnight at which the record's days begin.

    Raises
    ------
    BasinRainError
        As the functions of :mod:`basinrain.series` that it calls.
    """
    depth = stored.depth(gaps, method)
    found: list[dict[str, Any]] = []
    for basins in _columns(*depth.shape):
        part = copied(depth, slice(0, stored.n_steps), basins)
        largest, largest_depth = _largest(part)
        found.append(
            {
                "largest": largest,
                "largest_depth": largest_depth,
                "annual": mean_annual(starts, ends, part, water_year=water_year, complete=complete),
                "months": _totals(starts, ends, part, by="month", complete=complete),
                "years": _totals(starts, ends, part, by="year", complete=complete),
                "water_years": _totals(starts, ends, part, by="water-year", water_year=water_year, complete=complete),
                "greatest": greatest_depths(starts, ends, part, durations=durations, day_phase=day_phase)
                if len(durations)
                else None,
            }
        )
    lengths = (ends - starts) / np.timedelta64(1, "s")
    together = {name: _side_by_side([part[name] for part in found]) for name in found[0]}
    for name in ("largest", "largest_depth"):
        together[name] = np.concatenate([part[name] for part in found], axis=1)
    return SeriesSummary(terms=long_term(stored, gaps, method, lengths), **together)


def _totals(starts: Times, ends: Times, depth: npt.NDArray[np.float64], **how: Any) -> PeriodTotals:  # noqa: ANN401
    """Return totals by period; of no period where steps of more than a day lie in two."""
    try:
        return period_totals(starts, ends, depth, **how)
    except MethodError:
        times, depths = starts[:0], depth[:0]
        return PeriodTotals(
            names=(), starts=times, ends=times, total=depths, present=depths, share=depths, straddling=0
        )


def _largest(depth: npt.NDArray[np.float64]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]:
    number = min(LARGEST, len(depth))
    known = np.where(depth > 0, depth, 0.0)
    # Basin by basin, each in one stretch of memory.
    some = np.argpartition(np.ascontiguousarray(known.T), -number, axis=1)[:, len(known) - number :].T
    order = np.argsort(-np.take_along_axis(known, some, axis=0), axis=0, kind="stable")
    steps = np.take_along_axis(some, order, axis=0)
    depths = np.take_along_axis(known, steps, axis=0)
    return np.where(depths > 0, steps, -1), depths


def _columns(n_steps: int, n_basins: int) -> Iterator[slice]:
    size = max(_HELD // max(n_steps, 1), 1)
    return (slice(first, min(first + size, n_basins)) for first in range(0, n_basins, size))


def _side_by_side(parts: list[_T]) -> _T:
    """Return results of some basins as one of all."""
    first: Any = parts[0]
    if type(first) not in _BY_BASIN:
        return parts[0]
    joined: dict[str, Any] = {}
    for name in _BY_BASIN[type(first)]:
        values = [getattr(part, name) for part in parts]
        joined[name] = np.concatenate(values, axis=-1) if isinstance(values[0], np.ndarray) else _side_by_side(values)
    return cast("_T", replace(first, **joined))

"""Calendar years of a record: which are complete, and a gauge's years beside those of its neighbours."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.spans import span_starts
from basinrain.rainfall import RainRecord

__all__ = [
    "COMPARED",
    "COMPLETE",
    "FEWEST_NEIGHBOURS",
    "Beside",
    "CalendarYears",
    "beside_neighbours",
    "calendar_days",
    "calendar_years",
]

COMPLETE: Final = 0.95
"""Share of a year's days with which it counts for a normal: there the rain of the days that are missing is lost, so
that more of them than eighteen in 365 would make the year too dry (common practice)."""

COMPARED: Final = 0.90
"""Share of a year's days with which it counts beside the neighbours: both sums are over the same days, so that nothing
is lost with the others, and years of breaks are left in records with gaps (measured: docs/verification.md)."""

FEWEST_NEIGHBOURS: Final = 3
"""A mean of fewer gauges is no pattern: the fault of one of them would count for half of it."""

_MOST_NEIGHBOURS: Final = 5
_PRESENT: Final = 0.8
"""Share of a year's days on which a neighbour must report: less than of the gauge itself, since of five three will
do."""
_SHARES: Final = (0.8, 0.5, 0.0)
"""In how many of the gauge's own years each neighbour should be present, and how many should count; tried in turn."""
_LEVEL_YEARS: Final = 10
"""Years in which all neighbours should be present, so that their proportions to each other are known."""
_DAY: Final = np.timedelta64(86400, "s")


@dataclass(frozen=True, eq=False)
class CalendarYears:
    """The days of a record, or its steps where they are longer, by calendar years.

    Parameters
    ----------
    gauges : tuple of str
        Gauge ids, the columns.
    years : array of int, shape (n_years,)
        Calendar years, increasing; a year in which the record has no step is not there.
    ends : array of datetime64[s], shape (n_years,)
        When the last step of every year ends.
    first : array of int, shape (n_years,)
        The first day of every year.
    days : array of float, shape (n_days,)
        How long every day or step is, in days.
    depths : array of float, shape (n_days, n_gauges)
        mm; NaN unless the gauge has its own value at every step of the day.
    """

    gauges: tuple[str, ...]
    years: npt.NDArray[np.int64]
    ends: npt.NDArray[np.datetime64]
    first: npt.NDArray[np.int64]
    days: npt.NDArray[np.float64]
    depths: npt.NDArray[np.float64]

    def __len__(self) -> int:
        return len(self.years)

    @cached_property
    def known(self) -> npt.NDArray[np.bool_]:
        """Where a gauge has the day's depth, shape (n_days, n_gauges)."""
        return np.isfinite(self.depths)

    @property
    def length(self) -> npt.NDArray[np.int64]:
        """Days of the calendar year, shape (n_years,)."""
        return calendar_days(self.years)

    def by_year(self, values: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        """Return the sums of daily values by year; their first axis is the days."""
        if not len(self):
            return np.zeros((0, *values.shape[1:]))
        return np.add.reduceat(values, self.first, axis=0)

    @cached_property
    def covered(self) -> npt.NDArray[np.float64]:
        """Days of the year on which the gauge has its depth, shape (n_years, n_gauges)."""
        return self.by_year(self.known * self.days[:, None])

    @cached_property
    def complete(self) -> npt.NDArray[np.bool_]:
        """Whether the gauge has 95 % of the year's days, as for a normal, shape (n_years, n_gauges)."""
        return self.covered >= COMPLETE * self.length[:, None]

    @cached_property
    def compared(self) -> npt.NDArray[np.bool_]:
        """Whether the gauge has 90 % of the year's days, as beside its neighbours, shape (n_years, n_gauges)."""
        return self.covered >= COMPARED * self.length[:, None]

    @cached_property
    def present(self) -> npt.NDArray[np.bool_]:
        """Whether the gauge has 80 % of the year's days, as a neighbour must, shape (n_years, n_gauges)."""
        return self.covered >= _PRESENT * self.length[:, None]

    @cached_property
    def totals(self) -> npt.NDArray[np.float64]:
        """Depth in mm on the days that the gauge has; NaN where the year is not complete; (n_years, n_gauges)."""
        return np.where(self.complete, self.by_year(np.where(self.known, self.depths, 0.0)), np.nan)


@dataclass(frozen=True, eq=False)
class Beside:
    """A gauge's years beside those of its neighbours, both over the days that they share.

    Parameters
    ----------
    group : array of int
        Places of the neighbours in the network, the nearest first.
    totals, reference : array of float, shape (n_years,)
        mm, sums of the gauge and of its neighbours' mean over the shared days; NaN where these are less than 90 % of
        the year.
    days : array of int, shape (n_years,)
        Days that they share.
    """

    group: npt.NDArray[np.int64]
    totals: npt.NDArray[np.float64]
    reference: npt.NDArray[np.float64]
    days: npt.NDArray[np.int64]


def calendar_days(years: npt.NDArray[np.int64]) -> npt.NDArray[np.int64]:
    """Return the days of calendar years.

    Examples
    --------
    >>> calendar_days(np.array([2031, 2032, 2100]))
    array([365, 366, 365])
    """
    leap = (years % 4 == 0) & ((years % 100 != 0) | (years % 400 == 0))
    return np.where(leap, 366, 365)


def calendar_years(record: RainRecord) -> CalendarYears:
    """Return a record's days by calendar years.

    Parameters
    ----------
    record
        At any step; a day, or a longer step, belongs to the calendar year in which its middle lies, so that a day read
        at 08:00 on the first of January counts for the year before.

    Returns
    -------
    CalendarYears
        A year is complete at a gauge that has its own value on 95 % of the year's days: 347 of 365. Of a record by
        months that is all twelve, since the shortest is 7.7 % of a year; of one by weeks two may be missing. Beside
        neighbours 90 % will do: 329 days, eleven months, all but four or five weeks. Storm totals without times have no
        years.

    Examples
    --------
    >>> ends = np.arange("2031-02", "2033-02", dtype="datetime64[M]").astype("datetime64[s]")
    >>> starts = np.arange("2031-01", "2033-01", dtype="datetime64[M]").astype("datetime64[s]")
    >>> depths = np.full((24, 2), 50.0)
    >>> depths[20, 1] = np.nan
    >>> years = calendar_years(RainRecord.from_depths(("A", "B"), starts, ends, depths, step="1mo"))
    >>> years.years, years.totals
    (array([2031, 2032]), array([[600., 600.],
           [600.,  nan]]))
    >>> years.covered
    array([[365., 365.],
           [366., 336.]])
    """
    none = np.empty(0, dtype=np.int64)
    if not len(record) or np.isnat(record.ends).any():
        depths = np.empty((0, len(record.gauges)))
        return CalendarYears(record.gauges, none, none.astype("datetime64[s]"), none, none.astype(float), depths)
    seconds = record.ends - record.starts
    starts = span_starts(record, "day") if np.median(seconds / _DAY) < 1 else np.arange(len(record))
    own = record.reporting
    known = np.logical_and.reduceat(own, starts, axis=0)
    depths = np.where(known, np.add.reduceat(np.where(own, record.depth, 0.0), starts, axis=0), np.nan)
    begins, ends = record.starts[starts], record.ends[np.r_[starts[1:], len(record)] - 1]
    year_of = (begins + (ends - begins) // 2).astype("datetime64[Y]")
    first = np.flatnonzero(np.r_[True, year_of[1:] != year_of[:-1]])
    last = np.r_[first[1:], len(starts)] - 1
    # Of a day from which steps are absent only those that are there count.
    days = np.add.reduceat(seconds, starts) / _DAY
    return CalendarYears(record.gauges, year_of[first].astype(np.int64) + 1970, ends[last], first, days, depths)


def beside_neighbours(
    years: CalendarYears,
    network: GaugeNetwork,
    target: int,
    *,
    at_least: int,
    distances: npt.NDArray[np.float64],
    trusted: npt.NDArray[np.bool_] | None = None,
) -> Beside | None:
    """Return a gauge's years beside the mean of its nearest neighbours that have years enough in common.

    Parameters
    ----------
    years
        Columns in the network's order.
    network
        The gauges; equal distances go by id.
    target
        The gauge's place in the network.
    at_least
        Years that must count.
    distances : array of float, shape (n_gauges, n_gauges)
        m, as ``network.distances()`` gives them.
    trusted : array of bool, shape (n_gauges,), optional
        Which gauges may be neighbours; all where not given.

    Returns
    -------
    Beside or None
        Against three to five gauges; None where there are none such. They are taken nearest first. One is passed over
        that never had rain, that has 80 % of the days in less than 80 % of the years of which the gauge has 90 %, or
        that would leave fewer than ten years in which all that are taken have as much. Where three are not found so, or
        less than 80 % of the gauge's years would count, 50 % will do, and then as few as ``at_least``. How days are
        shared: :func:`_beside`.

    Examples
    --------
    >>> network = GaugeNetwork(ids=tuple("ABCD"), x=[0.0, 1.0, 2.0, 3.0], y=np.zeros(4), crs="local")
    >>> bounds = np.arange("2001", "2012", dtype="datetime64[Y]").astype("datetime64[s]")
    >>> depths = np.tile([700.0, 600.0, 800.0, 850.0], (10, 1))
    >>> years = calendar_years(RainRecord.from_depths(network.ids, bounds[:-1], bounds[1:], depths, step="1y"))
    >>> beside = beside_neighbours(years, network, 0, at_least=10, distances=network.distances())
    >>> beside.group, beside.totals[0], beside.reference[0], beside.days[0]
    (array([1, 2, 3]), np.float64(700.0), np.float64(750.0), np.int64(365))
    >>> beside_neighbours(years, network, 0, at_least=11, distances=network.distances()) is None
    True
    """
    own = np.count_nonzero(years.compared[:, target])
    order = network.nearest_first(distances[target])
    fit = np.nansum(years.depths, axis=0) > 0
    if trusted is not None:
        fit &= trusted
    order = order[(order != target) & fit[order]]
    tried: dict[tuple[int, ...], Beside] = {}
    for share in _SHARES:
        group = tuple(_group(years, target, order, share * own, min(at_least, _LEVEL_YEARS)))
        if len(group) < FEWEST_NEIGHBOURS:
            continue
        if group not in tried:
            tried[group] = _beside(years, target, np.array(group, dtype=np.int64))
        if np.count_nonzero(np.isfinite(tried[group].totals)) >= max(at_least, share * own):
            return tried[group]
    return None


def _group(years: CalendarYears, target: int, order: npt.NDArray[np.int64], each: float, together: int) -> list[int]:
    """Return the first gauges of the order, at most five, that are present in so many of the gauge's own years."""
    common = own = years.compared[:, target]
    group: list[int] = []
    for gauge in order.tolist():
        there = years.present[:, gauge]
        if np.count_nonzero(own & there) >= each and np.count_nonzero(common & there) >= together:
            common = common & there
            group.append(gauge)
            if len(group) == _MOST_NEIGHBOURS:
                break
    return group


def _beside(years: CalendarYears, target: int, group: npt.NDArray[np.int64]) -> Beside:
    """Return the gauge's years beside the group's, over the days on which it and three of the group report.

    The reference of a day is Σ p / Σ m over the gauges that report, times the mean of m over the whole group, with p
    their depths and m their sums over the days on which all of the group report. Where all report it is their mean; and
    it does not move with a wet or a dry gauge that is silent.
    """
    known = years.known[:, group]
    depths = np.where(known, years.depths[:, group], 0.0)
    levels = depths[known.all(axis=1)].sum(axis=0)
    there = known @ levels
    shared = years.known[:, target] & (known.sum(axis=1) >= FEWEST_NEIGHBOURS) & (there > 0)
    reference = np.divide(depths.sum(axis=1) * levels.mean(), there, out=np.zeros(len(there)), where=shared)
    days = years.by_year(shared * years.days)
    counts = days >= COMPARED * years.length
    totals, beside = (
        np.where(counts, years.by_year(np.where(shared, daily, 0.0)), np.nan)
        for daily in (years.depths[:, target], reference)
    )
    return Beside(group, totals, beside, np.rint(days).astype(np.int64))

"""The view of a record that all checks share: depths, days, neighbours, each computed once."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.days import day_totals
from basinrain.infill.spans import month_of
from basinrain.rainfall import RainRecord
from basinrain.screening.findings import ScreeningOptions
from basinrain.screening.wording import DepthUnit, depth_number, depth_text, steps_text

__all__ = [
    "DAY",
    "DRY",
    "NORMAL",
    "WET_DAY",
    "Bools",
    "Floats",
    "Ints",
    "Screened",
    "Sheet",
    "Times",
    "ranked_median",
    "runs_of",
]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]
Times = npt.NDArray[np.datetime64]

DAY: Final = 86400
"""Seconds."""

MOST_NEIGHBOURS: Final = 8
"""Enough for a median that two bad gauges cannot move, few enough to stay near (common practice: 5 to 10)."""

REACH: Final = 100_000.0
"""m: farther gauges say little of a day's rain; daily correlations are mostly gone by then (common practice)."""

MONTHLY_REACH: Final = 300_000.0
"""m: the same for steps of ten days and more, whose rain is alike over longer distances (common practice)."""

DRY: Final = 0.05
"""mm: depths up to here are none; below the resolution of every gauge in use."""

WET_DAY: Final = 1.0
"""mm: a wet day (common practice)."""

NORMAL: Final = 1.4826
"""Median absolute deviation to standard deviation, for the normal law."""

LEAST_SCATTER: Final = 0.6
"""mm^½: two gauges side by side differ by as much, 5 to 8 mm of a day with 30 (common practice)."""

UNTOLD_SCATTER: Final = 1.2
"""mm^½: about the scatter of summer showers among gauges some 10 km apart; for records too short to tell their own."""

_DEPTH_CLASSES: Final = (0.5, 1.0, 2.0, 4.0, 8.0, 16.0)
_LONG_STEP: Final = 10 * DAY
_CAP: Final = (0.9, 3.0)
"""Depths above three times a gauge's 90 % quantile of wet cases count as that in its climate, so that no fault makes
it; of rain one day in some hundreds is above."""

_LEAST_COMMON: Final = 30
"""Common wet cases below which two gauges' climates are not compared and count as the same."""


@dataclass(frozen=True, eq=False)
class Sheet:
    """Depths of some gauges at one scale.

    Parameters
    ----------
    scale
        ``"step"`` or ``"day"``.
    starts, ends : array of datetime64[s], shape (n,)
        The intervals ``(start, end]``; NaT without times.
    depths : array of float, shape (n, n_columns)
        mm; NaN where the gauge has no value of its own.
    gauges : array of int, shape (n_columns,)
        The columns' places in the network.
    """

    scale: str
    starts: Times
    ends: Times
    depths: Floats
    gauges: Ints

    @property
    def seconds(self) -> int:
        """Length of an interval, the median one; 0 without times."""
        if not len(self.ends) or np.isnat(self.ends).any():
            return 0
        return int(np.median((self.ends - self.starts).astype(np.int64)))

    @property
    def unit(self) -> str:
        """What people call an interval: ``"day"`` or ``"step"``."""
        return "day" if self.seconds == DAY else "step"

    def words(self, first: int, stop: int) -> str:
        """Return in words the intervals ``first`` to ``stop`` (not included): ``"the 3 days that end ..."``."""
        return steps_text(self.starts[first:stop], self.ends[first:stop])


@dataclass(frozen=True, eq=False)
class _Around:
    """What the neighbours of every gauge had, by case and gauge."""

    middle: Floats
    least_measured: Floats
    greatest: Floats
    greatest_measured: Floats
    spread: Floats
    count: Ints


@dataclass(frozen=True, eq=False)
class Screened:
    """A record with what the checks ask of it.

    Parameters
    ----------
    record, network, options
        As for :func:`basinrain.screening.screen`.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 9e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> ends = np.datetime64("2031-05-04", "s") + np.arange(1, 49) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(network.ids, ends - 3600, ends, np.tile([0.5, 1.0, 2.0], (48, 1)), step="1h")
    >>> view = Screened(record, network, ScreeningOptions())
    >>> view.cases.depths
    array([[12., 24., 48.],
           [12., 24., 48.]])
    >>> view.neighbours[0], view.middle[0]
    ([1, 2], array([36., 30., 18.]))
    """

    record: RainRecord
    network: GaugeNetwork
    options: ScreeningOptions

    @cached_property
    def timed(self) -> bool:
        """Whether the record's intervals have times."""
        return len(self.record) > 0 and not bool(np.isnat(self.record.ends).any())

    @cached_property
    def seconds(self) -> int:
        """Length of a step, the median one; 0 without times."""
        return self.steps.seconds

    @cached_property
    def steps(self) -> Sheet:
        """All gauges at the record's step, as measured: what was spread or infilled is not there."""
        record = self.record
        # By columns, since most checks go gauge by gauge.
        depths = np.asfortranarray(np.where(record.measured, record.depth, np.nan))
        return Sheet("step", record.starts, record.ends, depths, np.arange(len(self.network)))

    @cached_property
    def cases(self) -> Sheet:
        """All gauges by rainfall days where the step is shorter than a day, else by steps: the scale of comparison."""
        days = day_totals(self.record)
        scale = "day" if self.timed and self.seconds < DAY else "step"
        return Sheet(scale, days.starts, days.ends, np.asfortranarray(days.totals), np.arange(len(self.network)))

    @cached_property
    def sheets(self) -> tuple[Sheet, ...]:
        """Every gauge once, at the scale at which it measures: recorders by steps, daily gauges by days."""
        recording = np.array([gauge in self.record.recorders for gauge in self.record.gauges], dtype=bool)
        if self.cases.scale == "step" or recording.all():
            return (self.steps,)
        kinds = ((self.steps, np.flatnonzero(recording)), (self.cases, np.flatnonzero(~recording)))
        return tuple(
            Sheet(sheet.scale, sheet.starts, sheet.ends, sheet.depths[:, columns], columns)
            for sheet, columns in kinds
            if len(columns)
        )

    @cached_property
    def months(self) -> Ints:
        """The month of every case, 1 to 12; 0 without times."""
        return month_of(self.cases.starts, self.cases.ends)

    @cached_property
    def distances(self) -> Floats:
        """Distances between the gauges in m, infinite to itself, shape (n_gauges, n_gauges)."""
        distances = self.network.distances()
        np.fill_diagonal(distances, np.inf)
        return distances

    @cached_property
    def neighbours(self) -> list[list[int]]:
        """Every gauge's nearest gauges within reach, at most 8, the nearest first."""
        reach = MONTHLY_REACH if self.seconds >= _LONG_STEP else REACH
        order = self.network.nearest_first(self.distances)[:, :MOST_NEIGHBOURS]
        return [[int(j) for j in row if self.distances[g, j] <= reach] for g, row in enumerate(order)]

    @cached_property
    def climate(self) -> Floats:
        """How much more rain the row's gauge gets than the column's: ratio over common cases, (n_gauges, n_gauges).

        Of root depths, capped, so that a few wrong values do not make it; 1 where too little is common.
        """
        depths = self.cases.depths
        known = np.isfinite(depths)
        roots = np.sqrt(np.where(known, np.minimum(depths, self.caps), 0.0))
        mine = roots.T @ known
        common = (roots > 0).astype(float).T @ (roots > 0)
        enough = (common >= _LEAST_COMMON) & (mine > 0) & (mine.T > 0)
        ratio = np.ones_like(mine)
        np.divide(mine, mine.T, out=ratio, where=enough)
        squared: Floats = ratio**2
        return squared

    @cached_property
    def caps(self) -> Floats:
        """The depth in mm above which a gauge's cases count as it in its climate; 0 without rain; (n_gauges,)."""
        wet = np.sort(np.where(self.cases.depths > 0, self.cases.depths, np.nan), axis=0)
        count = np.isfinite(wet).sum(axis=0)
        at = np.maximum(np.ceil(_CAP[0] * count).astype(np.int64) - 1, 0)
        caps = wet[at, np.arange(wet.shape[1])] if len(wet) else np.zeros(wet.shape[1])
        return np.where(np.isfinite(caps), _CAP[1] * caps, 0.0)

    @cached_property
    def _around(self) -> _Around:
        shape = self.cases.depths.shape
        middle, least, greatest, measured, spread = (np.full(shape, np.nan) for _ in range(5))
        around = _Around(middle, least, greatest, measured, spread, np.zeros(shape, dtype=np.int64))
        for g, near in enumerate(self.neighbours):
            if not near:
                continue
            depths = self.cases.depths[:, near]
            ranked = np.sort(depths * self.climate[g, near], axis=1)
            count = np.isfinite(ranked).sum(axis=1)
            around.count[:, g] = count
            around.middle[:, g] = ranked_median(ranked, count)
            around.least_measured[:, g] = np.fmin.reduce(depths, axis=1)
            around.greatest[:, g] = np.fmax.reduce(ranked, axis=1)
            around.greatest_measured[:, g] = np.fmax.reduce(depths, axis=1)
            apart = np.sort(np.abs(np.sqrt(ranked) - np.sqrt(around.middle[:, [g]])), axis=1)
            around.spread[:, g] = ranked_median(apart, count)
        return around

    @property
    def middle(self) -> Floats:
        """Median of the neighbours in mm, in the gauge's climate; NaN where none reports; (n_cases, n_gauges)."""
        return self._around.middle

    @property
    def least_measured(self) -> Floats:
        """The least neighbour in mm, as measured; NaN where none reports; (n_cases, n_gauges)."""
        return self._around.least_measured

    @property
    def greatest(self) -> Floats:
        """The greatest neighbour in mm, in the gauge's climate; NaN where none reports; (n_cases, n_gauges)."""
        return self._around.greatest

    @property
    def greatest_measured(self) -> Floats:
        """The greatest neighbour in mm, as measured; NaN where none reports; (n_cases, n_gauges)."""
        return self._around.greatest_measured

    @property
    def spread(self) -> Floats:
        """Median absolute deviation of the neighbours' root depths from the root of their median, mm^½."""
        return self._around.spread

    @property
    def reporting(self) -> Ints:
        """How many neighbours report, shape (n_cases, n_gauges)."""
        return self._around.count

    @cached_property
    def scatter(self) -> Floats:
        """How far the gauge's root depth is from its neighbours' in that season, as a rule; mm^½, (n_cases, n_gauges).

        A robust standard deviation over the wet cases of the month and the two beside it, of all months where those are
        few; no less than 0.6, and 1.2 where the record is too short to tell.
        """
        depths, middle = self.cases.depths, self.middle
        with np.errstate(invalid="ignore"):
            wet = np.maximum(depths, middle) >= WET_DAY
        away = np.where(wet, np.abs(np.sqrt(depths) - np.sqrt(middle)), np.nan)
        every = _scatter(away, np.full(away.shape[1], UNTOLD_SCATTER))
        by_month = np.tile(every, (13, 1))
        for month in range(1, 13):
            season = np.isin(self.months, [(month + k - 1) % 12 + 1 for k in (-1, 0, 1)])
            by_month[month] = _scatter(away[season], every)
        scatter: Floats = by_month[self.months]
        return scatter

    @cached_property
    def dry_surprise(self) -> Floats:
        """How odd it would be for the gauge to be dry in that case, (n_cases, n_gauges).

        Less the logarithm of how often it is dry when its neighbours' median is like that; 0 where fewer than two
        report.
        """
        depths, middle = self.cases.depths, np.nan_to_num(self.middle)
        kind = np.searchsorted(_DEPTH_CLASSES, middle)
        surprise = np.zeros(depths.shape)
        known = np.isfinite(depths)
        for k in range(len(_DEPTH_CLASSES) + 1):
            there = kind == k
            dry = (there & (depths <= DRY)).sum(axis=0)
            odd = -np.log((dry + 1) / ((there & known).sum(axis=0) + 2))
            surprise[there] = np.broadcast_to(odd, there.shape)[there]
        return np.where(self.reporting >= 2, surprise, 0.0)

    @property
    def depth_unit(self) -> DepthUnit:
        """The unit in which depths are said."""
        return self.options.depth_unit

    def depth(self, depth: float) -> str:
        """Return a depth in mm as evidence says it: ``"23.8 mm"``, ``"0.94 in"``."""
        return depth_text(depth, self.depth_unit)

    def ids(self, gauges: list[int]) -> tuple[str, ...]:
        """Return the ids of gauges, sorted."""
        return tuple(sorted(self.network.ids[g] for g in gauges))

    def beside(self, g: int, first: int, stop: int) -> str:
        """Return in words what the nearest neighbours had over the cases ``first`` to ``stop`` (not included)."""
        parts = []
        for j in self.neighbours[g]:
            depths = self.cases.depths[first:stop, j]
            known = np.isfinite(depths)
            if known.any():
                depth = depth_number(float(depths[known].sum()), self.depth_unit)
                parts.append(f"{self.network.ids[j]} {depth}{'' if known.all() else ' (in part)'}")
        return ", ".join(parts[:4])

    def cases_of(self, start: np.datetime64, end: np.datetime64) -> tuple[int, int]:
        """Return the cases, first and stop, that hold any of ``(start, end]``."""
        first = int(np.searchsorted(self.cases.ends, start, "right"))
        return first, max(first + 1, int(np.searchsorted(self.cases.starts, end, "left")))


def _scatter(away: Floats, otherwise: Floats) -> Floats:
    """Return the robust standard deviation of each column, ``otherwise`` where too little is known."""
    ranked = np.sort(away, axis=0)
    count = np.isfinite(ranked).sum(axis=0)
    enough = count >= _LEAST_COMMON
    if not enough.any():
        return otherwise
    at = np.maximum(count - 1, 0) // 2
    middle = ranked[at, np.arange(ranked.shape[1])]
    return np.where(enough, np.maximum(NORMAL * middle, LEAST_SCATTER), otherwise)


def ranked_median(ranked: Floats, count: Ints) -> Floats:
    """Return the median of each row's first ``count`` values, which rise; NaN where there are none.

    Examples
    --------
    >>> ranked_median(np.array([[1.0, 2.0, np.nan], [np.nan, np.nan, np.nan]]), np.array([2, 0]))
    array([1.5, nan])
    """
    rows = np.arange(len(ranked))
    low, high = np.maximum(count - 1, 0) // 2, count // 2
    return np.where(count > 0, (ranked[rows, low] + ranked[rows, np.minimum(high, ranked.shape[1] - 1)]) / 2, np.nan)


def runs_of(mask: Bools) -> Iterator[tuple[int, int]]:
    """Yield first and stop (not included) of every run of true values.

    Examples
    --------
    >>> list(runs_of(np.array([True, True, False, True])))
    [(0, 2), (3, 4)]
    """
    edges = np.flatnonzero(np.diff(np.concatenate([[False], mask, [False]]).astype(np.int8)))
    yield from zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True)

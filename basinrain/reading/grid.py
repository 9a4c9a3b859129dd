"""The common time grid of a job, and how the values of one source come onto it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.intervals import DAY, Interval
from basinrain.notes import Note
from basinrain.rainfall import WITHOUT_DEPTH, KnownTotal, Status

__all__ = ["ABSENT", "Grid", "OnGrid", "Source", "off_bounds", "place", "relation"]

ABSENT: Final = 255
"""Stands in a status array where a source does not reach."""

# What a sum of values is called: the last of these that is among them, ZERO first.
_RANK: Final = (
    Status.ZERO,
    Status.TRACE,
    Status.PRESUMED_ZERO,
    Status.OBSERVED,
    Status.ADJUSTED,
    Status.ESTIMATED,
    Status.SPREAD,
    Status.INFILLED,
)
_MANY: Final = 3
"""So many accumulations in one total are told: their own times are lost."""

_EMPTY: Final = np.array([int(status) for status in WITHOUT_DEPTH], dtype=np.uint8)


@dataclass(frozen=True, eq=False)
class Source:
    """The intervals of one source in the job's clock.

    Parameters
    ----------
    name
        What messages call it: ``"source 2 (1d)"``.
    interval
        Its step; None for storm totals with given times.
    gauges, starts, ends, depth, status, totals
        As in a record; the intervals do not overlap.
    """

    name: str
    interval: Interval | None
    gauges: tuple[str, ...]
    starts: npt.NDArray[np.datetime64]
    ends: npt.NDArray[np.datetime64]
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    totals: tuple[KnownTotal, ...]


@dataclass(frozen=True, eq=False)
class OnGrid:
    """A source on the grid, from step ``first`` of it.

    Parameters
    ----------
    first
        The grid number of the first row.
    depth, status : arrays, shape (n_rows, n_gauges)
        Status ACCUMULATED without depth in the steps of ``totals``, ABSENT where the source does not reach.
    totals
        Depths known over several steps of the grid.
    notes
        ``total-not-used`` and ``totals-joined``, where accumulations do not fit the grid.
    """

    first: int
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    totals: tuple[KnownTotal, ...]
    notes: tuple[Note, ...] = ()


@dataclass(frozen=True)
class Grid:
    """Consecutive steps, numbered from 1970.

    Parameters
    ----------
    interval
        The step.
    phase
        Seconds by which its bounds stand after those of 1970-01-01 (of the first of the month, for months).

    Examples
    --------
    >>> hours = Grid(Interval("1h", 3600), 1800)
    >>> number, exact = hours.numbers(np.array(["1970-01-01T01:30", "1970-01-01T02:00"], dtype="datetime64[s]"))
    >>> number, exact, str(hours.bounds(np.array(1)))
    (array([1, 1]), array([ True, False]), '1970-01-01T01:30:00')
    """

    interval: Interval
    phase: int

    def numbers(self, times: npt.NDArray[np.datetime64]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.bool_]]:
        """Return the last bound at or before every time, and whether it is at it."""
        shifted = times.astype("datetime64[s]") - np.timedelta64(self.phase, "s")
        if self.interval.seconds is None:
            months = shifted.astype("datetime64[M]")
            return months.astype(np.int64), np.asarray(months == shifted)
        seconds = shifted.astype(np.int64)
        return seconds // self.interval.seconds, seconds % self.interval.seconds == 0

    def bounds(self, numbers: npt.NDArray[np.int64]) -> npt.NDArray[np.datetime64]:
        """Return the time of every bound."""
        if self.interval.seconds is None:
            times = numbers.astype("datetime64[M]").astype("datetime64[s]")
        else:
            times = (numbers * self.interval.seconds).astype("datetime64[s]")
        return np.asarray(times + np.timedelta64(self.phase, "s"))


def relation(source: Interval | None, common: Interval) -> str:
    """Return whether a step is ``"finer"`` than the common one (or the same), ``"coarser"``, or neither: ``""``.

    Months cover whole days, so that a step fits into them when it divides a day.

    Examples
    --------
    >>> hour, day, month = Interval("1h", 3600), Interval("1d", DAY), Interval("1mo", None)
    >>> relation(hour, day), relation(day, hour), relation(month, hour), relation(Interval("7h", 25200), hour)
    ('finer', 'coarser', 'coarser', 'coarser')
    >>> relation(Interval("7h", 25200), day)
    ''
    """
    if source is None:
        return "coarser"
    if source == common:
        return "finer"
    if source.seconds is None or common.seconds is None:
        other = common.seconds or source.seconds or DAY
        fits = "finer" if common.seconds is None else "coarser"
        return fits if DAY % other == 0 else ""
    if common.seconds % source.seconds == 0:
        return "finer"
    return "coarser" if source.seconds % common.seconds == 0 else ""


def off_bounds(source: Source, grid: Grid) -> npt.NDArray[np.int64]:
    """Return the rows whose interval does not fit: a finer one that crosses a bound, a coarser one off the bounds."""
    first, first_exact = grid.numbers(source.starts)
    last, last_exact = grid.numbers(source.ends)
    if relation(source.interval, grid.interval) == "finer":
        within = last - last_exact == first
        # A step as long as the grid's fits only bound on bound.
        fits = within & first_exact & last_exact if source.interval == grid.interval else within
    else:
        fits = first_exact & last_exact
    return np.flatnonzero(~fits)


def place(source: Source, grid: Grid) -> OnGrid:
    """Return a source on the grid; its rows must fit (:func:`off_bounds`).

    A finer one is summed: a step of the grid needs all its parts, else it is missing. An interval of a coarser one
    becomes a known total over the steps that it covers, or zeros.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T00:00:00") + np.arange(1, 5) * np.timedelta64(1800, "s")
    >>> halves = Interval("30min", 1800)
    >>> depth, status = np.array([[1.0], [2.0], [0.5], [0.0]]), np.zeros((4, 1), dtype=np.uint8)
    >>> source = Source("source 1", halves, ("A",), ends - np.timedelta64(1800, "s"), ends, depth, status, ())
    >>> place(source, Grid(Interval("1h", 3600), 0)).depth
    array([[3. ],
           [0.5]])
    """
    if relation(source.interval, grid.interval) == "coarser":
        return _place_coarser(source, grid)
    if source.interval == grid.interval:
        number, _ = grid.numbers(source.starts)
        first = int(number[0])
        depth, status = _blank(int(number[-1]) - first + 1, len(source.gauges))
        depth[number - first], status[number - first] = source.depth, source.status
        return OnGrid(first, depth, status, source.totals)
    return _place_finer(source, grid)


def _blank(n: int, n_gauges: int) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
    return np.full((n, n_gauges), np.nan), np.full((n, n_gauges), ABSENT, dtype=np.uint8)


def _place_coarser(source: Source, grid: Grid) -> OnGrid:
    begins, stops = grid.numbers(source.starts)[0], grid.numbers(source.ends)[0]
    first = int(begins.min())
    depth, status = _blank(int(stops.max()) - first, len(source.gauges))
    counts = stops - begins
    row = np.repeat(np.arange(len(begins)), counts)
    step = np.arange(len(row)) - np.repeat(np.cumsum(counts) - counts, counts) + begins[row] - first
    wet = source.depth > 0
    depth[step] = np.where(wet, np.nan, source.depth)[row]
    status[step] = np.where(wet, Status.ACCUMULATED, source.status).astype(np.uint8)[row]
    totals = [
        KnownTotal(source.gauges[g], source.starts[t], source.ends[t], float(source.depth[t, g]))
        for t, g in np.argwhere(wet)
    ]
    return OnGrid(first, depth, status, (*source.totals, *totals))


def _place_finer(source: Source, grid: Grid) -> OnGrid:
    number, _ = grid.numbers(source.starts)
    first = int(number[0])
    edges = np.flatnonzero(np.r_[True, np.diff(number) > 0])
    steps = number[edges]
    lengths = (grid.bounds(steps + 1) - grid.bounds(steps)).astype(np.int64)
    part = source.interval.seconds if source.interval and source.interval.seconds else 1
    complete = np.diff(np.r_[edges, len(number)]) == lengths // part

    fine_depth, fine_status, spanning = _settle_totals(source, number)
    rank = np.zeros(256, dtype=np.uint8)
    for order, status in enumerate(_RANK):
        rank[status] = order
    lacking = np.add.reduceat(np.isin(fine_status, _EMPTY), edges, axis=0, dtype=np.int64) > 0
    lacking |= ~complete[:, None]
    absent = np.minimum.reduceat(fine_status == Status.NOT_INSTALLED, edges, axis=0)
    sums = np.add.reduceat(np.nan_to_num(fine_depth), edges, axis=0)
    kinds = np.array(_RANK, dtype=np.uint8)[np.maximum.reduceat(rank[fine_status], edges, axis=0)]
    kinds = np.where(lacking, np.where(absent, Status.NOT_INSTALLED, Status.MISSING), kinds).astype(np.uint8)

    depth, status_on = _blank(int(number[-1]) - first + 1, len(source.gauges))
    at = steps - first
    depth[at], status_on[at] = np.where(lacking, np.nan, sums), kinds
    parts = _Parts(sums, np.add.reduceat(np.isnan(fine_depth), edges, axis=0, dtype=np.int64), complete, steps)
    totals, notes = _spanning_totals(source, grid, spanning, parts, depth=depth, status=status_on, first=first)
    return OnGrid(first, depth, status_on, totals, notes)


@dataclass(frozen=True, eq=False)
class _Parts:
    """Of every coarse step: the sum of its known parts, how many are not known, whether all exist, and its number."""

    sums: npt.NDArray[np.float64]
    unknown: npt.NDArray[np.int64]
    complete: npt.NDArray[np.bool_]
    steps: npt.NDArray[np.int64]


def _settle_totals(
    source: Source, number: npt.NDArray[np.int64]
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8], list[tuple[int, int, int, float]]]:
    """Return depths and statuses with the totals within one grid step settled; (gauge, first, stop, mm) of others.

    Where in its step an accumulated total fell does not matter to the sum of the step.
    """
    if not source.totals:
        return source.depth, source.status, []
    depth, status = source.depth.copy(), source.status.copy()
    column = {gauge: g for g, gauge in enumerate(source.gauges)}
    spanning = []
    for total in source.totals:
        g = column[total.gauge]
        first = int(np.searchsorted(source.starts, total.start))
        stop = int(np.searchsorted(source.ends, total.end)) + 1
        if number[first] == number[stop - 1]:
            depth[first:stop, g], status[first:stop, g] = 0.0, Status.ZERO
            if total.depth > 0:
                depth[stop - 1, g], status[stop - 1, g] = total.depth, Status.OBSERVED
        else:
            spanning.append((g, first, stop, total.depth))
    return depth, status, sorted(spanning)


def _spanning_totals(
    source: Source,
    grid: Grid,
    spanning: Sequence[tuple[int, int, int, float]],
    parts: _Parts,
    *,
    depth: npt.NDArray[np.float64],
    status: npt.NDArray[np.uint8],
    first: int,
) -> tuple[tuple[KnownTotal, ...], tuple[Note, ...]]:
    """Return totals over several grid steps: what accumulated, and the known values beside it in these steps.

    Accumulations that meet in one step make one total: nothing says how much of each fell in the step. For the same
    reason all of them stay missing where anything else in one of their steps is unknown.
    """
    number, _ = grid.numbers(source.starts)
    chains: list[list[tuple[int, int, int, float]]] = []
    for total in spanning:
        g, begin, _, _ = total
        last = chains[-1][-1] if chains else None
        if last is not None and last[0] == g and number[last[2] - 1] >= number[begin]:
            chains[-1].append(total)
        else:
            chains.append([total])
    totals, notes = [], []
    for chain in chains:
        g, begin, stop = chain[0][0], chain[0][1], chain[-1][2]
        low, high = int(number[begin]), int(number[stop - 1])
        mm = sum(total[3] for total in chain)
        rows = slice(int(np.searchsorted(parts.steps, low)), int(np.searchsorted(parts.steps, high)) + 1)
        accumulated = sum(last - first_of for _, first_of, last, _ in chain)
        if not parts.complete[rows].all() or parts.unknown[rows, g].sum() != accumulated:
            fell = KnownTotal(source.gauges[g], source.starts[begin], source.ends[stop - 1], mm)
            notes.append(_not_used(fell, grid.interval))
            continue
        bounds = grid.bounds(np.array([low, high + 1]))
        totals.append(KnownTotal(source.gauges[g], bounds[0], bounds[1], float(parts.sums[rows, g].sum()) + mm))
        depth[low - first : high - first + 1, g] = np.nan
        status[low - first : high - first + 1, g] = Status.ACCUMULATED
        if len(chain) >= _MANY:
            notes.append(_joined(totals[-1], len(chain), grid.interval))
    return tuple(totals), tuple(notes)


def _not_used(fell: KnownTotal, step: Interval) -> Note:
    return Note(
        code="total-not-used",
        text=f"Gauge {fell.gauge}: {fell.depth:.6g} mm that accumulated from {fell.start} to {fell.end} are not used: "
        f"other values in the {step.label} steps that they reach into are not known, so that these steps are missing.",
        gauge=fell.gauge,
    )


def _joined(total: KnownTotal, n: int, step: Interval) -> Note:
    return Note(
        code="totals-joined",
        text=f"Gauge {total.gauge}: {n} accumulations meet within steps of {step.label}, and are one total of "
        f"{total.depth:.6g} mm from {total.start} to {total.end}; a shorter common step would keep them apart.",
        gauge=total.gauge,
    )

"""Days, or a storm, of which a gauge misses more than half: their totals estimated and given to the missing steps."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from enum import IntEnum
from typing import Final, Protocol

import numpy as np
import numpy.typing as npt

from basinrain.infill.donor_sums import DonorSums
from basinrain.infill.intervals import Intervals, span_sums
from basinrain.infill.spans import EXACT, KnownTotals

__all__ = ["Block", "Fate", "NearGauges", "SpanCells", "fill_spans"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_TOGETHER: Final = 1 << 20
"""Values at missing steps that are looked at together."""


class NearGauges(Protocol):
    """The order in which gauges lie around each other."""

    @property
    def n_first(self) -> int:
        """How many of the nearest of each gauge are at hand."""

    def first(self, gauges: Ints, k: int, /) -> Ints:
        """Return the k-th nearest gauge of each of some gauges, itself the first as a rule; k below ``n_first``."""

    def all(self, gauge: int, /) -> Ints:
        """Return all gauges by their distance from one."""


class Fate(IntEnum):
    """What became of a span of which a gauge misses more than half."""

    LONG = 0
    UNKNOWN = 1
    UNKNOWN_CUT = 2
    RAISED = 3
    SPREAD = 4
    EVEN_NONE_COMPLETE = 5
    EVEN_NONE_WET = 6


@dataclass(frozen=True, eq=False)
class Block:
    """Some steps of a record that hold whole spans, and what there is at them.

    Parameters
    ----------
    depth : array of float, shape (n_steps, n_gauges)
        mm, NaN where there is none.
    measured, own, fillable, long, absent : array of bool, shape (n_steps, n_gauges)
        Where a value was measured at the step, is the gauge's own, is to be infilled, is missing for too long to be
        infilled, and where the gauge is not in service.
    """

    depth: Floats
    measured: Bools
    own: Bools
    fillable: Bools
    long: Bools
    absent: Bools


@dataclass(frozen=True, eq=False)
class SpanCells:
    """Spans of which a gauge misses more than half, and what became of each.

    Parameters
    ----------
    gauge, first, stop : array of int, shape (n,)
        The gauge's column, and the steps of the record.
    month : array of int, shape (n,)
        The month that holds the middle, 0 without times.
    total : array of float, shape (n,)
        The span's total as it was estimated, mm; NaN where there is none.
    fate : array of uint8, shape (n,)
        A :class:`Fate` for each.
    donating : array of bool, shape (n, n_gauges)
        Which gauges know their total over the span.
    """

    gauge: Ints
    first: Ints
    stop: Ints
    month: Ints
    total: Floats
    fate: npt.NDArray[np.uint8]
    donating: Bools

    def of_gauge(self, g: int) -> SpanCells:
        """Return those of one gauge."""
        mine = self.gauge == g
        return SpanCells(*(getattr(self, field.name)[mine] for field in fields(self)))

    @classmethod
    def joined(cls, parts: Sequence[tuple[int, SpanCells]], n_gauges: int) -> SpanCells:
        """Return those of several blocks, each given with the record's step that it begins at."""
        moved = [
            replace(cells, first=cells.first + begin, stop=cells.stop + begin)
            for begin, cells in ((0, cls.none(n_gauges)), *parts)
        ]
        return cls(*(np.concatenate([getattr(cells, field.name) for cells in moved]) for field in fields(cls)))

    @classmethod
    def none(cls, n_gauges: int) -> SpanCells:
        """Return that there is none."""
        empty = np.empty(0, dtype=np.int64)
        fate, donating = np.empty(0, dtype=np.uint8), np.empty((0, n_gauges), dtype=bool)
        return cls(empty, empty, empty, empty, np.empty(0), fate, donating)


def fill_spans(
    block: Block,
    intervals: Intervals,
    months: Ints,
    totals: KnownTotals,
    sums: DonorSums,
    *,
    recorders: Bools,
    near: NearGauges,
    out: Floats,
) -> tuple[Bools, SpanCells]:
    """Infill what a block's gauges miss of spans that they miss more than half of.

    Parameters
    ----------
    block
        The block.
    intervals, months
        Its spans, and the month of each.
    totals
        Totals that reach into it.
    sums
        Gives the estimates.
    recorders : array of bool, shape (n_gauges,)
        The gauges whose values can give a pattern in time.
    near
        Gives the order in which they are looked at.
    out : array of float, shape (n_steps, n_gauges)
        Where the depths are written.

    Returns
    -------
    by_step : array of bool, shape (n_steps, n_gauges)
        What is left to be infilled step by step.
    cells : SpanCells
        Their steps are counted from the block's first.

    Examples
    --------
    See :class:`basinrain.infill.RecordFiller`, which does this block by block.
    """
    n_spans, length = intervals.n_spans, intervals.stop - intervals.first
    spans = np.repeat(np.arange(n_spans), length[:n_spans])
    missing = span_sums(block.fillable, intervals)
    reported = span_sums(block.own, intervals)
    whole = (missing > 0) & (2 * reported < length[:, None])
    # A gauge that comes or goes within a span has its parts instead, which nobody else has.
    mine = np.zeros_like(whole)
    mine[:n_spans] = True
    mine[intervals.span, intervals.gauge] = False
    mine[intervals.row, intervals.gauge] = True
    whole &= mine
    by_step = block.fillable & ~whole[spans]
    for row, g in zip(intervals.row.tolist(), intervals.gauge.tolist(), strict=True):
        steps = slice(intervals.first[row], intervals.stop[row])
        by_step[steps, g] = block.fillable[steps, g] & ~whole[row, g]
    row, gauge = np.nonzero(whole)
    if not len(row):
        return by_step, SpanCells.none(block.depth.shape[1])
    depth = np.where(block.own, block.depth, 0.0)
    own_totals = span_sums(depth, intervals)
    complete = np.asarray(reported == length[:, None])
    all_measured = block.measured is block.own
    measured = complete if all_measured else np.asarray(span_sums(block.measured, intervals) == length[:, None])
    cut = _cut(totals, depth, intervals)
    donating = np.asarray(complete & ~cut)
    long = span_sums(block.long, intervals)[row, gauge] > 0 if block.long.any() else np.zeros(len(row), dtype=bool)
    chosen = whole.copy()
    chosen[row[long], gauge[long]] = False
    estimated = np.full(whole.shape, np.nan)
    sums.put(own_totals, donating, chosen, months, estimated)

    total, observed = estimated[row, gauge], own_totals[row, gauge]
    known = ~np.isnan(total)
    raised = known & (total < observed - EXACT * np.maximum(observed, 1))
    fate = np.full(len(row), Fate.SPREAD, dtype=np.uint8)
    fate[~known] = np.where((complete & cut)[row].any(axis=1), Fate.UNKNOWN_CUT, Fate.UNKNOWN)[~known]
    fate[long] = Fate.LONG
    fate[raised] = Fate.RAISED

    given = np.flatnonzero(known & ~raised)
    rest = np.maximum(total - observed, 0.0)
    donor = np.full(len(row), -1)
    searched = given[(rest[given] > 0) & (missing[row[given], gauge[given]] > 1)]
    wet = recorders & measured & (own_totals > 0)
    cells = _Steps.of(block.fillable, intervals, row, gauge)
    pattern = wet[row[searched]]
    part = np.flatnonzero(missing[row[searched], gauge[searched]] < length[row[searched]])
    # Where the gauge has some steps itself, the rain must have fallen in the others.
    pattern[part] = _wet_at_steps(depth, wet[row], cells, searched[part])
    donor[searched] = _nearest(pattern, gauge[searched], near)
    even = searched[donor[searched] < 0]
    any_complete = (recorders & measured)[row[even]].any(axis=1)
    fate[even] = np.where(any_complete, Fate.EVEN_NONE_WET, Fate.EVEN_NONE_COMPLETE)
    back = cells.among(raised)
    by_step[back.step, gauge[back.cell]] = True
    _share_out(depth, cells.among(known & ~raised), gauge, donor, rest, out)
    return by_step, SpanCells(gauge, intervals.first[row], intervals.stop[row], months[row], total, fate, donating[row])


@dataclass(frozen=True, eq=False)
class _Steps:
    """The missing steps of spans, in order: of each, the cell (a span of a gauge) and the step."""

    cell: Ints
    step: Ints

    @classmethod
    def of(cls, fillable: Bools, intervals: Intervals, row: Ints, gauge: Ints) -> _Steps:
        length = (intervals.stop - intervals.first)[row]
        cell = np.repeat(np.arange(len(row)), length)
        step = np.arange(len(cell)) + np.repeat(intervals.first[row] - (np.cumsum(length) - length), length)
        held = fillable[step, gauge[cell]]
        return cls(cell[held], step[held])

    def among(self, cells: Bools) -> _Steps:
        held = cells[self.cell]
        return self if held.all() else _Steps(self.cell[held], self.step[held])

    @property
    def first(self) -> Ints:
        """Where each cell begins."""
        return np.flatnonzero(np.diff(self.cell, prepend=-1))


def _wet_at_steps(depth: Floats, wet: Bools, cells: _Steps, chosen: Ints) -> Bools:
    """Return which of the gauges that are ``wet`` over each chosen cell's span are so at its missing steps."""
    result = np.zeros((len(chosen), depth.shape[1]), dtype=bool)
    some = chosen[wet[chosen].any(axis=1)]
    asked = np.zeros(len(wet), dtype=bool)
    asked[some] = True
    steps = cells.among(asked)
    borders = np.append(steps.first, len(steps.cell))
    most = max(_TOGETHER // max(depth.shape[1], 1), 1)
    k = 0
    found = np.zeros((len(some), depth.shape[1]), dtype=bool)
    while k < len(some):
        after = max(int(np.searchsorted(borders, borders[k] + most, "right")) - 1, k + 1)
        mine = slice(borders[k], borders[after])
        rain = depth[steps.step[mine]] > 0
        found[k:after] = np.logical_or.reduceat(rain, borders[k:after] - borders[k], axis=0)
        k = after
    result[np.searchsorted(chosen, some)] = found & wet[some]
    return result


def _nearest(usable: Bools, gauge: Ints, near: NearGauges) -> Ints:
    """Return of each row's usable gauges, (n, n_gauges), the one that is nearest to the row's gauge; -1 without any."""
    found = np.full(len(gauge), -1)
    open_ = np.flatnonzero(usable.any(axis=1))
    for k in range(near.n_first):
        if not len(open_):
            return found
        candidate = near.first(gauge[open_], k)
        right = usable[open_, candidate]
        found[open_[right]] = candidate[right]
        open_ = open_[~right]
    for g in np.unique(gauge[open_]).tolist():
        mine, order = open_[gauge[open_] == g], near.all(g)
        found[mine] = order[usable[np.ix_(mine, order)].argmax(axis=1)]
    return found


def _share_out(  # noqa: PLR0917 - each cell's donor and rest, by its place
    depth: Floats, steps: _Steps, gauge: Ints, donor: Ints, rest: Floats, out: Floats
) -> None:
    """Give each cell's rest to its steps in the donor's pattern, evenly without one; the sum is kept."""
    if not len(steps.cell):
        return
    first = steps.first
    length = np.diff(first, append=len(steps.cell))
    cell = steps.cell[first]
    shares = np.where(donor[steps.cell] >= 0, depth[steps.step, np.maximum(donor[steps.cell], 0)], 1.0)
    shares /= np.repeat(np.add.reduceat(shares, first), length)
    parts = shares * np.repeat(rest[cell], length)
    # Rounding goes to the last of the largest: it is wet, and large enough never to be pushed below zero.
    largest = shares == np.repeat(np.maximum.reduceat(shares, first), length)
    last = np.maximum.reduceat(np.where(largest, np.arange(len(shares)), -1), first)
    parts[last] += rest[cell] - np.add.reduceat(parts, first)
    out[steps.step, gauge[steps.cell]] = parts


def _cut(totals: KnownTotals, depth: Floats, intervals: Intervals) -> Bools:
    n = intervals.n_spans
    of_spans = totals.cut(depth, intervals.first[:n], intervals.stop[:n])
    of_parts = [
        totals.within(first, stop).cut(depth[first:stop], np.array([0]), np.array([stop - first]))
        for first, stop in zip(intervals.first[n:].tolist(), intervals.stop[n:].tolist(), strict=True)
    ]
    return np.concatenate([of_spans, *of_parts])

"""Gaps of a long record infilled, stretch after stretch of it: every method, at the scale of the step, day or storm."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.infill.donor_sums import DonorSums
from basinrain.infill.donors import distances_from, require_elevations
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.infill.intervals import intervals_of
from basinrain.infill.normals import require_normals
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import Relations
from basinrain.infill.span_filling import Block, SpanCells, fill_spans
from basinrain.infill.spans import KnownTotals, month_of, span_starts
from basinrain.rainfall import MEASURED, REPORTING, RainRecord, Status

__all__ = ["Filled", "RecordFiller", "scale_of"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_BLOCK: Final = 1 << 20
"""Values of the record that are looked at together."""
_NEAR: Final = 64
"""So many of the nearest gauges of each are remembered."""
_DAY: Final = np.timedelta64(86400, "s")

_MEASURED, _OWN, _GAP, _ABSENT = 1, 2, 4, 8
_KINDS: Final = np.zeros(256, dtype=np.uint8)
_KINDS[[int(s) for s in MEASURED]] |= _MEASURED
_KINDS[[int(s) for s in REPORTING]] |= _OWN
_KINDS[[int(s) for s in (Status.MISSING, Status.REJECTED, Status.ACCUMULATED)]] |= _GAP
_KINDS[int(Status.NOT_INSTALLED)] |= _ABSENT


@dataclass(frozen=True, eq=False)
class Filled:
    """Depths with their gaps infilled, as far as they can be.

    Parameters
    ----------
    depth : array of float, shape (n_steps, n_gauges)
        mm; NaN where there is no depth.
    filled : array of bool, shape (n_steps, n_gauges)
        Which of them were infilled.
    spans : SpanCells, optional
        What became of days, or of the storm, of which a gauge misses more than half, where that is asked for.

    Examples
    --------
    See :class:`RecordFiller`.
    """

    depth: Floats
    filled: Bools
    spans: SpanCells | None = None


class RecordFiller:
    """Infills the gaps of a record, or of one stretch of it after the other.

    Parameters
    ----------
    network, options, relations, ratios
        As for :func:`basinrain.infill.complete`; relations must be given where the method needs them.

    Notes
    -----
    The rule is that of :func:`basinrain.infill.complete`, which uses this. What is learned of donors is kept from call
    to call, about 64 MiB of it at most (:mod:`basinrain.infill.donor_sums`); it changes how long a call takes, never a
    number: a stretch gives the same bytes whatever was infilled before it. At the scale ``"day"`` a stretch should hold
    whole rainfall days, since each day in it is looked at as far as it is there. One filler serves one thread at a
    time. Beside what is returned a call needs about 64 MiB, and as much as the record's at the scale ``"storm"``.

    Examples
    --------
    B misses two hours of four, and each is the mean of A and C.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> filler = RecordFiller(network, InfillOptions(method="station-average", scale="day"))
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03", "2031-05-04T04"], dtype="datetime64[s]")
    >>> depths = [[5.0, 6.0, 4.0], [10.0, np.nan, 8.0], [5.0, np.nan, 6.0], [0.0, 1.0, 2.0]]
    >>> filled = filler.fill(RainRecord.from_depths(network.ids, ends - 3600, ends, depths, step="1h"))
    >>> filled.depth[:, 1], filled.filled[:, 1]
    (array([6. , 9. , 5.5, 1. ]), array([False,  True,  True, False]))
    """

    def __init__(
        self,
        network: GaugeNetwork,
        options: InfillOptions,
        *,
        relations: Relations | None = None,
        ratios: NormalRatios | None = None,
    ) -> None:
        self._network, self._options, self._ratios = network, options, ratios
        self._sums = DonorSums(network, options, relations=relations, ratios=ratios)
        self._near = _Near(network)

    def fill(self, record: RainRecord, long: Bools | None = None, *, trace: bool = False) -> Filled:
        """Return a record's depths with its gaps infilled.

        Parameters
        ----------
        record : RainRecord
            The record or a stretch of it, its columns in the network's order. It is not changed.
        long : array of bool, shape (n_steps, n_gauges), optional
            As for :func:`basinrain.infill.complete`.
        trace
            Whether to return what became of spans.

        Returns
        -------
        Filled

        Raises
        ------
        DataError
            As :func:`basinrain.infill.complete`.
        """
        self._check(record)
        if long is None:
            long = longer_than(record, gap_mask(record), self._options.longest_gap)
        scale = scale_of(record, self._options)
        first = span_starts(record, scale)
        self._require(record, long, scale, first)
        depth = np.array(record.depth, order="C")
        filled = np.zeros(depth.shape, dtype=bool)
        cells: list[tuple[int, SpanCells]] = []
        months = month_of(record.starts, record.ends)
        totals = KnownTotals.of(record) if scale != "step" else None
        recorders = np.array([gauge in record.recorders for gauge in record.gauges], dtype=bool)
        for begin, stop, starts in self._blocks(first, len(record)):
            steps = slice(begin, stop)
            block = _block_of(record, steps, long)
            if not block.fillable.any():
                continue
            if totals is None:
                by_step = block.fillable
            else:
                intervals = intervals_of(starts, block.absent)
                of_spans = month_of(record.starts[begin + intervals.first], record.ends[begin + intervals.stop - 1])
                by_step, found = fill_spans(
                    block,
                    intervals,
                    of_spans,
                    totals.within(begin, stop),
                    self._sums,
                    recorders=recorders,
                    near=self._near,
                    out=depth[steps],
                )
                if trace:
                    cells.append((begin, found))
            self._sums.put(block.depth, block.measured, by_step, months[steps], depth[steps])
            np.greater(block.fillable, np.isnan(depth[steps]), out=filled[steps])
        return Filled(depth, filled, SpanCells.joined(cells, depth.shape[1]) if trace else None)

    def _blocks(self, first: Ints, n_steps: int) -> Iterator[tuple[int, int, Ints]]:
        """Yield the first step, the step after the last, and the spans' first steps, of blocks of whole spans."""
        most = max(_BLOCK // max(len(self._network), 1), 1)
        k = 0
        while k < len(first):
            after = max(int(np.searchsorted(first, first[k] + most, "right")) - 1, k + 1)
            if n_steps - first[k] <= most:
                after = len(first)
            stop = int(first[after]) if after < len(first) else n_steps
            yield int(first[k]), stop, first[k:after] - first[k]
            k = after

    def _check(self, record: RainRecord) -> None:
        problems = Problems()
        if record.gauges != self._network.ids:
            problems.add(
                item="rain record",
                found="columns that are not the network's gauges in their order",
                expected=", ".join(self._network.ids),
                remedy="bring them in order first",
            )
        infilled = record.status == Status.INFILLED
        for g in np.flatnonzero(infilled.any(axis=0)) if infilled.any() else ():
            problems.add(
                item=f"gauge {record.gauges[g]}",
                found="infilled values",
                expected="a record as it was observed",
                remedy="infill from the record as it was read: an infilled value is never a donor",
                gauge=record.gauges[g],
            )
        problems.raise_as(DataError)

    def _require(self, record: RainRecord, long: Bools, scale: str, first: Ints) -> None:
        """Raise one error for all gauges of which the method, or an option, needs to know more."""
        network, options = self._network, self._options
        by_normals = options.chosen_method.needs_normals and self._ratios is None
        if not by_normals and options.elevation_limit is None:
            return
        fillable = gap_mask(record) & ~long
        if not fillable.any():
            return
        taking_part = np.asarray(record.reporting.any(axis=0) | fillable.any(axis=0))
        problems = Problems()
        try:
            if by_normals:
                months = _months(record, fillable, scale, first)
                require_normals(network, taking_part, [month or None for month in months], method=options.method)
        except DataError as error:
            problems.extend(error)
        try:
            if options.elevation_limit is not None:
                require_elevations(network, taking_part)
        except DataError as error:
            problems.extend(error)
        problems.raise_as(DataError)


class _Near:
    """The gauges around each gauge, those at hand asked for once."""

    def __init__(self, network: GaugeNetwork) -> None:
        self._network, self.n_first = network, min(len(network), _NEAR)
        self._first = np.zeros((len(network), self.n_first), dtype=np.int64)
        self._known = np.zeros(len(network), dtype=bool)

    def first(self, gauges: Ints, k: int, /) -> Ints:
        for g in np.unique(gauges[~self._known[gauges]]).tolist():
            self._first[g] = self.all(g)[: self.n_first]
            self._known[g] = True
        return np.asarray(self._first[gauges, k])

    def all(self, gauge: int, /) -> Ints:
        return self._network.nearest_first(distances_from(self._network, gauge))


def scale_of(record: RainRecord, options: InfillOptions) -> str:
    """Return the scale at which a record is infilled: as the options say, else what suits the record.

    Examples
    --------
    Gauges that all record are infilled by the storm; steps of a day are days.

    >>> ends = np.array(["2031-05-05", "2031-05-06"], dtype="datetime64[s]")
    >>> for hours in (12, 24):
    ...     starts = ends - np.timedelta64(hours, "h")
    ...     print(scale_of(RainRecord.from_depths(("A",), starts, ends, [[1.0], [2.0]], step="some"), InfillOptions()))
    storm
    day
    """
    # A total without times is a storm's, whatever else is asked for.
    if np.isnat(record.ends).any():
        return "storm"
    if options.scale is not None:
        return options.scale
    # Where steps are a day or longer, each is the span of its own day.
    if len(record) and np.median((record.ends - record.starts).astype(np.int64)) >= _DAY.astype(np.int64):
        return "day"
    daily = not record.recorders.issuperset(record.gauges) or bool((record.status == Status.SPREAD).any())
    return "day" if daily else "storm"


def _months(record: RainRecord, fillable: Bools, scale: str, first: Ints) -> list[int]:
    """Return the months of the steps and spans that have something to infill, 0 for those without times."""
    months = set(month_of(record.starts, record.ends)[fillable.any(axis=1)].tolist())
    if scale != "step":
        intervals = intervals_of(first, record.status == Status.NOT_INSTALLED)
        of_spans = month_of(record.starts[intervals.first], record.ends[intervals.stop - 1])
        held = np.logical_or.reduceat(fillable.any(axis=1), first) if len(first) else np.empty(0, dtype=bool)
        parts = [
            bool(fillable[intervals.first[row] : intervals.stop[row], g].any())
            for row, g in zip(intervals.row.tolist(), intervals.gauge.tolist(), strict=True)
        ]
        months |= set(of_spans[: intervals.n_spans][held].tolist())
        months |= set(of_spans[intervals.row[np.array(parts, dtype=bool)]].tolist())
    return sorted(months)


def _block_of(record: RainRecord, steps: slice, long: Bools) -> Block:
    kinds = _KINDS[record.status[steps]]
    own = (kinds & _OWN) != 0
    measured = (kinds & _MEASURED) != 0
    gaps = (kinds & _GAP) != 0
    return Block(
        depth=np.ascontiguousarray(record.depth[steps]),
        measured=own if np.array_equal(measured, own) else measured,
        own=own,
        fillable=gaps & ~long[steps],
        long=gaps & long[steps],
        absent=(kinds & _ABSENT) != 0,
    )

"""The window that is being completed, and its spans: what all its gauges share while they are infilled."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import Relations
from basinrain.infill.spans import cut_totals, month_of, span_starts
from basinrain.rainfall import RainRecord, Status

__all__ = ["Bools", "Floats", "Ints", "Spans", "Window"]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Window:
    """A window of the record with what all its gauges share, each thing computed once.

    Parameters
    ----------
    record, network, options
        As for :func:`basinrain.infill.complete`.
    scale : str
        The scale that is used: ``"step"``, ``"day"`` or ``"storm"``.
    fillable : array of bool, shape (n_steps, n_gauges)
        The gaps that may be infilled.
    relations : Relations, optional
        Relations between the gauges in the record, where the method needs them.
    ratios : NormalRatios, optional
        Normals from the record, where they are used.
    trace : bool
        Whether it is kept how every estimate came about.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[1.0, np.nan], [2.0, 0.5]], step="1h")
    >>> window = Window(record, network, InfillOptions(), "storm", np.isnan(record.depth))
    >>> window.own
    array([[1. , 0. ],
           [2. , 0.5]])
    >>> window.spans_of(1).totals, window.spans_of(1).donating
    (array([[3. , 0.5]]), array([[ True, False]]))
    """

    record: RainRecord
    network: GaugeNetwork
    options: InfillOptions
    scale: str
    fillable: Bools
    relations: Relations | None = None
    ratios: NormalRatios | None = None
    trace: bool = True
    _spans: dict[bytes, Spans] = field(init=False, repr=False, default_factory=dict)

    @cached_property
    def distances(self) -> Floats:
        """Distances between the gauges in m, shape (n_gauges, n_gauges)."""
        return self.network.distances()

    @cached_property
    def measured(self) -> Bools:
        """Where a value was measured at the step, shape (n_steps, n_gauges)."""
        return self.record.measured

    @cached_property
    def reporting(self) -> Bools:
        """Where a value is the gauge's own, shape (n_steps, n_gauges)."""
        return self.record.reporting

    @cached_property
    def own(self) -> Floats:
        """The gauges' own depths in mm, 0 where there is none, shape (n_steps, n_gauges)."""
        return np.where(self.reporting, self.record.depth, 0.0)

    @cached_property
    def recorders(self) -> Bools:
        """Whether a gauge records at the step or finer, shape (n_gauges,)."""
        return np.array([gauge in self.record.recorders for gauge in self.record.gauges], dtype=bool)

    @cached_property
    def months(self) -> Ints:
        """The month of every step, 0 without times, shape (n_steps,)."""
        return month_of(self.record.starts, self.record.ends)

    @cached_property
    def _bounds(self) -> Ints:
        return span_starts(self.record, self.scale)

    def spans_of(self, g: int) -> Spans:
        """Return the spans as they are for gauge ``g``: cut where it comes into service or leaves it."""
        absent = self.record.status[:, g] == Status.NOT_INSTALLED
        cuts = np.flatnonzero(np.diff(absent)) + 1
        first = np.union1d(self._bounds, cuts) if len(cuts) else self._bounds
        key = first.tobytes()
        if key not in self._spans:
            stop = np.append(first[1:], len(self.record))
            self._spans[key] = Spans(
                first=first,
                stop=stop,
                months=month_of(self.record.starts[first], self.record.ends[stop - 1]),
                totals=np.add.reduceat(self.own, first, axis=0),
                complete=np.logical_and.reduceat(self.reporting, first, axis=0),
                cut=cut_totals(self.record, self.own, first, stop),
                measured=np.logical_and.reduceat(self.measured, first, axis=0),
            )
        return self._spans[key]


@dataclass(frozen=True, kw_only=True, eq=False)
class Spans:
    """Spans of steps, which together are all steps of the window, and what every gauge has over them.

    Parameters
    ----------
    first, stop : array of int, shape (n_spans,)
        The steps of each span, ``first`` included, ``stop`` not.
    months : array of int, shape (n_spans,)
        The month that holds the middle, 0 without times.
    totals : array of float, shape (n_spans, n_gauges)
        mm of the gauges' own values.
    complete, measured : array of bool, shape (n_spans, n_gauges)
        Whether the gauge has its own, or measured, values at every step.
    cut : array of bool, shape (n_spans, n_gauges)
        Whether the span holds part of an interval over which the gauge knows only its total, but not all of that total:
        what fell inside is then known from other gauges' pattern alone.
    """

    first: Ints
    stop: Ints
    months: Ints
    totals: Floats
    complete: Bools
    measured: Bools
    cut: Bools

    @property
    def donating(self) -> Bools:
        """Whether the gauge knows its total over the span, shape (n_spans, n_gauges)."""
        return self.complete & ~self.cut

"""The window that is being completed, and its spans: what all its gauges share while they are infilled."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.options import InfillOptions
from basinrain.infill.spans import month_of, span_starts
from basinrain.rainfall import RainRecord, Status

__all__ = ["Bools", "Floats", "Ints", "Spans", "Window"]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Window:
    """What all gauges of a window share, computed once."""

    record: RainRecord
    network: GaugeNetwork
    options: InfillOptions
    scale: str
    fillable: Bools
    distances: Floats = field(init=False)
    own: Floats = field(init=False)
    measured: Bools = field(init=False)
    reporting: Bools = field(init=False)
    recorders: Bools = field(init=False)
    months: Ints = field(init=False)
    bounds: Ints = field(init=False)
    spans: dict[bytes, Spans] = field(init=False, default_factory=dict)

    def __post_init__(self) -> None:
        put, record = object.__setattr__, self.record
        put(self, "distances", self.network.distances() if self.fillable.any() else np.empty((0, 0)))
        put(self, "measured", record.measured)
        put(self, "reporting", record.reporting)
        put(self, "own", np.where(self.reporting, record.depth, 0.0))
        put(self, "recorders", np.array([gauge in record.recorders for gauge in record.gauges], dtype=bool))
        put(self, "months", month_of(record.starts, record.ends))
        put(self, "bounds", span_starts(record, self.scale))

    def spans_of(self, g: int) -> Spans:
        """Return the spans as they are for one gauge: cut where it comes into service or leaves it."""
        absent = self.record.status[:, g] == Status.NOT_INSTALLED
        cuts = np.flatnonzero(np.diff(absent)) + 1
        first = np.union1d(self.bounds, cuts) if len(cuts) else self.bounds
        key = first.tobytes()
        if key not in self.spans:
            self.spans[key] = Spans.of(self, first)
        return self.spans[key]


@dataclass(frozen=True, eq=False)
class Spans:
    """Spans of steps, with what every gauge has over them; arrays are (n_spans, n_gauges) or (n_spans,)."""

    first: Ints
    stop: Ints
    months: Ints
    totals: Floats
    reporting: Bools
    measured: Bools

    @classmethod
    def of(cls, window: Window, first: Ints) -> Spans:
        record = window.record
        stop = np.append(first[1:], len(record))
        return cls(
            first,
            stop,
            month_of(record.starts[first], record.ends[stop - 1]),
            np.add.reduceat(window.own, first, axis=0),
            np.logical_and.reduceat(window.reporting, first, axis=0),
            np.logical_and.reduceat(window.measured, first, axis=0),
        )

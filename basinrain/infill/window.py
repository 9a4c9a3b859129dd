"""The window that was completed: what all its gauges share while it is told how they were infilled."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import Relations
from basinrain.infill.spans import month_of
from basinrain.rainfall import RainRecord

__all__ = ["Bools", "Floats", "Ints", "Window"]

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

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[1.0, np.nan], [2.0, 0.5]], step="1h")
    >>> window = Window(record, network, InfillOptions(), "storm", np.isnan(record.depth))
    >>> window.own
    array([[1. , 0. ],
           [2. , 0.5]])
    """

    record: RainRecord
    network: GaugeNetwork
    options: InfillOptions
    scale: str
    fillable: Bools
    relations: Relations | None = None
    ratios: NormalRatios | None = None

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
    def months(self) -> Ints:
        """The month of every step, 0 without times, shape (n_steps,)."""
        return month_of(self.record.starts, self.record.ends)

"""Small windows with gaps, and their completion, for tests of infilling."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.infill.options import Scale
from basinrain.rainfall import RainRecord, Status


def network(n: int, normals: object = None) -> GaugeNetwork:
    """Return gauges A, B, C ... on a line, 1 km apart."""
    table = None if normals is None else np.array(normals, dtype=float)
    return GaugeNetwork(
        ids=tuple("ABCDEF"[:n]), x=np.arange(n, dtype=float) * 1000, y=np.zeros(n), crs="local", normals=table
    )


def hourly(
    *columns: list[float],
    start: str = "2031-05-04T00",
    hours: int = 1,
    day_phase: int = 0,
    recorders: str = "ABCDEF",
) -> RainRecord:
    """Return a record with one column a gauge."""
    step = np.timedelta64(3600 * hours, "s")
    ends = np.datetime64(start, "s") + np.arange(1, len(columns[0]) + 1) * step
    record = RainRecord.from_depths(
        tuple("ABCDEF"[: len(columns)]), ends - step, ends, np.array(columns).T, step=f"{hours}h"
    )
    return replace(record, day_phase=day_phase, recorders=frozenset(recorders))


def with_status(record: RainRecord, gauge: str, steps: slice, status: Status) -> RainRecord:
    """Return the record with another status at some steps of a gauge."""
    changed = record.status.copy()
    changed[steps, record.gauges.index(gauge)] = status
    return replace(record, status=changed)


def average(
    record: RainRecord,
    scale: Scale | None = None,
    *,
    min_donors: int = 2,
    radius: float | None = None,
    longest_gap: float = 31,
) -> Completed:
    """Complete the window by the station average."""
    options = InfillOptions(
        method="station-average", scale=scale, min_donors=min_donors, radius=radius, longest_gap=longest_gap
    )
    return complete(record, network(len(record.gauges)), options)


def column(completed: Completed, gauge: str = "B") -> list[float]:
    """Return a gauge's completed depths."""
    depths: npt.NDArray[np.float64] = completed.record.depth[:, completed.record.gauges.index(gauge)]
    return [float(depth) for depth in depths]


def codes(completed: Completed) -> list[str]:
    """Return the codes of its notes."""
    return [note.code for note in completed.notes]

"""One record from several sources on a common grid, without what lies outside the gauges' time of service."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.notes import Note
from basinrain.rainfall import KnownTotal, Status
from basinrain.reading.grid import ABSENT, OnGrid, Source

__all__ = ["Unused", "merge_sources", "take_out_of_service", "unused_values"]

_NOTHING: Final = np.array([ABSENT, Status.MISSING], dtype=np.uint8)


class Unused(NamedTuple):
    """Values outside a gauge's time of service: its column, their number, and the end of the first one's step."""

    gauge: int
    steps: int
    first: np.datetime64


def merge_sources(
    sources: Sequence[Source],
    placed: Sequence[OnGrid],
    gauges: tuple[str, ...],
    first: int,
    bounds: npt.NDArray[np.datetime64],
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
    """Return depth and status of all sources on one grid.

    Parameters
    ----------
    sources, placed
        The sources, and each on the grid.
    gauges
        The columns.
    first
        The grid number of the first step.
    bounds : array of datetime64[s], shape (n_steps + 1,)
        The bounds of the steps.

    Returns
    -------
    depth, status : arrays, shape (n_steps, n_gauges)
        Status ABSENT where no source reaches.

    Raises
    ------
    DataError
        A gauge has values in two sources at one time; all such gauges.
    """
    shape = (len(bounds) - 1, len(gauges))
    depth, status = np.full(shape, np.nan), np.full(shape, ABSENT, dtype=np.uint8)
    owner = np.zeros(shape, dtype=np.int16)
    column = {gauge: g for g, gauge in enumerate(gauges)}
    problems = Problems()
    for number, (source, part) in enumerate(zip(sources, placed, strict=True)):
        columns = np.array([column[gauge] for gauge in source.gauges])
        at = np.ix_(np.arange(len(part.depth)) + part.first - first, columns)
        free = np.isin(status[at], _NOTHING)
        both = ~free & ~np.isin(part.status, _NOTHING)
        for g in np.flatnonzero(both.any(axis=0)):
            rows = np.flatnonzero(both[:, g])
            row = int(rows[0]) + part.first - first
            other = sources[owner[row, columns[g]]].name
            problems.add(
                item=f"gauge {source.gauges[g]}",
                found=f"values in {other} and in {source.name} for {len(rows)} of the same steps, the first ending at "
                f"{bounds[row + 1]}",
                expected="one source for a gauge and time",
                remedy="remove it from one of them",
                gauge=source.gauges[g],
                time=str(bounds[row + 1]),
            )
        take = free & (part.status != ABSENT) & ~((part.status == Status.MISSING) & (status[at] != ABSENT))
        depth[at] = np.where(take, part.depth, depth[at])
        status[at] = np.where(take, part.status, status[at])
        owner[at] = np.where(take, number, owner[at])
    problems.raise_as(DataError)
    return depth, status


def take_out_of_service(
    network: GaugeNetwork,
    depth: npt.NDArray[np.float64],
    status: npt.NDArray[np.uint8],
    bounds: npt.NDArray[np.datetime64],
    totals: list[KnownTotal],
) -> list[Unused]:
    """Mark, in place, what lies outside the gauges' time of service; drop totals that reach into it.

    Parameters
    ----------
    network
        The columns.
    depth, status : arrays, shape (n_steps, n_gauges)
        Outside a gauge's time of service they become NaN and NOT_INSTALLED.
    bounds : array of datetime64[s], shape (n_steps + 1,)
        The bounds of the steps.
    totals
        Depths known over several steps; the steps of one that is dropped become missing.

    Returns
    -------
    list of Unused
        The values that do not count, by gauge in the network's order.
    """
    out = ~network.in_service(bounds[:-1], bounds[1:])
    if not out.any():
        return []
    unused = out & ~np.isin(status, [int(Status.MISSING), int(Status.NOT_INSTALLED)])
    found = [
        Unused(int(g), int(unused[:, g].sum()), bounds[int(unused[:, g].argmax()) + 1])
        for g in np.flatnonzero(unused.any(axis=0))
    ]
    kept = []
    for total in totals:
        place_of = network.position(total.gauge)
        rows_of = slice(*np.searchsorted(bounds, np.array([total.start, total.end])))
        if out[rows_of, place_of].any():
            status[rows_of, place_of] = Status.MISSING
        else:
            kept.append(total)
    totals[:] = kept
    depth[out], status[out] = np.nan, Status.NOT_INSTALLED
    return found


def unused_values(network: GaugeNetwork, unused: Sequence[Unused]) -> list[Note]:
    """Return a note for every gauge with values outside its time of service.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A",), x=[0.0], y=[0.0], crs="local")
    >>> print(*unused_values(network, [Unused(0, 2, np.datetime64("2031-05-04T01:00"))]))
    Gauge A has values for 2 steps outside its time of service, the first ending at 2031-05-04T01:00; they are not used.
    """
    return [
        Note(
            code="value-out-of-service",
            text=f"Gauge {network.ids[g]} has values for {steps} steps outside its time of service, the first "
            f"ending at {end}; they are not used.",
            gauge=network.ids[g],
        )
        for g, steps, end in unused
    ]

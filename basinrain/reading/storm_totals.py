"""Storm totals without times: joined by the storms' names, or given the times of their storms."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problems, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status

__all__ = ["merge_storm_totals", "storm_bounds"]


def storm_bounds(
    record: RainRecord,
    times: Mapping[str, tuple[np.datetime64, np.datetime64]],
    name: str,
    problems: Problems,
) -> tuple[npt.NDArray[np.datetime64], npt.NDArray[np.datetime64]]:
    """Return start and end of every storm of a totals-only record; what is wrong with them goes to ``problems``.

    Parameters
    ----------
    record
        Its ``labels`` are the storms' names.
    times
        Start and end by storm name.
    name
        What messages call the source.
    problems
        Takes storms without times, storms that end before they start, and storms that overlap.

    Returns
    -------
    starts, ends : arrays of datetime64[s], shape (n_storms,)
        NaT where a storm has no times.

    Examples
    --------
    >>> never = np.array(["NaT"], dtype="datetime64[s]")
    >>> record = RainRecord(
    ...     ("A",), never, never, np.array([[5.0]]), np.zeros((1, 1), np.uint8), step="storm", labels=("May",)
    ... )
    >>> times = {"May": (np.datetime64("2031-05-04T06:00:00"), np.datetime64("2031-05-05T06:00:00"))}
    >>> starts, ends = storm_bounds(record, times, "source 2 (storm)", Problems())
    >>> str(starts[0]), str(ends[0])
    ('2031-05-04T06:00:00', '2031-05-05T06:00:00')
    """
    starts, ends = record.starts.copy(), record.ends.copy()
    for row, storm in enumerate(record.labels):
        if storm in times:
            starts[row], ends[row] = times[storm]
        else:
            problems.add(
                item=f"storm {storm}",
                found=f"totals in {name}, but no start and end",
                expected="a [[storm]] of that name with start and end, to bring its totals to the other sources' step",
                remedy=f"add it; {nearest_name(storm, times)}" if times else "add it",
            )
    for bad in np.flatnonzero(starts >= ends):
        problems.add(
            item=f"storm {record.labels[bad]}", found=f"{starts[bad]} to {ends[bad]}", expected="an end after its start"
        )
    for earlier, later in pairwise(np.argsort(starts, kind="stable")):
        if starts[later] < ends[earlier]:
            problems.add(
                item=f"storms {record.labels[earlier]} and {record.labels[later]}",
                found=f"{ends[earlier]} as end and {starts[later]} as start",
                expected="storm totals of times that do not overlap",
            )
    return starts, ends


def merge_storm_totals(records: Mapping[int, RainRecord], network: GaugeNetwork) -> RainRecord:
    """Return the record of storm totals that totals-only sources make together.

    Parameters
    ----------
    records
        Records of storm totals, by the number under which messages name their source.
    network
        Holds all of their gauges.

    Returns
    -------
    RainRecord
        Columns in the network's order, storms in the order of the sources.

    Raises
    ------
    DataError
        A gauge and storm has a total in two sources.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1.0], y=[0.0, 0.0], crs="local")
    >>> never = np.array(["NaT"], dtype="datetime64[s]")
    >>> one, two = (
    ...     RainRecord(
    ...         (gauge,), never, never, np.array([[mm]]), np.zeros((1, 1), np.uint8), step="storm", labels=("May",)
    ...     )
    ...     for gauge, mm in (("B", 30.0), ("A", 10.0))
    ... )
    >>> merge_storm_totals({1: one, 2: two}, network).depth
    array([[10., 30.]])
    """
    storms = tuple(dict.fromkeys(storm for record in records.values() for storm in record.labels))
    depth = np.full((len(storms), len(network)), np.nan)
    status = np.full(depth.shape, Status.MISSING, dtype=np.uint8)
    problems = Problems()
    for number, record in records.items():
        at = np.ix_([storms.index(storm) for storm in record.labels], [network.position(g) for g in record.gauges])
        new = record.status != Status.MISSING
        for row, g in np.argwhere(new & (status[at] != Status.MISSING)):
            problems.add(
                item=f"gauge {record.gauges[g]}",
                found=f"another total of storm '{record.labels[row]}' in source {number}",
                expected="one source for a gauge and storm",
                remedy="remove it from one of them",
                gauge=record.gauges[g],
            )
        depth[at] = np.where(new, record.depth, depth[at])
        status[at] = np.where(new, record.status, status[at])
    problems.raise_as(DataError)
    never = np.full(len(storms), "NaT", dtype="datetime64[s]")
    return RainRecord(
        network.ids, never, never.copy(), depth, status, step="storm", labels=storms, recorders=frozenset()
    )

"""Brings the sources of a job to its common step: finer ones summed, coarser and accumulated ones spread."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import replace

import numpy as np

from basinrain.clocks import clock_name, clock_seconds, one_clock
from basinrain.errors import JobError, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.intervals import DAY, Interval, parse_interval
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.common_grid import common_grid, reading_hours
from basinrain.reading.grid import ABSENT, Grid, Source, place, relation
from basinrain.reading.membership import check_membership, without_gauges
from basinrain.reading.merging import merge_sources, take_out_of_service, unused_values
from basinrain.reading.storm_totals import merge_storm_totals, storm_bounds
from basinrain.spreading import spread_totals

__all__ = ["bring_to_step"]


def bring_to_step(
    records: Sequence[RainRecord],
    network: GaugeNetwork,
    *,
    common: str | None = None,
    storm_times: Mapping[str, tuple[np.datetime64, np.datetime64]] | None = None,
    exclude: Collection[str] = (),
    names: Sequence[str] = (),
) -> tuple[RainRecord, tuple[Note, ...]]:
    """Return the one record of all sources, at the common step.

    Parameters
    ----------
    records
        One a source, in the job's order; messages number them from 1.
    network
        The gauges; each must have rain values in one source at least, and the sources no other gauges.
    common
        The common step, ``"1h"``; the finest source's where none is given.
    storm_times
        Start and end of every storm, in the first source's clock, by name. Needed where storm totals without times come
        beside sources with times.
    exclude
        Ids of gauges that are left out, as if the sources did not have them; a source of none but these counts as none.
    names
        What messages call each source besides its number, such as its file; none by default.

    Returns
    -------
    record : RainRecord
        Columns in the network's order, on a regular axis over the union of all sources, in the first source's clock. A
        step of a finer source needs all its parts, else it is missing. Intervals of a coarser source, and
        accumulations, are spread over their steps in the pattern of the recording gauges
        (:func:`basinrain.spreading.spread_totals`); they stand in ``totals``. Outside a gauge's time of service nothing
        counts. Totals-only sources alone give a record of storm totals.
    notes : tuple of Note
        The notes of the records, those of gauges that are left out excepted; ``total-not-used``, ``totals-joined``,
        ``value-out-of-service``, ``mixed-reading-hours``, ``spread-evenly``.

    Raises
    ------
    DataError
        Gauges of the network without rain or the reverse; zones that some sources have and others have not; steps that
        neither divide nor are a multiple of the common one; intervals off the common bounds; a gauge with values in two
        sources at one time; all of a kind together.
    JobError
        The common step is not understood, or a storm's times are needed and not given.

    Examples
    --------
    A recorder and a daily gauge that was read at 08:00:

    >>> network = GaugeNetwork(ids=("R", "D"), x=[0.0, 4000.0], y=[0.0, 0.0], crs="local")
    >>> ends = np.datetime64("2031-06-04T08:00:00") + 6 * np.arange(1, 5) * np.timedelta64(3600, "s")
    >>> six = np.timedelta64(21600, "s")
    >>> recorder = RainRecord.from_depths(("R",), ends - six, ends, [[0.0], [12.0], [24.0], [0.0]], step="6h")
    >>> daily = RainRecord.from_depths(("D",), ends[3:] - 4 * six, ends[3:], [[48.0]], step="1d")
    >>> record, notes = bring_to_step([recorder, daily], network)
    >>> record.depth[:, 1]
    array([ 0., 16., 32.,  0.])
    """
    if not records:
        problems = Problems()
        problems.add(item="rainfall", found="no source", expected="at least one")
        problems.raise_as(JobError)
    used = without_gauges(dict(enumerate(records, 1)), exclude)
    check_membership(list(used.values()), network)
    remarks = [note for record in used.values() for note in record.notes if note.gauge not in exclude]
    labels = {number: _name(number, record, names) for number, record in used.items()}
    timed = {number: record for number, record in used.items() if record.step != "storm"}
    if not timed:
        return merge_storm_totals(used, network), tuple(remarks)
    zone = one_clock({number: record.zone for number, record in timed.items()}, labels)
    sources = _sources(used, labels, zone, storm_times)
    grid = common_grid(sources, common)
    step = grid.interval
    placed = [place(source, grid) for source in sources]
    first = min(part.first for part in placed)
    n = max(part.first + len(part.depth) for part in placed) - first
    bounds = grid.bounds(first + np.arange(n + 1))
    depth, status = merge_sources(sources, placed, network.ids, first, bounds)
    status[status == ABSENT] = Status.MISSING
    totals = [total for part in placed for total in part.totals]
    notes = unused_values(network, take_out_of_service(network, depth, status, bounds, totals))
    day_phase, mixed = _day_phase(sources, step, grid)
    recorders = frozenset(
        gauge for source in sources if relation(source.interval, step) == "finer" for gauge in source.gauges
    )
    record = RainRecord(
        network.ids,
        bounds[:-1],
        bounds[1:],
        depth,
        status,
        step=step.label,
        zone=zone,
        day_phase=day_phase,
        recorders=recorders,
    )
    record, evenly = spread_totals(record, network, totals)
    remarks += [note for part in placed for note in part.notes]
    return record, (*remarks, *notes, *mixed, *evenly)


def _name(number: int, record: RainRecord, names: Sequence[str]) -> str:
    beside = f", {names[number - 1]}" if names else ""
    return f"source {number} ({record.step}{beside})"


def _sources(
    records: Mapping[int, RainRecord],
    labels: Mapping[int, str],
    zone: str,
    storm_times: Mapping[str, tuple[np.datetime64, np.datetime64]] | None,
) -> list[Source]:
    """Return the sources in the clock of ``zone``, storm totals with their times."""
    sources = []
    problems = Problems()
    for number, record in records.items():
        name = labels[number]
        if record.step == "storm":
            starts, ends = storm_bounds(record, storm_times or {}, name, problems)
            order = np.argsort(ends, kind="stable")
            sources.append(
                Source(
                    name, None, record.gauges, starts[order], ends[order], record.depth[order], record.status[order], ()
                )
            )
            continue
        shift = np.timedelta64(clock_seconds(zone) - clock_seconds(record.zone) if zone else 0, "s")
        totals = tuple(replace(t, start=t.start + shift, end=t.end + shift) for t in record.totals)
        sources.append(
            Source(
                name,
                parse_interval(record.step),
                record.gauges,
                record.starts + shift,
                record.ends + shift,
                record.depth,
                record.status,
                totals,
            )
        )
    problems.raise_as(JobError)
    return sources


def _day_phase(sources: Sequence[Source], step: Interval, grid: Grid) -> tuple[int, list[Note]]:
    """Return the second at which the rainfall day begins, and a note where the daily gauges do not agree on it."""
    if step.whole_days:
        return grid.phase % DAY, []
    gauges: dict[int, dict[str, None]] = {}
    for source in sources:
        for hour in reading_hours(source):
            gauges.setdefault(hour, {}).update(dict.fromkeys(source.gauges))
    if len(gauges) < 2:
        return next(iter(gauges), 0), []
    listed = "; ".join(f"{clock_name(hour)[1:]} {', '.join(ids)}" for hour, ids in sorted(gauges.items()))
    text = f"Daily gauges are read at different hours: {listed}. Days are taken from midnight to midnight."
    return 0, [Note(code="mixed-reading-hours", text=text)]

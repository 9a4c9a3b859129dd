"""What a job's files hold, read, changed by its edits, screened and brought into the working plane."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import Any, TypeVar, cast

import numpy as np
import numpy.typing as npt

from basinrain import reading
from basinrain.basins import Basins
from basinrain.catch import correct_catch
from basinrain.colocated import merge_colocated
from basinrain.errors import BasinRainError, JobError, Problem, Problems, ReadError, nearest_name
from basinrain.gauges import GaugeNetwork, refuse_colocated
from basinrain.ground import Plane
from basinrain.infill_choice import infill_options
from basinrain.jobfile import Job
from basinrain.jobfile.tables import BasinsJob, EditTable, RainfallTable, StormTable
from basinrain.jobfile.times import edit_window_times, rainfall_day_start, storm_window_times
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.reading.options import of_source
from basinrain.screening import (
    Edit,
    Screening,
    ScreeningOptions,
    apply_edits,
    apply_rejections,
    screen,
    spread_edits,
)
from basinrain.screening.edits import Action
from basinrain.spreading import spread_totals
from basinrain.units import depth_factor

__all__ = [
    "Inputs",
    "attempt",
    "catch_factors",
    "edits_of",
    "input_digests",
    "read_basins_of",
    "read_gauges_of",
    "read_inputs",
    "window_of",
]

_SHAPEFILE_PARTS = frozenset({".shp", ".shx", ".dbf", ".prj", ".cpg"})

_T = TypeVar("_T")


@dataclass(frozen=True, eq=False)
class Inputs:
    """A job's gauges, record and basins, ready to compute with.

    Parameters
    ----------
    network, basins
        In the working plane; basins with the union's row.
    plane
        The working plane.
    raw
        The record at the common step, edited, as the checks saw it.
    record
        The same without what was rejected, corrected for catch.
    screening
        What the checks found in ``raw``, how consistent the years are without what was rejected, and what the job says
        of it.
    edits
        The job's changes of the record.
    edit_rows
        What each of them did, as plain values.
    notes
        What the reading had to remark.
    """

    network: GaugeNetwork
    raw: RainRecord
    record: RainRecord
    basins: Basins
    plane: Plane
    screening: Screening
    edits: tuple[Edit, ...]
    edit_rows: tuple[dict[str, Any], ...]
    notes: tuple[Note, ...]


def read_inputs(job: Job, say: Callable[[str], None]) -> Inputs:
    """Read a job's files, edit and screen the record, and bring all of it into the working plane.

    Parameters
    ----------
    job
        The job.
    say
        Called with a few words before each part of the work.

    Raises
    ------
    BasinRainError
        A file, an edit, or an entry of ``[screening]`` is at fault; every problem found is listed.
    """
    say("reading")
    network, raw, basins, edits, rows, notes = _read(job)
    network, basins, plane, ground_notes = reading.settle(network, basins, plane=job.job.plane)
    notes += ground_notes
    say("screening")
    screening = _screen(job, raw, network)
    record = apply_rejections(raw, screening.findings)
    if record is not raw:
        # Daily depths were spread in the times of recorders, some of which may have been rejected.
        record, spread_notes = spread_totals(replace(record, totals=()), network, record.totals)
        notes = (*(note for note in notes if note.code != "spread-evenly"), *spread_notes)
    # Each gauge has a catch of its own, so it is corrected before gauges at one place are merged.
    record = correct_catch(record, catch_factors(job, network))
    if job.gauges.colocated == "mean":
        network, record, merged = merge_colocated(network, record)
        notes += merged
    else:
        refuse_colocated(network)
    return Inputs(network, raw, record, basins, plane, screening, edits, rows, notes)


def _read(
    job: Job,
) -> tuple[GaugeNetwork, RainRecord, Basins, tuple[Edit, ...], tuple[dict[str, Any], ...], tuple[Note, ...]]:
    """Read every file; the problems of all files are reported together."""
    problems = Problems()
    network = attempt(problems, partial(read_gauges_of, job))
    records = [attempt(problems, partial(_read_source, job, k, source)) for k, source in enumerate(job.rainfall, 1)]
    basins = attempt(problems, partial(read_basins_of, job))
    # An option that the infill method does not take is told with the rest, not after it.
    attempt(problems, partial(infill_options, job))
    problems.raise_as(ReadError)
    # A reader that gave nothing has left a problem, so from here on everything is there.
    network, (polygons, basin_notes) = cast("GaugeNetwork", network), cast("tuple[Basins, tuple[Note, ...]]", basins)
    sources = cast("list[RainRecord]", records)
    zone = next((source.zone for source in sources if not np.isnat(source.ends).any()), "")
    edits = edits_of(job, zone, [source.gauges for source in sources])
    edited, rows = apply_edits(sources, edits)
    excluded = set(job.gauges.exclude)
    timed = [source.zone for source in sources if not source.labels and not excluded.issuperset(source.gauges)]
    record, step_notes = reading.bring_to_step(
        edited,
        network,
        common=job.step.common,
        storm_times=_storm_times(job, timed[0] if timed else ""),
        exclude=job.gauges.exclude,
        names=[source.paths[0] for source in job.rainfall],
    )
    return network, record, polygons, edits, tuple(rows), (*basin_notes, *step_notes, *spread_edits(record, edits))


def attempt(problems: Problems, work: Callable[[], _T]) -> _T | None:
    """Return what ``work`` gives; where it fails, keep its problems and return None."""
    try:
        return work()
    except BasinRainError as error:
        problems.extend(error)
        return None


def read_gauges_of(job: Job) -> GaugeNetwork:
    """Return a job's gauges as their file has them."""
    table = job.gauges
    return reading.read_gauges(
        job.path(table.file),
        layer=table.layer,
        crs=table.crs,
        length_unit=table.length_unit,
        elevation_unit=table.elevation_unit,
        normal_unit=table.normal_unit,
        normal_period=table.normal_period,
        columns=table.columns,
        exclude=table.exclude,
    )


def _read_source(job: Job, number: int, table: RainfallTable) -> RainRecord:
    options = table.model_dump(exclude={"file", "files"})
    with of_source(number, table.paths[0]):
        return reading.read_rainfall([job.path(name) for name in table.paths], **options)


def read_basins_of(job: BasinsJob) -> tuple[Basins, tuple[Note, ...]]:
    """Return a job's basins as their file has them, and what was remarked."""
    table = job.basins
    return reading.read_basins(job.path(table.file), **table.model_dump(exclude={"file"}))


def edits_of(job: Job, zone: str, gauges: Sequence[Sequence[str]]) -> tuple[Edit, ...]:
    """Return the job's edits with their times in a clock, that of the first source that has one.

    ``gauges`` are the gauges of every source, by which the day is known that a bare date names.
    """
    problems = Problems()
    edits = []
    for number, table in enumerate(job.edit, start=1):
        edit = attempt(problems, partial(_edit, job, table, number, zone, gauges))
        if edit is not None:
            edits.append(edit)
    problems.raise_as(JobError)
    return tuple(edits)


def _edit(job: Job, table: EditTable, number: int, zone: str, gauges: Sequence[Sequence[str]]) -> Edit:
    mine = [job.rainfall[k] for k, ids in enumerate(gauges) if table.gauge in ids] or job.rainfall
    days = {rainfall_day_start([source]) for source in mine}
    dated = any(text is not None and len(text) <= len("2031-05-04") for text in (table.start, table.end))
    if dated and len(days) > 1:
        raise JobError(
            Problem(
                item=f"[[edit]] {number} (gauge {table.gauge})",
                found="a date, in sources of the gauge whose days begin at different hours",
                expected="from and to with a time of day",
                remedy="write 2031-05-04T07:00:00",
                gauge=table.gauge,
            )
        )
    start, end = edit_window_times(table, number, zone, day_start=next(iter(days)))
    value = table.value
    if table.action == "set" and not isinstance(value, str) and value is not None:
        value *= depth_factor(job.job.depth_unit)
    return Edit(
        gauge=table.gauge,
        start=start,
        end=end,
        action=cast("Action", table.action),
        value=value,
        reason=table.reason,
        by=table.by,
        date=table.date,
        number=number,
    )


def _screen(job: Job, record: RainRecord, network: GaugeNetwork) -> Screening:
    table = job.screening
    problems = Problems()
    for gauge in table.unheated:
        if gauge not in network.ids:
            problems.add(
                item="[screening] unheated",
                found=f"'{gauge}'",
                expected="the id of a gauge",
                remedy=nearest_name(gauge, network.ids),
                gauge=gauge,
            )
    if bool(table.unheated) != bool(table.cold_months):
        problems.add(
            item="[screening]",
            found="unheated without cold_months" if table.unheated else "cold_months without unheated",
            expected="both: the gauges without heating, and the months in which precipitation may be snow",
            remedy="add the other",
        )
    problems.raise_as(JobError)
    envelope = None if table.envelope is None else reading.read_envelope(job.path(table.envelope))
    return screen(
        record,
        network,
        options=ScreeningOptions(
            envelope=envelope,
            unheated=table.unheated,
            cold_months=table.cold_months,
            depth_unit="in" if job.job.depth_unit == "in" else "mm",
        ),
        reject=table.reject,
        accept=table.accept,
    )


def window_of(job: Job, table: StormTable, zone: str) -> tuple[np.datetime64 | None, np.datetime64 | None]:
    """Return a storm's start and end in the record's clock; None where the job states none."""
    return storm_window_times(table, zone, day_start=rainfall_day_start(job.rainfall))


def _storm_times(job: Job, zone: str) -> dict[str, tuple[np.datetime64, np.datetime64]]:
    windows = {table.name: window_of(job, table, zone) for table in job.storm}
    return {name: (start, end) for name, (start, end) in windows.items() if start is not None and end is not None}


def catch_factors(job: Job, network: GaugeNetwork) -> dict[str, npt.NDArray[np.float64]]:
    """Return the twelve catch factors of every gauge that has any, by its id."""
    problems = Problems()
    factors = {}
    for gauge, value in job.gauges.catch_factor.items():
        months = np.array(value if isinstance(value, tuple) else [value] * 12, dtype=float)
        if gauge not in network.ids:
            problems.add(
                item=f"[gauges] catch_factor of {gauge}",
                found="a gauge that is not in the network",
                expected="the id of a gauge",
                gauge=gauge,
            )
        elif len(months) != 12:
            problems.add(
                item=f"[gauges] catch_factor of {gauge}",
                found=f"{len(months)} values",
                expected="one value, or twelve from January to December",
                gauge=gauge,
            )
        factors[gauge] = months
    problems.raise_as(JobError)
    return factors


def input_digests(job: BasinsJob, files: Sequence[str] | None = None) -> dict[str, str]:
    """Return the SHA-256 of every input file, or of some of them, by its name in the job."""
    names = job.input_names if files is None else files
    return {part: _digest(job.path(part)) for name in names for part in _parts(job, name)}


def _parts(job: BasinsJob, name: str) -> list[str]:
    """Return the files that one name stands for: a shapefile has its table, index and projection beside it."""
    path = job.path(name)
    if path.suffix.lower() != ".shp":
        return [name]
    beside = [p.name for p in path.parent.iterdir() if p.stem == path.stem and p.suffix.lower() in _SHAPEFILE_PARTS]
    return [str(Path(name).with_name(part)) for part in sorted(beside)]


def _digest(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()

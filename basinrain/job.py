"""The run of a job: the only place that knows the order of the rooms.

reading → screening → infill → averaging → storms → cautions; writing and report take the result from here.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import partial
from importlib.metadata import version
from pathlib import Path
from typing import TypeVar, cast

import numpy as np
import numpy.typing as npt

from basinrain import reading
from basinrain.averaging import Weigher, averaging_method
from basinrain.basin_depths import average_storm
from basinrain.basins import Basins
from basinrain.catch import correct_catch
from basinrain.cautions import network_cautions, record_cautions, storm_cautions
from basinrain.colocated import merge_colocated
from basinrain.errors import BasinRainError, DataError, JobError, MethodError, Problem, Problems, ReadError
from basinrain.gauges import GaugeNetwork, refuse_colocated
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.jobfile import Job, read_job
from basinrain.jobfile.tables import RainfallTable, StormTable
from basinrain.jobfile.times import rainfall_day_start, storm_window_times
from basinrain.notes import Note, once
from basinrain.rainfall import RainRecord, Status
from basinrain.results import StormResult, StormRun
from basinrain.storms import Storm, borrowed_times, hyetograph_shape, storm_window

__all__ = ["run_storm"]

_SHAPEFILE_PARTS = frozenset({".shp", ".shx", ".dbf", ".prj", ".cpg"})

_T = TypeVar("_T")
Report = Callable[[str], None]


def run_storm(job: Job | str | Path, settings: Sequence[str] = (), *, progress: Report | None = None) -> StormRun:
    r"""Run a job's storms: infill, average by every method, compare.

    Parameters
    ----------
    job
        A job, or the path of a job file.
    settings
        Changes to the file in the command line's words, ``"infill.method=normal-ratio"``.
    progress
        Called with a few words before each part of the work.

    Returns
    -------
    StormRun
        Nothing has been written; see :meth:`~basinrain.results.StormRun.write`.

    Raises
    ------
    BasinRainError
        The job, a file or the data are at fault; every problem found is listed.

    Examples
    --------
    >>> import tempfile
    >>> folder = Path(tempfile.mkdtemp())
    >>> _ = (folder / "gauges.csv").write_text("id,x,y\nA,2.5,5\nB,7.5,5\nC,11,5\n")
    >>> _ = (folder / "rain.csv").write_text("gauge,depth\nA,10\nB,30\nC,100\n")
    >>> _ = (folder / "basins.geojson").write_text(
    ...     '{"type": "Polygon", "coordinates": [[[0, 0], [10, 0], [10, 10], [0, 10], [0, 0]]]}'
    ... )
    >>> _ = (folder / "job.toml").write_text(
    ...     '[job]\nname = "Square"\n[gauges]\nfile = "gauges.csv"\ncrs = "local"\nlength_unit = "km"\n'
    ...     '[rainfall]\nfile = "rain.csv"\nlayout = "totals"\nunit = "mm"\n'
    ...     '[basins]\nfile = "basins.geojson"\ncrs = "local"\nlength_unit = "km"\n'
    ... )
    >>> run = run_storm(folder / "job.toml", ["averaging.methods=['arithmetic', 'thiessen']"])
    >>> run.basin_means[["basin", "method", "depth"]].values.tolist()
    [['1', 'arithmetic', 20.0], ['1', 'thiessen', 25.25]]
    """
    say = progress or (lambda _: None)
    if not isinstance(job, Job):
        job = read_job(job, settings)
    elif settings:
        raise JobError(
            Problem(
                item="settings",
                found="settings beside a job that is already resolved",
                expected="settings with the path of a job file",
                remedy="give them to read_job",
            )
        )
    say("reading")
    network, record, basins, notes = _read(job)
    network, basins, plane, ground_notes = reading.settle(network, basins, plane=job.job.plane)
    notes += ground_notes
    # Each gauge has a catch of its own, so it is corrected before gauges at one place are merged.
    record = correct_catch(record, _catch_factors(job, network))
    if job.gauges.colocated == "mean":
        network, record, merged = merge_colocated(network, record)
        notes += merged
    else:
        refuse_colocated(network)
    storms, window_notes = _storms(job, record)
    notes += window_notes

    say("weights")
    weighers = _weighers(job, network, basins)
    options = InfillOptions(**job.infill.model_dump())
    # Of the whole record, since a gap may be longer than the storm.
    long = longer_than(record, gap_mask(record), options.longest_gap)
    results = []
    for storm in storms:
        say(f"storm {storm.name}")
        window = storm.cut(record)
        _require_reporting(storm, window)
        completed = complete(window, network, options, long=long[storm.first : storm.stop])
        result, found = _run_one(job, storm, completed, network, basins, weighers)
        results.append(result)
        notes += found
    in_use = np.any([~(r.completed.record.status == Status.NOT_INSTALLED).all(axis=0) for r in results], axis=0)
    notes += (*network_cautions(network.subset(in_use), basins), *record_cautions(record))
    return StormRun(
        name=job.job.name,
        settings=job.model_dump(mode="json", exclude_none=True),
        depth_unit=job.job.depth_unit,
        area_unit=job.job.area_unit,
        network=network,
        basins=basins,
        plane=plane,
        record=record,
        storms=tuple(results),
        notes=once(notes, [storm.name for storm in storms]),
        inputs=_digests(job),
        versions={name: version(name) for name in ("basinrain", "numpy", "scipy", "shapely", "pyproj", "pandas")},
        facts=_facts(job, results[0]),
    )


def _read(job: Job) -> tuple[GaugeNetwork, RainRecord, Basins, tuple[Note, ...]]:
    """Read every file; the problems of all files are reported together."""
    problems = Problems()
    network = _try(problems, partial(_read_gauges, job))
    records = [_try(problems, partial(_read_source, job, source)) for source in job.rainfall]
    basins = _try(problems, partial(_read_basins, job))
    problems.raise_as(ReadError)
    # A reader that gave nothing has left a problem, so from here on everything is there.
    network, (polygons, basin_notes) = cast("GaugeNetwork", network), cast("tuple[Basins, tuple[Note, ...]]", basins)
    sources = cast("list[RainRecord]", records)
    excluded = set(job.gauges.exclude)
    timed = [source.zone for source in sources if not source.labels and not excluded.issuperset(source.gauges)]
    record, step_notes = reading.bring_to_step(
        sources,
        network,
        common=job.step.common,
        storm_times=_storm_times(job, timed[0] if timed else ""),
        exclude=job.gauges.exclude,
    )
    return network, record, polygons, (*basin_notes, *step_notes)


def _try(problems: Problems, read: Callable[[], _T]) -> _T | None:
    try:
        return read()
    except BasinRainError as error:
        problems.extend(error)
        return None


def _read_gauges(job: Job) -> GaugeNetwork:
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


def _read_source(job: Job, table: RainfallTable) -> RainRecord:
    options = table.model_dump(exclude={"file", "files"})
    return reading.read_rainfall([job.path(name) for name in table.paths], **options)


def _read_basins(job: Job) -> tuple[Basins, tuple[Note, ...]]:
    table = job.basins
    return reading.read_basins(job.path(table.file), **table.model_dump(exclude={"file"}))


def _window(job: Job, table: StormTable, zone: str) -> tuple[np.datetime64 | None, np.datetime64 | None]:
    return storm_window_times(table, zone, day_start=rainfall_day_start(job.rainfall))


def _storm_times(job: Job, zone: str) -> dict[str, tuple[np.datetime64, np.datetime64]]:
    windows = {table.name: _window(job, table, zone) for table in job.storm}
    return {name: (start, end) for name, (start, end) in windows.items() if start is not None and end is not None}


def _storms(job: Job, record: RainRecord) -> tuple[list[Storm], tuple[Note, ...]]:
    """Return the job's storms; without any the whole record is the storm, or each storm of a file of totals."""
    tables = job.storm or tuple(StormTable(name=name) for name in (record.labels or ("whole record",)))
    problems = Problems()
    names = [table.name for table in tables]
    for name in sorted({name for name in names if names.count(name) > 1}):
        problems.add(item=f"storm {name}", found="the name twice", expected="each storm its own name")
    storms: list[Storm] = []
    notes: list[Note] = []
    for table in tables:
        found = _try(problems, partial(_storm, job, table, record))
        if found is not None:
            storms.append(found[0])
            notes += found[1]
    problems.raise_as(JobError)
    return storms, tuple(notes)


def _storm(job: Job, table: StormTable, record: RainRecord) -> tuple[Storm, tuple[Note, ...]]:
    start, end = _window(job, table, record.zone)
    return storm_window(record, table.name, start=start, end=end, pattern=table.pattern)


def _catch_factors(job: Job, network: GaugeNetwork) -> dict[str, npt.NDArray[np.float64]]:
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


def _weighers(job: Job, network: GaugeNetwork, basins: Basins) -> dict[str, Weigher]:
    """Prepare every averaging method once, on the full network."""
    return {
        name: averaging_method(name)(network, basins, job.averaging.options(name)) for name in job.averaging.methods
    }


def _facts(job: Job, result: StormResult) -> dict[str, str]:
    """Return what the methods tell of themselves, and what was given for normals and catch."""
    tables = [depths.table for depths in result.depths.values()]
    facts = {note.code: note.text for table in tables for note in table.notes if note.level == "info"}
    if job.gauges.normal_period:
        facts["normals"] = f"Normals of {job.gauges.normal_period}."
    if job.gauges.catch_factor:
        facts["catch"] = "Catch factors applied to: " + ", ".join(sorted(job.gauges.catch_factor)) + "."
    return facts


def _require_reporting(storm: Storm, window: RainRecord) -> None:
    if not window.reporting.any():
        raise DataError(
            Problem(
                item=f"storm {storm.name}",
                found="no gauge reporting in it",
                expected="one gauge at least",
                remedy="correct the storm's times, or add a record",
            )
        )


def _run_one(  # noqa: PLR0917 - each room's product, in order
    job: Job,
    storm: Storm,
    completed: Completed,
    network: GaugeNetwork,
    basins: Basins,
    weighers: dict[str, Weigher],
) -> tuple[StormResult, tuple[Note, ...]]:
    depths = {name: average_storm(completed, weigher) for name, weigher in weighers.items()}
    shapes = hyetograph_shape(completed, storm, network, basins)
    if not any(d.table.answered.any() for d in depths.values()):
        raise MethodError(
            Problem(
                item=f"storm {storm.name}",
                found="no averaging method with a number for any basin",
                expected="one at least",
                remedy="add 'thiessen' or 'idw' to [averaging] methods",
            )
        )
    notes = (
        *borrowed_times(storm, completed),
        *(note if note.storm else replace(note, storm=storm.name) for note in completed.notes),
        *(
            replace(note, storm=storm.name)
            for result in depths.values()
            for note in result.table.notes
            if note.level == "warning"
        ),
        *storm_cautions(storm.name, network, basins, depths, depth_unit=job.job.depth_unit),
    )
    return StormResult(storm, completed, depths, tuple(shapes)), notes


def _digests(job: Job) -> dict[str, str]:
    names = [job.gauges.file, *(name for source in job.rainfall for name in source.paths), job.basins.file]
    return {part: _digest(job.path(part)) for name in names for part in _parts(job, name)}


def _parts(job: Job, name: str) -> list[str]:
    """Return the files that one name stands for: a shapefile has its table, index and projection beside it."""
    path = job.path(name)
    if path.suffix.lower() != ".shp":
        return [name]
    beside = [p.name for p in path.parent.iterdir() if p.stem == path.stem and p.suffix.lower() in _SHAPEFILE_PARTS]
    return [str(Path(name).with_name(part)) for part in sorted(beside)]


def _digest(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()

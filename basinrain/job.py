"""The run of a job: the only place that knows the order of the rooms.

inputs (reading → edits → screening) → infill → averaging → storms → cautions; writing and report take the result.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np
import numpy.typing as npt

from basinrain.averager import Averager
from basinrain.averaging import averaging_method
from basinrain.basin_depths import average_storm
from basinrain.basins import Basins
from basinrain.cautions import network_cautions, record_cautions, screening_cautions, storm_cautions
from basinrain.errors import DataError, JobError, MethodError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.infill import Completed
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.infill_choice import InfillChoice, choose_infill, compare
from basinrain.infill_effect import infill_effect, infill_spread_cautions
from basinrain.inputs import Inputs, attempt, read_inputs, window_of
from basinrain.job_parts import Report, choice_fact, common_fields, resolved
from basinrain.jobfile import Job
from basinrain.jobfile.tables import StormTable
from basinrain.notes import Note, once
from basinrain.rainfall import RainRecord, Status
from basinrain.results import InfillRun, ScreenRun, StormResult, StormRun
from basinrain.series_check import series_check
from basinrain.series_job import largest_storms
from basinrain.storms import Storm, borrowed_times, hyetograph_shape, storm_window

__all__ = ["run_infill", "run_screen", "run_storm"]


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
    job, say = resolved(job, settings), progress or (lambda _: None)
    given = read_inputs(job, say)
    network, record, basins = given.network, given.record, given.basins
    storms, window_notes = _storms(job, record)

    say("weights")
    weighers = _weighers(job, network, basins)
    infill = choose_infill(job, record, network, say)
    if job.storms is not None:
        chosen, chosen_notes = _chosen_storms(job, given, infill, say)
        storms, window_notes = [*storms, *chosen], (*window_notes, *chosen_notes)
    # Of the whole record, since a gap may be longer than the storm.
    long = longer_than(record, gap_mask(record), infill.options.longest_gap)
    results = []
    notes = [*given.notes, *window_notes, *infill.notes]
    for storm in storms:
        say(f"storm {storm.name}")
        window = storm.cut(record)
        _require_reporting(storm, window)
        completed = infill.complete(window, long=long[storm.first : storm.stop])
        result, found = _run_one(job, storm, completed, network, basins, weighers)
        result, moved = _moved(job, result, window, infill, network, weighers, long[storm.first : storm.stop], say)
        found += moved
        results.append(result)
        notes += found
    in_use = np.any([~(r.completed.record.status == Status.NOT_INSTALLED).all(axis=0) for r in results], axis=0)
    notes += (*network_cautions(network.subset(in_use), basins), *record_cautions(record))
    notes += screening_cautions(given.screening, storms)
    return StormRun(
        **common_fields(job, given, infill),
        storms=tuple(results),
        comparison=infill.comparison,
        notes=once(notes, [storm.name for storm in storms]),
        facts={**_facts(job, results[0]), **choice_fact(infill.comparison)},
    )


def run_screen(job: Job | str | Path, settings: Sequence[str] = (), *, progress: Report | None = None) -> ScreenRun:
    r"""Screen a job's record: is it fit to use.

    Parameters
    ----------
    job, settings, progress
        As for :func:`run_storm`.

    Returns
    -------
    ScreenRun
        Nothing has been written, and nothing changed but what the job's edits and rejections say.

    Raises
    ------
    BasinRainError
        The job, a file, an edit or an entry of ``[screening]`` is at fault; every problem found is listed.

    Examples
    --------
    2,000 mm in a day is more than was ever measured. The value stays until the job rejects it.

    >>> import tempfile
    >>> folder = Path(tempfile.mkdtemp())
    >>> _ = (folder / "gauges.csv").write_text("id,x,y\nA,0,0\nB,1,0\nC,2,0\n")
    >>> _ = (folder / "basins.geojson").write_text(
    ...     '{"type": "Polygon", "coordinates": [[[0, 0], [2, 0], [2, 2], [0, 2], [0, 0]]]}'
    ... )
    >>> _ = (folder / "job.toml").write_text(
    ...     '[job]\nname = "Three in a row"\n[gauges]\nfile = "gauges.csv"\ncrs = "local"\nlength_unit = "km"\n'
    ...     '[rainfall]\nfile = "rain.csv"\nunit = "mm"\ninterval = "1d"\n'
    ...     '[basins]\nfile = "basins.geojson"\ncrs = "local"\nlength_unit = "km"\n'
    ... )
    >>> _ = (folder / "rain.csv").write_text("date,A,B,C\n2031-05-04,8,2000,6\n2031-05-05,0,0,\n")
    >>> run = run_screen(folder / "job.toml")
    >>> run.findings[["check", "gauge", "severity", "state"]].values.tolist()
    [['greatest-depths', 'B', 'erroneous', 'open']]
    >>> run = run_screen(folder / "job.toml", ["screening.reject=['greatest-depths B']"])
    >>> run.findings["state"].tolist(), run.record.depth[0]
    (['rejected'], array([ 8., nan,  6.]))
    """
    job, say = resolved(job, settings), progress or (lambda _: None)
    given = read_inputs(job, say)
    notes = (*given.notes, *record_cautions(given.record))
    return ScreenRun(**common_fields(job, given), raw=given.raw, notes=once(notes, ()))


def run_infill(job: Job | str | Path, settings: Sequence[str] = (), *, progress: Report | None = None) -> InfillRun:
    r"""Compare the infill methods on a job's own network, gauge by gauge left out, and complete its record.

    Parameters
    ----------
    job, settings, progress
        As for :func:`run_storm`.

    Returns
    -------
    InfillRun
        Nothing has been written. The whole record is infilled by the method that the job names, or by the one that
        the comparison takes where it names ``"leave-one-out"``; day by day unless the job gives another scale.

    Raises
    ------
    BasinRainError
        The job, a file or the data are at fault; every problem found is listed.

    Examples
    --------
    B always has the mean of A and C, so leaving it out shows no error with the station average.

    >>> import tempfile
    >>> folder = Path(tempfile.mkdtemp())
    >>> _ = (folder / "gauges.csv").write_text("id,x,y\nA,0,0\nB,1,0\nC,2,0\n")
    >>> _ = (folder / "basins.geojson").write_text(
    ...     '{"type": "Polygon", "coordinates": [[[0, 0], [2, 0], [2, 2], [0, 2], [0, 0]]]}'
    ... )
    >>> _ = (folder / "job.toml").write_text(
    ...     '[job]\nname = "Three in a row"\n[gauges]\nfile = "gauges.csv"\ncrs = "local"\nlength_unit = "km"\n'
    ...     '[rainfall]\nfile = "rain.csv"\nunit = "mm"\ninterval = "1d"\n'
    ...     '[basins]\nfile = "basins.geojson"\ncrs = "local"\nlength_unit = "km"\n'
    ... )
    >>> rows = [(2, 3, 4), (9, 7, 5), (0, 4, 8), (6, 6, 6), (1, 2, 3), (5, "", 7)]
    >>> lines = [f"2031-05-{4 + day:02d},{a},{b},{c}" for day, (a, b, c) in enumerate(rows)]
    >>> _ = (folder / "rain.csv").write_text("\n".join(["date,A,B,C", *lines]))
    >>> run = run_infill(folder / "job.toml", ["infill.method='station-average'"])
    >>> scores = run.infill_scores.set_index(["infill_method", "gauge"])["rmse"]
    >>> float(scores["station-average", "B"]), float(scores["nearest-gauge", "B"].round(2))
    (0.0, 2.1)
    >>> run.infilled[["gauge", "depth", "donors"]].values.tolist()
    [['B', 6.0, 'A:0.5 C:0.5']]
    """
    job, say = resolved(job, settings), progress or (lambda _: None)
    given = read_inputs(job, say)
    say("comparing")
    comparison = compare(job, given.record, given.network, say)
    infill = choose_infill(job, given.record, given.network, say, comparison=comparison, whole_record=True)
    say("completing")
    completed = infill.complete(given.record)
    record, n_basins = given.record, len(given.basins)
    whole = Storm("whole record", 0, len(record), record.starts[0], record.ends[-1])
    say("weights")
    weighers = _weighers(job, given.network, given.basins)
    depths = {name: average_storm(completed, weigher) for name, weigher in weighers.items()}
    result = StormResult(whole, completed, depths, (("mean", None),) * n_basins)
    long = longer_than(record, gap_mask(record), infill.options.longest_gap)
    result, moved = _moved(job, result, record, infill, given.network, weighers, long, say)
    notes = (
        *given.notes,
        *infill.notes,
        *completed.notes,
        *record_cautions(record),
        *(replace(note, storm="") for note in (*moved, *screening_cautions(given.screening, [whole]))),
    )
    return InfillRun(
        **common_fields(job, given, infill),
        storms=(result,),
        comparison=comparison,
        completed=completed,
        notes=once(notes, ()),
        facts=choice_fact(comparison),
    )


def _moved(  # noqa: PLR0917 - each room's product, in order
    job: Job,
    result: StormResult,
    window: RainRecord,
    infill: InfillChoice,
    network: GaugeNetwork,
    weighers: dict[str, Averager],
    long: npt.NDArray[np.bool_],
    say: Report,
) -> tuple[StormResult, tuple[Note, ...]]:
    """Return a storm's result with how far infilling moved it; nothing is said where nothing was infilled."""
    checks = series_check(result.completed.record, result.depths)
    if not result.completed.estimates:
        return replace(result, checks=checks), ()
    effect = infill_effect(
        window,
        network,
        result.completed,
        weighers,
        options=infill.options,
        asked=infill.asked,
        long=long,
        relations=infill.relations,
        ratios=infill.ratios,
        progress=lambda label: say(f"storm {result.storm.name} by {label}"),
    )
    ids = next(iter(result.depths.values())).table.basins
    notes = infill_spread_cautions(result.storm.name, ids, effect, depth_unit=job.job.depth_unit)
    return replace(result, effect=effect, checks=checks), tuple(notes)


def _storms(job: Job, record: RainRecord) -> tuple[list[Storm], tuple[Note, ...]]:
    """Return the storms that the job names; where it neither names nor seeks any, the record, or each of its totals."""
    tables = job.storm
    if not tables and job.storms is None:
        tables = tuple(StormTable(name=name) for name in (record.labels or ("whole record",)))
    problems = Problems()
    names = [table.name for table in tables]
    for name in sorted({name for name in names if names.count(name) > 1}):
        problems.add(item=f"storm {name}", found="the name twice", expected="each storm its own name")
    storms: list[Storm] = []
    notes: list[Note] = []
    for table in tables:
        found = attempt(problems, partial(_storm, job, table, record))
        if found is not None:
            storms.append(found[0])
            notes += found[1]
    problems.raise_as(JobError)
    return storms, tuple(notes)


def _chosen_storms(job: Job, given: Inputs, infill: InfillChoice, say: Report) -> tuple[list[Storm], tuple[Note, ...]]:
    """Return the largest storms of the record, each with its rank and day for a name."""
    found = largest_storms(job, given, say, comparison=infill.comparison)
    if not found.taken:
        raise DataError(
            Problem(
                item="[storms]",
                found="; ".join(note.text for note in found.notes if note.code == "storms-not-sought")
                or f"no storm in the series of {found.basin} whose steps all have a number",
                expected="one at least",
                remedy="name the storms in [[storm]], or lower wet_depth",
            )
        )
    pattern = "mean" if job.storms is None else job.storms.pattern
    storms = []
    for ranked in found.taken:
        event = ranked.event
        name = f"No. {ranked.rank}, {event.start.astype('datetime64[D]')}"
        storm, _ = storm_window(given.record, name, start=event.start, end=event.end, pattern=pattern)
        storms.append(storm)
    return storms, found.notes


def _storm(job: Job, table: StormTable, record: RainRecord) -> tuple[Storm, tuple[Note, ...]]:
    start, end = window_of(job, table, record.zone)
    return storm_window(record, table.name, start=start, end=end, pattern=table.pattern)


def _weighers(job: Job, network: GaugeNetwork, basins: Basins) -> dict[str, Averager]:
    """Prepare every averaging method once, on the full network."""
    methods = [(averaging_method(name), job.averaging.options(name)) for name in job.averaging.methods]
    return {
        method.name: Averager(method(network, basins, options), partial(method.reweigher, network, basins, options))
        for method, options in methods
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
    weighers: dict[str, Averager],
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

"""``basinrain series``: the whole record of a job, basin by basin and step by step."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import Final, cast

import numpy as np
import numpy.typing as npt

from basinrain.averaging import choose_grid
from basinrain.basins import UNION
from basinrain.cautions import network_cautions
from basinrain.errors import JobError, Problem, Problems, nearest_name
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Comparison
from basinrain.infill.spans import span_starts
from basinrain.infill_choice import InfillChoice, choose_infill, infill_options
from basinrain.inputs import Inputs, attempt, input_digests, read_inputs
from basinrain.job_parts import Report, choice_fact, common_fields, library_versions, resolved
from basinrain.jobfile import Job
from basinrain.jobfile.series_tables import ESTIMATED_GAP, TOTAL, StormsTable
from basinrain.notes import Note, once
from basinrain.rainfall import RainRecord
from basinrain.reading.intervals import parse_interval
from basinrain.results_series import SeriesRun
from basinrain.run_chunks import check_place, run_chunks
from basinrain.series.chunks import ChunkSource, LoadChunk
from basinrain.series.dominance import dominances
from basinrain.series.engine import SeriesSetup
from basinrain.series.found_storms import FoundStorms, find_storms
from basinrain.series.long_term import LeftOut, gauges_to_leave_out, left_out
from basinrain.series.network_changes import network_changes
from basinrain.series.policies import REWEIGHT
from basinrain.series.regrouping import Regrouping, regroup
from basinrain.series.steps import DAY
from basinrain.series.summary import summarise
from basinrain.series_cautions import series_cautions
from basinrain.series_check import WET_DEPTH
from basinrain.series_inputs import SeriesInputs, borders_of, held_inputs
from basinrain.series_parts import needs_parts, parted_inputs
from basinrain.series_store import SeriesStore
from basinrain.units import depth_factor

__all__ = ["WET_DAY", "largest_storms", "run_series", "series_setup", "storms_of_series"]

Counted = Callable[[int, int], None]
"""Is called with the steps that are done and all steps."""

WET_DAY: Final = 1.0
"""mm; a day with at least this depth is wet, as in the indices of climate change (ETCCDI; from memory)."""

_DURATIONS: Final = ("5min", "10min", "15min", "30min", "1h", "2h", "3h", "6h", "12h", "1d", "2d", "3d", "5d", "10d")
"""Of the greatest depths, as far as the record's step divides them, where the job names none."""


def run_series(
    job: Job | str | Path,
    settings: Sequence[str] = (),
    *,
    progress: Report | None = None,
    counted: Counted | None = None,
    work: str | Path | None = None,
) -> SeriesRun:
    r"""Average a job's whole record over its basins, step by step, while gauges come and go.

    Parameters
    ----------
    job
        A job, or the path of a job file.
    settings
        Changes to the file in the command line's words, ``"series.gaps=reweight"``.
    progress
        Called with a few words before each part of the work.
    counted
        Called with the number of steps that are done, and of all.
    work
        A folder for the parts that are finished, from which the same job goes on if it is interrupted; held in memory
        where not given.

    Returns
    -------
    SeriesRun
        Nothing has been written but into ``work``; see :meth:`~basinrain.results.Run.write`.

    Raises
    ------
    BasinRainError
        The job, a file or the data are at fault; every problem found is listed.

    Examples
    --------
    B is silent on the second day: A has the square alone, or B has what its neighbours have.

    >>> import tempfile
    >>> folder = Path(tempfile.mkdtemp())
    >>> _ = (folder / "gauges.csv").write_text("id,x,y\nA,0,1\nB,2,1\nC,4,1\n")
    >>> _ = (folder / "basins.geojson").write_text(
    ...     '{"type": "Polygon", "coordinates": [[[0, 0], [2, 0], [2, 2], [0, 2], [0, 0]]]}'
    ... )
    >>> _ = (folder / "job.toml").write_text(
    ...     '[job]\nname = "Two and one"\n[gauges]\nfile = "gauges.csv"\ncrs = "local"\nlength_unit = "km"\n'
    ...     '[rainfall]\nfile = "rain.csv"\nunit = "mm"\ninterval = "1d"\n'
    ...     '[basins]\nfile = "basins.geojson"\ncrs = "local"\nlength_unit = "km"\n'
    ...     '[averaging]\nmethods = "thiessen"\n[infill]\nmethod = "station-average"\n'
    ... )
    >>> _ = (folder / "rain.csv").write_text("date,A,B,C\n2031-05-04,8,4,2\n2031-05-05,6,,2\n")
    >>> run = run_series(folder / "job.toml", ["series.gaps=['reweight', 'infill']"])
    >>> run.series_means[["gaps", "depth", "steps_infilled", "steps_reweighted"]].values.tolist()
    [['reweight', 12.0, 0, 1], ['infill', 11.0, 1, 0]]
    """
    job, say = resolved(job, settings), progress or (lambda _: None)
    inputs = parted_inputs(job, say) if needs_parts(job) else held_inputs(read_inputs(job, say), _longest_gap(job))
    given = inputs.given
    grouping, durations = _checked(job, inputs)
    setup, infill, facts, notes = series_setup(job, given, say)
    borders = borders_of(inputs, setup, job.series.memory)
    source = inputs.chunks(borders)
    store = SeriesStore.open(
        None if work is None else Path(work),
        key=_key(job, setup, borders),
        n_steps=len(inputs.starts),
        n_basins=len(setup.basins),
        series=setup.series,
        borders=borders,
    )
    try:
        say("series")
        run_chunks(setup, source, store, on=job.series.on, workers=job.series.workers, progress=counted)
        say("summing up")
        summaries = {
            (gaps, method): summarise(
                store,
                gaps,
                method,
                inputs.starts,
                inputs.ends,
                durations=durations,
                water_year=job.series.water_year,
                complete=job.series.complete,
                day_phase=given.record.day_phase,
            )
            for gaps, method in setup.series
        }
        storms = storms_of_series(job, inputs, setup, store)
        say("leaving out gauges")
        without = _left_out(job, inputs, setup, [source.task(k) for k in range(len(borders) - 1)], say)
        dominant = dominances(
            setup, {series: found.largest for series, found in summaries.items()}, partial(_day_of, source)
        )
        blocks = list(zip(borders[:-1].tolist(), borders[1:].tolist(), strict=True))
        changes = network_changes(setup.network.ids, inputs.starts, blocks, inputs.absent, inputs.silent)
    except BaseException:
        store.close()
        raise
    notes = (
        *given.notes,
        *notes,
        *grouping.notes,
        *network_cautions(setup.network, setup.basins),
        *series_cautions(setup, summaries, without, changes, dominant, ends=inputs.ends, zone=given.record.zone),
        *storms.notes,
    )
    return SeriesRun(
        **common_fields(job, given, infill),
        setup=setup,
        starts=inputs.starts,
        ends=inputs.ends,
        store=store,
        grouping=grouping,
        summaries=summaries,
        storms=storms,
        left_out=without,
        changes=changes,
        notes=once(notes, ()),
        facts={**facts, **choice_fact(None if infill is None else infill.comparison)},
    )


def series_setup(
    job: Job, given: Inputs, say: Report, *, comparison: Comparison | None = None
) -> tuple[SeriesSetup, InfillChoice | None, dict[str, str], tuple[Note, ...]]:
    """Return what a job's series rest on, the infill that was chosen, facts for the report, and what is to be remarked.

    Nothing is chosen for a job that infills nothing.
    """
    infill: InfillChoice | None = None
    options = infill_options(job)
    notes: tuple[Note, ...] = ()
    if set(job.series.gaps) != {REWEIGHT}:
        infill = choose_infill(job, given.record, given.network, say, comparison=comparison, whole_record=True)
        options, notes = infill.options, infill.notes
    options, scale_notes = _scale_of_series(options)
    say("weights")
    methods = {name: job.averaging.options(name) for name in job.averaging.methods}
    facts = {}
    if "idw" in methods:
        grid = choose_grid(given.network, given.basins, **methods["idw"])
        methods["idw"] = {**methods["idw"], "cell": None, "grid": grid}
        facts["grid"] = grid.sentence
    needs_relations = infill is not None and options.chosen_method.needs_relations
    setup = SeriesSetup(
        network=given.network,
        basins=given.basins,
        methods=methods,
        gaps=job.series.gaps,
        infill=options,
        relations=infill.relations if infill is not None and needs_relations else None,
        normal_ratios=None if infill is None else infill.ratios,
        ratios=job.series.weigh == "ratios",
    )
    return setup, infill, facts, (*notes, *scale_notes)


def _scale_of_series(options: InfillOptions) -> tuple[InfillOptions, tuple[Note, ...]]:
    """Return the options with a scale that a record can have: it is no storm, so its days are infilled."""
    if options.scale in {"step", "day"}:
        return options, ()
    text = "A record is no storm: its gaps are infilled by the day, though [infill] scale is 'storm'."
    told = () if options.scale is None else (Note(code="scale-of-series", text=text, level="info"),)
    return replace(options, scale="day"), told


def storms_of_series(job: Job, inputs: SeriesInputs, setup: SeriesSetup, store: SeriesStore) -> FoundStorms:
    """Return the storms of the series of one basin, by the first policy and method of the job."""
    table = job.storms or StormsTable()
    gaps, method = setup.series[0]
    column = setup.basins.ids.index(_basin_of_storms(table, setup.basins.ids))
    return find_storms(
        inputs.starts,
        inputs.ends,
        np.array(store.depth(gaps, method)[:, column], dtype=float),
        basin=setup.basins.ids[column],
        gaps=gaps,
        method=method,
        count=table.count,
        dry_gap=None if table.dry_gap == ESTIMATED_GAP else _length(table.dry_gap),
        wet_depth=_wet_depth(inputs) if table.wet_depth is None else table.wet_depth * depth_factor(job.job.depth_unit),
        rank="total" if table.rank == TOTAL else _length(table.rank),
        recession=table.antecedent.recession,
    )


def largest_storms(job: Job, given: Inputs, say: Report, *, comparison: Comparison | None = None) -> FoundStorms:
    """Return the storms that ``[storms]`` chooses from a job's record, by its first policy and averaging method.

    ``comparison`` is that of the infill methods, where it has been made.
    """
    inputs = held_inputs(given, _longest_gap(job))
    _checked(job, inputs)
    setup, *_ = series_setup(job, given, say, comparison=comparison)
    first = replace(setup, gaps=setup.gaps[:1], methods=dict(list(setup.methods.items())[:1]))
    borders = borders_of(inputs, first, job.series.memory)
    with SeriesStore.open(
        None, key="", n_steps=len(inputs.starts), n_basins=len(setup.basins), series=first.series, borders=borders
    ) as store:
        say("looking for storms")
        run_chunks(first, inputs.chunks(borders), store)
        return storms_of_series(job, inputs, first, store)


def _longest_gap(job: Job) -> float:
    return infill_options(job).longest_gap


def _wet_depth(inputs: SeriesInputs) -> float:
    """Return the depth in mm from which a step is wet where the job names none; a day needs more than an hour."""
    daily = (inputs.ends[0] - inputs.starts[0]) >= np.timedelta64(1, "D")
    return WET_DAY if daily else WET_DEPTH


def _checked(job: Job, inputs: SeriesInputs) -> tuple[Regrouping, tuple[np.timedelta64, ...]]:
    """Return how steps are written and the durations of greatest depths; what cannot be is told before any work."""
    problems = Problems()
    record, table = inputs.given.record, job.series
    grouping = attempt(
        problems,
        partial(
            regroup,
            inputs.starts,
            inputs.ends,
            step=table.step,
            zone=record.zone,
            timezone=table.timezone,
            day_phase=record.day_phase,
        ),
    )
    attempt(problems, partial(check_place, table.on))
    attempt(problems, partial(_basin_of_storms, job.storms or StormsTable(), inputs.given.basins.ids))
    for gauge in table.leave_out or ():
        if gauge not in record.gauges:
            problems.add(
                item="[series] leave_out",
                found=f"'{gauge}'",
                expected="the id of a gauge",
                remedy=nearest_name(gauge, record.gauges),
                gauge=gauge,
            )
    durations = attempt(problems, partial(_durations, job, inputs))
    problems.raise_as(JobError)
    return cast("Regrouping", grouping), cast("tuple[np.timedelta64, ...]", durations)


def _durations(job: Job, inputs: SeriesInputs) -> tuple[np.timedelta64, ...]:
    lengths = np.unique((inputs.ends - inputs.starts).astype("timedelta64[s]").astype(np.int64))
    step = int(lengths[0])
    named = [("[series] durations", word) for word in job.series.durations]
    if job.storms is not None and job.storms.rank != TOTAL:
        named.append(("[storms] rank", job.storms.rank))
    problems = Problems()
    for item, word in named:
        seconds = parse_interval(word).seconds
        if len(lengths) > 1 or seconds is None or seconds % step:
            own = inputs.given.record.step
            problems.add(item=item, found=f"'{word}'", expected=f"a whole number of the record's steps of {own}")
    # Windows of the clock begin with the day; steps of 18 h, say, need not.
    off_clock = int(inputs.starts[0].astype(np.int64) - inputs.given.record.day_phase) % DAY % step > 0
    if off_clock and job.series.durations and not problems:
        problems.add(
            item="[series] durations",
            found=f"steps that do not begin with the day, the first of them at {inputs.starts[0]}",
            expected="a record whose first step begins a whole number of steps after its day does",
            remedy="leave durations out",
        )
    problems.raise_as(JobError)
    if len(lengths) > 1 or off_clock:
        return ()
    words = job.series.durations or [word for word in _DURATIONS if (parse_interval(word).seconds or 0) % step == 0]
    return tuple(_length(word) for word in words)


def _length(word: str) -> np.timedelta64:
    return np.timedelta64(parse_interval(word).seconds or 0, "s")


def _basin_of_storms(table: StormsTable, basins: Sequence[str]) -> str:
    """Return the basin in which storms are sought: the one named; of a single basin there is no union to name."""
    if table.basin in basins:
        return table.basin
    if table.basin == UNION and len(basins) == 1:
        return basins[0]
    raise JobError(
        Problem(
            item="[storms] basin",
            found=f"'{table.basin}'",
            expected="the id of a basin",
            remedy=nearest_name(table.basin, basins),
            basin=table.basin,
        )
    )


def _left_out(
    job: Job, inputs: SeriesInputs, setup: SeriesSetup, chunks: Sequence[LoadChunk], say: Report
) -> tuple[LeftOut, ...]:
    gauges = job.series.leave_out
    if gauges is None:
        gauges = () if inputs.held is None else gauges_to_leave_out(setup, inputs.held)
    return left_out(setup, chunks, gauges, progress=lambda gauge: say(f"without gauge {gauge}")) if gauges else ()


def _day_of(source: ChunkSource, step: int) -> tuple[RainRecord, npt.NDArray[np.bool_] | None, int]:
    """Return the rainfall day that holds a step, its long gaps, and the step's place in it."""
    k = int(np.searchsorted(source.borders, step, side="right")) - 1
    chunk, long = source.task(k)()
    place = step - int(source.borders[k])
    days = np.append(span_starts(chunk, "day"), len(chunk))
    at = int(np.searchsorted(days, place, side="right")) - 1
    first, stop = int(days[at]), int(days[at + 1])
    return chunk.window(first, stop), None if long is None else long[first:stop], place - first


def _key(job: Job, setup: SeriesSetup, borders: npt.NDArray[np.int64]) -> str:
    """Return what decides the numbers of a series, as one word: parts of another job are never taken for this one's."""
    decides = job.model_dump(mode="json", by_alias=True, exclude={"storm", "storms", "series", "job"})
    told = {
        "job": decides,
        "plane": job.job.plane,
        "depth_unit": job.job.depth_unit,  # what edits set is given in it
        "series": setup.series,
        "weigh": job.series.weigh,
        "infill": setup.infill.label,
        "inputs": input_digests(job),
        "versions": library_versions(),
        "borders": borders.tolist(),
    }
    return hashlib.sha256(json.dumps(told, sort_keys=True, default=str).encode()).hexdigest()

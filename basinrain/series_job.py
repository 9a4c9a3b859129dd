"""``basinrain series``: the whole record of a job, basin by basin and step by step."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averaging import choose_grid
from basinrain.blas import one_blas_thread
from basinrain.cautions import network_cautions
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Comparison
from basinrain.infill_choice import InfillChoice, choose_infill, infill_options
from basinrain.inputs import Inputs, input_digests, read_inputs
from basinrain.job_parts import Report, choice_fact, common_fields, library_versions, resolved
from basinrain.jobfile import Job
from basinrain.jobfile.series_tables import ESTIMATED_GAP, TOTAL, StormsTable
from basinrain.notes import Note, once
from basinrain.rainfall import RainRecord
from basinrain.results_series import SeriesRun
from basinrain.run_chunks import run_chunks
from basinrain.series.chunks import LoadChunk
from basinrain.series.dominance import dominances
from basinrain.series.engine import SeriesEngine, SeriesSetup
from basinrain.series.found_storms import FoundStorms, find_storms
from basinrain.series.long_term import LeftOut, gauges_to_leave_out, left_out
from basinrain.series.network_changes import network_changes
from basinrain.series.policies import REWEIGHT
from basinrain.series.series_source import copied
from basinrain.series.summary import SeriesSummary, summarise
from basinrain.series_asked import basin_of_storms, checked, length_of, wet_depth_of
from basinrain.series_cautions import series_cautions
from basinrain.series_inputs import SeriesInputs, borders_of, held_inputs
from basinrain.series_parts import needs_parts, parted_inputs
from basinrain.series_store import SeriesStore

__all__ = ["largest_storms", "run_series", "series_setup", "storms_of_series"]

Counted = Callable[[int, int], None]
"""Is called with the steps that are done and all steps."""

_LOOKED_AT: Final = 50
"""Largest depths of a series whose weights are looked at."""


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
        Nothing has been written but into ``work``; see :meth:`~basinrain.results_common.Run.write`.

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
    grouping, durations = checked(job, inputs)
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
        with one_blas_thread():
            without = _left_out(job, inputs, setup, [source.task(k) for k in range(len(borders) - 1)], say)
        blocks = list(zip(borders[:-1].tolist(), borders[1:].tolist(), strict=True))
        in_use = np.any([~inputs.absent(first, stop).all(axis=0) for first, stop in blocks], axis=0)
        engine = SeriesEngine(setup)
        usual = {method: engine.weights(method, in_use) for method in setup.methods}
        largest = {series: _looked_at(found) for series, found in summaries.items()}
        dominant = dominances(setup, largest, usual, _Days(inputs).holding)
        changes = network_changes(setup.network.ids, inputs.starts, blocks, inputs.absent, inputs.silent)
    except BaseException:
        store.close()
        raise
    notes = (
        *given.notes,
        *notes,
        *grouping.notes,
        *network_cautions(setup.network.subset(in_use), setup.basins),
        *series_cautions(
            setup, summaries, without, changes, dominant, usual=usual, ends=inputs.ends, zone=given.record.zone
        ),
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
    column = setup.basins.ids.index(basin_of_storms(table, setup.basins.ids))
    return find_storms(
        inputs.starts,
        inputs.ends,
        copied(store.depth(gaps, method), slice(0, store.n_steps), slice(column, column + 1))[:, 0],
        basin=setup.basins.ids[column],
        gaps=gaps,
        method=method,
        count=table.count,
        dry_gap=None if table.dry_gap == ESTIMATED_GAP else length_of(table.dry_gap),
        wet_depth=wet_depth_of(job, inputs),
        rank="total" if table.rank == TOTAL else length_of(table.rank),
        recession=table.antecedent.recession,
    )


def largest_storms(job: Job, given: Inputs, say: Report, *, comparison: Comparison | None = None) -> FoundStorms:
    """Return the storms that ``[storms]`` chooses from a job's record, by its first policy and averaging method.

    ``comparison`` is that of the infill methods, where it has been made.
    """
    inputs = held_inputs(given, _longest_gap(job))
    checked(job, inputs)
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


def _left_out(
    job: Job, inputs: SeriesInputs, setup: SeriesSetup, chunks: Sequence[LoadChunk], say: Report
) -> tuple[LeftOut, ...]:
    gauges = job.series.leave_out
    if gauges is None:
        gauges = () if inputs.held is None else gauges_to_leave_out(setup, inputs.held)
    return left_out(setup, chunks, gauges, progress=lambda gauge: say(f"without gauge {gauge}")) if gauges else ()


def _looked_at(found: SeriesSummary) -> npt.NDArray[np.int64]:
    """Return the steps of a series whose weights are looked at, (n, n_basins): -1 but for the largest depths of all."""
    depth = found.largest_depth
    if depth.size <= _LOOKED_AT:
        return found.largest
    least = np.partition(depth, depth.size - _LOOKED_AT, axis=None)[depth.size - _LOOKED_AT]
    return np.where(depth >= least, found.largest, -1)


class _Days:
    """The rainfall days of a record."""

    def __init__(self, inputs: SeriesInputs) -> None:
        self._inputs = inputs
        begin, end = inputs.starts.astype(np.int64), inputs.ends.astype(np.int64)
        # A step belongs to the day that holds its middle.
        self._day = (begin + (end - begin) // 2 - inputs.given.record.day_phase) // 86400

    def holding(self, step: int) -> tuple[RainRecord, npt.NDArray[np.bool_] | None, int]:
        """Return the day that holds a step, its long gaps, and the step's place in it."""
        first, stop = np.searchsorted(self._day, [self._day[step], self._day[step] + 1]).tolist()
        return self._inputs.part(first, stop), self._inputs.silent(first, stop), step - first


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

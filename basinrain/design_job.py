"""``basinrain design``: from point depths to the hyetograph of every basin, and how rare storms were."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import cached_property, partial
from pathlib import Path
from typing import Any, NoReturn

import numpy as np

from basinrain import reading
from basinrain.blas import one_blas_thread
from basinrain.design_areas import Areas, areas_of
from basinrain.design_asked import Asked, asked
from basinrain.design_cautions import design_cautions
from basinrain.design_patterns import pattern_choices
from basinrain.design_rarity import ObservedStorms, storm_rarities
from basinrain.design_record import RecordSource, record_source
from basinrain.design_reduction import reducer, stated_options
from basinrain.design_sources import Sourced, interval_factors, sourced
from basinrain.designstorm.areal_reduction import areal_reduction, outside_region
from basinrain.designstorm.depth_chain import DepthChain, Links
from basinrain.designstorm.design_storms import DesignStorm, PatternChoice, design_storm
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.storm_depths import StormRarity
from basinrain.errors import BasinRainError, JobError, MethodError, Problem
from basinrain.infill_choice import InfillChoice, choose_infill
from basinrain.inputs import Inputs, read_basins_of, read_inputs
from basinrain.job_parts import Report, basin_fields, choice_fact, refuse_settings
from basinrain.jobfile import DesignJob, Job, read_design_job
from basinrain.jobfile.design_tables import RECORD, RarityTable, minutes_of
from basinrain.notes import once
from basinrain.results_design import ComparedReduction, DesignRun

__all__ = ["run_design"]


def run_design(
    job: Job | DesignJob | str | Path, settings: Sequence[str] = (), *, progress: Report | None = None
) -> DesignRun:
    r"""Make a job's design storms: point depths, areal reduction, temporal patterns; and how rare storms were.

    Parameters
    ----------
    job
        A job, or the path of a job file. Gauges are read only where something asks for them.
    settings
        Changes to the file in the command line's words, ``"design.aep=[0.1, 0.01]"``.
    progress
        Called with a few words before each part of the work.

    Returns
    -------
    DesignRun
        Nothing has been written; see :meth:`~basinrain.results_common.Run.write`.

    Raises
    ------
    BasinRainError
        The job, a file or the data are at fault; every problem found is listed.

    Examples
    --------
    60 mm in 6 h over 100 square miles, by the areal reduction of Leclerc and Schaake:

    >>> import tempfile
    >>> folder = Path(tempfile.mkdtemp())
    >>> _ = (folder / "basins.geojson").write_text(
    ...     '{"type": "Polygon", "coordinates": [[[0, 0], [10, 0], [10, 10], [0, 10], [0, 0]]]}'
    ... )
    >>> _ = (folder / "depths.csv").write_text("duration,aep,depth\n1h,0.1,40\n6h,0.1,60\n")
    >>> _ = (folder / "job.toml").write_text(
    ...     '[job]\nname = "Ten miles square"\narea_unit = "mi2"\n'
    ...     '[basins]\nfile = "basins.geojson"\ncrs = "local"\nlength_unit = "mi"\n'
    ...     '[design]\naep = 0.1\ndurations = "6h"\nstep = "1h"\njurisdiction = "United States"\n'
    ...     '[design.depths]\nfrom = "table"\nfile = "depths.csv"\nunit = "mm"\nprobability = "aep"\n'
    ...     'series = "annual-maximum"\nsource = "invented"\ndate = 2031\n'
    ...     '[design.areal_reduction]\nmethod = "leclerc-schaake"\n'
    ...     '[[design.pattern]]\nshape = "uniform"\n'
    ... )
    >>> run = run_design(folder / "job.toml")
    >>> run.design_depths[["area", "duration", "point_depth", "reduction", "areal_depth"]].round(4).values.tolist()
    [[100.0, '6h', 60.0, 0.887, 53.2193]]
    """
    say = progress or (lambda _: None)
    if isinstance(job, Job | DesignJob):
        refuse_settings(settings)
    else:
        job = read_design_job(job, settings)
    wanted = asked(job)
    say("reading")
    given = _Given(job, wanted, say)
    areas = areas_of(wanted.design, given.basins)
    observed, record = given.observed(areas), given.record_source(areas)
    if record is not None:
        depths = _of_record(record, areas, wanted.design.depths.average)
    else:
        depths = sourced(job, wanted.design, areas.basins)
    choices = pattern_choices(job, wanted.design, observed.ordinates if observed is not None else _no_storms)
    say("design storms")
    chain = _chain(job, wanted, areas, depths, record)
    links = _links(chain, areas, wanted)
    storms = _storms(chain, areas, wanted, choices)
    rarities: tuple[StormRarity, ...] = ()
    if observed is not None:
        say("how rare storms were")
        unadjusted = None if record is None or chain.interval_factor is not None else record.step
        rarities = storm_rarities(observed, chain, wanted, table_step=unadjusted)
    compared = _compared(chain, areas, wanted)
    fields = basin_fields(job, given.basins, given.plane, files=given.files)
    infill = given.infill
    if infill is not None:
        fields["settings"] = {**fields["settings"], "infill": infill.settings}
    return DesignRun(
        **fields,
        asked=wanted,
        areas=areas,
        sourced=depths,
        chain=chain,
        links=links,
        storms=storms,
        compared=compared,
        rarities=rarities,
        from_record=record,
        start=wanted.start,
        zone=given.zone,
        notes=once(
            (
                *given.notes,
                *(() if infill is None else infill.notes),
                *(() if record is None else record.notes),
                *(() if observed is None else observed.notes),
                *design_cautions(
                    wanted,
                    areas,
                    depths,
                    links=links,
                    storms=storms,
                    rarities=rarities,
                    record=record,
                    area_unit=job.job.area_unit,
                    depth_unit=job.job.depth_unit,
                ),
            ),
            (),
        ),
        facts=choice_fact(None if infill is None else infill.comparison),
    )


class _Given:
    """A job's basins, and its gauges with their record where something asks for them."""

    def __init__(self, job: Job | DesignJob, wanted: Asked, say: Report) -> None:
        self._job, self._wanted, self._say = job, wanted, say
        design = wanted.design
        self._of_storms = design.rarity is not None or any(table.storm is not None for table in design.pattern)
        self._of_record = design.depths.origin == RECORD
        self.inputs: Inputs | None = None
        if isinstance(job, Job) and (self._of_storms or self._of_record):
            self.inputs = given = read_inputs(job, say)
            self.basins, self.plane, self.notes = given.basins, given.plane, given.notes
        else:
            basins, notes = read_basins_of(job)
            self.basins, self.plane, more = reading.settle_basins(basins, plane=job.job.plane)
            self.notes = (*notes, *more)

    @property
    def files(self) -> tuple[str, ...]:
        """The input files that are read, as the job names them."""
        if self.inputs is not None:
            return self._job.input_names
        return (self._job.basins.file, *self._wanted.design.input_names)

    @property
    def zone(self) -> str:
        return "" if self.inputs is None else self.inputs.record.zone

    @cached_property
    def _infill_of_storms(self) -> InfillChoice:
        job, given = self._gauged()
        return choose_infill(job, given.record, given.network, self._say)

    @cached_property
    def _infill_of_record(self) -> InfillChoice:
        job, given = self._gauged()
        comparison = self._infill_of_storms.comparison if self._of_storms else None
        return choose_infill(job, given.record, given.network, self._say, comparison=comparison, whole_record=True)

    def _gauged(self) -> tuple[Job, Inputs]:
        if not isinstance(self._job, Job) or self.inputs is None:  # asked() has refused such a job
            raise TypeError("gauges of a job that has none")
        return self._job, self.inputs

    @property
    def infill(self) -> InfillChoice | None:
        """How gaps were infilled, if the record was read."""
        if self.inputs is None:
            return None
        return self._infill_of_record if self._of_record else self._infill_of_storms

    def observed(self, areas: Areas) -> ObservedStorms | None:
        if not self._of_storms:
            return None
        job, given = self._gauged()
        table = self._wanted.design.rarity or RarityTable()
        return ObservedStorms(job, given, areas, self._infill_of_storms, table.average)

    def record_source(self, areas: Areas) -> RecordSource | None:
        if not self._of_record:
            return None
        job, given = self._gauged()
        self._say("depths from the record")
        with one_blas_thread():
            return record_source(job, self._wanted, given, areas.basins, infill=self._infill_of_record)


def _of_record(record: RecordSource, areas: Areas, average: str) -> Sourced:
    """Depths from the record are those of the areas themselves."""
    return Sourced(source=record.depths.depths, weights=np.eye(len(areas.names)), method=f"areal, by {average}")


def _chain(
    job: Job | DesignJob, wanted: Asked, areas: Areas, depths: Sourced, record: RecordSource | None
) -> DepthChain:
    design = wanted.design
    return DepthChain(
        source=depths.source,
        weights=depths.weights,
        areas=areas.basins.areas,
        convert=design.depths.convert,
        extrapolate=design.depths.extrapolate,
        interval_factor=interval_factors(design.depths, None if record is None else record.step),
        uplift=1.0 if design.uplift is None else design.uplift.factor,
        reduce=reducer(job, design),
    )


class _Cases:
    """Collects what cannot be made, each complaint once with the first case that has it."""

    def __init__(self) -> None:
        self._found: dict[Problem, list[tuple[str, ...]]] = {}

    def attempt(self, case: tuple[str, ...], work: Callable[[], Any]) -> Any:  # noqa: ANN401 - what work gives
        try:
            return work()
        except BasinRainError as error:
            for problem in error.problems:
                self._found.setdefault(problem, []).append(case)
            return None

    def raise_any(self) -> None:
        if self._found:
            raise MethodError(self._told(problem, cases) for problem, cases in self._found.items())

    @staticmethod
    def _told(problem: Problem, cases: list[tuple[str, ...]]) -> Problem:
        # What the complaint says itself is not said twice; a point called A is not said by the word AEP.
        said = (part for part in cases[0] if not re.search(rf"(?<!\w){re.escape(part)}(?!\w)", problem.item))
        first = ", ".join(said)
        more = f" and {len(cases) - 1} more" if cases[1:] else ""
        return replace(problem, item=": ".join(part for part in (f"{first}{more}".strip(), problem.item) if part))


def _links(chain: DepthChain, areas: Areas, wanted: Asked) -> dict[tuple[str, Frequency], Links]:
    minutes = np.array(wanted.minutes, dtype=float)
    cases, result = _Cases(), {}
    for area in areas.reduced(wanted.design):
        for frequency in wanted.frequencies:
            work = partial(chain.links, area.row, minutes, frequency, reduced_as=area.reduced_as)
            result[area.name, frequency] = cases.attempt((area.name, frequency.label), work)
    cases.raise_any()
    return result


def _storms(
    chain: DepthChain, areas: Areas, wanted: Asked, choices: Sequence[PatternChoice]
) -> tuple[DesignStorm, ...]:
    design = wanted.design
    cases, storms = _Cases(), []
    for point in areas.points:
        for frequency in wanted.frequencies:
            for minutes in wanted.minutes:
                for choice, table in zip(choices, design.pattern, strict=True):
                    if table.durations and minutes not in {minutes_of(word) for word in table.durations}:
                        continue
                    work = partial(
                        design_storm,
                        chain,
                        point,
                        frequency,
                        choice,
                        minutes=minutes,
                        step=wanted.step,
                        sub_basins=design.sub_basins,
                        own_area=design.own_area,
                    )
                    case = (point.name, frequency.label, duration_text(minutes), choice.label)
                    storms.append(cases.attempt(case, work))
    cases.raise_any()
    return tuple(storms)


def _compared(chain: DepthChain, areas: Areas, wanted: Asked) -> tuple[ComparedReduction, ...]:
    """Return the areal reductions that are shown beside; one without an answer says why."""
    table = wanted.design.areal_reduction
    if table is None:
        return ()
    result = []
    for name in table.compare:
        method, factors, reasons = areal_reduction(name), {}, {}
        options = stated_options(name, table)
        for area in areas.reduced(wanted.design):
            size = float(chain.areas[area.reduced_as])
            for frequency in wanted.frequencies:
                for minutes in wanted.minutes:
                    key = (area.name, frequency, minutes)
                    try:
                        factors[key] = float(
                            method.reduce(size, np.array([float(minutes)]), frequency, **options).factor[0]
                        )
                    except MethodError as error:
                        reasons[key] = "; ".join(f"{p.found}, expected {p.expected}" for p in error.problems)
        outside = outside_region(method, wanted.design.jurisdiction or None)
        region = ": ".join((method.region_words, *(str(value) for key, value in options.items() if key == "region")))
        result.append(
            ComparedReduction(method=method, region=region, outside=outside, factors=factors, reasons=reasons)
        )
    return tuple(result)


def _no_storms(name: str) -> NoReturn:
    raise JobError(Problem(item=f"storm {name}", found="a job without gauges", expected="a job with a record"))

"""What a job asks of its design storms, checked as a whole before any file is read."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import datetime
from functools import partial
from itertools import pairwise
from typing import TypeVar

import numpy as np

from basinrain.design_keys import check_depth_keys, check_one_of, check_pattern_keys, check_reduction_keys
from basinrain.design_reduction import COMPARABLE, stated_options
from basinrain.designstorm.areal_reduction import areal_reduction, check_jurisdiction
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.designstorm.patterns import PATTERNS
from basinrain.designstorm.patterns.peak import peak_fraction
from basinrain.errors import JobError, Problem, Problems, nearest_name
from basinrain.inputs import attempt
from basinrain.jobfile import DesignJob, Job
from basinrain.jobfile.design_tables import (
    EQUATION,
    NO_REDUCTION,
    RECORD,
    TABLE,
    ArealReductionTable,
    DesignDepthsTable,
    DesignTable,
    minutes_of,
)
from basinrain.jobfile.fields import is_month
from basinrain.jobfile.tables import AveragingTable

__all__ = ["Asked", "asked"]

_T = TypeVar("_T")


@dataclass(frozen=True, eq=False, kw_only=True)
class Asked:
    """What a job asks of its design storms.

    Parameters
    ----------
    design
        The job's table.
    frequencies
        How often depths are exceeded, the most frequent first, counted in the series of the depths; where it is to be
        converted, in an annual maximum series.
    minutes
        Durations in minutes, the shortest first.
    step
        The step in minutes.
    start
        The nominal start of every storm, if one is given.
    """

    design: DesignTable
    frequencies: tuple[Frequency, ...]
    minutes: tuple[int, ...]
    step: int
    start: np.datetime64 | None


def asked(job: Job | DesignJob) -> Asked:
    """Return what a job asks of its design storms.

    Raises
    ------
    JobError
        Keys that do not go together, or values that cannot be; all of them.

    Examples
    --------
    >>> from basinrain.jobfile import parse_design_job
    >>> job = parse_design_job(
    ...     {
    ...         "job": {"name": "Culvert"},
    ...         "basins": {"file": "basins.geojson"},
    ...         "design": {
    ...             "aep": 10,
    ...             "durations": "1h",
    ...             "step": "25min",
    ...             "depths": {"from": "table", "file": "d.csv", "unit": "mm", "probability": "aep", "date": 2031},
    ...             "pattern": {"shape": "triangular", "basis": "point"},
    ...         },
    ...     }
    ... )
    >>> asked(job)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [design.depths] series: found nothing; expected 'annual-maximum' or 'partial-duration', \
as the source has it; state it
    [design.depths] source: found nothing; expected where the depths come from: publication, volume, edition; state it
    [design] aep: found 10; expected a fraction between 0 and 1; write 0.1 for 10 %
    [design] durations: found 1h beside a step of 25min; expected a whole number of steps; choose a step that divides it
    [[design.pattern]] no. 1 basis: found it beside shape = 'triangular'; expected peak; remove it
    """
    design = job.design
    if design is None:
        raise JobError(Problem(item="[design]", found="no such table", expected="it to be given", remedy="add it"))
    problems = Problems()
    check_depth_keys(design.depths, problems)
    _check_depth_frequencies(design.depths, problems)
    series = ANNUAL_MAXIMUM if design.depths.origin == RECORD else design.depths.series
    frequencies = _frequencies(design, series or ANNUAL_MAXIMUM, problems)
    minutes = sorted(minutes_of(word) for word in design.durations)
    step = minutes_of(design.step)
    for each in minutes:
        if each < step or each % step:
            word = next(word for word in design.durations if minutes_of(word) == each)
            problems.add(
                item="[design] durations",
                found=f"{word} beside a step of {design.step}",
                expected="a whole number of steps" if each > step else "a duration of one step at least",
                remedy="choose a step that divides it" if each > step else "choose a shorter step",
            )
    start = _start(design, problems)
    _check_reduction(design, problems)
    _check_points(design, problems)
    _check_patterns(job, design, problems)
    _check_record(job, design, problems)
    problems.raise_as(JobError)
    return Asked(design=design, frequencies=frequencies, minutes=tuple(minutes), step=step, start=start)


def _start(design: DesignTable, problems: Problems) -> np.datetime64 | None:
    if design.start is None:
        return None
    when = None if is_month(design.start) else datetime.fromisoformat(design.start)
    if when is None or when.tzinfo is not None:
        problems.add(
            item="[design] start",
            found=f"'{design.start}'",
            expected="a date, or a date and time without an offset, such as 2031-05-04T06:00:00",
        )
        return None
    return np.datetime64(when, "s")


def _check_depth_frequencies(table: DesignDepthsTable, problems: Problems) -> None:
    """Tell which frequencies of rasters and of an equation cannot be."""
    if table.series is None:
        return
    for number, raster in enumerate(table.raster, start=1):
        item = f"[[design.depths.raster]] no. {number}"
        if raster.aep is not None:
            _named(f"{item} aep", partial(Frequency.of_aep, raster.aep), problems)
        if raster.return_period is not None:
            _named(f"{item} return_period", partial(Frequency, raster.return_period, table.series), problems)
    if table.origin == EQUATION:
        item, periods = "[design.depths] return_periods", table.return_periods
        for years in periods:
            _named(item, partial(Frequency, years, table.series), problems)
        for before, after in pairwise(periods):
            if after < before:
                problems.add(item=item, found=f"{after:g} years after {before:g}", expected="each once, rising")


def _frequencies(design: DesignTable, series: str, problems: Problems) -> tuple[Frequency, ...]:
    keys = ("aep", "return_periods")
    check_one_of("[design]", keys, (design.aep is not None, design.return_periods is not None), problems)
    if (design.aep is None) == (design.return_periods is None):
        return ()
    key, values = ("aep", design.aep) if design.aep is not None else ("return_periods", design.return_periods)
    found = []
    for value in values or ():
        make = Frequency.of_aep if key == "aep" else partial(Frequency, series=series)
        frequency = _named(f"[design] {key}", partial(make, value), problems)
        if frequency is not None:
            found.append(frequency)
    if series == PARTIAL_DURATION and design.depths.convert:
        found = [frequency.to(ANNUAL_MAXIMUM) for frequency in found]
    elif series == PARTIAL_DURATION and key == "aep":
        problems.add(
            item="[design] aep",
            found="annual exceedance probabilities beside depths of a partial duration series",
            expected="return_periods, which such a series has",
            remedy="write return_periods, or allow AEP = 1 - exp(-1/T) with [design.depths] convert = true",
        )
    return tuple(sorted(found))


def _named(item: str, work: Callable[[], _T], problems: Problems) -> _T | None:
    """Do work, and keep what it complains of under the name of a key; None then."""
    try:
        return work()
    except JobError as error:
        problems.extend(JobError([replace(problem, item=item) for problem in error.problems]))
        return None


def _check_reduction(design: DesignTable, problems: Problems) -> None:
    table = design.areal_reduction
    if table is None:
        return
    areal = design.depths.origin == RECORD
    for key, value in (("method", table.method), ("compare", ", ".join(table.compare))):
        if areal and value not in {NO_REDUCTION, ""}:
            problems.add(
                item=f"[design.areal_reduction] {key}",
                found=f"'{value}' beside depths from the record, which are areal already",
                expected=f"'{NO_REDUCTION}'" if key == "method" else "nothing",
                remedy="take the table out",
            )
    if table.method != NO_REDUCTION and not areal:
        attempt(problems, partial(check_jurisdiction, areal_reduction(table.method), design.jurisdiction or None))
    if table.method == NO_REDUCTION or not areal:
        _check_options(table, problems)
    for name in table.compare:
        if name not in COMPARABLE:
            problems.add(
                item="[design.areal_reduction] compare",
                found=f"'{name}', which is made of values of the job's own",
                expected="one of: " + ", ".join(COMPARABLE),
            )


def _check_options(table: ArealReductionTable, problems: Problems) -> None:
    """Tell what is wrong with a reduction's keys; with their values where all keys are there."""
    before = len(problems)
    check_reduction_keys(table, problems)
    if len(problems) == before:
        for name in dict.fromkeys((table.method, *(each for each in table.compare if each in COMPARABLE))):
            if name not in {NO_REDUCTION, TABLE}:
                attempt(problems, partial(_check_stated, name, table))


def _check_stated(name: str, table: ArealReductionTable) -> None:
    areal_reduction(name).check_options(stated_options(name, table))


def _check_points(design: DesignTable, problems: Problems) -> None:
    names = [point.name for point in design.point]
    for name in sorted({name for name in names if names.count(name) > 1}):
        problems.add(item=f"[[design.point]] {name}", found="the name twice", expected="each once")


def _check_patterns(job: Job | DesignJob, design: DesignTable, problems: Problems) -> None:
    labels = [pattern.label for pattern in design.pattern]
    for label in sorted({label for label in labels if labels.count(label) > 1}):
        problems.add(
            item=f"[[design.pattern]] {label}",
            found="the name twice",
            expected="each once",
            remedy="give every pattern a name",
        )
    for number, table in enumerate(design.pattern, start=1):
        item = f"[[design.pattern]] no. {number}"
        for word in table.durations:
            if word not in design.durations:
                problems.add(
                    item=f"{item} durations",
                    found=f"'{word}'",
                    expected="of [design] durations: " + ", ".join(design.durations),
                )
        check_pattern_keys(item, table, problems)
        if table.peak is not None and "peak" in PATTERNS[table.shape].options:
            _named(f"{item} peak", partial(peak_fraction, table.peak), problems)
        if table.storm is not None and table.storm not in _storms_of(job):
            known = _storms_of(job)
            problems.add(
                item=f"{item} storm",
                found=f"'{table.storm}'",
                expected="the name of a [[storm]] of the job",
                remedy=nearest_name(table.storm, known) if known else "add it, or choose another shape",
            )


def _storms_of(job: Job | DesignJob) -> tuple[str, ...]:
    return tuple(storm.name for storm in job.storm) if isinstance(job, Job) else ()


def _check_record(job: Job | DesignJob, design: DesignTable, problems: Problems) -> None:
    """Tell what needs gauges in a job that has none, and storms that it does not have."""
    if not isinstance(job, Job):
        wanted = [
            ("[design.depths] from", f"'{RECORD}'", design.depths.origin == RECORD),
            ("[design.rarity]", "it", design.rarity is not None),
        ]
        for item, found, here in wanted:
            if here:
                problems.add(
                    item=item,
                    found=f"{found} in a job without gauges",
                    expected="[gauges], [[rainfall]] and [[storm]]",
                    remedy="add them, or take it out",
                )
        if job.averaging.methods != AveragingTable().methods:
            problems.add(
                item="[averaging] methods",
                found="it in a job without gauges",
                expected="options of the methods alone",
                remedy="name the method in [design.depths] average",
            )
        return
    for name in () if design.rarity is None else design.rarity.storms:
        if name not in _storms_of(job):
            problems.add(
                item="[design.rarity] storms",
                found=f"'{name}'",
                expected="the name of a [[storm]] of the job",
                remedy=nearest_name(name, _storms_of(job)),
            )
    if design.rarity is not None and not job.storm:
        problems.add(item="[design.rarity]", found="no [[storm]]", expected="one at least", remedy="add it")

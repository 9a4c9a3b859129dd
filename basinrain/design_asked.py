"""What a job asks of its design storms, checked as a whole before any file is read."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from datetime import datetime
from functools import partial
from typing import Any, Final

import numpy as np

from basinrain.designstorm.areal_reduction import REDUCTIONS, areal_reduction, check_jurisdiction
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.designstorm.patterns import PATTERNS
from basinrain.designstorm.patterns.peak import peak_fraction
from basinrain.errors import JobError, Problem, Problems, nearest_name
from basinrain.inputs import attempt
from basinrain.intervals import parse_interval
from basinrain.jobfile import DesignJob, Job
from basinrain.jobfile.design_tables import (
    EQUATION,
    NO_REDUCTION,
    RASTERS,
    RECORD,
    TABLE,
    ArealReductionTable,
    DesignDepthsTable,
    DesignTable,
    PatternTable,
)
from basinrain.jobfile.fields import is_month

__all__ = ["Asked", "asked", "minutes_of"]

_NEEDED: Final[Mapping[str, tuple[str, ...]]] = {
    TABLE: ("file", "unit", "probability", "series", "source", "date"),
    RASTERS: ("raster", "unit", "series", "source", "date"),
    EQUATION: (
        "equation",
        "coefficients",
        "return_periods",
        "valid",
        "unit",
        "duration_unit",
        "series",
        "source",
        "date",
    ),
    RECORD: (),
}
"""The keys of ``[design.depths]`` without which depths of an origin cannot be had."""

_TAKEN: Final[Mapping[str, tuple[str, ...]]] = {
    TABLE: ("layout", "duration_unit", "columns", "crs", "convert", "extrapolate", "interval_factor", "average"),
    RASTERS: ("crs", "convert", "extrapolate", "interval_factor"),
    EQUATION: ("convert", "extrapolate", "interval_factor"),
    RECORD: (
        "durations",
        "gauges",
        "wet_season",
        "distribution",
        "beyond_record",
        "extrapolate",
        "interval_factor",
        "average",
    ),
}
"""The further keys that depths of an origin take."""

_WORDS: Final = {
    "source": "where the depths come from: publication, volume, edition",
    "date": "when they were published or read",
    "series": f"'{ANNUAL_MAXIMUM}' or '{PARTIAL_DURATION}', as the source has it",
    "unit": "that of the depths, such as 'mm', or of intensities, such as 'mm/h'",
    "probability": "what the column holds: 'aep', 'aep-percent' or 'return-period'",
    "file": "the file of depths",
    "raster": "one table [[design.depths.raster]] for every duration and frequency",
    "equation": "its name",
    "coefficients": "those of the equation: one set with an x, or one for every return period",
    "return_periods": "that of every set of coefficients, or the least and the greatest of a set with an x",
    "duration_unit": "that of the durations in the equation: 'min' or 'h'",
    "valid": "the shortest and the longest duration for which the equation holds",
}


@dataclass(frozen=True, eq=False, kw_only=True)
class Asked:
    """What a job asks of its design storms.

    Parameters
    ----------
    design
        The job's table.
    frequencies
        How often depths are exceeded, the most frequent first, counted in the series of the depths.
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
    _check_depths(design.depths, problems)
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


def minutes_of(word: str) -> int:
    """Return the minutes of a duration such as ``"6h"``.

    Examples
    --------
    >>> minutes_of("6h"), minutes_of("1d")
    (360, 1440)
    """
    return (parse_interval(word).seconds or 0) // 60


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


def _check_depths(table: DesignDepthsTable, problems: Problems) -> None:
    needed = _NEEDED[table.origin]
    for key in needed:
        if not getattr(table, key):
            problems.add(item=f"[design.depths] {key}", found="nothing", expected=_WORDS[key], remedy="state it")
    taken = {"origin", *needed, *_TAKEN[table.origin]}
    if table.interval_factor is not None and table.origin != RECORD:
        taken.add("observed_every")
    for key, info in type(table).model_fields.items():
        if key not in taken and getattr(table, key) != info.default:
            problems.add(
                item=f"[design.depths] {key}",
                found=f"it beside from = '{table.origin}'",
                expected="what goes with that: " + ", ".join(sorted(taken - {"origin"})),
                remedy="remove it",
            )
    if table.interval_factor is not None and table.observed_every is None and table.origin != RECORD:
        problems.add(
            item="[design.depths] observed_every",
            found="nothing",
            expected="the fixed interval at which the depths were read, which interval_factor needs",
            remedy="state it, or take interval_factor out",
        )
    for number, raster in enumerate(table.raster, start=1):
        if (raster.aep is None) == (raster.return_period is None):
            problems.add(
                item=f"[[design.depths.raster]] no. {number}",
                found="both or neither of aep and return_period",
                expected="one of them",
                remedy="give one of the two",
            )
    if table.valid is not None and minutes_of(table.valid[0]) >= minutes_of(table.valid[1]):
        problems.add(
            item="[design.depths] valid",
            found=f"{table.valid[0]} to {table.valid[1]}",
            expected="the shorter duration first",
        )


def _frequencies(design: DesignTable, series: str, problems: Problems) -> tuple[Frequency, ...]:
    if (design.aep is None) == (design.return_periods is None):
        problems.add(
            item="[design]",
            found="both or neither of aep and return_periods",
            expected="one of them",
            remedy="give one of the two",
        )
        return ()
    key, values = ("aep", design.aep) if design.aep is not None else ("return_periods", design.return_periods)
    found = []
    for value in values or ():
        make = Frequency.of_aep if key == "aep" else partial(Frequency, series=series)
        frequency = _named(f"[design] {key}", partial(make, value), problems)
        if frequency is not None:
            found.append(frequency)
    if key == "aep" and series == PARTIAL_DURATION:
        if design.depths.convert:
            found = [frequency.to(series) for frequency in found]
        else:
            problems.add(
                item="[design] aep",
                found="annual exceedance probabilities beside depths of a partial duration series",
                expected="return_periods, which such a series has",
                remedy="write return_periods, or allow AEP = 1 - exp(-1/T) with [design.depths] convert = true",
            )
    return tuple(sorted(found))


def _named(item: str, work: Any, problems: Problems) -> Any:  # noqa: ANN401 - what work gives
    """Do work, and keep what it complains of under the name of a key."""
    try:
        return work()
    except JobError as error:
        problems.extend(JobError([replace(problem, item=item) for problem in error.problems]))
        return None


def _check_reduction(design: DesignTable, problems: Problems) -> None:
    table = design.areal_reduction
    if table is None:
        return
    if table.method == NO_REDUCTION:
        _refuse_keys("[design.areal_reduction]", table, ("method", "compare"), f"method = '{NO_REDUCTION}'", problems)
    elif design.depths.origin == RECORD:
        problems.add(
            item="[design.areal_reduction] method",
            found=f"'{table.method}' beside depths from the record, which are areal already",
            expected=f"'{NO_REDUCTION}'",
            remedy="take the table out",
        )
    else:
        attempt(problems, partial(check_jurisdiction, areal_reduction(table.method), design.jurisdiction or None))
        _check_keys_of_reduction(table, problems)
    for name in table.compare:
        if areal_reduction(name).options:
            problems.add(
                item="[design.areal_reduction] compare",
                found=f"'{name}', which needs values of the job's own",
                expected="one of: " + ", ".join(each for each, method in REDUCTIONS.items() if not method.options),
            )


_OF_REDUCTION: Final[Mapping[str, tuple[tuple[str, ...], tuple[str, ...]]]] = {
    "arr-2019": (("region",), ()),
    "exponential": (("coefficients", "source"), ("valid", "valid_areas", "area_unit")),
    "table": (("file", "source", "area_unit"), ()),
}
"""The keys that a method of areal reduction needs, and those that it takes besides."""


def _check_keys_of_reduction(table: ArealReductionTable, problems: Problems) -> None:
    needed, taken = _OF_REDUCTION.get(table.method, ((), ()))
    for key in needed:
        if not getattr(table, key):
            problems.add(
                item=f"[design.areal_reduction] {key}",
                found="nothing",
                expected=f"it, which method = '{table.method}' needs",
                remedy="state it",
            )
    keys = ("method", "area", "outside", "compare", *needed, *taken)
    _refuse_keys("[design.areal_reduction]", table, keys, f"method = '{table.method}'", problems)
    if table.valid_areas is not None and table.area_unit is None:
        problems.add(
            item="[design.areal_reduction] area_unit",
            found="nothing",
            expected="the unit of valid_areas",
            remedy="state it",
        )


def _refuse_keys(item: str, table: Any, taken: Iterable[str], beside: str, problems: Problems) -> None:  # noqa: ANN401
    for key, info in type(table).model_fields.items():
        if key not in taken and getattr(table, key) != info.default:
            problems.add(
                item=f"{item} {key}", found=f"it beside {beside}", expected=", ".join(taken), remedy="remove it"
            )


def _check_points(design: DesignTable, problems: Problems) -> None:
    names = [point.name for point in design.point]
    for name in {name for name in names if names.count(name) > 1}:
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
        _check_options(item, table, problems)
        if table.storm is not None and table.storm not in _storms_of(job):
            problems.add(
                item=f"{item} storm",
                found=f"'{table.storm}'",
                expected="the name of a [[storm]] of the job",
                remedy=nearest_name(table.storm, _storms_of(job)),
            )


def _check_options(item: str, table: PatternTable, problems: Problems) -> None:
    """Tell options that the shape does not take, and what it lacks."""
    options = PATTERNS[table.shape].options
    files = {"table": ("file", "percent", "columns"), "observed": ("storm",)}.get(table.shape, ())
    taken = ("name", "shape", "durations", *files, *(option for option in options if option != "ordinates"))
    for key, info in type(table).model_fields.items():
        if key not in taken and getattr(table, key) != info.default:
            words = ", ".join(taken[3:]) or "no options"
            problems.add(
                item=f"{item} {key}",
                found=f"it beside shape = '{table.shape}'",
                expected=words,
                remedy="remove it",
            )
    if table.peak is not None:
        _named(f"{item} peak", partial(peak_fraction, table.peak), problems)
    for key in files[:1]:
        if getattr(table, key) is None:
            words = "the file of the pattern" if key == "file" else "the name of a [[storm]] of the job"
            problems.add(item=f"{item} {key}", found="nothing", expected=words, remedy="name it")


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

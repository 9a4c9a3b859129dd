"""What a job asks of its series and storms, checked against its record before anything is computed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import partial
from typing import Final, cast

import numpy as np

from basinrain.basins import UNION
from basinrain.errors import DataError, JobError, Problem, Problems, nearest_name
from basinrain.infill.normals import require_normals
from basinrain.inputs import attempt
from basinrain.intervals import parse_interval
from basinrain.jobfile import Job
from basinrain.jobfile.series_tables import ESTIMATED_GAP, TOTAL, StormsTable
from basinrain.run_chunks import HERE, check_place
from basinrain.series.regrouping import Regrouping, regroup
from basinrain.series.steps import DAY
from basinrain.series_check import WET_DEPTH
from basinrain.series_inputs import SeriesInputs
from basinrain.units import depth_factor

__all__ = ["WET_DAY", "basin_of_storms", "checked", "length_of", "wet_depth_of"]

WET_DAY: Final = 1.0
"""mm; a day with at least this depth is wet, as in the indices of climate change (ETCCDI; from memory)."""

_DURATIONS: Final = ("5min", "10min", "15min", "30min", "1h", "2h", "3h", "6h", "12h", "1d", "2d", "3d", "5d", "10d")
"""Of the greatest depths, as far as the record's step divides them, where the job names none."""


def checked(job: Job, inputs: SeriesInputs) -> tuple[Regrouping, tuple[np.timedelta64, ...]]:
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
    if table.workers is not None and table.on == HERE:
        problems.add(
            item="[series] workers",
            found=f"{table.workers} beside on = '{HERE}'",
            expected="it only where chunks are computed elsewhere",
            remedy="remove it, or set on",
        )
    attempt(problems, partial(check_place, table.on))
    if table.weigh == "ratios":
        attempt(problems, partial(_require_normals, inputs))
    attempt(problems, partial(basin_of_storms, job.storms or StormsTable(), inputs.given.basins.ids))
    dry_gap = StormsTable().dry_gap if job.storms is None else job.storms.dry_gap
    if dry_gap != ESTIMATED_GAP and parse_interval(dry_gap).seconds is None:
        problems.add(item="[storms] dry_gap", found=f"'{dry_gap}'", expected="minutes, hours or days")
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


def _require_normals(inputs: SeriesInputs) -> None:
    """Raise an error that names every gauge without a normal that its depths can be divided by."""
    network = inputs.given.network
    try:
        require_normals(network, np.ones(len(network), dtype=bool), [None, *range(1, 13)], method="ratios to normals")
    except DataError as error:
        raise JobError(
            replace(
                problem,
                expected="a normal above 0, which [series] weigh = 'ratios' needs of every gauge",
                remedy="give it, exclude the gauge, or set weigh = 'depths'",
            )
            for problem in error.problems
        ) from error


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
    return tuple(length_of(word) for word in words)


def length_of(word: str) -> np.timedelta64:
    """Return the length of a word such as ``"6h"``."""
    return np.timedelta64(parse_interval(word).seconds or 0, "s")


def basin_of_storms(table: StormsTable, basins: Sequence[str]) -> str:
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


def wet_depth_of(job: Job, inputs: SeriesInputs) -> float:
    """Return the depth in mm from which a step is wet; where the job names none a day needs more than an hour."""
    table = job.storms or StormsTable()
    if table.wet_depth is not None:
        return table.wet_depth * depth_factor(job.job.depth_unit)
    daily = (inputs.ends[0] - inputs.starts[0]) >= np.timedelta64(1, "D")
    return WET_DAY if daily else WET_DEPTH

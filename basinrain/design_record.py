"""Areal depths by duration and frequency from a job's own record, its network held fixed."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.basins import Basins
from basinrain.design_asked import Asked
from basinrain.design_sources import mean_weights
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.record_depths import RecordDepths, record_depths
from basinrain.errors import DataError, JobError, Problem, Problems, nearest_name
from basinrain.infill_choice import InfillChoice
from basinrain.inputs import Inputs
from basinrain.jobfile import Job
from basinrain.jobfile.design_tables import minutes_of
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.series.greatest_depths import annual_maxima
from basinrain.series.steps import constant_step, year_starts
from basinrain.series_inputs import held_inputs

__all__ = ["SEASON_SHARE", "RecordSource", "record_source"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]

SEASON_SHARE: Final = 0.9
"""Share of the steps of a year's wet season that must have a depth for the year to count."""

_LADDER: Final = (2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0)
"""Return periods, in years, that are fitted beside those asked for, as far as the record allows."""

_DURATIONS: Final = (5, 10, 15, 30, 60, 120, 180, 360, 720, 1440, 2880, 4320)
"""Durations, in minutes, of annual maxima beside those asked for, as far as the record's step divides them."""


@dataclass(frozen=True, eq=False, kw_only=True)
class RecordSource:
    """Areal depths from a record.

    Parameters
    ----------
    depths
        The depths with their fits.
    gauges
        Ids of the gauges that were averaged, all of them at every step.
    step
        The record's step in minutes.
    years : array of int, shape (n_years,)
        Every year that the record touches.
    season_share : array of float, shape (n_years, n_areas)
        Share of the wet season's steps that have a depth.
    maxima : array of float, shape (n_years, n_durations, n_areas)
        Annual maxima in mm; NaN where the year does not count.
    minutes : array of float, shape (n_durations,)
        Their durations.
    notes
        What is to be remarked.
    """

    depths: RecordDepths
    gauges: tuple[str, ...]
    step: int
    years: npt.NDArray[np.int64]
    season_share: Floats
    maxima: Floats
    minutes: Floats
    notes: tuple[Note, ...]


def record_source(job: Job, asked: Asked, given: Inputs, areas: Basins, *, infill: InfillChoice) -> RecordSource:
    """Return areal depths by duration and frequency from annual maxima of a job's record.

    The mean of an area is taken with the weights of one network throughout: a step at which one of its gauges has no
    depth even after infill has no number. A year counts where :data:`SEASON_SHARE` of the steps of its wet season have
    one.

    Parameters
    ----------
    job, asked, given
        The job, what it asks of its design, and its files.
    areas
        The areas and what results call them.
    infill
        How gaps are infilled.

    Raises
    ------
    JobError
        Gauges that there are not; durations that the record's step does not divide, or that are shorter.
    DataError
        No gauge that is in service throughout; areas that the averaging method has no weights for.
    MethodError
        Fewer than ten years, or as :func:`~basinrain.designstorm.record_depths.record_depths`.
    """
    record, table = given.record, asked.design.depths
    inputs = held_inputs(given, infill.options.longest_gap)
    starts, ends = inputs.starts, inputs.ends
    step = constant_step(starts, ends, wanted_for="depths from the record") // 60
    columns = _held(record, table.gauges)
    network = given.network.subset(columns)
    weights = mean_weights(job, network, areas, table.average, whose="gauges that are held")
    depth = infill.complete(record, long=inputs.silent(0, len(starts)), trace=False).record.depth[:, columns].copy()
    depth[(record.status == Status.NOT_INSTALLED)[:, columns]] = np.nan
    gaps = np.isnan(depth)
    depth[gaps] = 0.0
    means = depth @ weights.T
    # A gauge without weight in an area does not take the area's number away.
    lost = np.flatnonzero(gaps.any(axis=1))
    means[lost] = np.where(gaps[lost].astype(float) @ (weights != 0).T > 0, np.nan, means[lost])
    minutes = _minutes(asked, step)
    found = annual_maxima(
        starts,
        ends,
        means,
        durations=[np.timedelta64(int(each) * 60, "s") for each in minutes],
        day_phase=record.day_phase,
        water_year=job.series.water_year,
    )
    share = _season_share(
        starts + (ends - starts) // 2,
        step,
        means,
        found.years,
        water_year=job.series.water_year,
        season=table.wet_season,
    )
    maxima = np.where((share >= SEASON_SHARE)[None], found.sliding.present, np.nan).transpose(1, 0, 2)
    frequencies = _frequencies(asked, int((share >= SEASON_SHARE).all(axis=1).sum()))
    depths = record_depths(
        maxima,
        found.years,
        minutes,
        areas.ids,
        frequencies=frequencies,
        distribution=table.distribution,
        beyond_record=table.beyond_record,
    )
    notes = (
        *_notes(given, columns, share, found.years, areas.ids),
        *_out_of_season(found.sliding.ends.transpose(1, 0, 2), ~np.isnan(maxima), table.wet_season),
    )
    return RecordSource(
        depths=depths,
        gauges=network.ids,
        step=step,
        years=found.years,
        season_share=share,
        maxima=maxima,
        minutes=minutes,
        notes=notes,
    )


def _held(record: RainRecord, named: tuple[str, ...]) -> Bools:
    """Return which gauges make up the network that is held: those named, or those in service throughout."""
    problems = Problems()
    for gauge in named:
        if gauge not in record.gauges:
            problems.add(
                item="[design.depths] gauges",
                found=f"'{gauge}'",
                expected="the id of a gauge",
                remedy=nearest_name(gauge, record.gauges),
                gauge=gauge,
            )
    problems.raise_as(JobError)
    if named:
        return np.array([gauge in named for gauge in record.gauges])
    throughout: Bools = ~(record.status == Status.NOT_INSTALLED).any(axis=0) & record.reporting.any(axis=0)
    if not throughout.any():
        raise DataError(
            Problem(
                item="[design.depths] gauges",
                found="none, and no gauge that is in service throughout the record",
                expected="the gauges whose network is to be held",
                remedy="name them; years in which one of them was not in service do not count",
            )
        )
    return throughout


def _minutes(asked: Asked, step: int) -> Floats:
    """Return the durations of annual maxima, rising."""
    named = [minutes_of(word) for word in asked.design.depths.durations]
    problems = Problems()
    if asked.minutes[0] < step and not asked.design.depths.extrapolate:
        problems.add(
            item="[design] durations",
            found=duration_text(asked.minutes[0]),
            expected=f"the record's step of {duration_text(step)} at least",
            remedy="ask for longer durations, or give a record of shorter steps",
        )
    for word, minutes in zip(asked.design.depths.durations, named, strict=True):
        if minutes % step:
            problems.add(
                item="[design.depths] durations",
                found=f"'{word}'",
                expected=f"a whole number of the record's steps of {duration_text(step)}",
                remedy="correct it, or leave durations out",
            )
    problems.raise_as(JobError)
    if not named:
        # Steps enough to hold the longest that is asked for.
        longest = -(-max(asked.minutes) // step) * step
        named = [each for each in (*asked.minutes, *_DURATIONS, step, longest) if each % step == 0 and each <= longest]
    return np.unique(np.array(named, dtype=float))


def _frequencies(asked: Asked, n_years: int) -> list[Frequency]:
    longest = 2 * n_years
    others = [Frequency(years, ANNUAL_MAXIMUM) for years in _LADDER if years <= longest]
    return sorted({*asked.frequencies, *others})


def _season_share(
    middles: npt.NDArray[np.datetime64],
    step: int,
    means: Floats,
    years: npt.NDArray[np.int64],
    *,
    water_year: int,
    season: tuple[int, ...],
) -> Floats:
    """Return what share of each year's wet season has a number, (n_years, n_areas); steps in minutes."""
    wanted = _in_months(middles, season)
    bounds = year_starts(np.arange(years[0], years[-1] + 2), first_month=water_year)
    shares = np.zeros((len(years), means.shape[1]))
    for k, (first, last) in enumerate(pairwise(bounds)):
        days = int(_in_months(np.arange(first.astype("datetime64[D]"), last.astype("datetime64[D]")), season).sum())
        rows = slice(*np.searchsorted(middles, [first, last]).tolist())
        shares[k] = (~np.isnan(means[rows]) & wanted[rows, None]).sum(axis=0) * step / (days * 1440)
    return shares


def _in_months(times: npt.NDArray[np.datetime64], months: tuple[int, ...]) -> Bools:
    """Return which times fall in some months of the year; in any where none are named."""
    month = times.astype("datetime64[M]").astype(np.int64) % 12 + 1
    return np.isin(month, months or tuple(range(1, 13)))


def _notes(
    given: Inputs, columns: Bools, share: Floats, years: npt.NDArray[np.int64], names: tuple[str, ...]
) -> tuple[Note, ...]:
    notes = []
    left = [gauge for gauge, kept in zip(given.network.ids, columns, strict=True) if not kept]
    if left:
        notes.append(
            Note(
                code="network-held",
                level="info",
                text=f"Depths from the record rest on a network that is held fixed, without {', '.join(left)}.",
            )
        )
    unsettled = sum(found.state == "open" and found.severity != "remark" for found in given.screening.findings)
    if unsettled:
        stretches = f"stretch{'es' if unsettled > 1 else ''} of the record, not settled by the job"
        notes.append(
            Note(
                code="screening",
                text=f"Screening found {unsettled} doubtful or erroneous {stretches}: annual maxima may rest on "
                f"{'them' if unsettled > 1 else 'it'}. 'basinrain screen' shows what they are.",
            )
        )
    alike: dict[str, list[str]] = {}
    for area, name in enumerate(names):
        short = years[share[:, area] < SEASON_SHARE]
        if len(short):
            least = f"{100 * SEASON_SHARE:.0f} %"
            text = (
                f"{len(short)} of {len(years)} years do not count, less than {least} of their wet season having a depth"
            )
            alike.setdefault(f"{text}: {', '.join(str(year) for year in short)}.", []).append(name)
    notes += [
        Note(code="years-not-counted", level="info", text=f"{', '.join(where)}: {text}")
        for text, where in alike.items()
    ]
    return tuple(notes)


def _out_of_season(ends: npt.NDArray[np.datetime64], counted: Bools, season: tuple[int, ...]) -> tuple[Note, ...]:
    """Return a remark where annual maxima that count ended outside the wet season."""
    outside = int((counted & ~_in_months(ends, season)).sum()) if season else 0
    if not outside:
        return ()
    text = (
        f"{outside} of {int(counted.sum())} annual maxima fell outside the wet season. Only its months decide whether "
        "a year counts; other months may have gaps."
    )
    return (Note(code="maxima-out-of-season", level="info", text=text),)

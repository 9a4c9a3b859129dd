"""How rare storms of a job's record were over the areas of its design."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import suppress
from dataclasses import dataclass, replace
from functools import cached_property, partial
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averager import Averager
from basinrain.averaging import averaging_method
from basinrain.basin_depths import BasinDepths, average_storm
from basinrain.cautions import screening_cautions, storm_cautions
from basinrain.design_areas import Areas
from basinrain.design_asked import Asked
from basinrain.design_sources import nearest_points
from basinrain.designstorm.depth_chain import DepthChain, Reducer
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.patterns import Ordinates, ordinates_of
from basinrain.designstorm.rarity import comparable, storm_rarity
from basinrain.designstorm.storm_depths import StormDepths, StormRarity
from basinrain.errors import DataError, JobError, MethodError, Problem, Problems
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.infill_choice import InfillChoice
from basinrain.inputs import Inputs, window_of
from basinrain.jobfile import Job
from basinrain.jobfile.design_tables import minutes_of
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.series.greatest_depths import greatest_depths
from basinrain.series.steps import constant_step
from basinrain.storms import Storm, storm_window
from basinrain.tables import time_text

__all__ = ["ObservedStorm", "ObservedStorms", "storm_rarities"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]

_NAMED: Final = 6
"""So many areas are named in a sentence."""

_TIMES: Final = 4

_DURATIONS: Final = (5, 10, 15, 30, 60, 120, 180, 360, 720, 1440, 2880, 4320, 7200, 14400)
"""Durations, in minutes, that are compared where the job names none."""


@dataclass(frozen=True, eq=False, kw_only=True)
class ObservedStorm:
    """A storm of the record over the areas of a design.

    Parameters
    ----------
    storm
        Its name and window.
    window
        Its record before infill.
    means
        Means over the areas after infill.
    notes
        What was remarked of the window, its infill and its means.
    """

    storm: Storm
    window: RainRecord
    means: BasinDepths
    notes: tuple[Note, ...]

    @property
    def step(self) -> int:
        """The record's step in minutes."""
        return constant_step(self.window.starts, self.window.ends, wanted_for=f"storm {self.storm.name}") // 60


@dataclass(frozen=True, eq=False)
class ObservedStorms:
    """The storms of a job's record, averaged over the areas of its design when they are asked for.

    Parameters
    ----------
    job, given
        The job and its files.
    areas
        The areas.
    infill
        How gaps are infilled.
    average
        The averaging method.
    """

    job: Job
    given: Inputs
    areas: Areas
    infill: InfillChoice
    average: str

    @cached_property
    def _found(self) -> dict[str, ObservedStorm]:
        return {}

    @property
    def notes(self) -> tuple[Note, ...]:
        """What was remarked of the storms that were asked for so far, and how they were averaged."""
        text = f"Storms of the record were averaged over the areas by '{self.average}'."
        storms = [found.storm for found in self._found.values()]
        return (
            *(note for found in self._found.values() for note in found.notes),
            *screening_cautions(self.given.screening, storms),
            Note(code="storms-averaged", level="info", text=text),
        )

    @cached_property
    def _long(self) -> Bools:
        record = self.given.record
        return longer_than(record, gap_mask(record), self.infill.options.longest_gap)

    @cached_property
    def _averager(self) -> Averager:
        method, options = averaging_method(self.average), self.job.averaging.options(self.average)
        network, basins = self.given.network, self.areas.basins
        return Averager(method(network, basins, options), partial(method.reweigher, network, basins, options))

    def storm(self, name: str) -> ObservedStorm:
        """Return one of the job's storms by its name.

        Raises
        ------
        JobError
            Its window cannot be, it is a total without times, or no gauge reports in it.
        """
        if name not in self._found:
            self._found[name] = self._storm(name)
        return self._found[name]

    def _storm(self, name: str) -> ObservedStorm:
        table = next(table for table in self.job.storm if table.name == name)
        record = self.given.record
        start, end = window_of(self.job, table, record.zone)
        storm, notes = storm_window(record, name, start=start, end=end, pattern=table.pattern)
        window = storm.cut(record)
        problems = Problems()
        if np.isnat(window.ends).any():
            problems.add(
                item=f"storm {name}",
                found="totals without times",
                expected="a record in steps, from which depths of shorter durations and a pattern can be had",
                remedy="give such a record, or leave the storm out of [design]",
            )
        elif not window.reporting.any():
            problems.add(
                item=f"storm {name}",
                found="no gauge that reports in it",
                expected="one at least",
                remedy="correct its start and end, or the record",
            )
        problems.raise_as(JobError)
        completed = self.infill.complete(window, long=self._long[storm.first : storm.stop])
        means = average_storm(completed, self._averager)
        areas = self.areas.basins
        unit = self.job.job.depth_unit
        notes = (
            *notes,
            *(note if note.storm else replace(note, storm=name) for note in completed.notes),
            *storm_cautions(name, self.given.network, areas, {self.average: means}, depth_unit=unit),
        )
        return ObservedStorm(storm=storm, window=window, means=means, notes=notes)

    def ordinates(self, name: str) -> Ordinates:
        """Return how a storm fell in time over the largest of the areas.

        Raises
        ------
        JobError
            It has no mean over that area at some step, or is dry; or as :meth:`storm`.
        """
        row = int(np.argmax(self.areas.basins.areas))
        storm = self.storm(name)
        depth = storm.means.depth[:, row]
        if np.isnan(depth).all():
            raise JobError(
                Problem(
                    item=f"storm {name}",
                    found=f"no mean over {self.areas.names[row]} by '{self.average}' at any step",
                    expected="one at every step",
                    remedy="choose another method in [design.rarity] average",
                )
            )
        if without := [time_text(end, self.given.record.zone) for end in storm.window.ends[np.isnan(depth)]]:
            more = f" and {len(without) - _TIMES} more" if len(without) > _TIMES else ""
            raise JobError(
                Problem(
                    item=f"storm {name}",
                    found=f"no gauge with a depth, infilled or its own, in the steps that end at "
                    f"{', '.join(without[:_TIMES])}{more}",
                    expected="a mean at every step",
                    remedy="choose a storm without such gaps, or let [infill] fill longer ones",
                )
            )
        try:
            return ordinates_of(depth, step=storm.step)
        except DataError as error:
            raise JobError(
                [
                    replace(problem, item=problem.item.replace("observed storm", f"storm {name}"))
                    for problem in error.problems
                ]
            ) from None


def storm_rarities(
    observed: ObservedStorms, chain: DepthChain, asked: Asked, *, table_step: int | None
) -> tuple[StormRarity, ...]:
    """Return how rare each of the storms that a job asks about was.

    Parameters
    ----------
    observed
        The storms.
    chain
        The depths of the design. Its uplift is left out: a storm that has fallen is compared with the climate that the
        depths are of. So is extrapolation: how rare a storm was is told from what the source knows.
    asked
        What the job asks.
    table_step
        The record's step in minutes, where the depths were made from it and nothing makes up for fixed intervals.
    """
    table = asked.design.rarity
    if table is None:
        return ()
    present = replace(chain, uplift=1.0, extrapolate=False)
    names = table.storms or tuple(storm.name for storm in observed.job.storm)
    named = [minutes_of(word) for word in table.durations]
    minutes = np.unique(np.array(named or [*asked.minutes, *_DURATIONS], dtype=float))
    # Of what nobody named, only what the table has is looked at.
    within = (minutes >= present.source.shortest) & (minutes <= present.source.longest)
    minutes = minutes[within | np.isin(minutes, named or asked.minutes)]
    frequencies = present.frequencies
    return tuple(
        _rarity(observed.storm(name), observed, present, minutes, frequencies, table_step=table_step) for name in names
    )


def _rarity(
    storm: ObservedStorm,
    observed: ObservedStorms,
    chain: DepthChain,
    minutes: Floats,
    frequencies: Sequence[Frequency],
    *,
    table_step: int | None,
) -> StormRarity:
    window = (storm.storm.end - storm.storm.start) / np.timedelta64(60, "s")
    fit = comparable(minutes, step=storm.step, window=window)
    if not fit.any():
        raise MethodError(
            Problem(
                item=f"[design.rarity] {storm.storm.name}",
                found="no duration that is a whole number of the record's steps, within the storm and in the table",
                expected="one at least",
                remedy="widen the storm's window, or give depths of longer durations",
            )
        )
    rows = observed.areas.rows_apart
    names = tuple(observed.areas.names[row] for row in rows)
    ladder = _ladder(chain, rows, minutes, frequencies)
    means = storm.means
    with np.errstate(invalid="ignore"):
        infilled = (means.infilled / means.total)[rows]
    found = storm_rarity(
        storm.storm.name,
        minutes,
        _depths(storm, means.depth[:, rows], minutes, names=names, ladder=ladder, window=window),
        frequencies=frequencies,
        step=storm.step,
        window=window,
        gauges=None if chain.source.areal else _gauges(storm, observed, chain, minutes, frequencies, window=window),
        infilled=infilled,
        table_step=table_step,
    )
    return replace(found, clamped=_clamped(chain, rows, names, minutes[fit], frequencies))


def _depths(
    storm: ObservedStorm, depth: Floats, minutes: Floats, *, names: tuple[str, ...], ladder: Floats, window: float
) -> StormDepths:
    shape = (len(minutes), len(names))
    most, aligned = np.full(shape, np.nan), np.full(shape, np.nan)
    ends = np.full(shape, np.datetime64("NaT", "s"))
    fit = comparable(minutes, step=storm.step, window=window)
    if fit.any():
        found = greatest_depths(
            storm.window.starts,
            storm.window.ends,
            depth,
            durations=[np.timedelta64(int(each) * 60, "s") for each in minutes[fit]],
            day_phase=storm.window.day_phase,
        )
        most[fit], ends[fit], aligned[fit] = found.sliding.depth, found.sliding.ends, found.aligned.depth
    return StormDepths(names=names, depth=most, ends=ends, ladder=ladder, aligned=aligned)


def _ladder(chain: DepthChain, rows: Sequence[int], minutes: Floats, frequencies: Sequence[Frequency]) -> Floats:
    """Return areal depths by area, duration and frequency, NaN where the table or the reduction has no answer."""
    depths = np.stack(
        [_answers(partial(_unreduced, chain, rows, frequency), minutes, len(rows)) for frequency in frequencies],
        axis=-1,
    )
    if chain.reduce is not None:
        for k, row in enumerate(rows):
            for f, frequency in enumerate(frequencies):
                factors = partial(_factors, chain.reduce, float(chain.areas[row]), frequency)
                depths[k, :, f] *= _answers(factors, minutes, 1)[0]
    return depths


def _unreduced(chain: DepthChain, rows: Sequence[int], frequency: Frequency, minutes: Floats) -> Floats:
    return chain.unreduced(rows, minutes, frequency)


def _factors(reduce: Reducer, area: float, frequency: Frequency, minutes: Floats) -> Floats:
    return reduce(area, minutes, frequency).factor[None]


def _clamped(
    chain: DepthChain, rows: Sequence[int], names: Sequence[str], minutes: Floats, frequencies: Sequence[Frequency]
) -> tuple[str, ...]:
    """Return what is brought into the reduction's range for these durations, each with the areas it is said of."""
    if chain.reduce is None:
        return ()
    known = minutes[(minutes >= chain.source.shortest) & (minutes <= chain.source.longest)]
    said: dict[str, dict[str, None]] = {}
    for row, name in zip(rows, names, strict=True):
        for frequency in frequencies:
            for text in _brought_in(chain.reduce, float(chain.areas[row]), frequency, known):
                said.setdefault(text, {})[name] = None
    return tuple(
        f"{', '.join(list(of)[:_NAMED])}{f' and {len(of) - _NAMED} more' if len(of) > _NAMED else ''}: {text}"
        for text, of in said.items()
    )


def _brought_in(reduce: Reducer, area: float, frequency: Frequency, minutes: Floats) -> tuple[str, ...]:
    """Return what is brought into the reduction's range, durations that have no answer left out."""
    if not len(minutes):
        return ()
    try:
        return reduce(area, minutes, frequency).clamped
    except MethodError:
        alone = [minutes[d : d + 1] for d in range(len(minutes))] if len(minutes) > 1 else []
        return tuple(text for each in alone for text in _brought_in(reduce, area, frequency, each))


def _answers(ask: Callable[[Floats], Floats], minutes: Floats, n_rows: int) -> Floats:
    """Return what is said of all durations, or of each by itself where some have no answer; (n_rows, n_durations)."""
    try:
        return ask(minutes)
    except MethodError:
        answers = np.full((n_rows, len(minutes)), np.nan)
        for d in range(len(minutes)):
            with suppress(MethodError):
                answers[:, d] = ask(minutes[d : d + 1])[:, 0]
        return answers


def _gauges(
    storm: ObservedStorm,
    observed: ObservedStorms,
    chain: DepthChain,
    minutes: Floats,
    frequencies: Sequence[Frequency],
    *,
    window: float,
) -> StormDepths | None:
    """Return the gauges that count in an area, with the depths of the point nearest to each, nothing reduced."""
    counts = (storm.means.table.weights > 0).any(axis=0) & storm.window.reporting.any(axis=0)
    network = observed.given.network.subset(np.asarray(counts))
    if not len(network):
        return None
    nearest = nearest_points(chain.source, network)
    # Gauges with one nearest point share its ladder.
    points, which = np.unique(nearest, return_inverse=True)
    weights = np.zeros((len(points), len(chain.source.points)))
    weights[np.arange(len(points)), points] = 1.0
    at_points = replace(chain, weights=weights, areas=np.ones(len(points)), reduce=None)
    ladder = _ladder(at_points, range(len(points)), minutes, frequencies)[which]
    return _depths(storm, storm.window.depth[:, counts], minutes, names=network.ids, ladder=ladder, window=window)

"""Design storms: the depth of every basin, its peak and when it falls, and short hyetographs."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.design_storms import DesignStorm, PointOfInterest
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.report import design_shown
from basinrain.report.table import Row, Table
from basinrain.report.words import (
    DASH,
    area_text,
    counted,
    depth_text,
    depth_texts,
    number_text,
    unit_text,
    unit_word,
    volume_text,
)
from basinrain.results_design import DesignRun
from basinrain.units import area_factor, depth_factor, volume_factor, volume_unit_for

__all__ = ["depth_tables", "hyetograph_tables", "peak_tables"]

_COLUMNS: Final = 8
_ALIKE: Final = 4
"""More basins of the same depth share one line."""
_PATTERNS: Final = 6
_ROWS: Final = 48
_STEPS: Final = 36
"""Longest hyetograph printed as a table."""

Floats = npt.NDArray[np.float64]
Key = tuple[str, Frequency, int, str]


class _Storms:
    """The storms of a run by point of interest, frequency, duration and pattern."""

    def __init__(self, run: DesignRun) -> None:
        self.run = run
        self._by = {_key(storm): storm for storm in run.storms}
        self.patterns = list(dict.fromkeys(storm.choice.label for storm in run.storms))
        self.rarest = run.asked.frequencies[-1]

    def one(self, point: PointOfInterest, frequency: Frequency, minutes: int, pattern: str) -> DesignStorm | None:
        return self._by.get((point.name, frequency, minutes, pattern))

    def any(self, point: PointOfInterest, frequency: Frequency, minutes: int) -> DesignStorm | None:
        """Return a storm of any pattern: the depth of the whole is the same by all of them."""
        found = (self.one(point, frequency, minutes, pattern) for pattern in self.patterns)
        return next((storm for storm in found if storm is not None), None)


def _key(storm: DesignStorm) -> Key:
    return storm.point.name, storm.frequency, storm.minutes, storm.choice.label


def _basins(storm: DesignStorm) -> list[int]:
    """Return the basins that are shown, of many the first."""
    return list(range(min(len(storm.point.basins), design_shown.AREAS)))


def _more_basins(point: PointOfInterest, file: str) -> tuple[str, ...]:
    more = len(point.basins) - design_shown.AREAS
    return (f"{counted(more, 'more basin is', 'more basins are')} in {file}.",) if more > 0 else ()


def depth_tables(run: DesignRun) -> list[Table]:
    """Return a table of the basins' depths for every point of interest that is shown."""
    storms = _Storms(run)
    tables = [_depths(storms, point) for point in design_shown.points(run)]
    return _with_left_out(run, tables)


def _with_left_out(run: DesignRun, tables: list[Table]) -> list[Table]:
    notes = design_shown.left_out(run, "design_storms.csv")
    return [*tables[:-1], replace(tables[-1], notes=(*tables[-1].notes, *notes))] if tables else []


def _depths(storms: _Storms, point: PointOfInterest) -> Table:
    run = storms.run
    often = design_shown.frequencies(run)
    own_area = run.asked.design.own_area
    together = point.apart and len(point.basins) > 1
    own = [storm for storm in run.storms if storm.point.name == point.name]
    alike = not own_area and len(point.basins) > _ALIKE and _alike(own)
    most = 1 if alike else min(len(point.basins), design_shown.AREAS) + together
    shown = design_shown.durations(run)
    minutes_shown = design_shown.spread(shown, max(1, _ROWS // most))
    notes = _depth_notes(alike=alike, together=together, own_area=own_area)
    if len(minutes_shown) < len(shown):
        of = len(run.asked.minutes)
        notes.append(f"Shown: {len(minutes_shown)} of {of} durations; all are in design_storms.csv.")
    lead = ("duration", "basin", f"area, {unit_text(run.area_unit)}", *(["reduction"] if own_area else []))
    heads = (*lead, *(f.short_label for f in often), often[-1].short_label)
    return Table(
        caption=f"{point.name}: depth of the basins by duration and frequency",
        heads=heads,
        over=(
            ("", len(lead)),
            (f"depth, {unit_word(run.depth_unit)}", len(often)),
            (f"volume, {unit_text(volume_unit_for(run.depth_unit))}", 1),
        ),
        align="tt" + "n" * (len(heads) - 2),
        rows=[
            row
            for minutes in minutes_shown
            for row in _depth_rows(storms, point, minutes, alike=alike, together=together)
        ],
        notes=(*notes, *(() if alike else _more_basins(point, "design_storms.csv"))),
    )


def _depth_rows(storms: _Storms, point: PointOfInterest, minutes: int, *, alike: bool, together: bool) -> list[Row]:
    """Return a row per basin with its volume at the rarest frequency, and one of all where they go together."""
    run, often = storms.run, design_shown.frequencies(storms.run)
    found = [storm for storm in (storms.any(point, frequency, minutes) for frequency in often) if storm is not None]
    if not found:
        return []
    mm, m2 = depth_factor(run.depth_unit), area_factor(run.area_unit)
    per = volume_factor(volume_unit_for(run.depth_unit))
    areas = run.areas.basins.areas[list(point.rows)]
    totals, rarest = np.array([storm.totals / mm for storm in found]), found[-1]

    def row(name: str, *, area: float, depths: Floats, volume: float, reduction: str) -> Row:
        return (
            duration_text(minutes),
            name,
            area_text(area / m2),
            *([reduction] if run.asked.design.own_area else []),
            *(depth_text(float(depth), run.depth_unit) for depth in depths),
            volume_text(volume / 1000 / per),
        )

    rows: list[Row] = []
    if not alike:
        rows += [
            row(
                point.basins[b],
                area=float(areas[b]),
                depths=totals[:, b],
                volume=float(rarest.totals[b] * areas[b]),
                reduction=number_text(float(rarest.reduction[b]), 4),
            )
            for b in _basins(rarest)
        ]
    if alike or together:
        name = f"each of {len(point.basins)}" if alike else "mean by area"
        whole = float(run.areas.basins.areas[point.row])
        depths = totals[:, 0] if alike else totals @ areas / areas.sum()
        volume = float(rarest.totals[0] * whole) if alike else float(rarest.totals @ areas)
        rows.append(row(name, area=whole, depths=depths, volume=volume, reduction=DASH))
    return rows


def _depth_notes(*, alike: bool, together: bool, own_area: bool) -> list[str]:
    if alike:
        return ["Every basin has the areal depth to the point of interest; area and volume are those of all."]
    if not together:
        return []
    more = "more than the areal depth to the point of interest: each basin is reduced by its own area."
    return [f"The mean by area is {more if own_area else 'the areal depth to the point of interest in section 1.'}"]


def _alike(storms: Iterable[DesignStorm]) -> bool:
    """Return whether all basins have the same depths in every storm."""
    return all(np.allclose(storm.depth, storm.depth[:, :1], rtol=1e-9, atol=0) for storm in storms)


def peak_tables(run: DesignRun) -> list[Table]:
    """Return a table of the peaks at the rarest frequency for every point of interest that is shown."""
    storms = _Storms(run)
    return _with_left_out(run, [_peaks(storms, point) for point in design_shown.points(run)])


def _peaks(storms: _Storms, point: PointOfInterest) -> Table:
    run, mm = storms.run, depth_factor(storms.run.depth_unit)
    step = duration_text(run.asked.step)
    unit = unit_word(run.depth_unit)
    rows: list[Row] = []
    for minutes in design_shown.durations(run):
        for pattern in storms.patterns:
            storm = storms.one(point, storms.rarest, minutes, pattern)
            if storm is None:
                continue
            alike = _alike([storm])
            for b in [0] if alike else _basins(storm):
                peak = int(np.argmax(storm.depth[:, b]))
                most = float(storm.depth[peak, b]) / mm
                rows.append(
                    (
                        f"{duration_text(minutes)}, {pattern}",
                        "all" if alike and len(point.basins) > 1 else point.basins[b],
                        depth_text(float(storm.totals[b]) / mm, run.depth_unit),
                        depth_text(most, run.depth_unit),
                        depth_text(most * 60 / storm.step, run.depth_unit),
                        elapsed_text((peak + 1) * storm.step),
                    )
                )
    more = len(rows) - _ROWS
    return Table(
        caption=f"{point.name}: peaks at {storms.rarest.label}",
        heads=(
            "duration, pattern",
            "basin",
            f"depth, {unit}",
            f"greatest in {step}, {unit}",
            f"intensity, {unit}/h",
            "it ends after, h:min",
        ),
        align="ttnnnn",
        rows=rows[:_ROWS],
        notes=(
            "The greatest depth of one step, as intensity over that step; of equal ones the first.",
            *((f"{counted(more, 'more line is', 'more lines are')} in design_storms.csv.",) if more > 0 else ()),
            *_more_basins(point, "design_storms.csv"),
        ),
    )


def elapsed_text(minutes: int) -> str:
    """Return a time since the start as hours and minutes.

    Examples
    --------
    >>> elapsed_text(90), elapsed_text(1440)
    ('1:30', '24:00')
    """
    return f"{minutes // 60}:{minutes % 60:02d}"


def hyetograph_tables(run: DesignRun) -> list[Table]:
    """Return the hyetographs of the rarest frequency that are short enough, of every point the longest such duration.

    What is printed sums to the printed total. Where basins differ and there is no room for all, the one with the
    greatest depth is printed.
    """
    storms = _Storms(run)
    tables = []
    for point in design_shown.points(run):
        short = [minutes for minutes in run.asked.minutes if minutes // run.asked.step <= _STEPS]
        for minutes in reversed(short):
            found = [storms.one(point, storms.rarest, minutes, pattern) for pattern in storms.patterns]
            kept = [storm for storm in found if storm is not None]
            if kept:
                tables.append(_hyetographs(run, kept))
                break
    return tables


def _hyetographs(run: DesignRun, storms: Sequence[DesignStorm]) -> Table:
    first, mm = storms[0], depth_factor(run.depth_unit)
    shown = list(storms[:_PATTERNS])
    alike = _alike(storms)
    basins = [0] if alike else list(range(len(first.point.basins)))
    if len(basins) * len(shown) > _COLUMNS:
        basins = [int(np.argmax(first.totals.round(9)))]
    columns = [storm.depth[:, b] / mm for storm in shown for b in basins]
    printed = [depth_texts(column, run.depth_unit) for column in columns]
    names = [first.point.basins[b] for b in basins]
    one = len(basins) == 1
    whose = (
        f" of {'every basin above it' if alike and len(first.point.basins) > 1 else f'basin {names[0]}'}" if one else ""
    )
    notes = ["What is printed sums to the printed total."]
    if not alike and one and len(first.point.basins) > 1:
        notes.append(f"Of {counted(len(first.point.basins), 'basin')} it has the greatest depth.")
    if len(storms) > len(shown):
        notes.append(f"Shown: {len(shown)} of {len(storms)} patterns.")
    notes.append(f"Other frequencies, durations and basins are in {design_shown.hyetograph_file(run)}.")
    labels = [storm.choice.label for storm in shown]
    return Table(
        caption=f"{first.point.name}, {duration_text(first.minutes)}: hyetographs{whose} at {first.frequency.label}, "
        f"{unit_word(run.depth_unit)} in {duration_text(first.step)}",
        heads=("ending after, h:min", *(labels if one else names * len(shown))),
        over=() if one else (("", 1), *((label, len(basins)) for label in labels)),
        align="n" * (1 + len(columns)),
        rows=[
            (elapsed_text((t + 1) * first.step), *(column[t] for column in printed)) for t in range(len(first.depth))
        ],
        foot=[("total", *(_total(column, run.depth_unit) for column in columns))],
        notes=tuple(notes),
    )


def _total(column: Floats, unit: str) -> str:
    return depth_text(float(column.sum()), unit)

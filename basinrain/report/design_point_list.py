"""The depths of points that a design rests on, and how much each point counts in every area."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.designstorm.equations import EquationDepths
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.patterns import PATTERNS
from basinrain.designstorm.point_depths import PointDepths
from basinrain.report import design_shown
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, counted, depth_text, number_text, round_to_sum, unit_word
from basinrain.results_design import DesignRun
from basinrain.units import depth_factor

__all__ = ["depths_table", "point_sentences", "weights_table"]

_AREAS: Final = 8


def point_sentences(run: DesignRun) -> list[str]:
    """Return where the points' depths are from, what the source covers, and what is interpolated."""
    source, table = run.sourced.source, run.asked.design.depths
    n = len(source.points)
    first, last = source.frequencies[0], source.frequencies[-1]
    covers = f"{duration_text(source.shortest)} to {duration_text(source.longest)}, {first.label} to {last.label}"
    sentences = [f"{source.source}, dated {source.date}: {counted(n, 'point')}, {covers}."]
    if isinstance(source, PointDepths):
        known = set(source.durations.tolist())
        how = f"interpolated{' or extrapolated' if table.extrapolate else ''}"
        between = [duration_text(m) for m in run.asked.minutes if float(m) not in known]
        often = [f.label for f in run.asked.frequencies if not _tabulated(f, run.chain.frequencies)]
        if between or often:
            words = design_shown.cut([*between, *often], design_shown.AREAS)
            sentences.append(f"Not tabulated, so {how}: {words}.")
        else:
            asked = "All durations and frequencies asked for are tabulated"
            curves = [table.label for table in run.asked.design.pattern if PATTERNS[table.shape].by_curve]
            sentences.append(
                f"{asked}; other durations, taken for {design_shown.cut(curves, design_shown.AREAS)}, are {how}."
                if curves
                else f"{asked}: no depth is interpolated."
            )
    elif isinstance(source, EquationDepths):
        sentences.append("Depths are the equation's intensity times the duration.")
    if n == 1:
        sentences.append("There is one point: its depth is that of every area.")
    elif run.sourced.method == "share of the area in every cell":
        sentences.append("Points are cells of the rasters; a cell counts by its share of the area.")
    else:
        sentences.append(f"Points are weighed over each area by {run.sourced.method}.")
    return sentences


def _tabulated(frequency: Frequency, known: tuple[Frequency, ...]) -> bool:
    return any(np.isclose(frequency.return_period, each.return_period, rtol=1e-9, atol=0) for each in known)


def _shown(run: DesignRun) -> list[int]:
    """Return the points that count anywhere; of many those that count most over the points of interest."""
    weights = run.sourced.weights
    counts = np.flatnonzero((weights > 0).any(axis=0))
    most = weights[[point.row for point in run.areas.points]][:, counts].max(axis=0)
    order = counts[np.argsort(-most, kind="stable")][: design_shown.AREAS]
    return sorted(order.tolist())


def depths_table(run: DesignRun) -> Table:
    """Return the depths of the points at what the job asks: one row per point and duration."""
    source, mm = run.sourced.source, depth_factor(run.depth_unit)
    shown, minutes, often = _shown(run), design_shown.durations(run), design_shown.frequencies(run)
    at = np.array(minutes, dtype=float)
    depths = np.array([run.chain.at(at, f)[shown] for f in often]) / mm
    rows: list[Row] = [
        (
            source.points[point],
            duration_text(each),
            *(depth_text(float(depth), run.depth_unit) for depth in depths[:, p, d]),
        )
        for p, point in enumerate(shown)
        for d, each in enumerate(minutes)
    ]
    more = _left_out(run, len(shown))
    notes = [f"{counted(more, 'more point is', 'more points are')} in point_depths.csv."] if more else []
    wholly = len(minutes) == len(run.asked.minutes) and len(often) == len(run.asked.frequencies)
    if not wholly:
        notes.append("Other durations and frequencies are in point_depths.csv.")
    return Table(
        caption=f"Point depths of the source, {unit_word(run.depth_unit)}",
        heads=("depth point", "duration", *(f.short_label for f in often)),
        align="tn" + "n" * len(often),
        rows=rows,
        notes=tuple(notes),
    )


def _left_out(run: DesignRun, shown: int) -> int:
    return int((run.sourced.weights > 0).any(axis=0).sum()) - shown


def weights_table(run: DesignRun) -> Table | None:
    """Return the weight of every point in the areas, those of points of interest first; None for one point."""
    source, weights = run.sourced.source, run.sourced.weights
    if len(source.points) == 1:
        return None
    every = run.areas.rows_apart
    areas, shown = every[:_AREAS], _shown(run)
    taken = weights[np.ix_(areas, shown)]
    others = np.maximum(1 - taken.sum(axis=1), 0)
    more = _left_out(run, len(shown))
    columns = np.column_stack([taken, others]) if more else taken
    printed = np.array([round_to_sum(column, 3) for column in columns])
    names = [source.points[point] for point in shown] + ([f"{more} others"] if more else [])
    rows: list[Row] = [
        (name, *(DASH if columns[a, p] == 0 else number_text(float(printed[a, p]), 3) for a in range(len(areas))))
        for p, name in enumerate(names)
    ]
    notes = [f"{DASH}: no weight."] if (columns == 0).any() else []
    if len(every) > len(areas) or more:
        notes.append("All areas and points are in point_weights.csv.")
    return Table(
        caption=f"Weights of the depth points ({run.sourced.method})",
        heads=("depth point", *(run.areas.names[area] for area in areas)),
        align="t" + "n" * len(areas),
        rows=rows,
        foot=[("sum", *(number_text(float(row.sum()), 3) for row in printed))],
        notes=tuple(notes),
    )

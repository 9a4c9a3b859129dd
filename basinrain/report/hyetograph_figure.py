"""Hyetographs and mass curves: bars over their intervals by one method, cumulative depth by all."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.collections import PolyCollection
from matplotlib.dates import date2num
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from basinrain.report import limits
from basinrain.report.figures import HALF_WIDTH, INK, LINES, Picture, figure_style, to_svg
from basinrain.report.time_axis import date_axis
from basinrain.report.words import depth_text, inline, step_text, unit_word, when_text, zone_text
from basinrain.results import StormResult, StormRun
from basinrain.units import depth_factor

__all__ = ["MOST_BARS", "binned", "hyetograph_pictures", "lead_method"]

MOST_BARS: Final = 240
"""Bars that a figure of half a page can still show apart."""

_HEIGHT: Final = 2.9
_NO_NUMBER: Final = "#8a8a8a"


def lead_method(result: StormResult) -> str:
    """Return the first method that has a number in every basin, or else the one with the most numbers."""
    counts = {method: int((~np.isnan(depths.depth)).sum()) for method, depths in result.depths.items()}
    most = max(counts.values())
    return next(method for method, count in counts.items() if count == most)


def binned(depth: npt.NDArray[np.float64], most: int) -> tuple[npt.NDArray[np.float64], int]:
    """Sum neighbouring steps of a series until at most ``most`` bars are left.

    Parameters
    ----------
    depth : array of float, shape (n_steps,)
        NaN in a bar's steps makes the bar NaN.
    most : int

    Returns
    -------
    array of float, shape (n_bars,)
    int
        Steps in one bar; the last bar may have fewer.

    Examples
    --------
    >>> binned(np.array([1.0, 2.0, 3.0]), 2)
    (array([3., 3.]), 2)
    """
    together = max(1, math.ceil(len(depth) / most))
    return np.add.reduceat(depth, np.arange(0, len(depth), together)), together


def hyetograph_pictures(run: StormRun, result: StormResult, number: int) -> list[Picture]:
    """Return the figures of one storm's first basins and its union; none for a storm of one step or without times.

    Parameters
    ----------
    run, result
        The run and one of its storms.
    number
        The storm's place in the report, from 1, for the figures' ids.
    """
    if len(result.completed.record) < 2 or np.isnat(result.completed.record.ends).any():
        return []
    mm = depth_factor(run.depth_unit)
    series = {method: result.hyetograph(method) / mm for method in result.depths}
    lead = lead_method(result)
    drawn = limits.drawn_basins(run)
    bars = [binned(series[lead][:, b], MOST_BARS)[0] for b in drawn]
    peak = max((float(np.nanmax(bar)) for bar in bars if not np.isnan(bar).all()), default=0.0)
    # A mass curve ends where a step has no number; fmax skips what comes after.
    mass = max(
        float(np.fmax.reduce(np.cumsum(depth[:, drawn], axis=0), axis=None, initial=0.0)) for depth in series.values()
    )
    with figure_style():
        return [
            _picture(run, result, series, lead, b, tops=(peak or 1.0, mass or 1.0), name=f"hyetograph-{number}-{b + 1}")
            for b in drawn
        ]


def _picture(
    run: StormRun,
    result: StormResult,
    series: Mapping[str, npt.NDArray[np.float64]],
    lead: str,
    b: int,
    *,
    tops: tuple[float, float],
    name: str,
) -> Picture:
    record = result.completed.record
    depth, together = binned(series[lead][:, b], MOST_BARS)
    starts = date2num(record.starts[::together])  # type: ignore[no-untyped-call]
    last = np.minimum(np.arange(len(starts)) * together + together, len(record)) - 1
    ends = date2num(record.ends[last])  # type: ignore[no-untyped-call]
    unit = unit_word(run.depth_unit)
    lines = -(-len(series) // 3)
    head = 0.32 + 0.15 * (1 + lines)
    total = _HEIGHT + 0.15 * (lines - 1)
    figure = Figure(figsize=(HALF_WIDTH, total))
    left, wide = 0.5 / HALF_WIDTH, 1 - (0.5 + 0.12) / HALF_WIDTH
    foot, gap = 0.5 / total, 0.12 / total
    room = 1 - (head / total) - foot - gap
    upper = figure.add_axes((left, foot + gap + 0.42 * room, wide, 0.58 * room))
    lower = figure.add_axes((left, foot, wide, 0.42 * room), sharex=upper)
    gaps = np.isnan(depth)
    edge = INK if len(depth) <= 80 else "none"
    upper.add_collection(_bars(starts[~gaps], ends[~gaps], depth[~gaps], edge))
    _mark_gaps((upper, lower), starts, ends, gaps)
    edges = np.append(starts[0], ends)
    for m, (_, depths) in enumerate(series.items()):
        cumulative = np.append(0.0, np.cumsum(depths[:, b])[last])
        lower.plot(
            edges, cumulative, linestyle=LINES[m % len(LINES)], color="black" if m != 1 else "#5a6268", linewidth=1.2
        )
    handles: list[Any] = [Patch(facecolor="#8d969c", edgecolor=INK, linewidth=0.4, label=f"depth by {lead}")]
    if gaps.any():
        handles.append(Patch(facecolor="white", hatch="////", edgecolor=_NO_NUMBER, label="no number"))
    _dress(figure, upper, lower, tops, (starts[0], ends[-1]))
    step = step_text(record.step) if together == 1 else f"{together} × {step_text(record.step)}"
    upper.set_ylabel(f"{unit} in {step}")
    lower.set_ylabel(f"sum, {unit}")
    lower.set_xlabel(f"time, {zone_text(record.zone)}")
    figure.text(
        0.02, 1 - 0.03 / total, inline(run.basins.ids[b], 44), ha="left", va="top", fontsize=8, fontweight="bold"
    )
    figure.legend(handles=handles, loc="upper left", bbox_to_anchor=(0.02, 1 - 0.2 / total), ncols=2, handletextpad=0.5)
    masses = [
        Line2D(
            [], [], linestyle=LINES[m % len(LINES)], color="black" if m != 1 else "#5a6268", linewidth=1.2, label=method
        )
        for m, method in enumerate(series)
    ]
    figure.legend(
        handles=masses,
        loc="upper left",
        bbox_to_anchor=(0.02, 1 - 0.35 / total),
        ncols=min(3, len(masses)),
        columnspacing=1.2,
        handletextpad=0.5,
        handlelength=2.6,
    )
    storm = result.storm.name
    caption = f"Basin {run.basins.ids[b]}, {storm}: hyetograph by {lead}, mass curves by every method."
    if together > 1:
        caption += f" A bar adds up {together} steps."
    title = inline(f"Hyetograph and mass curves of basin {run.basins.ids[b]}, {storm}")
    return Picture(
        name, caption, to_svg(figure, name, title, inline(_description(run, result, series, lead, b))), half=True
    )


def _bars(
    starts: npt.NDArray[np.float64], ends: npt.NDArray[np.float64], depth: npt.NDArray[np.float64], edge: str
) -> PolyCollection:
    """Return bars that stand on their intervals; one collection is several times faster than a patch for each."""
    zero = np.zeros(len(depth))
    corners = np.array([[starts, zero], [starts, depth], [ends, depth], [ends, zero]]).transpose(2, 0, 1)
    return PolyCollection(list(corners), facecolors="#8d969c", edgecolors=edge, linewidths=0.4)


def _mark_gaps(
    axes: tuple[Any, ...], starts: npt.NDArray[np.float64], ends: npt.NDArray[np.float64], gaps: npt.NDArray[np.bool_]
) -> None:
    turns = np.flatnonzero(np.diff(np.concatenate([[False], gaps, [False]]).astype(int)))
    for first, stop in zip(turns[::2], turns[1::2], strict=True):
        for panel in axes:
            panel.axvspan(
                starts[first], ends[stop - 1], facecolor="white", hatch="////", edgecolor=_NO_NUMBER, linewidth=0
            )


def _dress(figure: Figure, upper: Any, lower: Any, tops: tuple[float, float], span: tuple[float, float]) -> None:  # noqa: ANN401 - matplotlib's axes
    for axes, top in ((upper, tops[0]), (lower, tops[1])):
        axes.set_ylim(0, top * 1.06)
        axes.yaxis.set_major_locator(MaxNLocator(4))
        axes.set_axisbelow(True)
        axes.grid(axis="y")
        for side in ("top", "right"):
            axes.spines[side].set_visible(False)
    upper.set_xlim(*span)
    date_axis(lower.xaxis)
    upper.tick_params(axis="x", labelbottom=False)
    figure.align_ylabels([upper, lower])


def _description(
    run: StormRun, result: StormResult, series: Mapping[str, npt.NDArray[np.float64]], lead: str, b: int
) -> str:
    depth = series[lead][:, b]
    totals = ", ".join(f"{method} {depth_text(float(d[:, b].sum()), run.depth_unit)}" for method, d in series.items())
    text = f"Storm totals in {run.depth_unit}: {totals}."
    if np.isnan(depth).all():
        return text
    t = int(np.nanargmax(depth))
    when = when_text(result.completed.record.ends[t])
    return f"{text} Largest step by {lead}: {depth_text(float(depth[t]), run.depth_unit)}, ending {when}."

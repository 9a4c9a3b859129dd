"""The largest storms of a record: hyetographs, with the share of every step that was observed."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.collections import PolyCollection
from matplotlib.dates import date2num
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from basinrain.report import series_names
from basinrain.report.figures import HALF_WIDTH, INK, Picture, figure_style, to_svg
from basinrain.report.hyetograph_figure import binned
from basinrain.report.time_axis import date_axis
from basinrain.report.words import depth_text, inline, step_text, unit_text, unit_word, when_text, zone_text
from basinrain.results_series import SeriesRun
from basinrain.series.events import RankedEvent
from basinrain.units import depth_factor

__all__ = ["STORMS", "found_pictures"]

STORMS: Final = 4
"""Storms that are drawn, the largest."""

_BARS: Final = 120
_HEIGHT, _LEFT, _RIGHT, _HEAD, _FOOT, _SHARE, _GAP = 2.35, 0.52, 0.12, 0.3, 0.42, 0.34, 0.1  # inches

Floats = npt.NDArray[np.float64]


def found_pictures(run: SeriesRun) -> list[Picture]:
    """Return a figure for each of the largest storms, all with one scale of depth."""
    found, mm = run.storms, depth_factor(run.depth_unit)
    drawn = found.taken[:STORMS]
    if not drawn:
        return []
    b = run.basins.ids.index(found.basin)
    depth, share = run.store.depth(found.gaps, found.method), run.store.observed_share(found.gaps, found.method)
    parts = []
    for ranked in drawn:
        rows = slice(ranked.event.first, ranked.event.stop)
        parts.append((depth[rows, b : b + 1].ravel() / mm, share[rows, b : b + 1].ravel().astype(float)))
    top = max(float(binned(values, _BARS)[0].max()) for values, _ in parts)
    return [_picture(run, ranked, *part, top=top) for ranked, part in zip(drawn, parts, strict=True)]


def _picture(run: SeriesRun, ranked: RankedEvent, depth: Floats, share: Floats, *, top: float) -> Picture:
    event, found = ranked.event, run.storms
    bars, together = binned(depth, _BARS)
    first = np.arange(0, len(depth), together)
    shares = np.add.reduceat(share, first) / np.diff(first, append=len(depth))
    starts, ends = run.starts[event.first : event.stop], run.ends[event.first : event.stop]
    edges = date2num(np.append(starts[first], ends[-1]))  # type: ignore[no-untyped-call]
    step = step_text(run.record.step) if together == 1 else f"{together} × {step_text(run.record.step)}"
    unit = unit_word(run.depth_unit)
    with figure_style():
        figure = Figure(figsize=(HALF_WIDTH, _HEIGHT))
        left, wide = _LEFT / HALF_WIDTH, 1 - (_LEFT + _RIGHT) / HALF_WIDTH
        upper = figure.add_axes(
            (left, (_FOOT + _SHARE + _GAP) / _HEIGHT, wide, 1 - (_FOOT + _SHARE + _GAP + _HEAD) / _HEIGHT)
        )
        lower = figure.add_axes((left, _FOOT / _HEIGHT, wide, _SHARE / _HEIGHT), sharex=upper)
        _bars(upper, edges, bars)
        lower.stairs(shares * 100, edges, fill=True, facecolor="#dfe3e5", edgecolor=INK, linewidth=0.5)
        upper.set_ylim(0, top * 1.06)
        upper.yaxis.set_major_locator(MaxNLocator(4))
        upper.set_axisbelow(True)
        upper.grid(axis="y")
        lower.set_ylim(0, 100)
        lower.set_yticks([0, 100])
        upper.set_xlim(edges[0], edges[-1])
        date_axis(lower.xaxis, most=5)
        upper.tick_params(axis="x", labelbottom=False)
        upper.set_ylabel(f"{unit} in {step}")
        lower.set_ylabel("observed, %", fontsize=6)
        lower.set_xlabel(f"time, {zone_text(run.record.zone)}")
        for axes in (upper, lower):
            for side in ("top", "right"):
                axes.spines[side].set_visible(False)
        figure.align_ylabels([upper, lower])
        total = f"{depth_text(event.total / depth_factor(run.depth_unit), run.depth_unit)} {unit_text(run.depth_unit)}"
        figure.text(
            0.02,
            1 - 0.04 / _HEIGHT,
            f"{ranked.rank}: {total}, from {when_text(event.start)}",
            ha="left",
            va="top",
            fontsize=8,
            fontweight="bold",
        )
        peak = depth_text(event.peak / depth_factor(run.depth_unit), run.depth_unit)
        svg = to_svg(
            figure,
            f"found-{ranked.rank}",
            inline(f"Storm {ranked.rank} of basin {found.basin}"),
            inline(
                f"From {when_text(event.start)} to {when_text(event.end)}, {total}; greatest step {peak}, ending "
                f"{when_text(event.peak_end)}."
            ),
        )
    caption = (
        f"Storm {ranked.rank} of basin {found.basin} by {series_names.series_word((found.gaps, found.method))}; below, "
        "the share of the weight on gauges that report."
    )
    if together > 1:
        caption += f" A bar adds up {together} steps."
    return Picture(f"found-{ranked.rank}", caption, svg, half=True)


def _bars(axes: Any, edges: Floats, depth: Floats) -> None:  # noqa: ANN401 - matplotlib's axes
    left, right, zero = edges[:-1], edges[1:], np.zeros(len(depth))
    corners = np.array([[left, zero], [left, depth], [right, depth], [right, zero]]).transpose(2, 0, 1)
    edge = INK if len(depth) <= 80 else "none"
    axes.add_collection(PolyCollection(list(corners), facecolors="#8d969c", edgecolors=edge, linewidths=0.4))

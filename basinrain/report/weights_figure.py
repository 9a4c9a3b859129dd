"""The figure of the weights: one panel a basin, a line a gauge, a mark a method; made for black and white print."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from basinrain.report import limits
from basinrain.report.figures import HALF_WIDTH, INK, MARKS, Picture, figure_style, to_svg
from basinrain.report.words import inline, weight_text
from basinrain.results import StormResult, StormRun

__all__ = ["weights_pictures"]

_MOST_GAUGES: Final = 16
_ROW, _HEAD, _FOOT = 0.165, 0.5, 0.42  # inches


def weights_pictures(run: StormRun) -> list[Picture]:
    """Return the panels of the first basins and the union, once for every set of storms with the same weights."""
    pictures = []
    groups = limits.same_storms(run, _key)
    drawn = limits.drawn_basins(run)
    top = max(
        (
            float(np.nanmax(depths.table.weights))
            for result, _ in groups
            for depths in result.depths.values()
            if depths.table.answered.any()
        ),
        default=1.0,
    )
    with figure_style():
        for k, (result, names) in enumerate(groups, start=1):
            storms = f" ({', '.join(names)})" if len(groups) > 1 else ""
            pictures += [
                _panel(run, result, b, right=min(1.0, top * 1.04), storms=storms, name=f"weights-{k}-{b + 1}")
                for b in drawn
            ]
    return pictures


def _key(result: StormResult) -> bytes:
    return b"".join(np.nan_to_num(depths.table.weights, nan=-1.0).tobytes() for depths in result.depths.values())


def _panel(run: StormRun, result: StormResult, b: int, *, right: float, storms: str, name: str) -> Picture:
    methods = list(result.depths)
    weights = np.array([result.depths[method].table.weights[b] for method in methods])
    answered = ~np.isnan(weights).any(axis=1)
    most = np.nan_to_num(weights).max(axis=0)
    heavy = [int(g) for g in np.flatnonzero(most >= limits.LISTED_WEIGHT)]
    order = sorted(heavy, key=lambda g: (-round(float(most[g]), 9), run.network.ids[g]))
    rest = max(0, len(order) - _MOST_GAUGES)
    order = order[:_MOST_GAUGES]
    labels = [inline(run.network.ids[g], 14) for g in order]
    left = 0.3 + 0.062 * max((len(label) for label in labels), default=1)
    lines = -(-len(methods) // 3)
    head = _HEAD - 0.16 + 0.15 * lines
    height = head + _FOOT + _ROW * max(len(order), 1)
    figure = Figure(figsize=(HALF_WIDTH, height))
    axes = figure.add_axes(
        (left / HALF_WIDTH, _FOOT / height, 1 - (left + 0.12) / HALF_WIDTH, (height - head - _FOOT) / height)
    )
    places = np.arange(len(order))
    axes.hlines(places, 0, right, color="#c9cdd0", linewidth=0.5, zorder=1)
    if answered.any() and order:
        shown = weights[answered][:, order]
        axes.hlines(places, shown.min(axis=0), shown.max(axis=0), color=INK, linewidth=0.9, zorder=2)
    for m in np.flatnonzero(answered):
        axes.plot(
            weights[m, order],
            places,
            linestyle="none",
            color="black",
            clip_on=False,
            zorder=3 + int(m),
            **MARKS[m % len(MARKS)],
        )
    axes.set_yticks(places, labels)
    axes.set_ylim(max(len(order), 1) - 0.5, -0.5)
    axes.set_xlim(0, right)
    axes.tick_params(axis="y", length=0, pad=6)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    axes.set_xlabel("weight")
    basin = inline(run.basins.ids[b], 40)
    figure.text(0.02, 1 - 0.03 / height, basin, ha="left", va="top", fontsize=8, fontweight="bold")
    handles = [
        Line2D(
            [],
            [],
            linestyle="none",
            color="black",
            label=_legend_text(method, bool(ok)),
            **MARKS[m % len(MARKS)],
        )
        for m, (method, ok) in enumerate(zip(methods, answered, strict=True))
    ]
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(0.02, 1 - 0.19 / height),
        ncols=min(3, len(handles)),
        columnspacing=1.2,
        handletextpad=0.2,
    )
    caption = f"Weights in basin {run.basins.ids[b]}{storms}, heaviest gauge first."
    if rest:
        caption += f" {rest} more gauges with weight {limits.LISTED_WEIGHT} or more are in weights.csv."
    title = inline(f"Weights of the gauges in basin {run.basins.ids[b]}{storms}")
    svg = to_svg(figure, name, title, inline(_description(run, methods, weights, order)))
    return Picture(name, caption, svg, half=True)


def _legend_text(method: str, answered: bool) -> str:  # noqa: FBT001 - private
    return method if answered else f"{method}: no number"


def _description(run: StormRun, methods: list[str], weights: npt.NDArray[np.float64], order: list[int]) -> str:
    return "; ".join(
        f"{run.network.ids[g]}: "
        + ", ".join(f"{method} {weight_text(weights[m, g])}" for m, method in enumerate(methods))
        for g in order
    )

"""Scores by infill method: the error as a mark, and the interval of its difference to the best as a bar."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import MaxNLocator

from basinrain.infill.leave_one_out import Comparison
from basinrain.report.figures import HALF_WIDTH, INK, LINES, Picture, figure_style, to_svg
from basinrain.report.words import error_text, inline, unit_word
from basinrain.units import depth_factor

__all__ = ["scores_picture"]

_ROW, _HEAD, _FOOT = 0.19, 0.62, 0.44  # inches
_LEAST: Final = 2.2

_MARKS: Final[dict[str, dict[str, Any]]] = {
    "chosen": {"marker": "s", "markersize": 5.6, "markerfacecolor": "black"},
    "best": {"marker": "o", "markersize": 5.6, "markerfacecolor": "#9a9a9a"},
    "not told apart from the best": {"marker": "o", "markersize": 5.0, "markerfacecolor": "white"},
    "worse than the best": {"marker": "x", "markersize": 4.2, "markerfacecolor": "black", "markeredgewidth": 0.9},
}

# A band and no whiskers: these would hide the marks of short intervals.
_INTERVAL: Final[dict[str, Any]] = {"color": "#b4babe", "linewidth": 5.0, "solid_capstyle": "butt"}


def scores_picture(comparison: Comparison, *, depth_unit: str) -> Picture | None:
    """Return the figure of all candidates, from simple to complex; None where there is none.

    Parameters
    ----------
    comparison
        With a score of all gauges and a difference for every candidate.
    depth_unit
        ``"mm"`` or ``"in"``.
    """
    candidates = comparison.candidates
    if not candidates:
        return None
    mm = depth_factor(depth_unit)
    error = {c: comparison.score(c).rmse / mm for c in candidates}
    apart = {d.candidate: d for d in comparison.differences}
    best = error[comparison.best]
    labels = [inline(c, 34) for c in candidates]
    left = 0.22 + 0.049 * max(len(label) for label in labels)
    right = 0.5
    height = max(_LEAST, _HEAD + _FOOT + _ROW * len(candidates))
    with figure_style():
        figure = Figure(figsize=(HALF_WIDTH, height))
        axes = figure.add_axes(
            (left / HALF_WIDTH, _FOOT / height, 1 - (left + right) / HALF_WIDTH, (height - _HEAD - _FOOT) / height)
        )
        axes.axvline(best, color=INK, linewidth=0.7, linestyle=LINES[1], zorder=1)
        for row, candidate in enumerate(candidates):
            between = apart[candidate]
            if candidate != comparison.best and not np.isnan(between.low):
                low, high = best + between.low / mm, best + between.high / mm
                axes.plot([low, high], [row, row], zorder=2, **_INTERVAL)
            style = _MARKS[_kind(comparison, candidate)]
            axes.plot([error[candidate]], [row], linestyle="none", color="black", zorder=3, clip_on=False, **style)
            axes.annotate(
                error_text(error[candidate], depth_unit),
                (1.0, row),
                xycoords=("axes fraction", "data"),
                xytext=(5, 0),
                textcoords="offset points",
                va="center",
                fontsize=7,
                fontweight="bold" if candidate == comparison.chosen else "normal",
            )
        axes.set_yticks(np.arange(len(labels)), labels)
        for label, candidate in zip(axes.get_yticklabels(), candidates, strict=True):
            label.set_fontweight("bold" if candidate == comparison.chosen else "normal")
        axes.set_ylim(len(candidates) - 0.5, -0.5)
        axes.margins(x=0.08)
        axes.xaxis.set_major_locator(MaxNLocator(4))
        axes.set_axisbelow(True)
        axes.grid(axis="x")
        axes.tick_params(axis="y", length=0, pad=4)
        for side in ("top", "right", "left"):
            axes.spines[side].set_visible(False)
        figure.text(
            (left + (HALF_WIDTH - left - right) / 2) / HALF_WIDTH,
            0.06 / height,
            f"root mean square error, {unit_word(depth_unit)}",
            ha="center",
            fontsize=7.5,
        )
        _legend(figure, comparison, height)
        title = "Error of the infill methods"
        description = "; ".join(f"{c}: {error_text(error[c], depth_unit)} ({_kind(comparison, c)})" for c in candidates)
        svg = to_svg(figure, "scores-by-method", title, inline(description))
    caption = "Root mean square error of each method over the same cases, from simple to complex. "
    if _intervals(comparison):
        caption += (
            f"The bar is the 95 % bootstrap interval of the difference to the best ({comparison.best}), set off from "
            "the best's error: a bar that reaches the dashed line cannot be told from it. "
        )
    else:
        caption += "The cases are too few for intervals: no method can be told from another. "
    caption += "The axis does not begin at zero."
    return Picture("scores-by-method", caption, svg, half=True)


def _intervals(comparison: Comparison) -> bool:
    return any(not np.isnan(d.low) for d in comparison.differences if d.candidate != comparison.best)


def _kind(comparison: Comparison, candidate: str) -> str:
    if candidate == comparison.chosen:
        return "chosen"
    if candidate == comparison.best:
        return "best"
    worse = any(d.candidate == candidate and d.distinguishable for d in comparison.differences)
    return "worse than the best" if worse else "not told apart from the best"


def _legend(figure: Figure, comparison: Comparison, height: float) -> None:
    kinds = [kind for kind in _MARKS if any(_kind(comparison, c) == kind for c in comparison.candidates)]
    handles = [Line2D([], [], linestyle="none", color="black", label=kind, **_MARKS[kind]) for kind in kinds]
    handles.append(Line2D([], [], color=INK, linewidth=0.7, linestyle=LINES[1], label="error of the best"))
    if _intervals(comparison):
        handles.append(Line2D([], [], label="95 % interval", **_INTERVAL))
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(0.02, 1 - 0.03 / height),
        ncols=2,
        columnspacing=1.2,
        handletextpad=0.5,
        handlelength=1.6,
    )

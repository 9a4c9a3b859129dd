"""Estimated against observed depths of a leave-one-out comparison: points, or their density where there are many."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.colors import LinearSegmentedColormap, LogNorm
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FixedLocator, FuncFormatter

from basinrain.infill.leave_one_out import Comparison
from basinrain.report.figures import HALF_WIDTH, INK, LINES, Picture, figure_style, to_svg
from basinrain.report.words import error_text, inline, number_text, unit_word
from basinrain.units import depth_factor

__all__ = ["MOST_POINTS", "estimated_picture"]

MOST_POINTS: Final = 1500
"""Points beyond which their density is drawn instead of each of them."""

_HEIGHT: Final = 3.5
_CELLS: Final = 34
_APART: Final = 0.11  # of the axis, between two of its labels
_GREYS: Final = LinearSegmentedColormap.from_list("greys", ["#d9dcde", "#6d757b", "#000000"])


def estimated_picture(comparison: Comparison, *, depth_unit: str) -> Picture | None:
    """Return the figure for the chosen candidate, on square-root axes; None where nothing was compared.

    Parameters
    ----------
    comparison
        With its observed and estimated depths in mm.
    depth_unit
        ``"mm"`` or ``"in"``.
    """
    known = ~np.isnan(comparison.observed) & ~np.isnan(comparison.estimated)
    mm = depth_factor(depth_unit)
    observed, estimated = comparison.observed[known] / mm, comparison.estimated[known] / mm
    if not observed.size:
        return None
    top = max(float(observed.max()), float(estimated.max()), 0.1)
    unit = unit_word(depth_unit)
    scale = "days" if comparison.scale == "day" else "steps"
    dense = observed.size > MOST_POINTS
    with figure_style():
        figure = Figure(figsize=(HALF_WIDTH, _HEIGHT))
        left, foot, side = 0.52, 0.48, HALF_WIDTH - 0.52 - 0.14
        axes = figure.add_axes((left / HALF_WIDTH, foot / _HEIGHT, side / HALF_WIDTH, side / _HEIGHT))
        reach = float(np.sqrt(top)) * 1.04
        _guides(axes, reach)
        handles = _density(axes, observed, estimated, reach) if dense else _points(axes, observed, estimated)
        axes.set_xlim(-0.02 * reach, reach)
        axes.set_ylim(-0.02 * reach, reach)
        ticks = _ticks(top)
        for axis in (axes.xaxis, axes.yaxis):
            axis.set_major_locator(FixedLocator(np.sqrt(ticks).tolist()))
            axis.set_major_formatter(FuncFormatter(lambda value, _: f"{round(value**2, 3):g}"))
        axes.set_xlabel(f"observed, {unit} (square-root scale)")
        axes.set_ylabel(f"estimated, {unit}")
        for name in ("top", "right"):
            axes.spines[name].set_visible(False)
        handles += [
            Line2D([], [], color=INK, linewidth=0.9, label="equal"),
            Line2D([], [], color=INK, linewidth=0.7, linestyle=LINES[2], label="double, half"),
        ]
        figure.legend(
            handles=handles,
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / _HEIGHT),
            ncols=len(handles),
            columnspacing=1.0,
            handletextpad=0.4,
            handlelength=1.6,
        )
        score = comparison.score(comparison.chosen)
        numbers = (
            f"RMSE {error_text(score.rmse / mm, depth_unit)}, bias {error_text(score.bias / mm, depth_unit)} {unit}, "
            f"correlation {number_text(score.correlation, 2)}"
        )
        cases = f"{number_text(observed.size, 0, grouped=True)} case{'' if observed.size == 1 else 's'}"
        caption = (
            f"Estimated against observed by {comparison.chosen}, {cases} ({scale} at gauges). "
            f"{numbers[0].upper()}{numbers[1:]}." + (" Darker: more cases, in steps of equal ratios." if dense else "")
        )
        title = f"Estimated against observed depths by {comparison.chosen}"
        svg = to_svg(figure, "estimated", inline(title), inline(f"{cases}. {numbers}."))
    return Picture("estimated", caption, svg, half=True)


def _guides(axes: Any, reach: float) -> None:  # noqa: ANN401 - matplotlib's axes
    """Draw the lines of equal, double and half depth, on a white rim where they cross dark cells."""
    for ratio, style in ((1.0, "-"), (2.0, LINES[2]), (0.5, LINES[2])):
        ends = [0, reach], [0, reach * ratio**0.5]
        axes.plot(*ends, color="white", linewidth=2.2, zorder=4)
        axes.plot(*ends, color=INK, linewidth=0.9 if ratio == 1 else 0.7, linestyle=style, zorder=5)


def _points(axes: Any, observed: npt.NDArray[np.float64], estimated: npt.NDArray[np.float64]) -> list[Any]:  # noqa: ANN401 - matplotlib's axes
    style: dict[str, Any] = {
        "linestyle": "none",
        "marker": "o",
        "markersize": 3.2,
        "markerfacecolor": "none",
        "markeredgecolor": INK,
        "markeredgewidth": 0.5,
    }
    axes.plot(np.sqrt(observed), np.sqrt(estimated), zorder=6, clip_on=False, **style)
    return [Line2D([], [], label="a case", **style)]


def _density(
    axes: Any,  # noqa: ANN401 - matplotlib's axes
    observed: npt.NDArray[np.float64],
    estimated: npt.NDArray[np.float64],
    reach: float,
) -> list[Any]:
    counts = axes.hexbin(
        np.sqrt(observed),
        np.sqrt(estimated),
        gridsize=_CELLS,
        extent=(0, reach, 0, reach),
        mincnt=1,
        cmap=_GREYS,
        linewidths=0.1,
        zorder=3,
    )
    most = max(int(np.max(counts.get_array())), 2)
    counts.set_norm(LogNorm(1, most))
    middle = round(most**0.5)
    return [
        Line2D([], [], linestyle="none", marker="h", markersize=6, color=_GREYS(share), label=text, markeredgewidth=0)
        for share, text in ((0.0, "1"), (0.5, str(middle)), (1.0, f"{most} cases"))
        if text != "1" or middle > 1 or share == 0.0
    ]


def _ticks(top: float) -> npt.NDArray[np.float64]:
    """Return 0 and round depths up to ``top`` that stand well apart on a square-root axis.

    Examples
    --------
    >>> _ticks(120.0)
    array([  0.,   2.,  10.,  20.,  50., 100.])
    """
    power = 10.0 ** np.arange(np.floor(np.log10(top)) - 2, np.floor(np.log10(top)) + 1)
    kept = [np.inf]
    for tick in sorted((step * p for p in power for step in (1, 2, 5) if step * p <= top), reverse=True):
        if min(np.sqrt(kept[-1]) - np.sqrt(tick), np.sqrt(tick)) >= _APART * np.sqrt(top):
            kept.append(round(tick, 9))
    return np.array([0.0, *kept[:0:-1]])

"""Design hyetographs: the patterns of one point of interest and duration side by side."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import FixedLocator, FuncFormatter, MaxNLocator, MultipleLocator, PercentFormatter

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.report.design_shown import spread
from basinrain.report.figures import INK, LINES, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.hyetograph_figure import binned
from basinrain.report.words import depth_text, inline, short_names, unit_word
from basinrain.units import depth_factor

if TYPE_CHECKING:
    from basinrain.designstorm.design_hyetograph import DesignHyetograph

__all__ = ["MOST_BARS", "MOST_OUTLINES", "MOST_PATTERNS", "MOST_PICTURES", "design_pictures"]

MOST_PICTURES: Final = 6
"""Points of interest and durations that have a picture."""

MOST_PATTERNS: Final = 6
"""Patterns that have a panel."""

MOST_OUTLINES: Final = 3
"""Frequencies that are drawn in outline beside the rarest."""

MOST_BARS: Final = 120
"""Bars that a panel can still show apart."""

_ROW: Final = 3
"""Panels that stand in one row; more of them stand in two."""

_TICKS: Final = 5
_PANEL, _GAP, _LEFT, _RIGHT, _FOOT, _HEAD, _TITLE = 1.45, 0.3, 0.5, 0.5, 0.44, 0.42, 0.2  # inches
_WIDEST, _BETWEEN = 3.6, 0.24
_HOURS: Final = (0.25, 0.5, 1.0, 2.0, 3.0, 6.0, 12.0, 24.0)
_FILL: Final = "#c3c8cc"
_SHARE: Final[dict[str, Any]] = {"color": "black", "linewidth": 1.0}
_OUTLINES: Final = (LINES[1], LINES[2], LINES[3])

Floats = npt.NDArray[np.float64]
Storm = tuple[str, int]


def design_pictures(hyetographs: Sequence[DesignHyetograph], depth_unit: str) -> tuple[Picture, ...]:
    """Return a picture per point of interest and duration, the patterns in panels of one scale.

    Bars are those of the rarest frequency, with their share of the total as a line; other frequencies are outlines.
    Where depths differ between basins the one with the greatest depth is drawn, and named.

    Parameters
    ----------
    hyetographs
        Those of all points, frequencies, durations and patterns; of more than :data:`MOST_PICTURES` points and
        durations so many are drawn, spread over the durations of every point, and the last caption says so.
    depth_unit
        The unit to draw.
    """
    storms: dict[Storm, list[DesignHyetograph]] = {}
    for one in hyetographs:
        storms.setdefault((one.point, one.minutes), []).append(one)
    drawn = _drawn(list(storms))
    pictures = []
    with figure_style():
        for k, storm in enumerate(drawn, start=1):
            left_out = k == len(drawn) < len(storms)
            more = f" Drawn: {len(drawn)} of {len(storms)} points and durations." if left_out else ""
            pictures.append(_picture(storms[storm], depth_unit, name=f"design-hyetographs-{k}", more=more))
    return tuple(pictures)


def _drawn(storms: list[Storm]) -> list[Storm]:
    """Return the storms that are drawn, in order: of many durations of a point the first, the last and some between."""
    points = list(dict.fromkeys(point for point, _ in storms))[:MOST_PICTURES]
    chosen: list[Storm] = []
    for k, point in enumerate(points):
        own = sorted((storm for storm in storms if storm[0] == point), key=lambda storm: storm[1])
        room = (MOST_PICTURES - len(chosen)) // (len(points) - k)
        # A point's only picture is that of its longest storm.
        chosen += spread(own, room)
    return [storm for storm in storms if storm in chosen]


def _picture(storm: list[DesignHyetograph], unit: str, *, name: str, more: str) -> Picture:
    patterns = list(dict.fromkeys(one.pattern for one in storm))
    kept = patterns[:MOST_PATTERNS]
    storm = [one for one in storm if one.pattern in kept]
    rarest, others, left_out = _frequencies(storm)
    by_case = {(one.pattern, one.frequency): one for one in storm}
    b = _deepest(by_case, kept, rarest)
    first = storm[0]
    same = all(np.allclose(one.depth, one.depth[:, :1], rtol=1e-9, atol=0) for one in storm)
    whose = "every basin above it" if same and len(first.basins) > 1 else f"basin {first.basins[b]}"
    figure, panels = _panels(len(kept))
    mm = depth_factor(unit)
    together = 1
    for panel, pattern, label in zip(panels, kept, short_names(kept, 30), strict=True):
        panel.axes.set_title(label, fontsize=7.5)
        for frequency, line in zip(others, _OUTLINES, strict=False):
            if (pattern, frequency) in by_case:
                bars, edges, _ = _bars(by_case[pattern, frequency], b, mm)
                panel.axes.stairs(bars, edges, color=INK, linestyle=line, linewidth=0.8, zorder=3)
        if (pattern, rarest) in by_case:
            bars, edges, together = _bars(by_case[pattern, rarest], b, mm)
            panel.axes.add_collection(_filled(bars, edges))
            panel.axes.stairs(bars, edges, color=INK, linewidth=0.4)
            _draw_share(panel.share, by_case[pattern, rarest].depth[:, b], first.step)
        else:
            words = f"not at {rarest.label}"
            panel.axes.text(0.5, 0.92, words, transform=panel.axes.transAxes, ha="center", va="top", fontsize=7)
    drawn = [one for one in storm if one.frequency in (rarest, *others)]
    top = max(float(_bars(one, b, mm)[0].max()) for one in drawn)
    step = duration_text(first.step)
    step = step if together == 1 else f"{together} × {step}"
    _dress(panels, top or 1.0, first.minutes / 60, f"{unit_word(unit)} in {step}")
    duration = duration_text(first.minutes)
    _head(figure, f"{inline(first.point, 40)}, {duration}, {inline(whose, 40)}", rarest, others)
    caption = (
        f"{first.point}, {duration}: design hyetographs of {whose} by pattern; bars and their share of the total "
        f"at {rarest.label}."
    )
    if not same:
        caption += f" Of {len(first.basins)} basins it has the greatest depth."
    if len(kept) < len(patterns):
        caption += f" Drawn: {len(kept)} of {len(patterns)} patterns."
    if left_out:
        caption += f" {left_out} more {'frequency is' if left_out == 1 else 'frequencies are'} not drawn."
    if together > 1:
        caption += f" A bar adds up {together} steps."
    svg = to_svg(
        figure,
        name,
        inline(f"Design hyetographs of {whose}, {first.point}, {duration}"),
        inline(_description(drawn, b, unit)),
    )
    return Picture(name, caption + more, svg)


def _frequencies(storm: list[DesignHyetograph]) -> tuple[Frequency, list[Frequency], int]:
    """Return the rarest frequency, those drawn beside it from rare to common, and how many are left out."""
    order = sorted({one.frequency for one in storm}, key=lambda frequency: -frequency.variate)
    others = spread(order[1:], MOST_OUTLINES)
    return order[0], others, len(order) - 1 - len(others)


def _deepest(by_case: dict[tuple[str, Frequency], DesignHyetograph], patterns: list[str], rarest: Frequency) -> int:
    lead = next(by_case[pattern, rarest] for pattern in patterns if (pattern, rarest) in by_case)
    return int(np.argmax(lead.totals.round(9)))


def _bars(one: DesignHyetograph, b: int, mm: float) -> tuple[Floats, Floats, int]:
    """Return the depths of the bars, their borders in hours, and how many steps are in one."""
    bars, together = binned(one.depth[:, b] / mm, MOST_BARS)
    edges = np.minimum(np.arange(len(bars) + 1) * together * one.step, one.minutes) / 60
    return bars, edges, together


def _filled(bars: Floats, edges: Floats) -> PolyCollection:
    zero, starts, ends = np.zeros(len(bars)), edges[:-1], edges[1:]
    corners = np.array([[starts, zero], [starts, bars], [ends, bars], [ends, zero]]).transpose(2, 0, 1)
    rim = INK if len(bars) <= MOST_BARS // 3 else "face"
    return PolyCollection(list(corners), facecolors=_FILL, edgecolors=rim, linewidths=0.3)


def _draw_share(axes: Any, depth: Floats, step: int) -> None:  # noqa: ANN401 - matplotlib's axes
    total = float(depth.sum())
    if total > 0:
        share = np.append(0.0, np.cumsum(depth)) / total
        axes.plot(step / 60 * np.arange(len(share)), share, **_SHARE)


@dataclass(frozen=True)
class _Panel:
    """A panel's axes of depth and of shares, and whether it stands first or last in its row, or lowest."""

    axes: Any
    share: Any
    first: bool
    last: bool
    lowest: bool


def _panels(n: int) -> tuple[Figure, list[_Panel]]:
    """Return a figure with panels in one row or two, each with an axis of shares on its right side."""
    columns = n if n <= _ROW else -(-n // 2)
    rows = -(-n // columns)
    height = _HEAD + _FOOT + rows * (_TITLE + _PANEL) + (rows - 1) * _GAP
    figure = Figure(figsize=(PAGE_WIDTH, height))
    wide = min(_WIDEST, (PAGE_WIDTH - _LEFT - _RIGHT - (columns - 1) * _BETWEEN) / columns)
    panels = []
    for k in range(n):
        row, column = divmod(k, columns)
        bottom = height - _HEAD - (row + 1) * (_TITLE + _PANEL) - row * _GAP
        left = _LEFT + column * (wide + _BETWEEN)
        axes = figure.add_axes((left / PAGE_WIDTH, bottom / height, wide / PAGE_WIDTH, _PANEL / height))
        last = column == columns - 1 or k == n - 1
        panels.append(_Panel(axes, axes.twinx(), first=column == 0, last=last, lowest=k + columns >= n))
    return figure, panels


def _dress(panels: list[_Panel], top: float, hours: float, depth: str) -> None:
    between = next((step for step in _HOURS if hours / step <= _TICKS), 24.0 * math.ceil(hours / 24 / _TICKS))
    for panel in panels:
        axes, share = panel.axes, panel.share
        axes.set_xlim(0, hours)
        axes.set_ylim(0, top * 1.06)
        share.set_ylim(0, 1.06)
        axes.yaxis.set_major_locator(MaxNLocator(4))
        axes.xaxis.set_major_locator(MultipleLocator(between))
        axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        share.yaxis.set_major_locator(FixedLocator([0, 0.25, 0.5, 0.75, 1.0]))
        share.yaxis.set_major_formatter(PercentFormatter(1.0, decimals=0, symbol=""))
        axes.set_axisbelow(True)
        axes.grid(axis="y")
        axes.tick_params(axis="y", left=panel.first, labelleft=panel.first)
        share.tick_params(axis="y", right=panel.last, labelright=panel.last)
        axes.tick_params(axis="x", labelbottom=panel.lowest)
        axes.spines["top"].set_visible(False)
        share.spines["top"].set_visible(False)
        axes.set_ylabel(depth if panel.first else "")
        share.set_ylabel("share of the total, %" if panel.last else "")
        axes.set_xlabel("elapsed time, hours" if panel.lowest else "")
    panels[0].axes.figure.align_ylabels([panel.axes for panel in panels if panel.first])


def _head(figure: Figure, title: str, rarest: Frequency, others: list[Frequency]) -> None:
    height = figure.get_figheight()
    figure.text(0.012, 1 - 0.04 / height, title, ha="left", va="top", fontsize=8, fontweight="bold")
    handles: list[Any] = [Patch(facecolor=_FILL, edgecolor=INK, linewidth=0.4, label=rarest.label)]
    handles += [
        Line2D([], [], color=INK, linestyle=line, linewidth=0.8, label=frequency.short_label)
        for frequency, line in zip(others, _OUTLINES, strict=False)
    ]
    handles.append(Line2D([], [], label="cumulative share", **_SHARE))
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(0.012, 1 - 0.21 / height),
        ncols=len(handles),
        columnspacing=1.3,
        handletextpad=0.5,
        handlelength=2.4,
    )


def _description(drawn: list[DesignHyetograph], b: int, unit: str) -> str:
    mm = depth_factor(unit)
    parts = []
    for one in drawn:
        depth = one.depth[:, b] / mm
        t = int(np.argmax(depth))
        parts.append(
            f"{one.pattern}, {one.frequency.label}: total {depth_text(float(depth.sum()), unit)}, greatest step "
            f"{depth_text(float(depth[t]), unit)}, ending after {(t + 1) * one.step:g} min"
        )
    return f"{unit_word(unit)}; {'; '.join(parts)}"

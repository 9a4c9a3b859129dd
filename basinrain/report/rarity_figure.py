"""How rare a storm was: its greatest depths over depth-duration-frequency curves, areal and at the wettest gauge."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FixedLocator, NullLocator

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.found_frequency import odds
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.storm_depths import RarityRow, StormDepths, StormRarity
from basinrain.report.design_depths_figure import apart
from basinrain.report.duration_axis import depth_axis
from basinrain.report.figures import HALO, INK, LINES, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.words import depth_text, inline, unit_word
from basinrain.units import depth_factor

__all__ = ["rarity_picture"]

_HEIGHT, _LEFT, _FOOT, _HEAD, _GAP, _LABELS = 3.7, 0.52, 0.44, 0.52, 0.3, 0.66  # inches
_APART: Final = 9.0  # points between the labels of two curves
_CURVES: Final = 8
_NAMED: Final = (15.0, 60.0, 360.0, 1440.0)  # the durations looked for first
_GREY: Final = "#5a6268"
# Dashes only: the solid line is the storm's.
_DASHES: Final = (*LINES[1:], (0, (9, 2)), (0, (1, 3)), (0, (4, 1, 1, 1)))
_AREAL: Final[dict[str, Any]] = {"marker": "o", "markersize": 5.0, "markerfacecolor": "white"}
_POINT: Final[dict[str, Any]] = {"marker": "s", "markersize": 4.4, "markerfacecolor": "black"}

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class _Panel:
    """One kind of depths: curves by duration and frequency in the unit drawn, and the storm's rows."""

    title: str
    minutes: Floats
    curves: Floats
    rows: tuple[RarityRow, ...]
    look: dict[str, Any]


def rarity_picture(rarity: StormRarity, area: str, *, depth_unit: str, name: str = "rarity") -> Picture | None:
    """Return the figure of one storm over one area, beside it that of the wettest gauge.

    Parameters
    ----------
    rarity
        The storm.
    area
        One of its areas.
    depth_unit
        ``"mm"`` or ``"in"``.
    name
        The figure's id in the page.

    Returns
    -------
    Picture or None
        None where fewer than two durations have a curve, or none has a depth above 0: a logarithmic scale has no place
        for them.

    Notes
    -----
    At most eight curves are drawn, the first and the last among them. Where point depths differ from gauge to gauge,
    the curves of a duration are those at the gauge that was the wettest in it.
    """
    mm = depth_factor(depth_unit)
    rows = tuple(row for row in rarity.rows if row.place == area and row.found.depth > 0)
    if not rows:
        return None
    areal = rarity.areal.ladder[rarity.areal.names.index(area)] / mm
    shown = np.unique(np.linspace(0, len(rarity.frequencies) - 1, min(len(rarity.frequencies), _CURVES)).round())
    places = shown.astype(np.int64)
    panels = [_Panel(f"Mean over {inline(area, 34)}, areal depths", rarity.minutes, areal[:, places], rows, _AREAL)]
    points = tuple(row for row in rarity.gauge_rows if row.found.depth > 0)
    if rarity.gauges is not None and points:
        minutes, curves = _point_curves(rarity.gauges, rarity.minutes, points)
        panels.append(_Panel("Wettest gauge, point depths", minutes, curves[:, places] / mm, points, _POINT))
    panels = [panel for panel in panels if np.count_nonzero((panel.curves > 0).any(axis=1)) > 1]
    if not panels or panels[0].rows is not rows:
        return None
    frequencies = [rarity.frequencies[k] for k in places]
    with figure_style():
        svg = to_svg(
            _figure(panels, frequencies, rarity.storm, mm, depth_unit),
            name,
            inline(f"How rare storm {rarity.storm} was over {area}"),
            inline(_described(panels, mm, depth_unit)),
        )
    return Picture(name, _caption(panels, rarity, area, n_shown=len(places)), svg)


def _point_curves(gauges: StormDepths, minutes: Floats, rows: Sequence[RarityRow]) -> tuple[Floats, Floats]:
    """Return durations and point depths in mm: of all where they are the same everywhere, else at the wettest gauge."""
    if np.array_equal(gauges.ladder, np.broadcast_to(gauges.ladder[:1], gauges.ladder.shape), equal_nan=True):
        return minutes, gauges.ladder[0]
    durations = np.array([row.minutes for row in rows])
    d = np.searchsorted(minutes, durations)
    return durations, gauges.ladder[[gauges.names.index(row.place) for row in rows], d]


def _figure(
    panels: Sequence[_Panel], frequencies: Sequence[Frequency], storm: str, mm: float, depth_unit: str
) -> Figure:
    figure = Figure(figsize=(PAGE_WIDTH, _HEIGHT))
    n = len(panels)
    width = (PAGE_WIDTH - _LEFT - n * _LABELS - (n - 1) * _GAP) / n
    drawn = [panel.curves[panel.curves > 0] for panel in panels]
    depths = [np.array([row.found.depth / mm for row in panel.rows]) for panel in panels]
    every = np.concatenate([*drawn, *depths])
    durations = np.unique(np.concatenate([panel.minutes[(panel.curves > 0).any(axis=1)] for panel in panels]))
    # The same scales for both, so that the point and the area are seen beside each other.
    limits = float(every.min()) / 1.25, float(every.max()) * 1.25
    for k, panel in enumerate(panels):
        left = _LEFT + k * (width + _LABELS + _GAP)
        axes = figure.add_axes((left / PAGE_WIDTH, _FOOT / _HEIGHT, width / PAGE_WIDTH, 1 - (_FOOT + _HEAD) / _HEIGHT))
        axes.set_xscale("log")
        axes.set_yscale("log")
        axes.set_xlim(float(durations[0]) / 1.2, float(durations[-1]) * 1.2)
        axes.set_ylim(*limits)
        _draw_curves(axes, panel, frequencies)
        _draw_storm(axes, panel, mm)
        _label_axes(axes, durations, width)
        depth_axis(axes, "" if k else f"depth, {unit_word(depth_unit)}")
        axes.set_title(panel.title, pad=5)
    texts = {"areal": f"storm {inline(storm, 40)}, mean over the basin", "point": "wettest gauge"}
    handles = [
        Line2D([], [], color="black", linewidth=1.7, label=texts[panel.rows[0].kind], **panel.look) for panel in panels
    ]
    kind = "chance a year" if frequencies[0].series == ANNUAL_MAXIMUM else "return period, partial duration"
    handles.append(Line2D([], [], color=_GREY, linewidth=0.9, linestyle=_DASHES[0], label=f"curves by {kind}"))
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(0.02, 1 - 0.05 / _HEIGHT),
        ncols=3,
        columnspacing=1.6,
        handletextpad=0.5,
        handlelength=3.4,
    )
    return figure


def _draw_curves(axes: Axes, panel: _Panel, frequencies: Sequence[Frequency]) -> None:
    """Draw a line for every frequency, each named where it ends."""
    ends: list[tuple[float, float, str]] = []
    for k, frequency in enumerate(frequencies):
        here = panel.curves[:, k] > 0
        if here.any():
            minutes, depth = panel.minutes[here], panel.curves[here, k]
            axes.plot(minutes, depth, color=_GREY, linewidth=0.9, linestyle=_DASHES[k % len(_DASHES)], zorder=2)
            ends.append((float(minutes[-1]), float(depth[-1]), odds(frequency)))
    low, high = np.log(axes.get_ylim())
    points = axes.get_position().height * _HEIGHT * 72
    ends.sort(key=lambda end: end[1])
    wanted = [float((np.log(last) - low) / (high - low) * points) for _, last, _ in ends]
    for (longest, last, text), place in zip(ends, apart(wanted, gap=_APART, top=points), strict=True):
        axes.annotate(
            text,
            (longest, last),
            xytext=(1.01, place / points),
            textcoords=("axes fraction", "axes fraction"),
            fontsize=6.8,
            ha="left",
            va="center",
            annotation_clip=False,
            arrowprops={"arrowstyle": "-", "color": _GREY, "linewidth": 0.5, "shrinkA": 0.5, "shrinkB": 0.5},
        )


def _draw_storm(axes: Axes, panel: _Panel, mm: float) -> None:
    minutes = np.array([row.minutes for row in panel.rows])
    depth = np.array([row.found.depth / mm for row in panel.rows])
    axes.plot(minutes, depth, color="white", linewidth=3.4, zorder=3)
    axes.plot(minutes, depth, color="black", linewidth=1.7, zorder=4, **panel.look)
    if panel.rows[0].kind == "areal":
        return
    low, high = np.log(axes.get_xlim())
    changes = [k for k, row in enumerate(panel.rows) if not k or row.place != panel.rows[k - 1].place]
    for n, k in enumerate(changes):
        row = panel.rows[k]
        # By turns below and above the line, which rises; at its right end never beyond it, where the curves' names are.
        above = n % 2 == 1 or (np.log(row.minutes) - low) / (high - low) > 0.75
        axes.annotate(
            inline(row.place, 14),
            (row.minutes, depth[k]),
            xytext=(-3, 8) if above else (3, -8),
            textcoords="offset points",
            fontsize=6.5,
            ha="right" if above else "left",
            va="center",
            color=INK,
            zorder=5,
            gid=f"{HALO}-{k}",
        )


def _label_axes(axes: Axes, minutes: Floats, width: float) -> None:
    """Mark every duration, and name as many as have room."""
    low, high = np.log(axes.get_xlim())
    at = (np.log(minutes) - low) / (high - low) * width * 72
    words = [duration_text(one) for one in minutes.tolist()]
    half = np.array([2.1 * len(word) + 2 for word in words])
    shown: list[int] = []
    first = [int(k) for k in np.flatnonzero(np.isin(minutes, _NAMED))]
    for k in dict.fromkeys([*first, len(minutes) - 1, *range(len(minutes))]):
        if all(abs(at[k] - at[other]) >= half[k] + half[other] for other in shown):
            shown.append(k)
    axes.xaxis.set_major_locator(FixedLocator(minutes.tolist()))
    axes.set_xticks(minutes, [word if k in shown else "" for k, word in enumerate(words)])
    axes.xaxis.set_minor_locator(NullLocator())


def _described(panels: Sequence[_Panel], mm: float, depth_unit: str) -> str:
    return "; ".join(
        f"{panel.title}: "
        + ", ".join(
            f"{duration_text(row.minutes)} {depth_text(row.found.depth / mm, depth_unit)}"
            + (f" at {row.place}" if row.kind == "point" else "")
            + f" ({row.found.words})"
            for row in panel.rows
        )
        for panel in panels
    )


def _caption(panels: Sequence[_Panel], rarity: StormRarity, area: str, *, n_shown: int) -> str:
    text = (
        f"Storm {rarity.storm}: greatest mean depths over {area} by duration, drawn on its areal depths of equal "
        "frequency; both axes logarithmic."
    )
    if len(panels) > 1:
        text += (
            " Right: the wettest gauge of each duration, named where it changes, on point depths. How rare a depth "
            "was is read against the curves of its own panel only."
        )
        if len(panels[1].minutes) != len(rarity.minutes):
            text += " Point depths are those at the gauge named."
    if n_shown < len(rarity.frequencies):
        text += f" Of the table's {len(rarity.frequencies)} frequencies {n_shown} are drawn."
    return text

"""The map of the error: how far the estimates at every gauge are from what it observed."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt
import shapely
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import PathPatch

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.ground import LOCAL
from basinrain.infill.leave_one_out import Comparison
from basinrain.report.figures import HALO, INK, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.labels import Box, LabelPlacer
from basinrain.report.map_parts import (
    Extent,
    kilometres,
    line_parts,
    merged,
    nice_length,
    north_arrow,
    outline,
    scale_bar,
)
from basinrain.report.words import counted, error_text, inline, short_names, unit_word
from basinrain.units import depth_factor

__all__ = ["error_map_picture"]

_TALLEST: Final = 6.4
_LARGEST: Final = 17.0  # points across the circle of the largest error
_RIM: Final = 2.0  # points that labels keep from circles
_FEW: Final = 60
_LEFT, _RIGHT, _BOTTOM, _HEAD = 0.55, 0.1, 0.42, 0.34  # inches
_FILLS: Final = {"over": "white", "under": "#8d969c"}

Floats = npt.NDArray[np.float64]


def error_map_picture(
    comparison: Comparison, network: GaugeNetwork, basins: Basins | None, *, depth_unit: str
) -> Picture | None:
    """Return the map: circles whose area is the mean square error, filled where the estimates are too low.

    Parameters
    ----------
    comparison
        Its chosen candidate's scores by gauge are shown.
    network, basins
        In the working plane; basins where the job has any.
    depth_unit
        ``"mm"`` or ``"in"``.

    Returns
    -------
    Picture or None
        None where no gauge has a score.
    """
    errors = _errors(comparison, network, depth_unit)
    if errors is None:
        return None
    extent = _extent(network, basins)
    wide, high = extent.east - extent.west, extent.north - extent.south
    width = PAGE_WIDTH - _LEFT - _RIGHT
    height = width * high / wide
    if height > _TALLEST - _HEAD - _BOTTOM:
        height = _TALLEST - _HEAD - _BOTTOM
        width = height * wide / high
    total = height + _HEAD + _BOTTOM
    scale = width * 72 / wide
    with figure_style():
        figure = Figure(figsize=(PAGE_WIDTH, total))
        left = _LEFT + (PAGE_WIDTH - _LEFT - _RIGHT - width) / 2
        axes = figure.add_axes((left / PAGE_WIDTH, _BOTTOM / total, width / PAGE_WIDTH, height / total))
        axes.set_xlim(extent.west, extent.east)
        axes.set_ylim(extent.south, extent.north)
        if basins is not None:
            _draw_basins(axes, basins, 1 / scale)
        kilometres(axes)
        _circles(axes, network, errors)
        lost = _label(_Sheet(axes, extent, scale), network, errors)
        scale_bar(axes, extent, scale)
        if network.crs != LOCAL:
            north_arrow(axes, extent, scale, network.crs)
        legend = _legend(errors)
        if basins is not None:
            legend.append(Line2D([], [], color="#6d757b", linewidth=0.8, label="basin boundary"))
        figure.legend(
            handles=legend,
            loc="center left",
            bbox_to_anchor=(_LEFT / PAGE_WIDTH, 1 - (_HEAD / 2) / total),
            ncols=len(legend),
            columnspacing=1.4,
            handletextpad=0.7,
        )
        unit = unit_word(depth_unit)
        told = np.flatnonzero(~np.isnan(errors.size))
        description = "; ".join(
            f"{network.ids[g]}: error {error_text(errors.size[g], depth_unit)}, "
            f"bias {error_text(errors.bias[g], depth_unit)}"
            for g in told
        )
        svg = to_svg(figure, "error-map", "Map of the error at the gauges", inline(f"In {unit}. {description}."))
    caption = (
        f"Root mean square error at every gauge by {comparison.chosen}, estimated from the others, and bias in {unit}. "
        "The area of a circle grows with the square of the error. A gauge at the rim of the network has neighbours on "
        "one side only."
    )
    silent = len(network) - len(told)
    if silent:
        caption += f" {counted(silent, 'gauge without a score is', 'gauges without a score are')} a cross."
    if lost:
        caption += f" For want of room {counted(lost, 'label is', 'labels are')} left out; all are in the table."
    if network.crs != LOCAL:
        caption += " The arrow points to true north."
    return Picture("error-map", caption, svg)


def _extent(network: GaugeNetwork, basins: Basins | None) -> Extent:
    x, y = network.x, network.y
    west, south, east, north = float(x.min()), float(y.min()), float(x.max()), float(y.max())
    if basins is not None:
        b_west, b_south, b_east, b_north = basins.bounds
        west, south, east, north = min(west, b_west), min(south, b_south), max(east, b_east), max(north, b_north)
    longer = max(east - west, north - south) or 1000.0
    pad = 0.09 * longer
    # A row of gauges still gets a map that one can look at.
    extra_x, extra_y = max(0.0, 0.35 * longer - (east - west)) / 2, max(0.0, 0.35 * longer - (north - south)) / 2
    return Extent(west - pad - extra_x, south - 1.8 * pad - extra_y, east + pad + extra_x, north + pad + extra_y)


def _draw_basins(axes: Any, basins: Basins, pixel: float) -> None:  # noqa: ANN401 - matplotlib's axes
    area = outline(basins.union.simplify(pixel / 2))
    axes.add_patch(PathPatch(area, facecolor="#eef0ee", edgecolor="none", zorder=1))
    borders = merged(shapely.unary_union(shapely.boundary(basins.polygons))).simplify(pixel / 2)
    axes.add_collection(LineCollection(line_parts(borders), colors="#6d757b", linewidths=0.8, zorder=2))


@dataclass(frozen=True)
class _Errors:
    """Error and bias of every gauge in the depth unit, NaN where it has no score, and the unit."""

    size: Floats
    bias: Floats
    unit: str

    @property
    def largest(self) -> float:
        return float(np.nanmax(self.size)) or 1.0

    def across(self, size: Floats | float) -> Floats:
        """Return diameters in points: in proportion to the error, and never too small to be seen."""
        return np.maximum(_LARGEST * np.asarray(size) / self.largest, 3.0)


def _errors(comparison: Comparison, network: GaugeNetwork, depth_unit: str) -> _Errors | None:
    mm = depth_factor(depth_unit)
    scores = {s.gauge: s for s in comparison.scores if s.scale == comparison.scale and s.candidate == comparison.chosen}
    size = np.array([scores[g].rmse / mm if g in scores else np.nan for g in network.ids])
    bias = np.array([scores[g].bias / mm if g in scores else np.nan for g in network.ids])
    return None if np.isnan(size).all() else _Errors(size, bias, depth_unit)


def _circle(size: float, fill: str) -> dict[str, Any]:
    return {
        "marker": "o",
        "markersize": size,
        "markerfacecolor": _FILLS[fill],
        "markeredgecolor": INK,
        "markeredgewidth": 0.9,
        "linestyle": "none",
    }


def _circles(axes: Any, network: GaugeNetwork, errors: _Errors) -> None:  # noqa: ANN401 - matplotlib's axes
    across = errors.across(errors.size)
    # The large ones first, so that no small one is hidden.
    for g in np.argsort(-np.nan_to_num(across), kind="stable"):
        if np.isnan(across[g]):
            axes.plot(network.x[g], network.y[g], marker="x", markersize=5, color=INK, linestyle="none", zorder=8)
        else:
            fill = "under" if errors.bias[g] < 0 else "over"
            axes.plot(network.x[g], network.y[g], zorder=8, **_circle(float(across[g]), fill))


@dataclass(frozen=True)
class _Sheet:
    """A map being drawn: its axes, what it shows, points a metre."""

    axes: Any
    extent: Extent
    scale: float


def _label(sheet: _Sheet, network: GaugeNetwork, errors: _Errors) -> int:
    """Write id, error and bias beside every gauge that has room for it; return how many have none."""
    extent, scale = sheet.extent, sheet.scale
    half = np.nan_to_num(errors.across(errors.size), nan=5.0) / 2
    x, y = (network.x - extent.west) * scale, (network.y - extent.south) * scale
    frame = Box(0, 0, (extent.east - extent.west) * scale, (extent.north - extent.south) * scale)
    reach = half + _RIM
    taken = [Box(x[g] - reach[g], y[g] - reach[g], x[g] + reach[g], y[g] + reach[g]) for g in range(len(network))]
    placer = LabelPlacer(frame, [*taken, Box(0, 0, frame.right, 26)])
    few = len(network) <= _FEW
    size = 6.5 if few else 5.5
    names = short_names(network.ids, 16)
    lost = 0
    for g in sorted(range(len(network)), key=lambda g: (-np.nan_to_num(errors.size[g], nan=-1.0), network.ids[g])):
        lines = [names[g]]
        if few and not np.isnan(errors.size[g]):
            lines.append(f"{error_text(errors.size[g], errors.unit)} ({_signed(errors.bias[g], errors.unit)})")
        place = placer.beside(x[g], y[g], lines, size, gap=half[g] + 2.5)
        if place is None and len(lines) > 1:
            lines = lines[:1]
            place = placer.beside(x[g], y[g], lines, size, gap=half[g] + 2.5)
        if place is None:
            lost += 1
            continue
        sheet.axes.text(
            extent.west + place.x / scale,
            extent.south + place.y / scale,
            "\n".join(lines),
            ha=place.side,
            va="center",
            fontsize=size,
            linespacing=1.0,
            gid=f"{HALO}-{g}",
            zorder=7,
        )
    return lost


def _signed(value: float, unit: str) -> str:
    text = error_text(value, unit)
    return f"+{text}" if value > 0 and text.strip("0.") else text


def _legend(errors: _Errors) -> list[Line2D]:
    bias = errors.bias[~np.isnan(errors.size)]
    top = nice_length(errors.largest)
    handles = [
        Line2D([], [], label=text, **_circle(float(errors.across(value)), "over"))
        for value, text in ((top / 2, f"{top / 2:g}"), (top, f"error of {top:g} {unit_word(errors.unit)}"))
    ]
    if (bias >= 0).any():
        handles.append(Line2D([], [], label="estimates not too low on average", **_circle(6.0, "over")))
    if (bias < 0).any():
        handles.append(Line2D([], [], label="too low on average", **_circle(6.0, "under")))
    return handles

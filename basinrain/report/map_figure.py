"""The map: basins, Thiessen cells inside them, and gauges whose marks say what is known of them."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt
import shapely
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import PathPatch

from basinrain.averaging import thiessen_pieces
from basinrain.basins import UNION
from basinrain.ground import LOCAL
from basinrain.report import limits
from basinrain.report.figures import HALO, INK, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.labels import Box, Label, LabelPlacer
from basinrain.report.map_parts import Extent, Shape, kilometres, line_parts, merged, north_arrow, outline, scale_bar
from basinrain.report.words import counted, depth_text, inline, unit_word
from basinrain.results import StormResult, StormRun
from basinrain.storms import status_of_total
from basinrain.units import depth_factor

__all__ = ["map_pictures"]

_REACH: Final = 0.6  # gauges farther from the basins than this share of their box are only named
_TALLEST: Final = 7.2
_FEW: Final = 40  # gauges that still have their totals beside them
_LONGEST: Final = 18  # letters of a label
_LEFT, _RIGHT, _BOTTOM, _LINE_HEIGHT = 0.55, 0.1, 0.42, 0.15  # inches
_TOUCH: Final = 1e-3

# Fill and overlay of a gauge's mark, by the status of its total.
_FILLS: Final[dict[str, dict[str, Any]]] = {
    "observed": {"markerfacecolor": "black"},
    "spread": {"markerfacecolor": "#9a9a9a"},
    "partly infilled": {"markerfacecolor": "black", "markerfacecoloralt": "white", "fillstyle": "bottom"},
    "infilled": {"markerfacecolor": "white"},
    "in service for part": {"markerfacecolor": "black", "markerfacecoloralt": "white", "fillstyle": "left"},
    "missing": {"markerfacecolor": "none"},
    "not installed": {"markerfacecolor": "none"},
}
_WORDS: Final = {"spread": "observed over a longer time, spread", "missing": "no total"}


def map_pictures(run: StormRun) -> list[Picture]:
    """Return one map for every set of storms in which the gauges have the same statuses."""
    pictures = []
    with figure_style():
        ground = _Ground(run)
        for k, (result, names) in enumerate(limits.same_storms(run, _statuses), start=1):
            pictures.append(_picture(run, ground, result, names, k))
    return pictures


def _statuses(result: StormResult) -> tuple[str, ...]:
    record = result.completed.record
    statuses = (status_of_total(record, g) for g in range(len(record.gauges)))
    # A map has room for who measured and who did not; the gauges' table tells estimated and adjusted values apart.
    return tuple(status if status in _FILLS else "observed" for status in statuses)


class _Ground:
    """What all maps of a run share: the lines, cut to what the map's width can show, and the frame."""

    def __init__(self, run: StormRun) -> None:
        basins = run.basins
        west, south, east, north = basins.bounds
        reach = _REACH * max(east - west, north - south)
        x, y = run.network.x, run.network.y
        self.on_map: npt.NDArray[np.bool_] = (
            (x >= west - reach) & (x <= east + reach) & (y >= south - reach) & (y <= north + reach)
        )
        west, south = min(west, *x[self.on_map], east), min(south, *y[self.on_map], north)
        east, north = max(east, *x[self.on_map], west), max(north, *y[self.on_map], south)
        pad = 0.06 * max(east - west, north - south)
        self.west, self.south, self.east, self.north = west - pad, south - 2 * pad, east + pad, north + pad
        pixel = max(self.east - self.west, self.north - self.south) / (PAGE_WIDTH * 72)
        union: Shape = basins.polygons[basins.ids.index(UNION)] if UNION in basins.ids else basins.union
        self.area = union.simplify(pixel / 2)
        self.inside: npt.NDArray[np.bool_] = np.asarray(shapely.dwithin(shapely.points(x, y), union, _TOUCH))
        # Nodes and merges, so that an edge of two basins is drawn once and simplified once.
        borders = shapely.unary_union(shapely.boundary(basins.polygons))
        self.borders = merged(borders).simplify(pixel / 2)
        self.border_width = 1.2 if len(basins) <= limits.BASINS else 0.7
        self.cells = self._cells(run, union, pixel)

    @staticmethod
    def _cells(run: StormRun, union: Shape, pixel: float) -> Shape:
        basin, _, polygons, _ = thiessen_pieces(run.network, run.basins)
        whole = run.basins.ids.index(UNION) if UNION in run.basins.ids else None
        pieces = polygons if whole is None else polygons[np.asarray(basin) == whole]
        edges: Shape = shapely.unary_union(shapely.boundary(pieces))
        rim = shapely.boundary(union).buffer(pixel / 4, quad_segs=1)
        return merged(edges.difference(rim)).simplify(pixel / 2)


def _picture(run: StormRun, ground: _Ground, result: StormResult, names: tuple[str, ...], number: int) -> Picture:
    statuses = _statuses(result)
    handles = _legend(ground, statuses)
    legend_columns = 3
    head = 0.12 + _LINE_HEIGHT * math.ceil(len(handles) / legend_columns)
    wide, high = ground.east - ground.west, ground.north - ground.south
    width = PAGE_WIDTH - _LEFT - _RIGHT
    height = width * high / wide
    if height > _TALLEST - head - _BOTTOM:
        height = _TALLEST - head - _BOTTOM
        width = height * wide / high
    total = height + head + _BOTTOM
    figure = Figure(figsize=(PAGE_WIDTH, total))
    left = _LEFT + (PAGE_WIDTH - _LEFT - _RIGHT - width) / 2
    axes = figure.add_axes((left / PAGE_WIDTH, _BOTTOM / total, width / PAGE_WIDTH, height / total))
    axes.set_xlim(ground.west, ground.east)
    axes.set_ylim(ground.south, ground.north)
    axes.add_patch(PathPatch(outline(ground.area), facecolor="#eef0ee", edgecolor="none", zorder=1))
    axes.add_collection(
        LineCollection(line_parts(ground.cells), colors=INK, linewidths=0.7, linestyles=[(0, (3, 2))], zorder=2)
    )
    axes.add_collection(
        LineCollection(line_parts(ground.borders), colors=INK, linewidths=ground.border_width, zorder=3)
    )
    kilometres(axes)
    for mark, gauges in _marks(ground, statuses).items():
        axes.plot(run.network.x[gauges], run.network.y[gauges], **_mark_style(*mark), linestyle="none", zorder=5)
    scale = width * 72 / wide  # points a metre
    sheet = _Sheet(axes, ground, scale, LabelPlacer(Box(0, 0, width * 72, height * 72)))
    unlabelled = _label(sheet, run, result)
    extent = Extent(ground.west, ground.south, ground.east, ground.north)
    scale_bar(axes, extent, scale)
    if run.plane.crs != LOCAL:
        north_arrow(axes, extent, scale, run.plane.crs)
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(_LEFT / PAGE_WIDTH, 1 - 0.02 / total),
        ncols=legend_columns,
        columnspacing=1.6,
        handletextpad=0.6,
    )
    storms = ", ".join(names) if len(run.storms) > 1 else ""
    caption = _caption(run, ground, storms, unlabelled)
    name = f"map-{number}"
    description = (
        f"Map of {counted(int((np.array(run.basins.ids) != UNION).sum()), 'basin')} and "
        f"{counted(int(ground.on_map.sum()), 'gauge')} with Thiessen cells. "
        + "; ".join(
            f"{_mark_words(*mark)}: {', '.join(run.network.ids[g] for g in gauges[:40])}"
            for mark, gauges in _marks(ground, statuses).items()
        )
        + "."
    )
    title = "Map of basins and gauges" + (f", {storms}" if storms else "")
    return Picture(name, caption, to_svg(figure, name, inline(title), inline(description)))


def _caption(run: StormRun, ground: _Ground, storms: str, unlabelled: int) -> str:
    parts = [
        "Basins, Thiessen cells with every gauge of the network present, and gauges with their storm total in "
        f"{unit_word(run.depth_unit)}" + (f" ({storms})." if storms else ".")
    ]
    away = [run.network.ids[g] for g in np.flatnonzero(~ground.on_map)]
    if away:
        listed = ", ".join(away[:12]) + (f" and {len(away) - 12} more" if len(away) > 12 else "")
        parts.append(f"Beyond the map: {counted(len(away), 'gauge')} ({listed}).")
    if unlabelled:
        parts.append(f"For want of room {counted(unlabelled, 'label is', 'labels are')} left out.")
    if run.plane.crs != LOCAL:
        parts.append("The arrow points to true north.")
    return " ".join(parts)


Mark = tuple[str, bool]


def _marks(ground: _Ground, statuses: Iterable[str]) -> dict[Mark, list[int]]:
    marks: dict[Mark, list[int]] = {}
    for g, status in enumerate(statuses):
        if ground.on_map[g]:
            marks.setdefault((status, bool(ground.inside[g])), []).append(g)
    order = list(_FILLS)
    return dict(sorted(marks.items(), key=lambda item: (not item[0][1], order.index(item[0][0]))))


def _mark_style(status: str, inside: bool) -> dict[str, Any]:  # noqa: FBT001 - one half of a mark's key
    if status in ("missing", "not installed"):
        shape = {"missing": "x", "not installed": "+"}[status]
        return {"marker": shape, "markersize": 7 if inside else 5, "color": INK, "markeredgewidth": 1.3}
    return {
        "marker": "o" if inside else "s",
        "markersize": 6.2 if inside else 5.4,
        "color": INK,
        "markeredgecolor": INK,
        "markeredgewidth": 1.0,
        **_FILLS[status],
    }


def _mark_words(status: str, inside: bool) -> str:  # noqa: FBT001 - one half of a mark's key
    return f"{'gauge' if inside else 'gauge outside'}, {_WORDS.get(status, status)}"


def _legend(ground: _Ground, statuses: Iterable[str]) -> list[Line2D]:
    handles = [
        Line2D([], [], **_mark_style(*mark), linestyle="none", label=_mark_words(*mark))
        for mark in _marks(ground, statuses)
    ]
    handles.append(Line2D([], [], color=INK, linewidth=ground.border_width, label="basin boundary"))
    if not ground.cells.is_empty:
        handles.append(Line2D([], [], color=INK, linewidth=0.7, linestyle=(0, (3, 2)), label="edge of Thiessen cells"))
    return handles


@dataclass(frozen=True)
class _Sheet:
    """A map being drawn: its axes, their ground, points a metre, and the labels placed so far."""

    axes: Any
    ground: _Ground
    scale: float
    placer: LabelPlacer

    def points(self, x: Any, y: Any) -> tuple[Any, Any]:  # noqa: ANN401 - numbers or arrays
        """Return positions in points from the map's lower left corner."""
        return (x - self.ground.west) * self.scale, (y - self.ground.south) * self.scale

    def write(self, place: Label, text: str, gid: str, **style: Any) -> None:  # noqa: ANN401 - a text's properties
        """Write a text on a white rim."""
        x, y = self.ground.west + place.x / self.scale, self.ground.south + place.y / self.scale
        self.axes.text(x, y, text, ha=place.side, va="center", gid=f"{HALO}-{gid}", **style)


def _label(sheet: _Sheet, run: StormRun, result: StormResult) -> int:
    """Label basins and gauges; return how many labels found no room."""
    network, placer = run.network, sheet.placer
    x, y = sheet.points(network.x, network.y)
    shown = np.flatnonzero(sheet.ground.on_map)
    # Marks, scale bar and arrow stay clear.
    placer.taken += [Box(x[g] - 4, y[g] - 4, x[g] + 4, y[g] + 4) for g in shown]
    placer.taken.append(Box(0, 0, placer.frame.right, 26))
    lost = _label_basins(sheet, run)
    totals = result.completed.record.depth.sum(axis=0) / depth_factor(run.depth_unit)
    few = len(shown) <= _FEW
    size = 6.5 if few else 5.5
    weight = np.max([np.nan_to_num(d.table.weights).max(axis=0) for d in result.depths.values()], axis=0)
    for g in sorted(shown, key=lambda g: (-round(float(weight[g]), 9), network.ids[g])):
        lines = [inline(network.ids[g], _LONGEST)] + ([depth_text(totals[g], run.depth_unit)] if few else [])
        place = placer.beside(x[g], y[g], lines, size, gap=5.5)
        if place is None and len(lines) > 1:
            lines = lines[:1]
            place = placer.beside(x[g], y[g], lines, size, gap=5.5)
        if place is None:
            lost += 1
        else:
            sheet.write(place, "\n".join(lines), str(g), fontsize=size, linespacing=1.0, zorder=7)
    return lost


def _label_basins(sheet: _Sheet, run: StormRun) -> int:
    basins = [b for b, basin in enumerate(run.basins.ids) if basin != UNION]
    if len(basins) == 1:
        return 0
    lost = 0
    size = 8.0 if len(basins) <= limits.BASINS else 6.0
    style = {"fontsize": size, "fontstyle": "italic", "fontweight": "bold", "color": "#4a545b"}
    for b in basins:
        west, south, east, north = run.basins.polygons[b].bounds
        circle = shapely.maximum_inscribed_circle(
            run.basins.polygons[b], tolerance=min(east - west, north - south) / 60
        )
        (x, y), (rim_x, rim_y) = shapely.get_coordinates(circle)[:2]
        radius = math.hypot(rim_x - x, rim_y - y)
        steps = [(0.0, 0.0)] + [
            (share * radius * math.cos(turn * math.pi / 4), share * radius * math.sin(turn * math.pi / 4))
            for share in (0.35, 0.7)
            for turn in range(8)
        ]
        text = inline(run.basins.ids[b], _LONGEST)
        place = sheet.placer.over([sheet.points(x + dx, y + dy) for dx, dy in steps], text, size)
        if place is None:
            lost += 1
        else:
            sheet.write(place, text, f"basin-{b}", zorder=6, **style)
    return lost

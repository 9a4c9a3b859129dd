"""What all maps have: outlines, kilometres along the sides, a scale bar, an arrow to true north."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import shapely
from matplotlib.patches import Polygon
from matplotlib.path import Path
from matplotlib.ticker import FuncFormatter, MaxNLocator

from basinrain.ground import LONLAT, transform
from basinrain.report.figures import HALO, INK

__all__ = [
    "Extent",
    "Shape",
    "kilometres",
    "line_parts",
    "merged",
    "nice_length",
    "north_arrow",
    "outline",
    "scale_bar",
]

Shape = Any
"""A geometry of shapely, of any kind."""


@dataclass(frozen=True)
class Extent:
    """What a map shows: west, south, east and north in metres of the plane."""

    west: float
    south: float
    east: float
    north: float


def merged(lines: Shape) -> Shape:
    """Return lines with those that meet end to end joined."""
    return lines if lines.geom_type == "LineString" else shapely.line_merge(lines)


def line_parts(geometry: Shape) -> list[npt.NDArray[np.float64]]:
    """Return the vertices of every line that has a length, each of shape (n, 2)."""
    return [shapely.get_coordinates(part) for part in shapely.get_parts(geometry) if part.length > 0]


def outline(geometry: Shape) -> Path:
    """Return polygons, their holes included, as one path to be filled."""
    rings: list[Shape] = []
    for polygon in shapely.get_parts(geometry):
        rings += [polygon.exterior, *polygon.interiors]
    return Path.make_compound_path(*(Path(shapely.get_coordinates(ring), closed=True) for ring in rings))


def kilometres(axes: Any) -> None:  # noqa: ANN401 - matplotlib's axes
    """Label the sides of a map in km of the working plane."""
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(MaxNLocator(6))
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value / 1000:g}".replace("-", "−")))
    axes.set_xlabel("easting in the working plane, km")
    axes.set_ylabel("northing, km")


def nice_length(length: float) -> float:
    """Return the greatest of 1, 2 and 5 times a power of ten that is not longer.

    Examples
    --------
    >>> nice_length(7300.0), nice_length(0.24)
    (5000.0, 0.2)
    """
    power: float = 10.0 ** math.floor(math.log10(length))
    return max(step * power for step in (1, 2, 5) if step * power <= length)


def scale_bar(axes: Any, extent: Extent, scale: float) -> None:  # noqa: ANN401 - matplotlib's axes
    """Draw a bar of a round length at the lower left; ``scale`` is points a metre."""
    length = nice_length(0.25 * (extent.east - extent.west))
    x, y, thick = extent.west + 10 / scale, extent.south + 8 / scale, 3.2 / scale
    for k, colour in enumerate((INK, "white")):
        left = x + k * length / 2
        corners = [(left, y), (left + length / 2, y), (left + length / 2, y + thick), (left, y + thick)]
        axes.add_patch(Polygon(corners, closed=True, facecolor=colour, edgecolor=INK, linewidth=0.6, zorder=8))
    unit, factor = ("km", 1000.0) if length >= 1000 else ("m", 1.0)
    for k, text in enumerate(("0", f"{length / 2 / factor:g}", f"{length / factor:g} {unit}")):
        axes.text(
            x + k * length / 2,
            y + thick + 2 / scale,
            text,
            ha="center" if k < 2 else "left",
            va="bottom",
            fontsize=6.5,
            gid=f"{HALO}-scale-{k}",
            zorder=8,
        )


def north_arrow(axes: Any, extent: Extent, scale: float, crs: str) -> None:  # noqa: ANN401 - matplotlib's axes
    """Draw an arrow to true north at the middle of the map, whatever the plane's own north is, at the lower right."""
    middle = np.array([(extent.west + extent.east) / 2]), np.array([(extent.south + extent.north) / 2])
    lon, lat = transform(*middle, crs, LONLAT)
    x, y = transform(lon, lat + 0.01, LONLAT, crs)
    up = np.array([x[0] - middle[0][0], y[0] - middle[1][0]])
    up /= np.hypot(*up)
    side = np.array([up[1], -up[0]])
    foot = np.array([extent.east - 14 / scale, extent.south + 6 / scale])
    tip = foot + up * 18 / scale
    left, right, notch = (foot + side * s / scale + up * h / scale for s, h in ((-4.5, 0), (4.5, 0), (0, 4)))
    axes.add_patch(Polygon([tip, left, notch], closed=True, facecolor=INK, edgecolor=INK, linewidth=0.6, zorder=8))
    axes.add_patch(Polygon([tip, right, notch], closed=True, facecolor="white", edgecolor=INK, linewidth=0.6, zorder=8))
    axes.text(*(tip + up * 5 / scale), "N", ha="center", va="center", fontsize=7.5, fontweight="bold", zorder=8)

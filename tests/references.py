"""Slow and plain ways to the same numbers, sharing no code with the package: half-plane clipping and dense rasters."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import shapely

Array = npt.NDArray[np.float64]


def clip_to_nearer(ring: Array, here: Array, there: Array) -> Array:
    """Cut a closed ring (n, 2), not repeated at its end, to the points nearer to ``here`` than to ``there``.

    Sutherland and Hodgman (1974): right for areas, though pieces of a hollow outline stay joined by lines of no width.
    """
    toward = there - here
    signed = (ring - (here + there) / 2) @ toward
    kept: list[Array] = []
    for k in range(len(ring)):
        a, b, p, q = ring[k - 1], ring[k], signed[k - 1], signed[k]
        if p * q < 0:
            kept.append(a + (b - a) * p / (p - q))
        if q <= 0:
            kept.append(b)
    return np.array(kept).reshape(-1, 2)


def shoelace(ring: Array) -> float:
    """Return the signed area of a closed ring (n, 2), taken about its first corner."""
    if len(ring) < 3:
        return 0.0
    x, y = (ring - ring[0]).T
    return float((x * np.roll(y, -1) - y * np.roll(x, -1)).sum() / 2)


def nearest_areas(polygon: shapely.Geometry, gauges: Array) -> Array:
    """Return the area of a polygon, with parts and holes, that is nearest to every gauge (n, 2)."""
    areas = np.zeros(len(gauges))
    for part in shapely.get_parts(polygon):
        for sign, lines in ((1.0, [part.exterior]), (-1.0, list(part.interiors))):
            for line in lines:
                whole = shapely.get_coordinates(line)[:-1]
                for g, here in enumerate(gauges):
                    ring = whole
                    for there in np.delete(gauges, g, axis=0):
                        if len(ring):
                            ring = clip_to_nearer(ring, here, there)
                    areas[g] += sign * abs(shoelace(ring))
    return areas


def raster(polygon: shapely.Geometry, size: float) -> Array:
    """Return the centres (n, 2) of the squares of a dense raster that lie inside a polygon."""
    west, south, east, north = shapely.bounds(polygon)
    x, y = np.meshgrid(np.arange(west + size / 2, east, size), np.arange(south + size / 2, north, size))
    points = np.column_stack((x.ravel(), y.ravel()))
    return points[shapely.contains_xy(polygon, points)]


def raster_nearest(points: Array, gauges: Array) -> Array:
    """Return the share of points nearest to every gauge."""
    distance = np.hypot(*(points[:, None, :] - gauges[None, :, :]).transpose(2, 0, 1))
    return np.bincount(distance.argmin(axis=1), minlength=len(gauges)) / len(points)


def raster_idw(points: Array, gauges: Array, power: float) -> Array:
    """Return the mean over points of every gauge's inverse-distance weight."""
    distance = np.hypot(*(points[:, None, :] - gauges[None, :, :]).transpose(2, 0, 1))
    weight = distance**-power
    mean: Array = (weight / weight.sum(axis=1, keepdims=True)).mean(axis=0)
    return mean

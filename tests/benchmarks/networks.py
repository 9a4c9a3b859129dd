"""Seeded networks and basins for the benchmarks: an invented square country, wiggled basins with shared borders."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import shapely

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

SIDE = 200_000.0
"""Side of the square country, m."""


def scattered_gauges(n: int, *, seed: int) -> GaugeNetwork:
    """Return ``n`` gauges scattered evenly over the country and 2 % beyond it on every side."""
    rng = np.random.default_rng(seed)
    x, y = rng.uniform(-0.02 * SIDE, 1.02 * SIDE, (2, n))
    return GaugeNetwork(ids=tuple(f"G{k:05d}" for k in range(n)), x=x, y=y, crs="local")


def wiggled_basins(columns: int, rows: int, vertices: int, *, seed: int) -> Basins:
    """Return ``columns`` x ``rows`` basins of about ``vertices`` vertices each that fill the country without overlap.

    Every border of a lattice is drawn with the same points from both sides, then all points are displaced by one smooth
    field: a sum of waves whose slopes add up to under 1, so that no border can fold over itself.
    """
    rng = np.random.default_rng(seed)
    per_side = vertices // 4
    width, height = SIDE / columns, SIDE / rows
    waves = []
    for count in (0.7, 1.9, 5.3, 14.1, 39.7):
        k = 2 * np.pi * count / min(width, height)
        turn, phase = rng.uniform(0, 2 * np.pi, (2, 2))
        waves.append((k, turn, phase, 0.12 / k))

    def displaced(xy: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        moved = xy.copy()
        for k, turn, phase, amplitude in waves:
            for axis in (0, 1):
                along = xy[:, 0] * np.cos(turn[axis]) + xy[:, 1] * np.sin(turn[axis])
                moved[:, axis] += amplitude * np.sin(k * along + phase[axis])
        return moved

    # Lattice points are counted in whole steps, so that both sides of a border get the very same numbers.
    step = np.arange(per_side)
    zeros, ends = np.zeros(per_side, dtype=int), np.full(per_side, per_side)
    ring = np.column_stack(
        (
            np.concatenate((step, ends, per_side - step, zeros)),
            np.concatenate((zeros, step, ends, per_side - step)),
        )
    )
    ids, polygons = [], []
    for i in range(columns):
        for j in range(rows):
            lattice = ring + np.array([i, j]) * per_side
            ids.append(f"B{i:02d}-{j:02d}")
            polygons.append(shapely.Polygon(displaced(lattice * (np.array([width, height]) / per_side))))
    return Basins(ids=tuple(ids), polygons=np.array(polygons, dtype=object), crs="local")

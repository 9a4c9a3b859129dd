"""Gauges and basins that can be drawn on a sheet of squared paper: everything in local metres."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import shapely

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

KM: Final = 1000.0


def gauges_at(*positions: tuple[float, float], ids: str | Sequence[str] = "", unit: float = 1.0) -> GaugeNetwork:
    """Return gauges A, B, C ... at positions in ``unit`` metres."""
    x, y = np.array(positions, dtype=float).reshape(-1, 2).T * unit
    return GaugeNetwork(ids=tuple(ids or "ABCDEFGHIJKLMNOPQRSTUVWXYZ"[: len(x)]), x=x, y=y, crs="local")


def basins_of(unit: float = 1.0, **polygons: shapely.Geometry) -> Basins:
    """Return basins with the given names, their polygons drawn in ``unit`` metres."""
    drawn = np.array(list(polygons.values()), dtype=object)
    if unit != 1.0:
        drawn = np.asarray(shapely.transform(drawn, lambda xy: xy * unit), dtype=object)
    return Basins(ids=tuple(polygons), polygons=drawn, crs="local")

"""A basin's point lies in the basin."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from basinrain.basins import Basins
from basinrain.writing.series_points import points_inside


def test_points_lie_inside_whatever_the_shape() -> None:
    """In a ring and a basin of two parts the middle is outside; in metres of UTM the point comes in degrees."""
    ring = shapely.box(0, 0, 4, 4) - shapely.box(1, 1, 3, 3)
    parts = shapely.MultiPolygon([shapely.box(10, 0, 11, 1), shapely.box(15, 0, 16, 1)])
    basins = Basins(ids=("ring", "parts"), polygons=np.array([ring, parts]), crs="EPSG:4326")
    points = points_inside(basins)
    assert points is not None
    assert shapely.contains_xy([ring, parts], points).all()
    east = shapely.box(499_000, 5_538_000, 501_000, 5_540_000)
    projected = points_inside(Basins(ids=("one",), polygons=np.array([east]), crs="EPSG:32633"))
    assert projected is not None
    # 500 km east is zone 33's central meridian.
    assert projected[0].tolist() == pytest.approx([15.0, 50.0], abs=0.01)

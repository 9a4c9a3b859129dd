"""Inverse distance on ratios to normals."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import NormalRatios, inverse_distance_ratio_weights, inverse_distance_weights

# 1, 2 and 4 km from X: by the square 16 : 4 : 1, by the power of 1 it is 4 : 2 : 1.
NETWORK = GaugeNetwork(
    ids=("X", "A", "B", "C"),
    x=np.array([0.0, 1e3, -2e3, 4e3]),
    y=np.zeros(4),
    crs="local",
    normals=np.array([[900.0], [600.0], [1200.0], [300.0]]),
)
DONORS = np.array([False, True, True, True])


def test_by_hand() -> None:
    """Shares 16/21, 4/21, 1/21 times 900/600, 900/1200, 900/300."""
    weights = inverse_distance_ratio_weights(NETWORK, 0, DONORS)
    assert weights == pytest.approx([0, 16 / 21 * 1.5, 4 / 21 * 0.75, 1 / 21 * 3])


def test_power() -> None:
    """Shares 4/7, 2/7, 1/7."""
    weights = inverse_distance_ratio_weights(NETWORK, 0, DONORS, power=1)
    assert weights == pytest.approx([0, 4 / 7 * 1.5, 2 / 7 * 0.75, 1 / 7 * 3])


def test_depths() -> None:
    """Donors at 10, 20 and 30 % of their normals: X at 16/21 of 10, 4/21 of 20, 1/21 of 30 %, of 900 mm."""
    depths = np.array([0.0, 60.0, 240.0, 90.0])
    weights = inverse_distance_ratio_weights(NETWORK, 0, DONORS)
    assert weights @ depths == pytest.approx(900 * (16 * 0.1 + 4 * 0.2 + 0.3) / 21)


def test_equal_normals_are_inverse_distance() -> None:
    """With one normal for all the ratio is 1."""
    equal = GaugeNetwork(ids=NETWORK.ids, x=NETWORK.x, y=NETWORK.y, crs="local", normals=np.full((4, 1), 700.0))
    expected = inverse_distance_weights(equal, 0, DONORS, power=3)
    assert inverse_distance_ratio_weights(equal, 0, DONORS, power=3) == pytest.approx(expected)


def test_normals_from_the_record() -> None:
    """C has no ratio in July: 4 : 1 between A and B, at ratios of 2 and 1/2."""
    bare = GaugeNetwork(ids=NETWORK.ids, x=NETWORK.x, y=NETWORK.y, crs="local")
    means = np.full((12, 4, 4), 50.0)
    means[6, :, 0] = [50, 25, 100, np.nan]
    ratios = NormalRatios(bare.ids, np.full((12, 4, 4), 10), means)
    weights = inverse_distance_ratio_weights(bare, 0, DONORS, month=7, ratios=ratios)
    assert weights == pytest.approx([0, 0.8 * 2, 0.2 * 0.5, 0])


def test_normals_that_cannot_be_used() -> None:
    """Without normals one line says so, and names this method."""
    bare = GaugeNetwork(ids=NETWORK.ids, x=NETWORK.x, y=NETWORK.y, crs="local")
    with pytest.raises(DataError, match="found no normals; expected a normal above 0 for the inverse-distance-ratios"):
        inverse_distance_ratio_weights(bare, 0, DONORS)

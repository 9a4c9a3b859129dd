"""Inverse distance, by hand and against a general-purpose library."""

from __future__ import annotations

import numpy as np
import pytest
from sklearn.neighbors import KNeighborsRegressor

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, complete, inverse_distance_weights
from basinrain.rainfall import RainRecord

THREE = GaugeNetwork(ids=("T", "A", "B"), x=np.array([0.0, 1e3, -2e3]), y=np.zeros(3), crs="local")
DONORS = np.array([False, True, True])


@pytest.mark.parametrize(
    ("power", "expected"), [(1, [2 / 3, 1 / 3]), (2, [4 / 5, 1 / 5]), (0.5, [0.5857864, 0.4142136])]
)
def test_weights_by_hand(power: float, expected: list[float]) -> None:
    """Distances as 1 to 2: weights as 2**b to 1."""
    weights = inverse_distance_weights(THREE, 0, DONORS, power=power)
    assert weights[1:] == pytest.approx(expected, abs=1e-7)


def test_a_huge_power_takes_the_nearest() -> None:
    """At the power 400 the inverse distances themselves would be below the smallest number; the weights are not."""
    assert inverse_distance_weights(THREE, 0, DONORS, power=400).tolist() == pytest.approx([0, 1, 0])


def test_no_donors_no_weights() -> None:
    """Zeros, without a division by zero, where nobody reports."""
    assert inverse_distance_weights(THREE, 0, np.zeros((2, 3), dtype=bool)).tolist() == [[0, 0, 0], [0, 0, 0]]


def test_equals_a_nearest_neighbour_regression() -> None:
    """scikit-learn's KNeighborsRegressor with weights of the inverse squared distance, at every missing value."""
    rng = np.random.default_rng(7)
    n_gauges, n_steps = 30, 40
    x, y = rng.uniform(0, 5e4, (2, n_gauges))
    network = GaugeNetwork(ids=tuple(f"G{k:02d}" for k in range(n_gauges)), x=x, y=y, crs="local")
    depth = rng.gamma(0.5, 8.0, (n_steps, n_gauges))
    depth[rng.random(depth.shape) < 0.3] = np.nan
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, n_steps + 1) * np.timedelta64(3600, "s")
    record = RainRecord.from_depths(network.ids, ends - 3600, ends, depth, step="1h")
    filled = complete(record, network, InfillOptions(method="inverse-distance", scale="step")).record.depth
    compared = 0
    for step in range(n_steps):
        known = ~np.isnan(depth[step])
        model = KNeighborsRegressor(n_neighbors=5, weights=lambda d: 1 / d**2)
        model.fit(np.column_stack([x, y])[known], depth[step, known])
        expected = model.predict(np.column_stack([x, y])[~known])
        assert filled[step, ~known] == pytest.approx(expected, rel=1e-12)
        compared += len(expected)
    assert compared == np.isnan(depth).sum() > 300

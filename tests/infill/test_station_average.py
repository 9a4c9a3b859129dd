"""Station average."""

from __future__ import annotations

import numpy as np

from basinrain.gauges import GaugeNetwork
from basinrain.infill import station_average_weights

NETWORK = GaugeNetwork(ids=tuple("TABCDEF"), x=np.arange(7, dtype=float) * 1000, y=np.zeros(7), crs="local")


def test_the_five_nearest_share_equally() -> None:
    """Six gauges report; the farthest gets nothing, the others a fifth each."""
    weights = station_average_weights(NETWORK, 0, np.ones(7, dtype=bool))
    assert weights.tolist() == [0, 1 / 5, 1 / 5, 1 / 5, 1 / 5, 1 / 5, 0]


def test_all_may_share() -> None:
    """With nearest = all each of the six counts a sixth."""
    weights = station_average_weights(NETWORK, 0, np.ones(7, dtype=bool), nearest="all")
    assert weights.tolist() == [0, *[1 / 6] * 6]


def test_many_cases_at_once() -> None:
    """A row for every row of reporting gauges, zeros where there are too few."""
    reporting = np.array([[0, 1, 1, 0, 0, 0, 0], [1, 0, 0, 0, 0, 0, 1]], dtype=bool)
    assert station_average_weights(NETWORK, 0, reporting).tolist() == [[0, 0.5, 0.5, 0, 0, 0, 0], [0.0] * 7]

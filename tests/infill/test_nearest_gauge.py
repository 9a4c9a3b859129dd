"""Nearest gauge."""

from __future__ import annotations

import numpy as np
from windows import hourly, network

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, complete, nearest_gauge_weights

# Distances from T: D and C 1 km, B 2 km, A 3 km.
LINE = GaugeNetwork(ids=("T", "D", "C", "B", "A"), x=np.array([0.0, 1e3, -1e3, 2e3, -3e3]), y=np.zeros(5), crs="local")


def taken(*silent: str, radius: float | None = None) -> list[str]:
    reporting = np.array([gauge not in silent for gauge in LINE.ids])
    weights = nearest_gauge_weights(LINE, 0, reporting, radius=radius)
    assert set(weights.tolist()) <= {0.0, 1.0}
    return [gauge for gauge, weight in zip(LINE.ids, weights, strict=True) if weight]


def test_one_of_two_equally_near_goes_by_id() -> None:
    """C before D; then D, then B, then A."""
    assert taken() == ["C"]
    assert taken("C") == ["D"]
    assert taken("C", "D") == ["B"]
    assert taken("C", "D", "B") == ["A"]


def test_nobody_within_the_radius() -> None:
    """A is 3 km away."""
    assert taken("C", "D", "B", radius=2.5e3) == []


def test_one_reporting_gauge_is_enough() -> None:
    """B and C are silent in the second hour: both take A's 7 mm as it is."""
    record = hourly([5, 7], [6, np.nan], [4, np.nan])
    completed = complete(record, network(3), InfillOptions(method="nearest-gauge", scale="step"))
    assert completed.record.depth[1].tolist() == [7, 7, 7]
    assert [estimate.donors for estimate in completed.estimates] == [{"A": 1.0}] * 2


def test_where_nobody_reports() -> None:
    """The note asks for one gauge, since one is all that the method needs."""
    record = hourly([5, np.nan], [6, np.nan])
    completed = complete(record, network(2), InfillOptions(method="nearest-gauge", scale="step"))
    texts = [note.text for note in completed.notes if note.code == "not-infilled"]
    assert len(texts) == 2
    assert all("no other gauge reported at the step" in text for text in texts)

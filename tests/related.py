"""Relations between gauges, written by hand."""

from __future__ import annotations

import numpy as np

from basinrain.gauges import GaugeNetwork
from basinrain.infill import Relations


def line(n: int, normals: object = None) -> GaugeNetwork:
    """Return gauges X, A, B, C ... on a line, 1 km apart."""
    table = None if normals is None else np.array(normals, dtype=float)
    return GaugeNetwork(
        ids=tuple("XABCDE"[:n]), x=np.arange(n, dtype=float) * 1e3, y=np.zeros(n), crs="local", normals=table
    )


def relations_with(network: GaugeNetwork, correlation: list[float], slope: list[float] | None = None) -> Relations:
    """Return relations of the first gauge with the others; depths and ratios alike, those between the others 1."""
    n = len(network)
    r, b = np.ones((n, n)), np.ones((n, n))
    r[0, 1:] = r[1:, 0] = correlation
    b[0, 1:] = np.ones(n - 1) if slope is None else slope
    return Relations(network.ids, np.full((n, n), 99), r, b, r, b)

"""A seeded tessellation: twenty gauges over five round basins that overlap."""

from __future__ import annotations

import numpy as np
import shapely
from drawn import KM, basins_of, gauges_at

from basinrain.averaging.thiessen_tessellation import Tessellation, whole_tessellation


def scattered() -> Tessellation:
    """Return it; gauges stand in a square of 10 km, some of them out of reach of every basin."""
    rng = np.random.default_rng(8)
    network = gauges_at(*rng.uniform(0, 10, (20, 2)).tolist(), ids=[f"G{k}" for k in range(20)], unit=KM)
    rounds = {f"b{k}": shapely.Point(*rng.uniform(2, 8, 2)).buffer(rng.uniform(1, 3)) for k in range(5)}
    return whole_tessellation(network, basins_of(KM, **rounds), np.ones(20, dtype=bool), 5)

"""A basin of three strips, one gauge in the middle of each, and hourly records of them."""

from __future__ import annotations

from typing import Final

import numpy as np
import shapely

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord

NAN: Final = float("nan")
# Three gauges so placed that the basin is shared in thirds by the arithmetic mean, and by strips of 10 km.
NETWORK: Final = GaugeNetwork(ids=("A", "B", "C"), x=np.array([5e3, 15e3, 25e3]), y=np.full(3, 5e3), crs="local")
BASINS: Final = Basins(ids=("all",), polygons=np.array([shapely.box(0, 0, 30e3, 10e3)]), crs="local")


def hourly(depth: list[list[float]], network: GaugeNetwork = NETWORK) -> RainRecord:
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, len(depth) + 1) * np.timedelta64(3600, "s")
    return RainRecord.from_depths(network.ids, ends - 3600, ends, depth, step="1h")

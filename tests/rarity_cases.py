"""A storm over two basins and three gauges that can be judged by eye, for the tests of its rarity."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.rarity import storm_rarity
from basinrain.designstorm.storm_depths import StormDepths, StormRarity

Floats = npt.NDArray[np.float64]

NAN = np.nan
MINUTES = [30.0, 60.0, 360.0, 1440.0, 2880.0]
FREQUENCIES = [Frequency(years, ANNUAL_MAXIMUM) for years in (2, 10, 100)]
END = np.datetime64("2031-05-04T06:00", "s")

# Over Upper by duration and frequency; over Lower 10 mm less, at a point 10 mm more.
UPPER = np.array([[20.0, 30, 40], [30, 40, 50], [50, 60, 70], [60, 80, 100], [70, 90, 110]])


def storm_depths(names: str, depth: object, ladder: object, aligned: Floats | None = None) -> StormDepths:
    """Return depths of a storm at places of one letter each or parted by blanks, all with the same end."""
    array = np.array(depth, dtype=float)
    return StormDepths(
        names=tuple(names.split()),
        depth=array,
        ends=np.full(array.shape, END),
        ladder=np.array(ladder, dtype=float),
        aligned=aligned,
    )


def over_basins(aligned: Floats | None = None) -> StormDepths:
    """Return the storm over the basins: 1 h, 6 h and 24 h have a depth."""
    depth = [[NAN, NAN], [40, 15], [75, 45], [80, 95], [NAN, NAN]]
    return storm_depths("Upper Lower", depth, [UPPER, UPPER - 10], aligned)


def at_gauges() -> StormDepths:
    """Return the storm at the gauges: W2 is the wettest in 1 h, W1 and W3 alike in 6 h, W3 in 24 h."""
    depth = [[NAN] * 3, [30, 45, 20], [70, 60, 70], [90, 80, 110], [NAN] * 3]
    return storm_depths("W3 W2 W1", np.array(depth)[:, [2, 1, 0]], [UPPER + 10] * 3)


def quill(areal: StormDepths | None = None, **others: Any) -> StormRarity:  # noqa: ANN401 - as storm_rarity takes them
    """Return how rare it was: hourly steps, a window of a day and a half."""
    asked = {"frequencies": FREQUENCIES, "step": 60.0, "window": 2160.0, **others}
    return storm_rarity("Quill", MINUTES, areal or over_basins(), **asked)

"""Small series to write: kept in memory, or made up when asked for."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from basinrain.series.series_source import SeriesSource
from basinrain.writing.series_content import SeriesContent

SERIES = (("reweight", "thiessen"), ("infill-then-reweight", "idw"))
BASINS = ("Upper, west", "upper/east", "Mill", "union")
NAMES = ('the "old" one', "", "Mühle", "")
AREAS = np.array([1.5e6, 2.25e6, 4e5, 4.15e6])
POINTS = np.array([[11.25, 47.5], [11.5, 47.5], [11.375, 47.25], [11.375, 47.5]])


@dataclass(frozen=True, eq=False)
class Kept:
    """A source that holds three arrays a series: depths, shares, flags."""

    arrays: Mapping[tuple[str, str], tuple[npt.NDArray[Any], npt.NDArray[Any], npt.NDArray[Any]]]

    @property
    def n_steps(self) -> int:
        """Steps of every series."""
        return len(next(iter(self.arrays.values()))[0])

    @property
    def series(self) -> tuple[tuple[str, str], ...]:
        """Policy and method of every series."""
        return tuple(self.arrays)

    def depth(self, gaps: str, method: str, /) -> npt.NDArray[Any]:
        """Return the depths, mm."""
        return self.arrays[gaps, method][0]

    def observed_share(self, gaps: str, method: str, /) -> npt.NDArray[Any]:
        """Return the shares."""
        return self.arrays[gaps, method][1]

    def flags(self, gaps: str, method: str, /) -> npt.NDArray[Any]:
        """Return the marks."""
        return self.arrays[gaps, method][2]


def hours(n: int, first: str = "2031-05-04T00:00:00") -> tuple[npt.NDArray[np.datetime64], npt.NDArray[np.datetime64]]:
    """Return starts and ends of some hours."""
    ends = np.datetime64(first, "s") + 3600 * np.arange(1, n + 1)
    return ends - np.timedelta64(3600, "s"), ends


def drawn(n_steps: int, n_basins: int, series: tuple[tuple[str, str], ...] = SERIES, seed: int = 4) -> Kept:
    """Depths with every digit, two thirds of them 0, one in twenty missing."""
    rng = np.random.default_rng(seed)
    arrays = {}
    for one in series:
        shape = (n_steps, n_basins)
        depth = np.where(rng.random(shape) < 0.67, 0.0, rng.gamma(0.7, 3.0, shape))
        share = rng.choice(np.array([1.0, 0.75, 1 / 3, 0.0]), shape).astype(np.float32)
        flags = rng.integers(0, 16, shape).astype(np.uint8)
        gone = rng.random(shape) < 0.05
        depth[gone], share[gone], flags[gone] = np.nan, np.nan, 16
        arrays[one] = depth, share, flags
    return Kept(arrays)


def small_content(n_steps: int = 50, source: SeriesSource | None = None, **changed: object) -> SeriesContent:
    """Return some hours of four basins by two methods, in mm, in a clock two hours ahead of UTC."""
    starts, ends = hours(n_steps)
    given: dict[str, object] = {
        "source": source or drawn(n_steps, len(BASINS)),
        "starts": starts,
        "ends": ends,
        "basins": BASINS,
        "areas": AREAS,
        "names": NAMES,
        "points": POINTS,
        "zone": "+02:00",
        "job": "Alder Fork",
        "caution": "For use by a qualified hydrologist.",
        "plane": "an equal-area plane about the basins",
        "version": "0.1.0",
    }
    return SeriesContent(**{**given, **changed})  # type: ignore[arg-type]

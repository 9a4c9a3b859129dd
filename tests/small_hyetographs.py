"""Small design hyetographs to write and to draw."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.designstorm.exceedance import Frequency
from basinrain.writing.design_content import DesignContent

RARE = Frequency.of_aep(0.01)
COMMON = Frequency(2.0, "partial-duration")
BASINS = ("Upper, west", "upper/east", "Mill")
NAMES = ('the "old" one', "", "Mühle")
AREAS = np.array([1.5e6, 2.25e6, 4e5])
POSITIONS = np.array([[11.25, 47.5], [11.5, 47.5], [11.375, 47.25]])


def hyetograph(
    depth: npt.ArrayLike,
    *,
    basins: Sequence[str],
    point: str = "bridge",
    frequency: Frequency = RARE,
    pattern: str = "nrcs-type-ii",
    step: int = 60,
) -> DesignHyetograph:
    """Return a hyetograph of the given steps and basins; its duration is that of the steps."""
    depths = np.asarray(depth, dtype=float)
    return DesignHyetograph(
        point=point,
        frequency=frequency,
        minutes=step * len(depths),
        pattern=pattern,
        step=step,
        basins=tuple(basins),
        depth=depths,
    )


def two_steps(**changed: object) -> DesignContent:
    """Return two hours over two basins: 25.4 and 12.7 mm, 1 in and half an inch; 2.54 and 0 mm."""
    one = hyetograph([[25.4, 2.54], [12.7, 0.0]], basins=("west", "a,b"))
    given: dict[str, object] = {
        "hyetographs": (one,),
        "basins": ("west", "a,b"),
        "areas": np.array([1e6, 2e6]),
        "depth_unit": "in",
        "area_unit": "km2",
    }
    return DesignContent(**{**given, **changed})  # type: ignore[arg-type]


def drawn_content(**changed: object) -> DesignContent:
    """Return depths with every digit: two points, two frequencies, two patterns, two durations, three basins.

    Above the bridge lie all basins in reverse order, above the weir only the one in the middle.
    """
    rng = np.random.default_rng(7)
    hyetographs = tuple(
        hyetograph(
            rng.gamma(0.7, 3.0, (n_steps, len(basins))),
            basins=basins,
            point=point,
            frequency=frequency,
            pattern=pattern,
            step=10,
        )
        for point, basins in (("bridge", BASINS[::-1]), ("old weir", BASINS[1:2]))
        for frequency in (RARE, COMMON)
        for n_steps in (6, 36)
        for pattern in ("nrcs-type-ii", "late, peak")
    )
    given: dict[str, object] = {
        "hyetographs": hyetographs,
        "basins": BASINS,
        "areas": AREAS,
        "names": NAMES,
        "positions": POSITIONS,
        "start": np.datetime64("2031-05-04T06:00"),
        "job": "Alder Fork",
        "caution": "For use by a qualified hydrologist.",
        "source": "an invented table, 2031",
        "version": "0.1.0",
    }
    return DesignContent(**{**given, **changed})  # type: ignore[arg-type]

"""The range of a method of areal reduction, and areas in words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.measures import duration_text
from basinrain.units import area_factor

__all__ = ["TOLERANCE", "Limits", "area_words", "between_words", "joined"]

Floats = npt.NDArray[np.float64]

TOLERANCE: Final = 1e-9
"""How far past an end, relative to it, a value still counts as the end: unit conversions may miss it by a last bit."""


@dataclass(frozen=True, kw_only=True)
class Limits:
    """Where a method of areal reduction holds.

    Parameters
    ----------
    minutes : (float, float)
        Shortest and longest duration; infinity where there is no longest.
    smallest_area : float
        m²; 0 where every area above zero is allowed.
    largest_areas : tuple of (float, float)
        Pairs of a duration in minutes, rising from 0, and the largest area in m² from that duration on.
    aep : (float, float), optional
        Least and greatest annual exceedance probability; None where the method knows none.
    area_unit : {"km2", "mi2"}
        The method's own unit of area, for messages.

    Examples
    --------
    Up to 1000 km² below a day, up to 30 000 km² from a day on:

    >>> limits = Limits(minutes=(1, 10080), largest_areas=((0, 1e9), (1440, 3e10)))
    >>> limits.largest_area(np.array([720.0, 1440.0])) / 1e6
    array([ 1000., 30000.])
    """

    minutes: tuple[float, float] = (0.0, np.inf)
    smallest_area: float = 0.0
    largest_areas: tuple[tuple[float, float], ...] = ((0.0, np.inf),)
    aep: tuple[float, float] | None = None
    area_unit: Literal["km2", "mi2"] = "km2"

    def largest_area(self, minutes: Floats) -> Floats:
        """Return the largest area in m² at every duration in minutes, shape (n,)."""
        starts, areas = np.array(self.largest_areas, dtype=float).T
        nearly = np.asarray(minutes) * (1 + TOLERANCE)
        largest: Floats = areas[np.searchsorted(starts, nearly, side="right") - 1]
        return largest

    def duration_words(self) -> str:
        """Return the range of durations in words."""
        low, high = (duration_text(minutes) for minutes in self.minutes)
        return between_words(low, high)

    def below_words(self, area: float) -> str:
        """Return for which durations an area is the largest, with a space before; empty where for all."""
        ends = {largest: until for (_, largest), (until, _) in pairwise(self.largest_areas)}
        return f" below {duration_text(ends[area])}" if area in ends else ""


def area_words(area: float, unit: str = "km2") -> str:
    """Return an area given in m² in words.

    Examples
    --------
    >>> area_words(2.5e7), area_words(1.035995244e9, "mi2")
    ('25 km²', '1036 km² (400 mi²)')
    """
    metric = f"{area / 1e6:.6g} km²"
    return metric if unit == "km2" else f"{metric} ({area / area_factor(unit):.6g} {unit[:-1]}²)"


def between_words(low: str, high: str) -> str:
    """Return a range in words, its unit once where both ends have the same.

    Examples
    --------
    >>> between_words("1 h", "24 h"), between_words("30 min", "24 h")
    ('1 to 24 h', '30 min to 24 h')
    """
    number, _, unit = low.partition(" ")
    return f"{number} to {high}" if unit == high.partition(" ")[2] else f"{low} to {high}"


def joined(words: Sequence[str]) -> str:
    """Return words as a list in a sentence.

    Examples
    --------
    >>> joined(["1 h"]), joined(["1 h", "2 h", "3 h"])
    ('1 h', '1 h, 2 h and 3 h')
    """
    return " and ".join(filter(None, (", ".join(words[:-1]), words[-1])))

"""What gives depths by duration and frequency: a table, an equation, the record."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency

__all__ = ["Curve", "DepthSource"]

Floats = npt.NDArray[np.float64]

Curve = Callable[[Floats], Floats]
"""Depths in mm of durations in minutes, at one frequency."""


class DepthSource(Protocol):
    """Depths by duration and frequency at one point or several."""

    @property
    def points(self) -> tuple[str, ...]:
        """Ids of the points, or of the areas where the depths are areal."""

    @property
    def series(self) -> str:
        """The kind of series that return periods are counted in."""

    @property
    def areal(self) -> bool:
        """Whether the depths are of areas already, so that none may be reduced again."""

    @property
    def frequencies(self) -> tuple[Frequency, ...]:
        """Those that depths are known of without interpolation, the most frequent first."""

    @property
    def source(self) -> str:
        """Where the depths come from."""

    @property
    def date(self) -> str:
        """Of when they are."""

    @property
    def shortest(self) -> float:
        """The shortest duration that has a depth, minutes."""

    @property
    def longest(self) -> float:
        """The longest duration that has a depth, minutes."""

    def at(self, minutes: Floats, frequency: Frequency, *, extrapolate: bool = False) -> Floats:
        """Return depths in mm, shape (n_points, n_durations), of durations in minutes at one frequency.

        Raises
        ------
        MethodError
            A duration or the frequency lies outside what is known, and extrapolation is not asked for; the frequency is
            counted in another series.
        """

"""Invented annual maxima of areas, for the tests of depths from the record."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency

Floats = npt.NDArray[np.float64]

MINUTES: Final = np.array([30.0, 60.0, 180.0, 1440.0])
FREQUENCIES: Final = tuple(Frequency(years, "annual-maximum") for years in (2.0, 5.0, 10.0, 20.0))


def annual_maxima(years: int, areas: int = 2, *, seed: int = 21) -> Floats:
    """Return maxima of shape (years, 4, areas): a wet year is wet in all durations and, less so, in all areas."""
    generator = np.random.default_rng(seed)
    storm = generator.gumbel(22, 6, (years, 1, 1)) + generator.gumbel(2, 2, (years, 1, areas))
    return np.maximum(storm * (MINUTES[:, None] / 60) ** 0.35 + generator.random((years, 4, areas)), 1.0)


def crossing_maxima(years: int = 20) -> Floats:
    """Return maxima of one area in an hour and in three, never less in three, whose fits cross.

    The hour has one great storm with nothing around it; in other years the three hours have much more than the hour.
    """
    hour = 14 + 4 * np.sin(np.arange(years) * 1.7)
    three = 34 + 2 * np.sin(np.arange(years) * 2.3)
    hour[7] = three[7] = 52.0
    return np.stack([hour, three], axis=1)[:, :, None]

"""Invented annual maxima of areas, for the tests of depths from the record."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency

Floats = npt.NDArray[np.float64]

MINUTES: Final = np.array([30.0, 60.0, 180.0, 720.0])
FREQUENCIES: Final = tuple(Frequency(years, "annual-maximum") for years in (2.0, 5.0, 10.0, 20.0))


def annual_maxima(years: int, areas: int = 2, *, seed: int = 21) -> Floats:
    """Return maxima of shape (years, 4, areas): a wet year is wet in all durations and, less so, in all areas."""
    generator = np.random.default_rng(seed)
    storm = generator.gumbel(22, 6, (years, 1, 1)) + generator.gumbel(2, 2, (years, 1, areas))
    return np.maximum(storm * (MINUTES[:, None] / 60) ** 0.35 + generator.random((years, 4, areas)), 1.0)


def crossing_maxima() -> Floats:
    """Return maxima of 20 years of one area in an hour and in three, never less in three, whose fits cross.

    Six years have great storms that last an hour. The others have little in the hour and much more in the three, so
    that the three hours differ less from year to year; from 1 in 20 on the hour's Gumbel fit is the greater one.
    """
    place = np.arange(20)
    stormy = place % 3 == 1
    stormy[19] = False
    hour = np.where(stormy, 50.0, 6.0) + 0.1 * (place * 7 % 20)
    three = np.where(stormy, hour, 25.0 + 0.1 * (place * 7 % 20))
    return np.stack([hour, three], axis=1)[:, :, None]

"""Areal reduction after Leclerc and Schaake (1972), for the United States."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import Limits
from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.units import area_factor

__all__ = ["LECLERC_SCHAAKE", "leclerc_schaake"]

_SQUARE_MILE: Final = area_factor("mi2")


def leclerc_schaake(area: npt.ArrayLike, minutes: npt.ArrayLike) -> npt.NDArray[np.float64]:
    """Return the areal reduction factor of Leclerc and Schaake.

    Parameters
    ----------
    area : array_like
        m².
    minutes : array_like
        Durations in minutes; broadcast with ``area``.

    Returns
    -------
    array of float
        The broadcast shape; 1 for area 0, NaN for NaN. No range is held here.

    Notes
    -----
    1 - exp(-1.1 t^0.25) + exp(-1.1 t^0.25 - 0.01 A), with t in hours and A in square miles: a fit to the curves of the
    United States Weather Bureau's Technical Papers 29 and 40 (Leclerc, G. and Schaake, J. C., 1972: Derivation of
    hydrologic frequency curves, MIT, R. M. Parsons Laboratory, report 142). The formula is from memory. The curves are
    for 30 minutes to 24 hours and up to 400 square miles, and do not depend on the frequency.

    Examples
    --------
    60 mm in 6 h at a point, over 25 and over 100 square miles:

    >>> (60 * leclerc_schaake(np.array([25, 100]) * 1609.344**2, 360)).round(2)
    array([57.63, 53.22])
    """
    damped = -1.1 * (np.asarray(minutes, dtype=float) / 60) ** 0.25
    factor: npt.NDArray[np.float64] = 1 + np.exp(damped) * np.expm1(-0.01 * (np.asarray(area) / _SQUARE_MILE))
    return factor


def _limits() -> Limits:
    return Limits(minutes=(30, 1440), largest_areas=((0, 400 * _SQUARE_MILE),), area_unit="mi2")


LECLERC_SCHAAKE = ArealReduction(
    name="leclerc-schaake",
    title="Leclerc and Schaake 1972 (curves of TP-29 and TP-40)",
    jurisdiction=("united states", "united states of america", "us", "usa"),
    region_words="the United States",
    factor=leclerc_schaake,
    limits=_limits,
    falls_with_area=True,
    rises_with_duration=True,
    source="Leclerc, G. and Schaake, J. C. (1972): Derivation of hydrologic frequency curves, MIT, R. M. Parsons"
    " Laboratory, report 142; a fit to U.S. Weather Bureau Technical Papers 29 and 40",
    evidence="formula and range from memory",
)
"""Areal reduction after Leclerc and Schaake, from 30 minutes to 24 hours and up to 400 square miles."""

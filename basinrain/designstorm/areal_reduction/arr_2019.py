"""Areal reduction of Australian Rainfall and Runoff 2019."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import TOLERANCE, Limits
from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.errors import JobError, unknown

__all__ = ["ARR_2019", "REGIONS", "LongCoefficients", "arr_2019", "arr_2019_long", "arr_2019_region", "arr_2019_short"]

Floats = npt.NDArray[np.float64]

_HALF_DAY: Final = 720.0
_DAY: Final = 1440.0
_AGREED_AEP: Final = 0.005


class LongCoefficients(NamedTuple):
    """Coefficients of the long-duration equation in one region."""

    a: float
    b: float
    c: float
    d: float
    e: float
    f: float
    g: float
    h: float
    i: float


REGIONS: Final[Mapping[str, LongCoefficients]] = MappingProxyType(
    {
        "East Coast North": LongCoefficients(0.327, 0.241, 0.448, 0.36, 0.00096, 0.48, -0.21, 0.012, -0.0013),
        "Semi-arid Inland QLD": LongCoefficients(0.159, 0.283, 0.25, 0.308, 7.3e-07, 1.0, 0.039, 0.0, 0.0),
        "Tasmania": LongCoefficients(0.0605, 0.347, 0.2, 0.283, 0.00076, 0.347, 0.0877, 0.012, -0.00033),
        "SW WA": LongCoefficients(0.183, 0.259, 0.271, 0.33, 3.845e-06, 0.41, 0.55, 0.00817, -0.00045),
        "Central NSW": LongCoefficients(0.265, 0.241, 0.505, 0.321, 0.00056, 0.414, -0.021, 0.015, -0.00033),
        "SE Coast": LongCoefficients(0.06, 0.361, 0.0, 0.317, 8.11e-05, 0.651, 0.0, 0.0, 0.0),
        "Southern Semi-arid": LongCoefficients(0.254, 0.247, 0.403, 0.351, 0.0013, 0.302, 0.058, 0.0, 0.0),
        "Southern Temperate": LongCoefficients(0.158, 0.276, 0.372, 0.315, 0.000141, 0.41, 0.15, 0.01, -0.0027),
        "Northern Coastal": LongCoefficients(0.326, 0.223, 0.442, 0.323, 0.0013, 0.58, -0.374, 0.013, -0.0015),
        "Inland Arid": LongCoefficients(0.297, 0.234, 0.449, 0.344, 0.00142, 0.216, 0.129, 0.0, 0.0),
    }
)
"""The ten regions of the long-duration equation (Australian Rainfall and Runoff 2019, book 2, chapter 4)."""


def arr_2019_region(name: str) -> LongCoefficients:
    """Return the long-duration coefficients of a region, however its letters are cased.

    Raises
    ------
    JobError
        There is no such region.

    Examples
    --------
    >>> arr_2019_region("tasmania").a
    0.0605
    >>> arr_2019_region("Tasmani")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [design.areal_reduction] region: found 'Tasmani'; expected one of: East Coast North, \
Semi-arid Inland QLD, Tasmania, SW WA, Central NSW, SE Coast, Southern Semi-arid, Southern Temperate, \
Northern Coastal, Inland Arid; did you mean 'Tasmania'?
    """
    asked = " ".join(name.split()).casefold()
    for region, coefficients in REGIONS.items():
        if region.casefold() == asked:
            return coefficients
    raise JobError(unknown("[design.areal_reduction] region", name, REGIONS))


def arr_2019_short(area: npt.ArrayLike, minutes: npt.ArrayLike, *, aep: float) -> Floats:
    """Return the factor of the short-duration equation, for 12 hours and less in every region.

    Parameters
    ----------
    area : array_like
        m².
    minutes : array_like
        Durations in minutes; broadcast with ``area``.
    aep : float
        Annual exceedance probability, a fraction.

    Returns
    -------
    array of float
        The broadcast shape, at most 1; outside its range it may be negative.

    Notes
    -----
    With A in km², D in minutes and the decimal logarithm: 1 - 0.287 (A^0.265 - 0.439 log D) D^-0.36
    + 2.26e-3 A^0.226 D^0.125 (0.3 + log AEP) + 0.0141 A^0.213 10^(-0.021 (D - 180)²/1440) (0.3 + log AEP).

    Examples
    --------
    Published: 0.9377527 for 26 km², 12 h and AEP 1 in 2000 (Ladson, A., 2020).

    >>> arr_2019_short(26e6, 720, aep=0.0005).round(7)
    np.float64(0.9377527)
    """
    km2, d = np.asarray(area, dtype=float) / 1e6, np.asarray(minutes, dtype=float)
    rarity = 0.3 + np.log10(aep)  # -0.00103 and not 0 at an AEP of 0.5
    factor = (
        1
        - 0.287 * (km2**0.265 - 0.439 * np.log10(d)) * d**-0.36
        + 2.26e-3 * km2**0.226 * d**0.125 * rarity
        + 0.0141 * km2**0.213 * 10 ** (-0.021 * (d - 180) ** 2 / 1440) * rarity
    )
    capped: Floats = np.minimum(factor, 1.0)
    return capped


def arr_2019_long(area: npt.ArrayLike, minutes: npt.ArrayLike, *, aep: float, region: str) -> Floats:
    """Return the factor of the long-duration equation, for a day and more in one region.

    Parameters
    ----------
    area : array_like
        m².
    minutes : array_like
        Durations in minutes; broadcast with ``area``.
    aep : float
        Annual exceedance probability, a fraction.
    region : str
        One of :data:`REGIONS`, however its letters are cased.

    Returns
    -------
    array of float
        The broadcast shape, at most 1.

    Raises
    ------
    JobError
        There is no such region.

    Notes
    -----
    With A in km², D in minutes, the decimal logarithm and the region's coefficients: 1 - a (A^b - c log D) D^-d
    + e A^f D^g (0.3 + log AEP) + h 10^(i A D/1440) (0.3 + log AEP).

    Examples
    --------
    Published: 0.9322746 for 26 km², 24 h and AEP 1 in 2000 in Tasmania (Ladson, A., 2020).

    >>> arr_2019_long(26e6, 1440, aep=0.0005, region="Tasmania").round(7)
    np.float64(0.9322746)
    """
    k = arr_2019_region(region)
    km2, d = np.asarray(area, dtype=float) / 1e6, np.asarray(minutes, dtype=float)
    rarity = 0.3 + np.log10(aep)
    factor = (
        1
        - k.a * (km2**k.b - k.c * np.log10(d)) * d**-k.d
        + k.e * km2**k.f * d**k.g * rarity
        + k.h * 10 ** (k.i * km2 * d / _DAY) * rarity
    )
    capped: Floats = np.minimum(factor, 1.0)
    return capped


def arr_2019(area: npt.ArrayLike, minutes: npt.ArrayLike, *, aep: float, region: str) -> Floats:
    """Return the areal reduction factor of Australian Rainfall and Runoff 2019.

    Parameters
    ----------
    area : array_like
        m².
    minutes : array_like
        Durations in minutes; broadcast with ``area``.
    aep : float
        Annual exceedance probability, a fraction.
    region : str
        One of :data:`REGIONS`, however its letters are cased.

    Returns
    -------
    array of float
        The broadcast shape, at most 1. No range is held here.

    Raises
    ------
    JobError
        There is no such region.

    Notes
    -----
    Australian Rainfall and Runoff 2019, book 2, chapter 4: up to 1 km² the factor is 1; up to 12 hours the
    short-duration equation holds, from 24 hours the long-duration one of the region, between them the factor is linear
    in the duration; between 1 and 10 km² it is 1 - 0.6614 (1 - factor of 10 km²) (A^0.4 - 1). The equations are of two
    studies: the factor may fall from 12 to 24 hours.

    Examples
    --------
    >>> arr_2019(1e8, [720, 1080, 1440], aep=0.01, region="East Coast North").round(4)
    array([0.9179, 0.9305, 0.943 ])
    >>> arr_2019([1e6, 5e6, 1e7], 1080, aep=0.01, region="East Coast North").round(4)
    array([1.    , 0.9823, 0.9704])
    """
    km2, d = np.asarray(area, dtype=float) / 1e6, np.asarray(minutes, dtype=float)
    equated = np.maximum(km2, 10.0) * 1e6
    short = arr_2019_short(equated, np.minimum(d, _HALF_DAY), aep=aep)
    long = arr_2019_long(equated, np.maximum(d, _DAY), aep=aep, region=region)
    onward = np.clip((d - _HALF_DAY) / (_DAY - _HALF_DAY), 0, 1)
    factor = (1 - onward) * short + onward * long
    small = 1 - 0.6614 * (1 - factor) * (np.maximum(km2, 1.0) ** 0.4 - 1)
    return np.where(km2 < 10, small, factor)


def _limits(*, region: str) -> Limits:
    arr_2019_region(region)
    return Limits(minutes=(1, 10_080), largest_areas=((0, 1e9), (_DAY, 3e10)), aep=(0.0005, 0.5))


def _remarks(*, aep: float, region: str) -> tuple[str, ...]:
    del region
    # Without the last bits: 1/200 must not count as rarer than 0.005.
    if aep >= _AGREED_AEP * (1 - TOLERANCE):
        return ()
    remark = (
        f"The areal reduction factors at AEP {aep:.4g} are extrapolated: sources disagree whether those of Australian"
        f" Rainfall and Runoff 2019 reach AEP {_AGREED_AEP:g} or 0.0005."
    )
    return (remark,)


ARR_2019 = ArealReduction(
    name="arr-2019",
    title="Australian Rainfall and Runoff 2019",
    jurisdiction=("australia", "au"),
    region_words="Australia",
    factor=arr_2019,
    limits=_limits,
    uses_frequency=True,
    options=("region",),
    remarks=_remarks,
    source="Australian Rainfall and Runoff 2019, book 2, chapter 4; two outputs published by Ladson, A. (2020)",
)
"""Areal reduction of Australian Rainfall and Runoff 2019: to 7 days; to 1000 km² below a day, else to 30 000 km²."""

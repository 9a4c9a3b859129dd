"""Areal reduction after Keers and Wescott (1977), for the United Kingdom."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import Limits
from basinrain.designstorm.areal_reduction.reduction import ArealReduction

__all__ = ["KEERS_WESCOTT", "keers_wescott"]


def keers_wescott(area: npt.ArrayLike, minutes: npt.ArrayLike) -> npt.NDArray[np.float64]:
    """Return the areal reduction factor of Keers and Wescott.

    Parameters
    ----------
    area : array_like
        m², above 0.
    minutes : array_like
        Durations in minutes; broadcast with ``area``.

    Returns
    -------
    array of float
        The broadcast shape; NaN for NaN. No range is held here: large areas at short durations have values below 0.

    Notes
    -----
    1 - b D^-a with D in hours and A in km² (Keers, J. F. and Wescott, P., 1977: A computer-based model for design
    rainfall in the United Kingdom, Meteorological Office, Scientific Paper 36), a fit to table 5.1 of the Flood Studies
    Report (1975), volume II; in use in the Flood Estimation Handbook. From memory:

    ============  ===================================  =================
    A             a                                    b
    ============  ===================================  =================
    up to 20      0.40 - 0.0208 ln(4.6 - ln A)         0.0394 A^0.354
    20 to 100     0.40 - 0.00382 (4.6 - ln A)²         0.0394 A^0.354
    100 to 500    0.40 - 0.00382 (4.6 - ln A)²         0.0627 A^0.254
    500 to 1000   0.40 - 0.0208 ln(ln A - 4.6)         0.0627 A^0.254
    from 1000     0.40 - 0.0208 ln(ln A - 4.6)         0.1050 A^0.180
    ============  ===================================  =================

    At 6 h the factor steps down by 0.0004 at 100 km² and by 0.0008 at 1000 km²; an area of exactly 100, 500 or 1000 km²
    has the coefficients of larger ones. At 20 and 500 km² the two rows differ by less than 1e-5, upwards at some
    durations. From 30 minutes on the factor is within 0.032 of the Flood Studies Report's table; below 15 minutes it
    diverges from it.

    Examples
    --------
    >>> keers_wescott(np.array([1e7, 5e8]), np.array([60, 720])).round(5)
    array([0.91098, 0.88468])
    """
    km2 = np.asarray(area, dtype=float) / 1e6
    from_hundred = np.log(km2) - 4.6
    # Of the pieces that do not hold for an area, some have no value there.
    apart = 0.0208 * np.log(np.maximum(np.abs(from_hundred), 1e-9))
    a = 0.40 - np.where((km2 <= 20) | (km2 >= 500), apart, 0.00382 * from_hundred**2)
    b = np.select(
        [km2 < 100, km2 < 1000],
        [0.0394 * km2**0.354, 0.0627 * km2**0.254],
        0.1050 * km2**0.180,
    )
    factor: npt.NDArray[np.float64] = 1 - b * (np.asarray(minutes, dtype=float) / 60) ** -a
    return factor


def _limits() -> Limits:
    # The largest areas are those that the table which was fitted reaches at the duration (from memory).
    return Limits(minutes=(15, 36_000), largest_areas=((0, 3e9), (30, 1e10), (60, 3e10)))


KEERS_WESCOTT = ArealReduction(
    name="keers-wescott",
    title="Keers and Wescott 1977 (Flood Studies Report)",
    jurisdiction=("united kingdom", "great britain", "uk"),
    region_words="the United Kingdom",
    factor=keers_wescott,
    limits=_limits,
    falls_with_area=True,
    rises_with_duration=True,
    source="Keers, J. F. and Wescott, P. (1977): A computer-based model for design rainfall in the United Kingdom,"
    " Meteorological Office, Scientific Paper 36; a fit to the Flood Studies Report (1975), vol. II, table 5.1",
    evidence="formula, coefficients and range from memory",
)
"""Areal reduction after Keers and Wescott, from 15 minutes to 600 h; up to 30 000 km² from 1 h on, less below."""

"""The triangular pattern of Yen and Chow."""

from __future__ import annotations

from functools import partial
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.patterns.cumulative import fall_by
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.designstorm.patterns.peak import CENTRE, peak_fraction

__all__ = ["TRIANGULAR", "triangular"]

Floats = npt.NDArray[np.float64]


def triangular(case: PatternCase, *, peak: str | float = CENTRE) -> Shaped:
    """Return the hyetograph of a depth whose intensity is a triangle over the duration.

    Parameters
    ----------
    case
        The depth that is to fall.
    peak
        Where the intensity is greatest: ``"early"``, ``"centre"``, ``"late"`` or a fraction r of the duration,
        strictly between 0 and 1.

    Returns
    -------
    Shaped

    Raises
    ------
    JobError
        The peak is nothing of that.
    MethodError
        The step does not divide the duration.

    Notes
    -----
    With the depth P and the duration T the intensity rises from 0 to h = 2 P / T in r T and falls to 0 in (1 - r) T.
    Every step gets the integral of the intensity over it, so the greatest step lies below h by up to a step's rise.
    Yen, B. C. and Chow, V. T., 1980: Design hyetographs for small drainage structures, Journal of the Hydraulics
    Division, ASCE, 106 (from memory).

    Examples
    --------
    >>> def curve(minutes):
    ...     return 32 * (minutes / 240) ** 0.3
    >>> case = PatternCase(minutes=240, step=60, total=32.0, curve=curve, curve_by_duration=curve, area=5e6)
    >>> triangular(case).depth, triangular(case, peak="early").depth.round(3)
    (array([ 4., 12., 12.,  4.]), array([ 8.   , 13.333,  8.   ,  2.667]))
    """
    return Shaped(fall_by(partial(_share, ratio=peak_fraction(peak)), case))


def _share(time: Floats, *, ratio: float) -> Floats:
    rising = time <= ratio
    share = 1 - (1 - time) ** 2 / (1 - ratio)
    share[rising] = time[rising] ** 2 / ratio
    return np.asarray(share, dtype=np.float64)


TRIANGULAR: Final = Pattern(
    name="triangular",
    title="Triangular",
    shape=triangular,
    options=("peak",),
    source="Yen and Chow (1980), Journal of the Hydraulics Division, ASCE, 106",
    evidence="The formula is from memory.",
)
"""The pattern, as the registry has it."""

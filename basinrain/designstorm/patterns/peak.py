"""Where in a storm its peak stands."""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from basinrain.errors import JobError, Problem, nearest_name

__all__ = ["CENTRE", "PEAKS", "peak_fraction", "peak_step"]

CENTRE: Final = "centre"
"""The peak where none is asked for."""

PEAKS: Final[Mapping[str, float]] = MappingProxyType({"early": 0.25, CENTRE: 0.5, "late": 0.75})
"""Fractions of the duration that lie before the peak, by their words."""

_ITEM: Final = "[[design.pattern]] peak"

_EXPECTED: Final = "early, centre, late, or a fraction of the duration between 0 and 1"

# What a fraction times a number of steps may be off, in steps, for the rounding of decimal fractions.
_ROUNDING: Final = 1e-9


def peak_fraction(peak: str | float = CENTRE) -> float:
    """Return the fraction of the duration that lies before the peak.

    Parameters
    ----------
    peak
        ``"early"`` (0.25), ``"centre"`` (0.5), ``"late"`` (0.75), or the fraction, strictly between 0 and 1.

    Returns
    -------
    float

    Raises
    ------
    JobError
        It is no such word and no such number.

    Examples
    --------
    >>> [peak_fraction(peak) for peak in ("early", "centre", "late", 0.375)]
    [0.25, 0.5, 0.75, 0.375]
    >>> peak_fraction(37.5)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [[design.pattern]] peak: found 37.5; expected early, centre, late, or a fraction of the \
duration between 0 and 1; write 0.375 for 37.5 %
    """
    if isinstance(peak, str):
        if peak in PEAKS:
            return PEAKS[peak]
        remedy = nearest_name(peak, PEAKS)
        raise JobError(Problem(item=_ITEM, found=f"'{peak}'", expected=_EXPECTED, remedy=remedy))
    # True is a number to Python, but no fraction that anybody means.
    if isinstance(peak, bool) or not 0 < peak < 1:
        percent = not isinstance(peak, bool) and 1 < peak < 100
        remedy = f"write {peak / 100:g} for {peak:g} %" if percent else "correct it"
        found = str(peak).lower() if isinstance(peak, bool) else f"{peak:g}"
        raise JobError(Problem(item=_ITEM, found=found, expected=_EXPECTED, remedy=remedy))
    return float(peak)


def peak_step(fraction: float, n_steps: int) -> int:
    """Return the step, counted from 0, that the peak stands in.

    It is the step whose middle is nearest to the peak, which is the one that holds it; a peak on the border of two
    steps stands in the earlier one.

    Parameters
    ----------
    fraction
        Of the duration before the peak, strictly between 0 and 1.
    n_steps
        Steps of the hyetograph, 1 at least.

    Returns
    -------
    int

    Examples
    --------
    Of twelve steps the sixth, when the peak stands on the border between the sixth and the seventh; of five the middle
    one; of one there is no choice.

    >>> peak_step(0.5, 12), peak_step(0.5, 5), peak_step(0.375, 12), peak_step(0.9, 1)
    (5, 2, 4, 0)
    """
    return max(math.ceil(fraction * n_steps - _ROUNDING) - 1, 0)

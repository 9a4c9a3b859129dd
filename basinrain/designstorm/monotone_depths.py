"""Depths fitted duration by duration, raised where they contradict each other."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

__all__ = ["monotone_depths"]

Floats = npt.NDArray[np.float64]


def monotone_depths(depth: Floats, minutes: Floats) -> Floats:
    """Return the least depths, none below those given, that do not fall with duration or rarity.

    Nor does their intensity rise with duration. First every depth is raised to the greatest of the shorter durations
    and the more frequent ones; then, from the longest duration to the shortest, to the intensity of the next longer
    one, which keeps what the first two have reached. Depths that agree with each other are returned as they are.

    Parameters
    ----------
    depth : array of float, shape (..., n_durations, n_frequencies)
        mm. A NaN makes its whole column, and those of rarer frequencies, NaN.
    minutes : array of float, shape (n_durations,)
        Rising.

    Returns
    -------
    array of float, as ``depth``

    Examples
    --------
    The two hours have less than the one hour, and the four hours more than twice what the two have then.

    >>> monotone_depths(np.array([[30.0], [28.0], [66.0]]), np.array([60.0, 120.0, 240.0]))
    array([[30.],
           [33.],
           [66.]])
    """
    raised = np.maximum.accumulate(np.maximum.accumulate(depth, axis=-1), axis=-2)
    for d in range(len(minutes) - 2, -1, -1):
        # Only what the next one's intensity exceeds is reckoned anew; the rest keeps its digits.
        np.maximum(raised[..., d, :], raised[..., d + 1, :] * (minutes[d] / minutes[d + 1]), out=raised[..., d, :])
    return raised

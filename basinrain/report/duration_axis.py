"""Durations along an axis: in words, as many as have room."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.ticker import NullLocator

__all__ = ["duration_axis", "words_with_room"]

_APART: Final = 17.0  # points between labels
_LETTER: Final = 4.2  # points

Floats = npt.NDArray[np.float64]


def duration_axis(
    axes: Any,  # noqa: ANN401 - matplotlib's axes
    durations: Floats,
    words: Sequence[str],
    *,
    points: float,
    left: float,
    right: float,
) -> None:
    """Make the horizontal axis logarithmic, mark every duration, and name as many as have room.

    Parameters
    ----------
    axes
        To be changed.
    durations : array of float, shape (n,)
        Rising, in any unit, above 0.
    words
        What each is called.
    points
        Width of the axes.
    left, right
        Points that are left free before the first duration and after the last.
    """
    axes.set_xscale("log")
    span = float(np.log(durations[-1] / durations[0]))
    # One duration by itself stands where the first of many would.
    scale = (span or 1.0) / (points - left - right)
    start = float(durations[0]) * np.exp(-left * scale)
    axes.set_xlim(start, start * np.exp(points * scale))
    axes.set_xticks(durations, words_with_room((np.log(durations / start) / scale).tolist(), words))
    axes.xaxis.set_minor_locator(NullLocator())


def words_with_room(places: Sequence[float], words: Sequence[str]) -> list[str]:
    """Return the words that can stand at their places, in points, without meeting the one before; the others blank.

    Examples
    --------
    >>> words_with_room([0.0, 10.0, 30.0], ["1 h", "2 h", "6 h"])
    ['1 h', '', '6 h']
    """
    shown: list[str] = []
    last = -math.inf
    for place, word in zip(places, words, strict=True):
        room = place - last >= max(_APART, _LETTER * len(word))
        shown.append(word if room else "")
        last = place if room else last
    return shown

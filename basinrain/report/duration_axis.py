"""The axes of figures of depth by duration: plain depths, and durations in words, as many as have room."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter, NullLocator

__all__ = ["depth_axis", "duration_axis", "words_with_room"]

_APART: Final = 17.0  # points between labels
_LETTER: Final = 4.2  # points

Floats = npt.NDArray[np.float64]


def depth_axis(
    axes: Any,  # noqa: ANN401 - matplotlib's axes
    label: str,
    *,
    places: Sequence[float] = (1.0, 2.0, 5.0),
) -> None:
    """Write plain numbers along the vertical logarithmic axis of depths by duration, and draw its grid.

    Parameters
    ----------
    axes
        Where to draw; its limits are the caller's.
    label
        What stands along the axis.
    places
        Where in every decade a number stands.
    """
    axes.yaxis.set_major_locator(LogLocator(subs=places))
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.yaxis.set_minor_formatter(NullFormatter())
    axes.yaxis.set_minor_locator(NullLocator())
    axes.set_axisbelow(True)
    axes.grid(axis="both")
    axes.set_xlabel("duration")
    axes.set_ylabel(label)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


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

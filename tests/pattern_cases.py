"""Depths that are to fall in time, for tests of temporal patterns."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from hypothesis import strategies as st

from basinrain.designstorm.patterns.ordinates import Ordinates
from basinrain.designstorm.patterns.pattern import PatternCase

Array = npt.NDArray[np.float64]


def pattern_case(
    minutes: int = 360,
    step: int = 10,
    *,
    total: float = 60.0,
    area: float = 5e6,
    exponent: float = 0.3,
    own: float = 0.0,
) -> PatternCase:
    """Return a case with the curve ``total (t / minutes)^exponent``.

    Depths reduced by their own duration are smaller by a further factor ``(t / minutes)^own``, so that both curves give
    the total for the whole duration. Area in m².
    """

    def curve(durations: Array) -> Array:
        return np.asarray(total * (durations / minutes) ** exponent, dtype=np.float64)

    def by_duration(durations: Array) -> Array:
        return np.asarray(curve(durations) * (durations / minutes) ** own, dtype=np.float64)

    return PatternCase(minutes=minutes, step=step, total=total, curve=curve, curve_by_duration=by_duration, area=area)


@st.composite
def ordinates(draw: st.DrawFn, *, at_most: int = 9) -> Ordinates:
    """Draw a cumulative curve of 2 ordinates or more, with stretches that are dry, steep or both."""
    inside = draw(st.lists(st.integers(1, 999), max_size=at_most, unique=True))
    time = np.array([0, *sorted(inside), 1000]) / 1000
    rises = draw(st.lists(st.integers(0, 50), min_size=len(time) - 1, max_size=len(time) - 1).filter(any))
    fallen = np.concatenate(([0], np.cumsum(rises)))
    return Ordinates(time, fallen / fallen[-1])

"""Tables of depths by duration and frequency for tests: small ones, and any that can be."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
from hypothesis import strategies as st

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM
from basinrain.designstorm.point_depths import PointDepths

DURATIONS = (5.0, 10.0, 15.0, 30.0, 60.0, 120.0, 180.0, 360.0, 720.0, 1440.0, 2880.0)
PERIODS = (1.25, 2.0, 5.0, 10.0, 20.0, 25.0, 50.0, 100.0, 200.0)


def table(depth: npt.ArrayLike, **other: Any) -> PointDepths:  # noqa: ANN401 - any field of the table
    """Return a table of one point or several, by default of 1, 4, 16 ... h and of 2, 10, 50 ... years."""
    values = np.array(depth, dtype=float)
    values = values[None] if values.ndim == 2 else values
    fields: dict[str, Any] = {
        "points": tuple(f"P{k}" for k in range(1, len(values) + 1)),
        "durations": 60.0 * 4.0 ** np.arange(values.shape[1]),
        "return_periods": 2.0 * 5.0 ** np.arange(values.shape[2]),
        "series": ANNUAL_MAXIMUM,
        "source": "invented",
        "date": "2031",
    }
    return PointDepths(depth=values, **(fields | other))


@st.composite
def tables(draw: st.DrawFn, *, series: str = ANNUAL_MAXIMUM) -> PointDepths:
    """Draw a table of 1 to 3 points, 1 to 6 durations and 1 to 5 frequencies.

    Sums of products of a curve that grows with duration while its intensity falls, and one that grows with rarity.
    """
    durations = np.array(sorted(draw(st.sets(st.sampled_from(DURATIONS), min_size=1, max_size=6))))
    periods = np.array(sorted(draw(st.sets(st.sampled_from(PERIODS), min_size=1, max_size=5))))
    n_points = draw(st.integers(1, 3))
    depth = np.zeros((n_points, len(durations), len(periods)))
    slopes = st.integers(0, 10)
    for point in range(n_points):
        for _ in range(2):
            slope = np.array([draw(slopes) for _ in durations[1:]]) / 10
            grown = np.concatenate(([0.0], np.cumsum(slope * np.diff(np.log(durations)))))
            steps = np.array([draw(st.integers(0, 8)) for _ in periods]) / 10
            depth[point] += draw(st.integers(1, 40)) * np.outer(np.exp(grown), 1 + np.cumsum(steps))
    return table(depth, durations=durations, return_periods=periods, series=series)

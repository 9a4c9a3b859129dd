"""Depth-duration curves and slow references for tests of storms that are made from them."""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt
from hypothesis import strategies as st

from basinrain.designstorm.patterns.pattern import PatternCase

Array = npt.NDArray[np.float64]
Curve = Callable[[Array], Array]

PUBLISHED: Final = Path(__file__).parent / "data" / "published"

INCH: Final = 25.4


def durations(n_steps: int, step: float) -> Array:
    """Return 1, 2, ... n steps in minutes."""
    return np.asarray(np.arange(1, n_steps + 1) * float(step), dtype=np.float64)


def published(name: str) -> list[dict[str, str]]:
    """Return the rows of a table of published values."""
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def denver(minutes: Array) -> Array:
    """Return depths in mm of i = 96.6 / (t^0.97 + 13.90) in/h: Denver, 10 years (Wenzel 1982, from memory)."""
    return np.asarray(96.6 / (minutes**0.97 + 13.90) * minutes / 60 * INCH, dtype=np.float64)


def through(minutes: list[float] | Array, depth: list[float] | Array) -> Curve:
    """Return the curve of straight lines from the origin through depths in mm of durations in minutes."""
    times, depths = np.concatenate([[0.0], minutes]), np.concatenate([[0.0], depth])

    def curve(wanted: Array) -> Array:
        return np.asarray(np.interp(wanted, times, depths), dtype=np.float64)

    return curve


def case_of(curve: Curve, minutes: int, step: int, *, by_duration: Curve | None = None) -> PatternCase:
    """Return the case of a curve, both reductions alike unless the second is given."""
    total = float(curve(np.array([float(minutes)]))[0])
    own = by_duration or curve
    return PatternCase(minutes=minutes, step=step, total=total, curve=curve, curve_by_duration=own, area=5e7)


def added_up(increments: list[float], step: int) -> PatternCase:
    """Return the case whose steps add these depths in mm to one another."""
    return case_of(through(durations(len(increments), step), np.cumsum(increments)), len(increments) * step, step)


def greatest(depth: Array) -> Array:
    """Return the greatest depth of 1, 2, ... n steps on end, over all windows."""
    n = len(depth)
    return np.array([max(depth[i : i + k].sum() for i in range(n - k + 1)) for k in range(1, n + 1)])


def has_one_peak(depth: Array) -> bool:
    """Tell whether depths rise to the greatest and fall after it, but for rounding."""
    peak = int(np.argmax(depth))
    slack = 1e-9 * depth.sum()
    return bool((np.diff(depth[: peak + 1]) >= -slack).all() and (np.diff(depth[peak:]) <= slack).all())


def falling_depths(max_steps: int = 30) -> st.SearchStrategy[list[float]]:
    """Draw depths in mm that further steps add: none above the one before, the first above 0, ties and dry ones too."""
    sizes = st.one_of(st.floats(0.01, 80), st.sampled_from([0.0, 0.5, 4.0]))
    return st.tuples(st.floats(1, 90), st.lists(sizes, max_size=max_steps - 1)).map(
        lambda drawn: sorted([drawn[0], *drawn[1]], reverse=True)
    )


def peaks() -> st.SearchStrategy[str | float]:
    """Draw places of the peak."""
    return st.one_of(st.sampled_from(["early", "centre", "late"]), st.floats(0.001, 0.999))

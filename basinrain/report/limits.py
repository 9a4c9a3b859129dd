"""How much of a large run is printed; the rest is in the files beside the report."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.basins import UNION
from basinrain.results import AveragedRun, StormResult, StormRun

__all__ = [
    "BASINS",
    "ESTIMATES",
    "GAUGES",
    "LISTED_WEIGHT",
    "STEPS",
    "STORMS",
    "drawn_basins",
    "drawn_storms",
    "left_out",
    "listed_gauges",
    "same_storms",
]

BASINS: Final = 12
"""Basins, besides the union, that have figures and detailed tables."""

STORMS: Final = 4
"""Storms that have figures and detailed tables."""

LISTED_WEIGHT: Final = 0.005
"""Gauges with less weight than this by every method share one line of a table of weights."""

STEPS: Final = 72
"""Longest hyetograph printed as a table."""

ESTIMATES: Final = 40
"""Most estimates of one storm printed one by one."""

GAUGES: Final = 60
"""Networks up to this size are listed whole."""


def drawn_basins(run: AveragedRun) -> list[int]:
    """Return the rows of the first dozen basins and of the union."""
    union = [b for b, basin in enumerate(run.basins.ids) if basin == UNION]
    return [b for b in range(len(run.basins)) if b not in union][:BASINS] + union


def drawn_storms(run: AveragedRun) -> tuple[StormResult, ...]:
    """Return the first few storms."""
    return run.storms[:STORMS]


def left_out(run: StormRun, file: str) -> tuple[str, ...]:
    """Return the sentence that says what is not printed and where it is; nothing when all is printed."""
    basins = len(run.basins) - len(drawn_basins(run))
    storms = len(run.storms) - len(drawn_storms(run))
    parts = [f"the first {STORMS} of {len(run.storms)} storms"] if storms else []
    if basins:
        parts.append(f"the first {BASINS} basins and the union of {len(run.basins)} rows")
    return (f"Shown here: {' and '.join(parts)}. The others are in {file}.",) if parts else ()


def listed_gauges(run: StormRun) -> npt.NDArray[np.bool_]:
    """Return which gauges stand in the tables of gauges: all of a small network, else those with weight anywhere."""
    n = len(run.network)
    if n <= GAUGES:
        return np.ones(n, dtype=bool)
    most = np.zeros(n)
    for result in run.storms:
        for depths in result.depths.values():
            most = np.maximum(most, np.nan_to_num(depths.table.weights).max(axis=0))
    return most >= LISTED_WEIGHT


def same_storms(run: StormRun, key: Callable[[StormResult], Hashable]) -> list[tuple[StormResult, tuple[str, ...]]]:
    """Return the first storm of every set that looks the same, with the names of that set; at most a few sets."""
    groups: dict[Hashable, list[StormResult]] = {}
    for result in run.storms:
        groups.setdefault(key(result), []).append(result)
    return [(results[0], tuple(r.storm.name for r in results)) for results in groups.values()][:STORMS]

"""Stretches of days in another unit that are too short for their months to tell."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from basinrain.screening.screened import NORMAL, Floats, Screened

__all__ = ["DAY_SURE", "LEAST_DAYS", "DaysInUnit", "days_in_unit"]

LEAST_WET: Final = 1.0
"""mm that the neighbours' median must have, in the gauge's climate, for a day's ratio to say something."""

LEAST_DAYS: Final = 6
"""Such days, with rain at the gauge, that a stretch must have."""

DAY_SURE: Final = 16.0
"""Natural logarithm of how much likelier the days of a stretch are with the factor than without."""

MOST_TOLD: Final = 4.0
"""The most that one day may add to it, either way: days of showers are wilder than the normal law."""

CLOSE: Final = 0.5
"""Natural logarithm: how near the median ratio of the days must come to the factor."""

TIGHT: Final = 1.5
"""Times the gauge's usual scatter that the ratios may scatter in the stretch; cloudbursts scatter more."""

LEAST_SCATTER: Final = 0.3
"""Natural logarithm: days of gauges side by side differ by as much."""

LEAST_USUAL: Final = 60
"""Such days of the whole record from which the gauge's usual ratio and scatter are known."""

_LEAST_REPORTING: Final = 2


@dataclass(frozen=True)
class DaysInUnit:
    """Cases ``first`` to ``stop`` (not included) whose ratio to the neighbours is near ``factor``.

    ``ratio`` is the median one there, ``usual`` that of the record.
    """

    first: int
    stop: int
    factor: float
    ratio: float
    usual: float


def days_in_unit(
    view: Screened, g: int, factors: Sequence[float], free: np.ndarray[tuple[int], np.dtype[np.bool_]]
) -> list[DaysInUnit]:
    """Return the stretches of days that a factor explains better than none, the surest first.

    Parameters
    ----------
    g
        The gauge's place.
    factors
        Those that are asked, above 1: a gauge that showers miss for a week has a tenth of its neighbours too.
    free : array of bool, shape (n_cases,)
        The cases that no other stretch has.
    """
    depths, middle = view.cases.depths[:, g], view.middle[:, g]
    with np.errstate(invalid="ignore"):
        telling = np.flatnonzero((depths > 0) & (middle >= LEAST_WET) & (view.reporting[:, g] >= _LEAST_REPORTING))
    if len(telling) < LEAST_USUAL:
        return []
    logs = np.log(depths[telling] / middle[telling])
    usual = float(np.median(logs))
    logs -= usual
    scatter = max(NORMAL * float(np.median(np.abs(logs))), LEAST_SCATTER)
    taken = ~free[telling]
    found: list[tuple[float, DaysInUnit]] = []
    for factor in factors:
        log = np.log(factor)
        gain = np.clip((logs**2 - (logs - log) ** 2) / (2 * scatter**2), -MOST_TOLD, MOST_TOLD)
        gain[taken] = -np.inf
        while True:
            a, b, sure = _richest(gain)
            if sure < DAY_SURE:
                break
            stand = float(np.median(logs[a:b]))
            spread = NORMAL * float(np.median(np.abs(logs[a:b] - stand)))
            if b - a >= LEAST_DAYS and abs(stand - log) <= CLOSE and spread <= TIGHT * scatter:
                stretch = DaysInUnit(
                    int(telling[a]), int(telling[b - 1]) + 1, factor, float(np.exp(stand + usual)), float(np.exp(usual))
                )
                found.append((sure, stretch))
            gain[a:b] = -np.inf
    kept: list[DaysInUnit] = []
    for _, stretch in sorted(found, key=lambda item: (-item[0], item[1].first, item[1].factor)):
        if all(stretch.first >= other.stop or stretch.stop <= other.first for other in kept):
            kept.append(stretch)
    return kept


def _richest(gain: Floats) -> tuple[int, int, float]:
    """Return first and stop of the stretch with the greatest sum, and the sum; minus infinity parts stretches."""
    best, begin, total = (0, 0, 0.0), 0, 0.0
    for k, value in enumerate(gain.tolist()):
        total += value
        if total <= 0:
            begin, total = k + 1, 0.0
        elif total > best[2]:
            best = begin, k + 1, total
    return best

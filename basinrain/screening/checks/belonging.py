"""Whose a stretch of rain is that stands under two gauges' names."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.screening.screened import Floats, Screened

__all__ = ["LEAST_KNOWN", "TELLING", "better_fit"]

TELLING: Final = 4.6
"""Natural logarithm of how much likelier the stretch must be as one gauge's than as the other's: e^4.6 is 100 to 1."""

MOST_TOLD: Final = 2.0
"""The most that one case may add to it, either way: showers are wilder than the normal law."""

LEAST_KNOWN: Final = 0.9
"""Share of the cases that another gauge must have to be asked, in the stretch and outside it."""

LEAST_CASES: Final = 60
"""Wet cases outside the stretch that are needed: some ten for every gauge that is asked."""

MOST_ASKED: Final = 6
"""Other gauges that are asked, the nearest to either."""


def better_fit(view: Screened, pair: tuple[int, int], start: np.datetime64, end: np.datetime64) -> float:
    """Return how much likelier a stretch that two gauges share is the first one's than the second's.

    Either gauge's root depths are estimated from those of other gauges, by a regression on the cases outside the
    stretch. In the stretch the estimates of both are held against the values that both have, by the normal law with the
    scatter of either regression.

    Parameters
    ----------
    pair
        Places of the two in the network.
    start, end
        The stretch ``(start, end]``.

    Returns
    -------
    float
        A natural logarithm, above 0 for the first; 0 where too little is known to tell.
    """
    cases = view.cases
    roots = np.sqrt(cases.depths)
    within = (cases.ends > start) & (cases.starts < end)
    asked = _asked(view, roots, within, pair)
    if not asked:
        return 0.0
    others = np.column_stack([np.ones(len(roots)), roots[:, asked]])
    complete = np.isfinite(others).all(axis=1)
    wet = (np.nan_to_num(others[:, 1:]).max(axis=1) > 0) & complete
    shared = np.flatnonzero(within & wet & np.isfinite(roots[:, pair]).all(axis=1))
    if not len(shared):
        return 0.0
    likely = []
    for gauge in pair:
        known = np.flatnonzero(~within & wet & np.isfinite(roots[:, gauge]))
        if len(known) < LEAST_CASES:
            return 0.0
        slopes, *_ = np.linalg.lstsq(others[known], roots[known, gauge], rcond=None)
        scatter = float(np.sqrt(np.mean((roots[known, gauge] - others[known] @ slopes) ** 2)))
        away = (roots[shared, gauge] - others[shared] @ slopes) / max(scatter, 1e-3)
        likely.append(-(away**2) / 2 - np.log(max(scatter, 1e-3)))
    return float(np.clip(likely[0] - likely[1], -MOST_TOLD, MOST_TOLD).sum())


def _asked(
    view: Screened, roots: Floats, within: np.ndarray[tuple[int], np.dtype[np.bool_]], pair: tuple[int, int]
) -> list[int]:
    """Return the nearest gauges to either that are known in the stretch and outside it."""
    distances = np.minimum(view.distances[pair[0]], view.distances[pair[1]])
    near = [int(j) for j in np.argsort(distances, kind="stable") if j not in pair and np.isfinite(distances[j])]
    known = np.isfinite(roots)
    full = [j for j in near if known[within, j].mean() >= LEAST_KNOWN and known[~within, j].mean() >= LEAST_KNOWN]
    return full[:MOST_ASKED]

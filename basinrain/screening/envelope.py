"""The greatest depths that are known, or held possible, for a duration."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
import numpy.typing as npt

__all__ = ["GreatestDepth", "envelope_depth", "greatest_depths", "world_depth"]


@dataclass(frozen=True)
class GreatestDepth:
    """The greatest point rainfall on record for a duration.

    Parameters
    ----------
    hours, depth
        Duration in h and depth in mm.
    place, year, evidence
        Where and when it fell, and where the figure is from.
    """

    hours: float
    depth: float
    place: str
    year: int
    evidence: str


@cache
def greatest_depths() -> tuple[GreatestDepth, ...]:
    """Return the world's greatest point rainfalls, by rising duration.

    Returns
    -------
    tuple of GreatestDepth
        1 minute to 2 years. A longer duration may stand with a smaller depth than a shorter one, as lists have it.

    Examples
    --------
    >>> [(r.depth, r.place) for r in greatest_depths() if r.hours == 24]
    [(1825.0, 'Foc-Foc, La Réunion')]
    """
    text = files("basinrain.screening").joinpath("greatest_depths.csv").read_text(encoding="utf-8")
    return tuple(
        GreatestDepth(float(row["hours"]), float(row["depth_mm"]), row["place"], int(row["year"]), row["evidence"])
        for row in csv.DictReader(text.splitlines())
    )


def world_depth(hours: float) -> float:
    """Return the envelope of the world's greatest point rainfalls.

    Parameters
    ----------
    hours
        Duration in h, above 0.

    Returns
    -------
    float
        mm; straight between the records on doubly logarithmic paper and never falling with duration. The one minute's
        depth below it, no limit (infinite) above two years.

    Examples
    --------
    >>> round(world_depth(24), 1), round(world_depth(1), 1), round(world_depth(1e-3), 1)
    (1825.0, 401.0, 38.0)
    >>> round(world_depth(12), 1)  # the 1400 mm of 10 h hold for 12 h too
    1480.1
    """
    return envelope_depth([(record.hours, record.depth) for record in greatest_depths()], hours)


def envelope_depth(points: list[tuple[float, float]] | tuple[tuple[float, float], ...], hours: float) -> float:
    """Return the depth of an envelope at a duration.

    Parameters
    ----------
    points
        Durations in h and depths in mm, above 0, in any order.
    hours
        Duration in h, above 0.

    Returns
    -------
    float
        mm; interpolated on logarithms, never falling with duration: a point below an earlier one does not count. The
        shortest duration's depth below it; infinite above the longest, and without points.

    Examples
    --------
    >>> points = [(1, 80), (4, 160), (24, 150)]
    >>> [round(envelope_depth(points, hours), 1) for hours in (0.5, 1, 2, 24, 48)]
    [80.0, 80.0, 113.1, 160.0, inf]
    """
    ordered = np.array(sorted(points), dtype=float).reshape(-1, 2)
    if not len(ordered) or hours > ordered[-1, 0] * (1 + 1e-9):
        return float("inf")
    highest: npt.NDArray[np.float64] = np.maximum.accumulate(ordered[:, 1])
    # A record that an earlier one tops says nothing of its duration; the line runs past it.
    telling = np.concatenate([[True], ordered[1:, 1] >= highest[:-1]])
    durations, depths = ordered[telling, 0], ordered[telling, 1]
    return float(np.exp(np.interp(np.log(hours), np.log(durations), np.log(depths))))

"""What a temporal pattern is, and what it is given."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.depth_source import Curve

__all__ = ["Pattern", "PatternCase", "Shaped"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class PatternCase:
    """One depth that is to fall in time.

    Parameters
    ----------
    minutes : int
        The duration, a whole number of steps.
    step : int
        The step in minutes.
    total : float
        The areal depth of the whole duration, mm.
    curve : callable
        Depths in mm of durations in minutes, all with the areal reduction of the whole duration; ``total`` for it.
    curve_by_duration : callable
        The same, each with the areal reduction of its own duration.
    area : float
        The area over which it falls, m².
    """

    minutes: int
    step: int
    total: float
    curve: Curve
    curve_by_duration: Curve
    area: float

    @property
    def n_steps(self) -> int:
        """Steps of the hyetograph."""
        return self.minutes // self.step


@dataclass(frozen=True, eq=False)
class Shaped:
    """A hyetograph.

    Parameters
    ----------
    depth : array of float, shape (n_steps,)
        mm a step; sums to the total.
    remarks : tuple of str
        Whole sentences on what a reader must know of it.
    """

    depth: Floats
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, kw_only=True)
class Pattern:
    """A temporal pattern, as the registry has it.

    Parameters
    ----------
    name
        As a job says it.
    title
        As a report says it.
    shape
        Makes the hyetograph of a :class:`PatternCase`; further keyword arguments are the pattern's ``options``.
    options
        Names of the keyword arguments that ``shape`` takes.
    by_curve
        Whether it is made from depths of durations down to a step, not of a shape of its own.
    source
        Where it is published.
    evidence
        Where values are not from a text that was seen, that is said; else empty.
    """

    name: str
    title: str
    shape: Callable[..., Shaped]
    options: tuple[str, ...] = ()
    by_curve: bool = False
    source: str
    evidence: str = ""

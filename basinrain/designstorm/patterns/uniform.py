"""The uniform pattern: the same depth in every step."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.designstorm.patterns.increments import check_step
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped

__all__ = ["UNIFORM", "uniform"]


def uniform(case: PatternCase) -> Shaped:
    """Return the hyetograph of a depth that falls evenly.

    Parameters
    ----------
    case
        The depth that is to fall.

    Returns
    -------
    Shaped

    Raises
    ------
    MethodError
        The step does not divide the duration.

    Notes
    -----
    Common practice; the rain of the rational method.

    Examples
    --------
    >>> def curve(minutes):
    ...     return 30 * (minutes / 180) ** 0.3
    >>> uniform(PatternCase(minutes=180, step=60, total=30.0, curve=curve, curve_by_duration=curve, area=5e6)).depth
    array([10., 10., 10.])
    """
    check_step(case.minutes, case.step)
    return Shaped(np.full(case.n_steps, case.total / case.n_steps))


UNIFORM: Final = Pattern(name="uniform", title="Uniform", shape=uniform, source="common practice")
"""The pattern, as the registry has it."""

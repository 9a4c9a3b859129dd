"""How a depth falls by a cumulative curve: the increments on the step grid."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.patterns.increments import check_step, increments_of
from basinrain.designstorm.patterns.pattern import PatternCase
from basinrain.errors import MethodError, Problems

__all__ = ["fall_by", "step_problems"]

Floats = npt.NDArray[np.float64]


def fall_by(curve: Callable[[Floats], Floats], case: PatternCase) -> Floats:
    """Return the depth of every step when a case's total falls by a dimensionless cumulative curve.

    Parameters
    ----------
    curve
        Shares of the depth that have fallen after shares of the duration; 0 for 0 and 1 for 1, nowhere falling.
    case
        The depth that is to fall.

    Returns
    -------
    array of float, shape (n_steps,)
        mm; what the curve rises by over each step, exactly, however it runs within.

    Raises
    ------
    MethodError
        The step does not divide the duration.

    Examples
    --------
    >>> def even(minutes):
    ...     return 30 * (minutes / 180) ** 0.3
    >>> case = PatternCase(minutes=180, step=60, total=30.0, curve=even, curve_by_duration=even, area=5e6)
    >>> fall_by(lambda time: time**2, case).round(3)
    array([ 3.333, 10.   , 16.667])
    """
    check_step(case.minutes, case.step)
    return increments_of(curve(np.arange(case.n_steps + 1) / case.n_steps), case.total)


def step_problems(case: PatternCase) -> Problems:
    """Return what is wrong with a case's step, so that it is reported together with what else is wrong.

    Examples
    --------
    >>> def even(minutes):
    ...     return 30 * (minutes / 180) ** 0.3
    >>> len(step_problems(PatternCase(minutes=180, step=7, total=30.0, curve=even, curve_by_duration=even, area=5e6)))
    1
    """
    problems = Problems()
    try:
        check_step(case.minutes, case.step)
    except MethodError as error:
        problems.extend(error)
    return problems

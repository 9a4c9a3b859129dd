"""A temporal pattern that the user gives as a table of ordinates."""

from __future__ import annotations

from typing import Final

from basinrain.designstorm.patterns.cumulative import fall_by
from basinrain.designstorm.patterns.ordinates import Ordinates
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped

__all__ = ["TABLE", "by_table"]


def by_table(case: PatternCase, *, ordinates: Ordinates) -> Shaped:
    """Return the hyetograph of a depth that falls by a cumulative curve, straight between its ordinates.

    Parameters
    ----------
    case
        The depth that is to fall.
    ordinates
        The curve.

    Returns
    -------
    Shaped

    Raises
    ------
    MethodError
        The step does not divide the duration.

    Examples
    --------
    >>> def curve(minutes):
    ...     return 30 * (minutes / 180) ** 0.3
    >>> case = PatternCase(minutes=180, step=60, total=30.0, curve=curve, curve_by_duration=curve, area=5e6)
    >>> by_table(case, ordinates=Ordinates(time=[0.0, 0.5, 1.0], share=[0.0, 0.9, 1.0])).depth.round(3)
    array([18., 10.,  2.])
    """
    return Shaped(fall_by(ordinates.at, case))


TABLE: Final = Pattern(
    name="table", title="The user's own table", shape=by_table, options=("ordinates",), source="the user's own table"
)
"""The pattern, as the registry has it."""

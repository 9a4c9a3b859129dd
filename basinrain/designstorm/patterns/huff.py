"""Huff's median distributions of heavy storms, by the quarter of the storm in which most of it fell."""

from __future__ import annotations

from functools import partial
from typing import Final

from basinrain.designstorm.patterns.increments import check_step
from basinrain.designstorm.patterns.ordinates import increments_by, published_ordinates
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.errors import JobError, MethodError, Problem, Problems, nearest_name
from basinrain.intervals import interval_of

__all__ = ["BASES", "HUFF", "SQUARE_MILE", "huff"]

BASES: Final = ("point", "area")
"""The two tables: of a point (areas to 10 mi²), and of areas of 50 to 400 mi²."""

SQUARE_MILE: Final = 2_589_988.110336
"""m², exactly: a mile is 1609.344 m."""

_POINT_MOST: Final = 10 * SQUARE_MILE
_AREA_LEAST: Final = 50 * SQUARE_MILE
_AREA_MOST: Final = 400 * SQUARE_MILE

_SPACING: Final = 20
"""Ordinates are every twentieth of the duration."""

_HOURS: Final = {1: (0.0, 6.0), 2: (6.0, 12.0), 3: (12.0, 24.0), 4: (24.0, float("inf"))}
"""Durations for which a quartile is commonly used: above the first, to the second, hours."""


def huff(case: PatternCase, *, quartile: int, basis: str | None = None) -> Shaped:
    """Return the hyetograph of a depth by the median distribution of a quartile.

    Parameters
    ----------
    case
        The depth that is to fall.
    quartile
        1 to 4: the quarter of the storm in which most of it falls.
    basis
        One of :data:`BASES`; None takes the one that the case's area is in.

    Returns
    -------
    Shaped
        With remarks: where the stated basis is not that of the area, where the duration is not one that the quartile is
        commonly used for, where the step is shorter than the spacing of the ordinates (a twentieth of the duration),
        and with basis ``"area"`` always that its values are from memory.

    Raises
    ------
    JobError
        The basis is not known.
    MethodError
        No basis is stated and the area is in neither table; the step does not divide the duration; both together.

    Notes
    -----
    Half of the storms of a quartile had more by any time than the median says, so it is not the curve of any one storm.
    Huff, F. A., 1990: Time distributions of heavy rainstorms in Illinois, Illinois State Water Survey Circular 173;
    Huff, F. A. and Angel, J. R., 1992: Rainfall frequency atlas of the Midwest, Illinois State Water Survey Bulletin
    71. The table of 50 to 400 mi² is from memory. Which quartile goes with which duration is common practice after
    Bulletin 75 of the same survey.

    Examples
    --------
    By the first quartile 60 % fall in the first quarter, then 22, 10 and 8 %.

    >>> def curve(minutes):
    ...     return 50 * (minutes / 240) ** 0.3
    >>> case = PatternCase(minutes=240, step=60, total=50.0, curve=curve, curve_by_duration=curve, area=5e6)
    >>> huff(case, quartile=1).depth.round(6)
    array([30., 11.,  5.,  4.])
    """
    if basis is not None and basis not in BASES:
        raise JobError(
            Problem(
                item="[[design.pattern]] basis",
                found=f"'{basis}'",
                expected="one of: " + ", ".join(BASES),
                remedy=nearest_name(basis, BASES),
            )
        )
    chosen = basis or _basis_of(case.area)
    problems = Problems()
    if chosen is None:
        problems.add(
            item=f"pattern huff-{quartile}",
            found=f"an area of {_words(case.area)}",
            expected="up to 10 mi² (25.9 km²), or 50 to 400 mi² (129.5 to 1036 km²), for which it is published",
            remedy='state basis = "point" or "area"',
        )
    try:
        check_step(case.minutes, case.step)
    except MethodError as error:
        problems.extend(error)
    if chosen is None or problems:
        raise MethodError(problems.kept)
    depth = increments_by(published_ordinates(f"huff_{chosen}", f"Q{quartile}"), case)
    return Shaped(depth, tuple(_remarks(case, quartile, chosen)))

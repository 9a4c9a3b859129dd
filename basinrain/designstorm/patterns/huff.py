"""Huff's median distributions of heavy storms, by the quarter of the storm in which most of it fell."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from typing import Final

from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.patterns.cumulative import fall_by, step_problems
from basinrain.designstorm.patterns.ordinates import published_ordinates
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.errors import JobError, MethodError, unknown
from basinrain.units import area_factor

__all__ = ["BASES", "HUFF", "huff"]

BASES: Final = ("point", "area")
"""The two tables: of a point (areas to 10 mi²), and of areas of 50 to 400 mi²."""

_SQUARE_MILE: Final = area_factor("mi2")

# Limits in m²; an area that is a limit but for rounding is within it.
_ROUNDING: Final = 1e-9
_POINT_MOST: Final = 10 * _SQUARE_MILE * (1 + _ROUNDING)
_AREA_LEAST: Final = 50 * _SQUARE_MILE * (1 - _ROUNDING)
_AREA_MOST: Final = 400 * _SQUARE_MILE * (1 + _ROUNDING)

_PARTS: Final = 20
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
        raise JobError(unknown("[[design.pattern]] basis", basis, BASES))
    chosen = basis or _basis_of(case.area)
    problems = step_problems(case)
    if not chosen:
        problems.add(
            item=f"pattern huff-{quartile}",
            found=f"an area of {_area_words(case.area)}",
            expected="up to 10 mi² (25.9 km²) or 50 to 400 mi² (129.5 to 1036 km²), for which it is published",
            remedy='state basis = "point" or "area"',
        )
    problems.raise_as(MethodError)
    depth = fall_by(published_ordinates(f"huff_{chosen}", f"Q{quartile}").at, case)
    return Shaped(depth, tuple(_remarks(case, quartile, chosen)))


def _basis_of(area: float) -> str:
    """Return the basis whose range an area in m² is in; empty where it is in neither."""
    if area <= _POINT_MOST:
        return "point"
    return "area" if _AREA_LEAST <= area <= _AREA_MOST else ""


def _remarks(case: PatternCase, quartile: int, basis: str) -> Iterator[str]:
    if basis == "area":
        yield f"The Huff quartile {quartile} distribution of 50 to 400 mi² is from memory; check it against the source."
    if basis != _basis_of(case.area):
        known = "up to 10 mi² (25.9 km²)" if basis == "point" else "50 to 400 mi² (129.5 to 1036 km²)"
        yield (
            f"The Huff quartile {quartile} distribution used is published for areas of {known}; the area here is "
            f"{_area_words(case.area)}."
        )
    above, most = _HOURS[quartile]
    if not above < case.minutes / 60 <= most:
        usual = next(number for number, (_, most) in _HOURS.items() if case.minutes / 60 <= most)
        yield (
            f"A storm of {duration_text(case.minutes)} is commonly given Huff quartile {usual}, not "
            f"{quartile} (to 6 h the first, to 12 h the second, to 24 h the third, longer the fourth)."
        )
    if case.step * _PARTS < case.minutes:
        yield (
            f"The ordinates of Huff quartile {quartile} are {case.minutes / _PARTS:g} minutes apart, so that steps of "
            f"{case.step} min between two of them get equal depths."
        )


def _area_words(area: float) -> str:
    return f"{area / _SQUARE_MILE:.6g} mi² ({area / 1e6:.6g} km²)"


HUFF: Final = tuple(
    Pattern(
        name=f"huff-{quartile}",
        title=f"Huff quartile {quartile}, median",
        shape=partial(huff, quartile=quartile),
        options=("basis",),
        source="Huff (1990), Illinois State Water Survey Circular 173; Huff and Angel (1992), Bulletin 71",
        evidence="The distributions of 50 to 400 mi² are from memory; those of a point were seen in public copies.",
    )
    for quartile in _HOURS
)
"""A pattern for each quartile."""

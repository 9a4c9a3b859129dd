"""Areal reduction by an exponential formula with coefficients of the user's own."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import Limits
from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.errors import JobError, Problems

__all__ = ["EXPONENTIAL", "ExponentialCoefficients", "exponential"]

_KEYS = "[design.areal_reduction]"


@dataclass(frozen=True, kw_only=True)
class ExponentialCoefficients:
    """Coefficients of the exponential formula, and where they hold.

    Parameters
    ----------
    c1 : float
        A km² of area, above 0.
    c2 : float
        Of the duration in hours to the power ``c3``, above 0.
    c3 : float
        Above 0.
    source : str
        Where they are from; not empty.
    areas : (float, float), optional
        Smallest and largest area that they are for, m².
    minutes : (float, float), optional
        Shortest and longest duration that they are for, minutes.

    Raises
    ------
    JobError
        A coefficient is no number above 0, a range does not rise, the source is empty; all such problems together.

    Examples
    --------
    >>> ExponentialCoefficients(c1=0.0021, c2=0.53, c3=0.25, source="a regional study", minutes=(60, 1440)).areas
    >>> ExponentialCoefficients(c1=0, c2=0.53, c3=0.25, source="")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [design.areal_reduction] coefficients, c1: found 0; expected a number above 0
    [design.areal_reduction] source: found none; say where the coefficients are from
    """

    c1: float
    c2: float
    c3: float
    source: str
    areas: tuple[float, float] | None = None
    minutes: tuple[float, float] | None = None

    def __post_init__(self) -> None:
        problems = Problems()
        for name in ("c1", "c2", "c3"):
            if not (math.isfinite(value := getattr(self, name)) and value > 0):
                problems.add(item=f"{_KEYS} coefficients, {name}", found=f"{value:g}", expected="a number above 0")
        if not self.source.strip():
            problems.add(item=f"{_KEYS} source", found="none", remedy="say where the coefficients are from")
        for name, key, unit in (("areas", "valid_areas", "m²"), ("minutes", "valid", "min")):
            ends = getattr(self, name)
            if ends is not None and not (0 <= ends[0] <= ends[1] < math.inf and ends[1] > 0):
                problems.add(
                    item=f"{_KEYS} {key}",
                    found=f"{ends[0]:g} to {ends[1]:g} {unit}",
                    expected="the least and the greatest, in this order",
                )
        problems.raise_as(JobError)


def exponential(
    area: npt.ArrayLike, minutes: npt.ArrayLike, *, coefficients: ExponentialCoefficients
) -> npt.NDArray[np.float64]:
    """Return the areal reduction factor of the exponential formula.

    Parameters
    ----------
    area : array_like
        m².
    minutes : array_like
        Durations in minutes; broadcast with ``area``.
    coefficients
        Those of the formula.

    Returns
    -------
    array of float
        The broadcast shape; 1 for area 0, NaN for NaN. No range is held here.

    Notes
    -----
    1 - (1 - exp(-c1 A)) exp(-c2 d^c3), with A in km² and d in hours: the form in which the U.S. Weather Bureau's curves
    are written, also in Italy. With c1 = 0.01 a square mile, c2 = 1.1 and c3 = 0.25 it is that of Leclerc and Schaake.
    It falls with area, to 1 - exp(-c2 d^c3), and rises with duration.

    Examples
    --------
    Coefficients remembered for Calabria, 100 km² in 1 and in 6 hours:

    >>> calabria = ExponentialCoefficients(c1=0.0021, c2=0.53, c3=0.25, source="from memory")
    >>> exponential(1e8, [60, 360], coefficients=calabria).round(5)
    array([0.88851, 0.91736])
    """
    hours = np.asarray(minutes, dtype=float) / 60
    taken = np.expm1(-coefficients.c1 * np.asarray(area, dtype=float) / 1e6)
    factor: npt.NDArray[np.float64] = 1 + taken * np.exp(-coefficients.c2 * hours**coefficients.c3)
    return factor


def _limits(*, coefficients: ExponentialCoefficients) -> Limits:
    smallest, largest = coefficients.areas or (0.0, math.inf)
    return Limits(
        minutes=coefficients.minutes or (0.0, math.inf),
        smallest_area=smallest,
        largest_areas=((0.0, largest),),
    )


def _remarks(*, coefficients: ExponentialCoefficients) -> tuple[str, ...]:
    stated = {"areas": coefficients.areas, "durations": coefficients.minutes}
    missing = " or ".join(name for name, ends in stated.items() if ends is None)
    given = f"The coefficients of the areal reduction were given with the job: {coefficients.source}."
    if not missing:
        return (given,)
    return (given, f"No range of {missing} was stated for the coefficients of the areal reduction: none was held.")


EXPONENTIAL = ArealReduction(
    name="exponential",
    title="Exponential formula with the given coefficients",
    jurisdiction=(),
    region_words="wherever the coefficients are for",
    factor=exponential,
    limits=_limits,
    options=("coefficients",),
    remarks=_remarks,
    falls_with_area=True,
    rises_with_duration=True,
    source="1 - (1 - exp(-c1 A)) exp(-c2 d^c3), A in km² and d in hours; the coefficients' own source",
)
"""Areal reduction with :class:`ExponentialCoefficients`."""

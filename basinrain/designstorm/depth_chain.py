"""From the depths of points to the areal depth of a basin, every link of the chain kept."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.reduction import Reduced
from basinrain.designstorm.depth_source import Curve, DepthSource
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.errors import MethodError, Problem

__all__ = ["CurvePair", "DepthChain", "Links", "Reducer"]

Floats = npt.NDArray[np.float64]


Reducer = Callable[[float, Floats, Frequency], Reduced]
"""Gives the areal reduction of an area in m², of durations in minutes, at a frequency."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Links:
    """The depths of one area at one frequency, link by link.

    Parameters
    ----------
    minutes : array of float, shape (n,)
        Durations.
    point : array of float, shape (n,)
        Mean over the area of the depths of the points, mm.
    interval_factor : array of float, shape (n,)
        What makes up for depths that were read at fixed intervals; 1 where nothing does.
    uplift : float
        The factor for climate to come; 1 where there is none.
    reduction : array of float, shape (n,)
        Areal over point depth; 1 where nothing is reduced.
    reduced_area : float
        The area that decides the reduction, m².
    clamped, remarks : tuple of str
        Whole sentences: what was brought into the reduction's range, and what a reader must know of it.
    """

    minutes: Floats
    point: Floats
    interval_factor: Floats
    uplift: float
    reduction: Floats
    reduced_area: float
    clamped: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()

    @property
    def unreduced(self) -> Floats:
        """The depths before the areal reduction, mm."""
        return self.point * self.interval_factor * self.uplift

    @property
    def areal(self) -> Floats:
        """The areal depths, mm."""
        return self.unreduced * self.reduction


@dataclass(frozen=True, eq=False, kw_only=True)
class DepthChain:
    """What leads from depths of points to areal depths.

    Parameters
    ----------
    source : DepthSource
        Depths by duration and frequency.
    weights : array of float, shape (n_areas, n_points)
        The weight of every point of the source in every area.
    areas : array of float, shape (n_areas,)
        m².
    convert : bool
        Whether frequencies are counted in an annual maximum series, and brought to the source's by Langbein's relation.
    extrapolate : bool
        Whether the source may go on beyond what it knows.
    interval_factor : callable, optional
        Factors for depths that were read at fixed intervals, by durations in minutes.
    uplift : float
        Factor for climate to come.
    reduce : callable, optional
        The areal reduction.

    Raises
    ------
    MethodError
        An areal reduction of depths that are areal already.

    Examples
    --------
    Two points that count alike, and nothing reduced:

    >>> from basinrain.designstorm.point_depths import PointDepths
    >>> table = PointDepths(
    ...     points=("P", "Q"),
    ...     durations=[60, 360],
    ...     return_periods=[2, 10],
    ...     series="annual-maximum",
    ...     depth=[[[20, 30], [40, 60]], [[30, 40], [50, 80]]],
    ...     source="invented",
    ...     date="2031",
    ... )
    >>> chain = DepthChain(source=table, weights=np.array([[0.5, 0.5]]), areas=np.array([2e7]), uplift=1.1)
    >>> links = chain.links(0, np.array([60.0, 360.0]), Frequency(10.0, "annual-maximum"))
    >>> links.point, links.areal.round(3)
    (array([35., 70.]), array([38.5, 77. ]))
    """

    source: DepthSource
    weights: Floats
    areas: Floats
    convert: bool = False
    extrapolate: bool = False
    interval_factor: Callable[[Floats], Floats] | None = None
    uplift: float = 1.0
    reduce: Reducer | None = None

    def __post_init__(self) -> None:
        if self.source.areal and self.reduce is not None:
            raise MethodError(
                Problem(
                    item="[design.areal_reduction]",
                    found="an areal reduction of depths that are areal already",
                    expected="depths of points, or no reduction",
                    remedy='take the table out, or write method = "none"',
                )
            )

    @property
    def frequencies(self) -> tuple[Frequency, ...]:
        """Those that the source knows without interpolation, counted as they are asked for."""
        known = self.source.frequencies
        return tuple(each.to(ANNUAL_MAXIMUM) for each in known) if self.convert else known

    def at(self, minutes: Floats, frequency: Frequency) -> Floats:
        """Return depths of the points, mm, shape (n_points, n).

        Raises
        ------
        MethodError
            The source has no answer.
        """
        asked = frequency.to(self.source.series) if self.convert else frequency
        return self.source.at(np.asarray(minutes, dtype=float), asked, extrapolate=self.extrapolate)

    def links(self, area: int, minutes: Floats, frequency: Frequency, *, reduced_as: int | None = None) -> Links:
        """Return every link from the points' depths to the areal depth.

        Parameters
        ----------
        area
            The row of the area over which depths are meant.
        minutes : array of float, shape (n,)
            Durations.
        frequency
            How often.
        reduced_as
            The row of the area that decides the reduction; by default the same.

        Raises
        ------
        MethodError
            The source or the reduction has no answer.
        """
        asked = np.asarray(minutes, dtype=float)
        point = self.weights[area] @ self.at(asked, frequency)
        ones = np.ones(len(asked))
        size = float(self.areas[area if reduced_as is None else reduced_as])
        reduced = None if self.reduce is None else self.reduce(size, asked, frequency)
        return Links(
            minutes=asked,
            point=point,
            interval_factor=ones if self.interval_factor is None else self.interval_factor(asked),
            uplift=self.uplift,
            reduction=ones if reduced is None else reduced.factor,
            reduced_area=size,
            clamped=() if reduced is None else reduced.clamped,
            remarks=() if reduced is None else reduced.remarks,
        )

    def unreduced(self, rows: Sequence[int], minutes: Floats, frequency: Frequency) -> Floats:
        """Return depths of several areas before the areal reduction, mm, shape (n_rows, n).

        Raises
        ------
        MethodError
            The source has no answer.
        """
        asked = np.asarray(minutes, dtype=float)
        depth: Floats = self.weights[list(rows)] @ self.at(asked, frequency)
        factor = 1.0 if self.interval_factor is None else self.interval_factor(asked)
        return depth * factor * self.uplift

    def curves(self, area: int, minutes: int, frequency: Frequency, *, reduced_as: int | None = None) -> CurvePair:
        """Return areal depths by duration, with the reduction of one duration, and each with that of its own."""
        whole = self.links(area, np.array([float(minutes)]), frequency, reduced_as=reduced_as).reduction[0]

        def one(durations: Floats) -> Floats:
            result: Floats = self.unreduced([area], durations, frequency)[0] * whole
            return result

        said: dict[str, None] = {}

        def each(durations: Floats) -> Floats:
            links = self.links(area, durations, frequency, reduced_as=reduced_as)
            said.update(dict.fromkeys(links.clamped))
            return links.areal

        return CurvePair(one, each, said)


@dataclass(frozen=True)
class CurvePair:
    """Areal depths by duration.

    Parameters
    ----------
    one
        All with one reduction.
    each
        Each with that of its own duration.
    said
        Whole sentences on what was brought into the reduction's range so far, as ``each`` was asked.
    """

    one: Curve
    each: Curve
    said: Mapping[str, None]

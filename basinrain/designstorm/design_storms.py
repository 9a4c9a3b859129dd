"""Design storms: the hyetograph of every basin above a point of interest."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.depth_chain import DepthChain
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.errors import MethodError, Problem

__all__ = ["OWN_DEPTH", "SAME_DEPTH", "DesignStorm", "PatternChoice", "PointOfInterest", "design_storm"]

Floats = npt.NDArray[np.float64]

SAME_DEPTH: Final = "same-depth"
"""Every basin above the point has the areal depth of all of them."""

OWN_DEPTH: Final = "own-depth"
"""Every basin has a depth in proportion to its own point depths, the volume of all of them kept."""


@dataclass(frozen=True, eq=False, kw_only=True)
class PointOfInterest:
    """A point for which design storms are made, by the basins above it.

    Parameters
    ----------
    name
        As the job has it.
    row
        The row of the chain that stands for all basins above it as one area.
    basins, rows
        Ids of these basins, and their rows of the chain.
    apart
        Whether they do not overlap, so that their volumes add up to that of the whole.
    """

    name: str
    row: int
    basins: tuple[str, ...]
    rows: tuple[int, ...]
    apart: bool

    def part(self, basin: str) -> str:
        """Return what one of its basins is called where each has a depth of its own."""
        return basin if basin == self.name else f"{self.name}: {basin}"


@dataclass(frozen=True, eq=False, kw_only=True)
class PatternChoice:
    """A temporal pattern with its options.

    Parameters
    ----------
    label
        What results call it.
    pattern
        From the registry.
    options
        Keyword arguments of its ``shape``.
    """

    label: str
    pattern: Pattern
    options: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, eq=False, kw_only=True)
class DesignStorm:
    """One storm: a point of interest, a frequency, a duration and a pattern.

    Parameters
    ----------
    point
        The point of interest.
    frequency
        How often the depth is exceeded.
    minutes, step
        Duration and step, minutes.
    choice
        The pattern.
    depth : array of float, shape (n_steps, n_basins)
        mm a step of every basin above the point, in the point's order.
    reduction : array of float, shape (n_basins,)
        The areal reduction that each basin's depth has.
    remarks : tuple of str
        What a reader must know of the pattern.
    clamped : tuple of str
        Whole sentences: what was brought into the reduction's range, each with the name of its area.
    """

    point: PointOfInterest
    frequency: Frequency
    minutes: int
    step: int
    choice: PatternChoice
    depth: Floats
    reduction: Floats
    remarks: tuple[str, ...] = ()
    clamped: tuple[str, ...] = ()

    @property
    def totals(self) -> Floats:
        """Depth of every basin, mm, shape (n_basins,)."""
        result: Floats = self.depth.sum(axis=0)
        return result


def design_storm(
    chain: DepthChain,
    point: PointOfInterest,
    frequency: Frequency,
    choice: PatternChoice,
    *,
    minutes: int,
    step: int,
    sub_basins: str = SAME_DEPTH,
    own_area: bool = False,
) -> DesignStorm:
    """Return the hyetographs of the basins above a point of interest.

    Parameters
    ----------
    chain
        The depths.
    point
        The point of interest.
    frequency, choice
        How often, and the pattern.
    minutes, step
        Duration and step; the step divides the duration.
    sub_basins
        :data:`SAME_DEPTH` or :data:`OWN_DEPTH`.
    own_area
        Whether each basin's depth is reduced by its own area rather than by that of all basins above the point. The
        depths then belong to no one storm over the whole, and are said so.

    Returns
    -------
    DesignStorm

    Raises
    ------
    MethodError
        A depth, the reduction or the pattern has no answer; each basin's own depths where basins overlap.

    Examples
    --------
    Two halves with 30 and 40 mm on their points: the whole has 35 mm, in two equal steps.

    >>> from basinrain.designstorm.patterns import pattern
    >>> from basinrain.designstorm.point_depths import PointDepths
    >>> table = PointDepths(
    ...     points=("P", "Q"),
    ...     durations=[30, 60],
    ...     return_periods=[10],
    ...     series="annual-maximum",
    ...     depth=[[[20], [30]], [[25], [40]]],
    ...     source="invented",
    ...     date="2031",
    ... )
    >>> chain = DepthChain(
    ...     source=table, weights=np.array([[0.5, 0.5], [1, 0], [0, 1]]), areas=np.array([2e6, 1e6, 1e6])
    ... )
    >>> outlet = PointOfInterest(name="outlet", row=0, basins=("east", "west"), rows=(1, 2), apart=True)
    >>> uniform = PatternChoice(label="uniform", pattern=pattern("uniform"))
    >>> ten = Frequency(10.0, "annual-maximum")
    >>> design_storm(chain, outlet, ten, uniform, minutes=60, step=30).depth
    array([[17.5, 17.5],
           [17.5, 17.5]])
    >>> design_storm(chain, outlet, ten, uniform, minutes=60, step=30, sub_basins="own-depth").depth
    array([[15., 20.],
           [15., 20.]])
    """
    at = np.array([float(minutes)])
    asked: dict[str, Any] = {"frequency": frequency, "choice": choice, "minutes": minutes, "step": step}
    remarks: list[str] = []
    clamped: list[str] = []
    if own_area:
        depths, reductions = [], []
        for row, basin in zip(point.rows, point.basins, strict=True):
            means = row if sub_basins == OWN_DEPTH else point.row
            links = chain.links(means, at, frequency, reduced_as=row)
            shaped, said = _shaped(chain, means, row, links.areal[0], **asked)
            depths.append(shaped.depth)
            reductions.append(links.reduction[0])
            remarks += shaped.remarks
            clamped += [f"{point.part(basin)}: {text}" for text in (*links.clamped, *said)]
        depth, reduction = np.stack(depths, axis=1), np.array(reductions)
    else:
        links = chain.links(point.row, at, frequency)
        shaped, said = _shaped(chain, point.row, point.row, links.areal[0], **asked)
        remarks += shaped.remarks
        clamped += [f"{point.name}: {text}" for text in (*links.clamped, *said)]
        share = np.ones(len(point.rows))
        if sub_basins == OWN_DEPTH:
            share = _shares(chain, point, at, frequency)
        depth, reduction = shaped.depth[:, None] * share, np.full(len(point.rows), links.reduction[0])
    return DesignStorm(
        point=point,
        frequency=frequency,
        minutes=minutes,
        step=step,
        choice=choice,
        depth=depth,
        reduction=reduction,
        remarks=tuple(dict.fromkeys(remarks)),
        clamped=tuple(dict.fromkeys(clamped)),
    )


def _shaped(
    chain: DepthChain,
    row: int,
    reduced_as: int,
    total: float,
    *,
    frequency: Frequency,
    choice: PatternChoice,
    minutes: int,
    step: int,
) -> tuple[Shaped, tuple[str, ...]]:
    """Return the hyetograph, and what was brought into the reduction's range for it."""
    curves = chain.curves(row, minutes, frequency, reduced_as=reduced_as)
    case = PatternCase(
        minutes=minutes,
        step=step,
        total=float(total),
        curve=curves.one,
        curve_by_duration=curves.each,
        area=float(chain.areas[reduced_as]),
    )
    return choice.pattern.shape(case, **choice.options), tuple(curves.said)


def _shares(chain: DepthChain, point: PointOfInterest, at: Floats, frequency: Frequency) -> Floats:
    """Return each basin's depth over that of all of them, so that the volumes add up to that of the whole."""
    if not point.apart:
        raise MethodError(
            Problem(
                item=f"[[design.point]] {point.name}",
                found="basins that overlap",
                expected="basins apart from each other, for each to have its own depth with the whole volume kept",
                remedy=f'write sub_basins = "{SAME_DEPTH}", or name basins that do not overlap',
            )
        )
    own = chain.unreduced(point.rows, at, frequency)[:, 0]
    areas = chain.areas[list(point.rows)]
    shares: Floats = own * areas.sum() / (own @ areas)
    return shares

"""The areas of a design: all basins above every point of interest as one, and each basin by itself."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import shapely

from basinrain.basins import UNION, Basins
from basinrain.designstorm.design_storms import OWN_DEPTH, PointOfInterest
from basinrain.errors import JobError, Problems, nearest_name
from basinrain.jobfile.design_tables import DesignTable

__all__ = ["Areas", "ReducedArea", "areas_of"]

_LAPPED: Final = 1e-6
"""Share of the area over which basins may lap, as they do by the rounding of their corners, and still be apart."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Areas:
    """The areas of a design, each a row.

    Parameters
    ----------
    points
        The points of interest, each with its rows.
    basins
        Every area as a polygon in the working plane, rows as the points have them. Ids are what results call them, each
        once: names of the points, and ids of the basins that are not points as well.
    """

    points: tuple[PointOfInterest, ...]
    basins: Basins

    def reduced(self, design: DesignTable) -> tuple[ReducedArea, ...]:
        """Return the areas whose chain of depths is shown, and by which the areal reduction goes."""
        if not design.own_area:
            return tuple(ReducedArea(point.name, point.name, "", point.row, point.row) for point in self.points)
        own = design.sub_basins == OWN_DEPTH
        return tuple(
            ReducedArea(point.part(basin), point.name, basin, row if own else point.row, row)
            for point in self.points
            for basin, row in zip(point.basins, point.rows, strict=True)
        )

    @property
    def rows_apart(self) -> list[int]:
        """Rows of the points of interest, and of basins other than a point's only one: no area twice."""
        alone = {point.rows[0] for point in self.points if len(point.rows) == 1} - {point.row for point in self.points}
        return [row for row in range(len(self.names)) if row not in alone]

    @property
    def names(self) -> tuple[str, ...]:
        """What results call the areas."""
        return self.basins.ids


@dataclass(frozen=True)
class ReducedArea:
    """An area with a depth of its own: all basins above a point of interest, or one of them where the job says so.

    Parameters
    ----------
    name
        What results call it.
    point
        The point of interest.
    basin
        The basin; empty where all of them are one area.
    row
        The row of the areas over which points are averaged.
    reduced_as
        The row of the area that decides the areal reduction.
    """

    name: str
    point: str
    basin: str
    row: int
    reduced_as: int


def areas_of(design: DesignTable, basins: Basins) -> Areas:
    """Return the areas of a design.

    Parameters
    ----------
    design
        The job's table; without points of interest there is one, for all basins together.
    basins
        In the working plane, with the union's row.

    Raises
    ------
    JobError
        A point names a basin that there is not, or is called after one but has others above it; all of them.

    Examples
    --------
    >>> from basinrain.jobfile import parse_design_job
    >>> job = parse_design_job(
    ...     {
    ...         "job": {"name": "Two halves"},
    ...         "basins": {"file": "basins.geojson"},
    ...         "design": {
    ...             "aep": 0.1,
    ...             "durations": "1h",
    ...             "step": "10min",
    ...             "depths": {"from": "table"},
    ...             "point": [{"name": "ford", "basins": ["east"]}, {"name": "mouth", "basins": ["east", "west"]}],
    ...             "pattern": {"shape": "uniform"},
    ...         },
    ...     }
    ... )
    >>> halves = Basins(
    ...     ids=("west", "east"), polygons=[shapely.box(0, 0, 5, 10), shapely.box(5, 0, 10, 10)], crs="local"
    ... )
    >>> areas = areas_of(job.design, halves.with_union())
    >>> areas.names, areas.basins.areas, areas.points[1].rows
    (('ford', 'mouth', 'east', 'west'), array([ 50., 100.,  50.,  50.]), (2, 3))
    """
    known = tuple(basin for basin in basins.ids if basin != UNION)
    asked = {point.name: point.basins for point in design.point} or {_name_of_all(known): known}
    problems = Problems()
    for name, above in asked.items():
        if name in known and tuple(above) != (name,):
            problems.add(
                item=f"[[design.point]] {name}",
                found="the id of a basin that is not all that lies above the point",
                expected="a name of its own",
                remedy="results could not tell the two apart",
                basin=name,
            )
        for basin in above:
            if basin not in known:
                problems.add(
                    item=f"[[design.point]] {name}, basins",
                    found=f"'{basin}'",
                    expected="the id of a basin",
                    remedy=nearest_name(basin, known),
                    basin=basin,
                )
    problems.raise_as(JobError)
    every_part = dict.fromkeys(basin for above in asked.values() for basin in above)
    of = {basin: basins.polygons[basins.ids.index(basin)] for basin in every_part}
    wholes = [shapely.union_all([of[basin] for basin in above]) for above in asked.values()]
    # A point that has the name of its one basin stands for the basin too.
    parts = tuple(basin for basin in every_part if basin not in asked)
    row = {name: k for k, name in enumerate((*asked, *parts))}
    points = tuple(
        PointOfInterest(
            name=name,
            row=k,
            basins=tuple(above),
            rows=tuple(row[basin] for basin in above),
            apart=sum(of[basin].area for basin in above) <= wholes[k].area * (1 + _LAPPED),
        )
        for k, (name, above) in enumerate(asked.items())
    )
    names = (*asked, *parts)
    every = np.empty(len(names), dtype=object)
    every[:] = [*wholes, *(of[basin] for basin in parts)]
    return Areas(points=points, basins=Basins(ids=names, polygons=every, crs=basins.crs))


def _name_of_all(known: tuple[str, ...]) -> str:
    return known[0] if len(known) == 1 else UNION

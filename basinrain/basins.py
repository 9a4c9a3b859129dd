"""Basins: watershed polygons in the working plane, and their union."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt
import shapely
from shapely.geometry.base import BaseGeometry

from basinrain import ground
from basinrain.errors import DataError, Problems

__all__ = ["UNION", "Basins"]

UNION: Final = "union"
"""The id of the row that stands for all basins together; no basin may have it."""


@dataclass(frozen=True, eq=False)
class Basins:
    """Watershed polygons with ids.

    Parameters
    ----------
    ids : tuple of str
        One id per basin, all different, none of them ``"union"`` (that row is made by :meth:`with_union`).
    polygons : array of shapely Polygon or MultiPolygon, shape (n_basins,)
        Valid, with an area; they may touch, nest and overlap.
    crs : str
        Coordinate system of the polygons, or ``"local"`` (metres).
    official_areas : array of float, shape (n_basins,), optional
        Areas in m² that a register states; NaN where it states none.
    elevations : array of float, shape (n_basins, 2), optional
        Lowest and highest ground of each basin, m above sea level; NaN where not known.

    Raises
    ------
    DataError
        Ids are repeated, a polygon is empty, invalid or without area, an array has another length; all such problems
        together.

    Examples
    --------
    >>> halves = [shapely.box(0, 0, 5, 10), shapely.box(5, 0, 10, 10)]
    >>> basins = Basins(ids=("west", "east"), polygons=halves, crs="local")
    >>> basins.areas
    array([50., 50.])
    >>> basins.with_union().ids
    ('west', 'east', 'union')
    >>> basins.with_union().areas
    array([ 50.,  50., 100.])
    >>> Basins(ids=("flat",), polygons=[shapely.Polygon([(0, 0), (1, 1), (2, 2)])], crs="local")
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: basin flat: found a polygon that encloses no area; expected a polygon with an area; \
correct or remove it
    """

    ids: tuple[str, ...]
    polygons: npt.NDArray[np.object_]
    crs: str = field(kw_only=True)
    official_areas: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty(0), kw_only=True)
    elevations: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty((0, 2)), kw_only=True)

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "ids", tuple(self.ids))
        problems = Problems()
        for name in ("polygons", "official_areas"):
            if (n := len(getattr(self, name))) != len(self.ids) and (n or name == "polygons"):
                problems.add(item=name, found=f"{n} values", expected=f"{len(self.ids)}, one a basin")
        problems.raise_as(DataError)
        polygons = np.empty(len(self.ids), dtype=object)
        polygons[:] = list(self.polygons)
        put(self, "polygons", polygons)
        if not len(self.official_areas):
            put(self, "official_areas", np.full(len(self.ids), np.nan))
        if not len(self.elevations):
            put(self, "elevations", np.full((len(self.ids), 2), np.nan))
        problems = Problems()
        seen: set[str] = set()
        for basin, polygon in zip(self.ids, polygons, strict=True):
            item = f"basin {basin}"
            if basin in seen:
                problems.add(item=item, found="the id twice", expected="each id once", basin=basin)
            seen.add(basin)
            if polygon is None or polygon.is_empty or polygon.area <= 0:
                problems.add(
                    item=item,
                    found="a polygon that encloses no area",
                    expected="a polygon with an area",
                    remedy="correct or remove it",
                    basin=basin,
                )
            elif not polygon.is_valid:
                problems.add(
                    item=item,
                    found=shapely.is_valid_reason(polygon),
                    expected="a polygon that does not cross itself",
                    remedy="correct it",
                    basin=basin,
                )
        problems.raise_as(DataError)

    def __len__(self) -> int:
        return len(self.ids)

    @cached_property
    def areas(self) -> npt.NDArray[np.float64]:
        """Areas in m², shape (n_basins,); the coordinates must be those of a plane."""
        areas: npt.NDArray[np.float64] = shapely.area(self.polygons)
        return areas

    @cached_property
    def union(self) -> BaseGeometry:
        """The polygon of all basins together, overlaps counted once."""
        return shapely.union_all(self.polygons)

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """The box of all basins: west, south, east, north."""
        west, south, east, north = shapely.total_bounds(self.polygons)
        return float(west), float(south), float(east), float(north)

    def with_union(self) -> Basins:
        """Return the basins and, where there are two or more, their union as one more row.

        Returns
        -------
        Basins
            The union is the last row, its id :data:`UNION`. No register states its area (NaN); its ground reaches from
            the lowest of all basins to the highest, NaN where one basin's is not known. One basin alone, or basins that
            have the row already, are returned as they are.

        Examples
        --------
        >>> lapped = [shapely.box(0, 0, 6, 10), shapely.box(4, 0, 10, 10)]
        >>> basins = Basins(ids=("west", "east"), polygons=lapped, crs="local").with_union()
        >>> basins.ids, basins.areas  # the overlap of 20 counts once
        (('west', 'east', 'union'), array([ 60.,  60., 100.]))
        >>> basins.with_union() is basins
        True
        >>> Basins(ids=("west",), polygons=lapped[:1], crs="local").with_union().ids
        ('west',)
        """
        if len(self) < 2 or UNION in self.ids:
            return self
        polygons = np.empty(len(self) + 1, dtype=object)
        polygons[:-1] = self.polygons
        polygons[-1] = self.union
        return replace(
            self,
            ids=(*self.ids, UNION),
            polygons=polygons,
            official_areas=np.append(self.official_areas, np.nan),
            elevations=np.vstack([self.elevations, [self.elevations[:, 0].min(), self.elevations[:, 1].max()]]),
        )

    def to_crs(self, crs: str) -> Basins:
        """Return the same basins in another coordinate system, edges kept straight as the present one draws them.

        Parameters
        ----------
        crs : str
            Anything pyproj reads; the basins' own, however named, leaves them untouched.

        Returns
        -------
        Basins
            Long edges have more corners than before (:func:`basinrain.ground.project`).

        Raises
        ------
        DataError
            One of the two systems is ``"local"`` and the other is not, or ``crs`` cannot show a basin.

        Examples
        --------
        >>> basins = Basins(ids=("cell",), polygons=[shapely.box(10, 50, 11, 51)], crs="EPSG:4326")
        >>> (basins.to_crs("EPSG:3035").areas / 1e6).round(1)  # km², in an equal-area plane
        array([7892.2])
        """
        return replace(self, polygons=ground.project(self.polygons, self.crs, crs), crs=crs)

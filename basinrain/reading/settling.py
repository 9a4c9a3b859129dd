"""Bringing gauges and basins onto one plane, once both have been read."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt
import shapely

from basinrain import ground
from basinrain.basins import Basins
from basinrain.errors import DataError, JobError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.ground import Plane
from basinrain.notes import Note
from basinrain.reading.options import option_problems

__all__ = ["check_near", "settle", "settle_basins"]

_NEAR_DIAGONALS: Final = 5.0
_NEAR_METRES: Final = 100_000.0
_MOST_POINTS: Final = 200
_DIFFERENCE: Final = 0.01
"""Areas and distances that are off by more than this share are warned of."""


def settle(
    network: GaugeNetwork, basins: Basins, *, plane: str | None = None
) -> tuple[GaugeNetwork, Basins, Plane, tuple[Note, ...]]:
    """Bring gauges and basins onto the plane of the run.

    Parameters
    ----------
    network, basins
        As they were read, each in its own coordinate system.
    plane
        The plane's coordinate system, in metres; without it a Lambert azimuthal equal-area plane centred on the basins'
        box of longitudes and latitudes. Gauges and basins that are both ``"local"`` stay where they are.

    Returns
    -------
    GaugeNetwork, Basins
        In the plane; the basins with the row of their union where they are two or more.
    Plane
        With its largest distortion of distances between the gauges and the corners of the basins' convex hull.
    tuple of Note
        ``area-differs`` for every basin whose polygon is over 1 % from its official area, ``plane-distortion`` where
        distances are over 1 % off.

    Raises
    ------
    DataError
        One of the two is local and the other is not; or no gauge is within five diagonals of the basins' box (100 km
        where that is more and they are on the map) of the basins.
    JobError
        The named plane is not known, is in degrees or in another unit than the metre, or is none for local coordinates.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[8.1, 8.4], y=[47.1, 47.2], crs="EPSG:4326")
    >>> basins = Basins(ids=("upper",), polygons=[shapely.box(8, 47, 8.5, 47.5)], crs="EPSG:4326")
    >>> network, basins, plane, notes = settle(network, basins)
    >>> plane.name, round(float(basins.areas[0]) / 1e6, 1), notes
    ('Lambert azimuthal equal-area plane centred on 47.25° N, 8.25° E', 2104.0, ())
    """
    if (network.crs == ground.LOCAL) != (basins.crs == ground.LOCAL):
        raise DataError(
            Problem(
                item="coordinate reference systems",
                found=f"gauges in '{network.crs}', basins in '{basins.crs}'",
                expected="both 'local', or both on the map",
                remedy="give both crs so that they can be brought together",
            )
        )
    if plane is not None:
        _check_plane(plane, local=basins.crs == ground.LOCAL)
    check_near(network, basins)
    basins, used = _on_plane(basins, plane)
    network = network.to_crs(used.crs)
    if used.crs != ground.LOCAL:
        used = replace(used, distortion=_distortion(basins, network))
    return network, basins.with_union(), used, _notes(basins, used, "gauges and basins")


def settle_basins(basins: Basins, *, plane: str | None = None) -> tuple[Basins, Plane, tuple[Note, ...]]:
    """Bring basins without gauges onto the plane of the run.

    Parameters, what is returned and what is raised are as for :func:`settle`, without what concerns gauges.

    Examples
    --------
    >>> basins = Basins(ids=("upper",), polygons=[shapely.box(8, 47, 8.5, 47.5)], crs="EPSG:4326")
    >>> basins, plane, notes = settle_basins(basins)
    >>> plane.name, round(float(basins.areas[0]) / 1e6, 1), notes
    ('Lambert azimuthal equal-area plane centred on 47.25° N, 8.25° E', 2104.0, ())
    """
    if plane is not None:
        _check_plane(plane, local=basins.crs == ground.LOCAL)
    basins, used = _on_plane(basins, plane)
    if used.crs != ground.LOCAL:
        used = replace(used, distortion=_distortion(basins))
    return basins.with_union(), used, _notes(basins, used, "places in the basins")


def _on_plane(basins: Basins, plane: str | None) -> tuple[Basins, Plane]:
    """Return basins in their plane, and the plane with its distortion still to be found."""
    if basins.crs == ground.LOCAL:
        return basins, Plane(ground.LOCAL, "local coordinates in m", 0.0)
    crs, name = _around(basins.polygons, basins.crs)
    if plane is not None:
        crs, name = plane, ground.title(plane)
    return basins.to_crs(crs), Plane(crs, name, 0.0)


def _notes(basins: Basins, used: Plane, between: str) -> tuple[Note, ...]:
    notes = _area_notes(basins)
    if used.distortion > _DIFFERENCE:
        notes.append(
            Note(
                code="plane-distortion",
                text=f"Distances between {between} in the plane {used.name} are up to "
                f"{100 * used.distortion:.1f} % off those on the ground.",
            )
        )
    return tuple(notes)


def _check_plane(plane: str, *, local: bool) -> None:
    problems = Problems()
    with option_problems(problems, item="[job] plane"):
        ground.parse_crs(plane)
    problems.raise_as(JobError)
    fault = ""
    if (plane == ground.LOCAL) != local:
        fault = "for local coordinates" if local else "for coordinates on the map"
        expected = "none, or 'local'" if local else "a projected system in metres"
    elif ground.is_geographic(plane):
        fault, expected = "which is in degrees", "a projected system in metres"
    elif (unit := ground.unit_name(plane)) != "metre":
        fault, expected = f"which is in the unit {unit}", "a projected system in metres"
    if fault:
        raise JobError(
            Problem(
                item="[job] plane",
                found=f"'{plane}', {fault}",
                expected=expected,
                remedy="name another plane, or leave plane out",
            )
        )


def _around(polygons: npt.NDArray[np.object_], crs: str) -> tuple[str, str]:
    """Return the equal-area plane centred on the polygons, and its name."""
    lon, lat = ground.transform(*_xy(polygons), crs, ground.LONLAT)
    if np.ptp(lon) > 180:
        # Basins on both sides of the antimeridian.
        lon = lon % 360
    west, south, east, north = (float(v) for v in (lon.min(), lat.min(), lon.max(), lat.max()))
    x, y = ((west + east) / 2 + 180) % 360 - 180, (south + north) / 2
    name = (
        "Lambert azimuthal equal-area plane centred on "
        f"{abs(y):.6g}° {'N' if y >= 0 else 'S'}, {abs(x):.6g}° {'E' if x >= 0 else 'W'}"
    )
    return ground.equal_area_plane(x, south, x, north), name


def check_near(network: GaugeNetwork, basins: Basins, *, kind: str = "gauge") -> None:
    """Refuse gauges, or other points, that are nowhere near the basins.

    Parameters
    ----------
    network, basins
        Each in its own coordinate system; both local or both on the map.
    kind
        What the points are called.

    Raises
    ------
    DataError
        As :func:`settle`.

    Examples
    --------
    >>> basins = Basins(ids=("cell",), polygons=[shapely.box(0, 0, 100, 100)], crs="local")
    >>> check_near(GaugeNetwork(ids=("P",), x=[9000], y=[50], crs="local"), basins, kind="depth point")
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: depth points and basins: found them nowhere near each other: depth point P, the \
nearest, is 8.9 km away; expected a depth point within 0.707 km of the basins; check both files and their crs
    """
    x, y, polygons = network.x, network.y, basins.polygons
    away, limit, gauge = _nearest(x, y, network.crs, polygons, basins.crs)
    if away <= limit:
        return
    swapped = []
    if _may_swap(x, y, network.crs) and _is_near(_nearest(y, x, network.crs, polygons, basins.crs)):
        swapped.append(f"{_pair(network.crs)} of the {kind}s")
    if _may_swap(*_xy(polygons), basins.crs):
        flipped = shapely.transform(polygons, lambda xy: xy[:, ::-1])
        if _is_near(_nearest(x, y, network.crs, flipped, basins.crs)):
            swapped.append(f"{_pair(basins.crs)} of the basins")
    how_far = f"{_km(away)} away" if np.isfinite(away) else "off the map"
    raise DataError(
        Problem(
            item=f"{kind}s and basins",
            found=f"them nowhere near each other: {kind} {network.ids[gauge]}, the nearest, is {how_far}",
            expected=f"a {kind} within {_km(limit)} of the basins",
            remedy=f"{', or '.join(swapped)} look swapped" if swapped else "check both files and their crs",
        )
    )


def _km(metres: float) -> str:
    return f"{metres / 1000:,.0f} km" if metres >= 10_000 else f"{metres / 1000:.3g} km"


def _pair(crs: str) -> str:
    return "longitude and latitude" if ground.is_geographic(crs) else "x and y"


def _xy(polygons: npt.NDArray[np.object_]) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    xy = shapely.get_coordinates(polygons)
    return xy[:, 0], xy[:, 1]


def _may_swap(x: npt.NDArray[np.float64], y: npt.NDArray[np.float64], crs: str) -> bool:
    return not ground.is_geographic(crs) or bool((np.abs(x) <= 90).all() and (np.abs(y) <= 180).all())


def _is_near(nearest: tuple[float, float, int]) -> bool:
    return nearest[0] <= nearest[1]


def _nearest(
    x: npt.NDArray[np.float64], y: npt.NDArray[np.float64], crs: str, polygons: npt.NDArray[np.object_], basins_crs: str
) -> tuple[float, float, int]:
    """Return how far the nearest gauge is from the polygons in m, how far it may be, and which it is."""
    local = crs == ground.LOCAL
    if not local:
        plane, _ = _around(polygons, basins_crs)
        x, y = ground.transform(x, y, crs, plane)
        xy = np.column_stack(ground.transform(*_xy(polygons), basins_crs, plane))
        polygons = shapely.set_coordinates(polygons.copy(), xy)
    west, south, east, north = (float(v) for v in shapely.total_bounds(polygons))
    diagonal = float(np.hypot(east - west, north - south))
    limit = _NEAR_DIAGONALS * diagonal if local else max(_NEAR_DIAGONALS * diagonal, _NEAR_METRES)
    in_box = (west <= x) & (x <= east) & (south <= y) & (y <= north)
    if in_box.any():
        return 0.0, limit, int(np.flatnonzero(in_box)[0])
    finite = np.flatnonzero(np.isfinite(x) & np.isfinite(y))
    if not len(finite):
        return np.inf, limit, 0
    points = np.asarray(shapely.points(x[finite], y[finite]), dtype=object)
    (which, polygon), planar = shapely.STRtree(polygons).query_nearest(points, return_distance=True)
    first = int(np.argmin(planar))
    gauge, away = int(finite[which[first]]), float(planar[first])
    if not local:
        line = shapely.get_coordinates(shapely.shortest_line(points[which[first]], polygons[polygon[first]]))
        away = float(ground.distances(line[:1, 0], line[:1, 1], line[1:, 0], line[1:, 1], plane)[0, 0])
    return away, limit, gauge


def _distortion(basins: Basins, network: GaugeNetwork | None = None) -> float:
    """Return the largest relative difference of planar and geodesic distances among gauges and the basins' corners."""
    corners = shapely.get_coordinates(
        shapely.convex_hull(shapely.multipoints(shapely.get_coordinates(basins.polygons)))
    )
    gauges = np.empty((0, 2)) if network is None else np.column_stack([network.x, network.y])
    if len(gauges) > _MOST_POINTS // 2:
        gauges = shapely.get_coordinates(shapely.convex_hull(shapely.multipoints(gauges)))
    xy = np.vstack([_thinned(corners), _thinned(gauges)])
    x, y = xy[:, 0], xy[:, 1]
    planar = ground.distances(x, y, x, y, ground.LOCAL)
    geodesic = ground.distances(x, y, x, y, basins.crs)
    apart = geodesic > 1.0
    return float(np.abs(planar[apart] / geodesic[apart] - 1).max(initial=0.0))


def _thinned(points: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    most = _MOST_POINTS // 2
    return points if len(points) <= most else points[np.linspace(0, len(points) - 1, most).astype(int)]


def _area_notes(basins: Basins) -> list[Note]:
    with np.errstate(invalid="ignore"):
        off = basins.areas / basins.official_areas - 1
    return [
        Note(
            code="area-differs",
            basin=basins.ids[place],
            text=f"Basin {basins.ids[place]} has {basins.areas[place] / 1e6:.3f} km2 by its polygon and "
            f"{basins.official_areas[place] / 1e6:.3f} km2 by its attribute: {100 * off[place]:+.1f} %.",
        )
        for place in np.flatnonzero(np.abs(off) > _DIFFERENCE)
    ]

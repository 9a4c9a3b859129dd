"""Bringing gauges and basins onto one plane, once both have been read."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt
import shapely

from basinrain import ground
from basinrain.basins import Basins
from basinrain.errors import DataError, JobError, Problem
from basinrain.gauges import GaugeNetwork
from basinrain.ground import Plane
from basinrain.notes import Note

__all__ = ["settle"]

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
    ('Lambert azimuthal equal-area plane centred on 47.25° N, 8.25° E', 2105.3, ())
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
    _check_near(network, basins)
    if basins.crs == ground.LOCAL:
        settled, notes = basins.with_union(), _area_notes(basins)
        return network, settled, Plane(ground.LOCAL, "local coordinates in m", 0.0), tuple(notes)
    crs, name = _around(basins.polygons, basins.crs)
    if plane is not None:
        crs, name = plane, ground.title(plane)
    network, basins = network.to_crs(crs), basins.to_crs(crs)
    used = Plane(crs, name, _distortion(network, basins))
    notes = _area_notes(basins)
    if used.distortion > _DIFFERENCE:
        notes.append(
            Note(
                code="plane-distortion",
                text=f"Distances between gauges and basins in the plane {name} are up to {100 * used.distortion:.1f} % "
                "off those on the ground.",
            )
        )
    return network, basins.with_union(), used, tuple(notes)


def _check_plane(plane: str, *, local: bool) -> None:
    ground.parse_crs(plane)
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
    xy = shapely.get_coordinates(polygons)
    lon, lat = ground.transform(xy[:, 0], xy[:, 1], crs, ground.LONLAT)
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


def _check_near(network: GaugeNetwork, basins: Basins) -> None:
    away, limit, ends = _nearest(network.x, network.y, network.crs, basins.polygons, basins.crs)
    if away <= limit:
        return
    swapped = ""
    flipped = shapely.transform(basins.polygons, lambda xy: xy[:, ::-1])
    if _could_swap(network.x, network.y, network.crs):
        near, within, _ = _nearest(network.y, network.x, network.crs, basins.polygons, basins.crs)
        if near <= within:
            swapped = "gauges"
    corners = shapely.get_coordinates(basins.polygons)
    if not swapped and _could_swap(corners[:, 0], corners[:, 1], basins.crs):
        near, within, _ = _nearest(network.x, network.y, network.crs, flipped, basins.crs)
        if near <= within:
            swapped = "basins"
    pair = "longitude and latitude" if ground.is_geographic(getattr_crs(network, basins, swapped)) else "x and y"
    raise DataError(
        Problem(
            item="gauges and basins",
            found=f"them nowhere near each other: the nearest gauge, {network.ids[ends]}, is {away / 1000:,.0f} km from "
            "the basins",
            expected=f"a gauge within {limit / 1000:,.0f} km",
            remedy=f"{pair} of the {swapped} look swapped" if swapped else "check both files and their crs",
        )
    )

"""The ground: coordinate systems, the working plane in which areas are taken, and distances.

Areas and grids live in one plane per run: a Lambert azimuthal equal-area plane centred on the basins, unless the user
names another. Distances between gauges for infilling are geodesic (WGS 84 ellipsoid; Karney 2013, through PROJ).
Coordinates are always in the order x (easting, longitude), y (northing, latitude). ``"local"`` is a flat plane in
metres without a place on the map, for handbook cases and site grids; its distances are planar.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import numpy as np
import numpy.typing as npt
import pyproj
import shapely
from pyproj.network import set_network_enabled  # type: ignore[attr-defined]

from basinrain.errors import DataError, JobError, Problem

__all__ = [
    "LOCAL",
    "LONLAT",
    "Plane",
    "azimuths",
    "degree_fault",
    "distances",
    "equal_area_plane",
    "is_geographic",
    "parse_crs",
    "project",
    "same_crs",
    "title",
    "transform",
    "unit_name",
]

LOCAL: Final = "local"
LONLAT: Final = "EPSG:4326"

_EDGE_DEGREES: Final = 0.01
_EDGE_METRES: Final = 1000.0
_HAIR: Final = 1e-6


@dataclass(frozen=True)
class Plane:
    """The plane of a run.

    Parameters
    ----------
    crs
        The plane's coordinate system, as pyproj reads it, or ``"local"``.
    name
        What the report calls it.
    distortion
        Largest relative difference between planar and geodesic distance over the network and the basins' corners;
        0 for a local plane.
    """

    crs: str
    name: str
    distortion: float


@lru_cache(maxsize=64)
def _parsed(crs: str) -> pyproj.CRS:
    try:
        parsed = pyproj.CRS.from_user_input(crs)
    except pyproj.exceptions.CRSError:
        parsed = None
    if parsed is None or not (parsed.is_geographic or parsed.is_projected):
        raise JobError(
            Problem(
                item="coordinate reference system",
                found=f"'{crs}'",
                expected="'local', or a map's system: an EPSG code such as 'EPSG:4326', WKT or a PROJ string",
                remedy="correct crs",
            )
        )
    return parsed


def parse_crs(crs: str) -> str:
    """Return ``crs`` unchanged when it is ``"local"``, or a geographic or projected system known to pyproj.

    Raises
    ------
    JobError
        It is neither.

    Examples
    --------
    >>> parse_crs("EPSG:26904"), parse_crs("local")
    ('EPSG:26904', 'local')
    >>> parse_crs("EPSG:nonsense")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: coordinate reference system: found 'EPSG:nonsense'; expected 'local', or a map's \
system: an EPSG code such as 'EPSG:4326', WKT or a PROJ string; correct crs
    """
    if crs != LOCAL:
        _parsed(crs)
    return crs


def is_geographic(crs: str) -> bool:
    """Return whether coordinates in ``crs`` are degrees.

    Examples
    --------
    >>> is_geographic("EPSG:4326"), is_geographic("local")
    (True, False)
    """
    return crs != LOCAL and bool(_parsed(crs).is_geographic)


def unit_name(crs: str) -> str:
    """Return the unit of coordinates in ``crs``, as its authority calls it.

    Examples
    --------
    >>> unit_name("EPSG:5070"), unit_name("EPSG:2263"), unit_name("local")
    ('metre', 'US survey foot', 'metre')
    """
    return "metre" if crs == LOCAL else str(_parsed(crs).axis_info[0].unit_name)


def title(crs: str) -> str:
    """Return a coordinate system as people should read it: what was given, and its name.

    Examples
    --------
    >>> title("EPSG:5070")
    'EPSG:5070 (NAD83 / Conus Albers)'
    >>> title("+proj=utm +zone=13 +datum=WGS84")
    '+proj=utm +zone=13 +datum=WGS84'
    """
    name = "" if crs == LOCAL else _parsed(crs).name
    if name in {"", "unknown"}:
        return crs
    # WKT is too long to read, and has the name in it.
    return f"{crs} ({name})" if len(crs) <= len("EPSG:00000000") else name


@lru_cache(maxsize=256)
def same_crs(one: str, other: str) -> bool:
    """Return whether two texts name one coordinate system, the order of its axes apart.

    Examples
    --------
    >>> same_crs("EPSG:4326", "OGC:CRS84"), same_crs("EPSG:4326", "EPSG:4269"), same_crs("local", "EPSG:4326")
    (True, False, False)
    """
    if one == other or LOCAL in (one, other):
        return one == other
    return bool(_parsed(one).equals(_parsed(other), ignore_axis_order=True))


def degree_fault(lon: float, lat: float) -> str:
    """Return what is wrong with a longitude and a latitude in degrees; empty where a place may have them.

    Examples
    --------
    >>> degree_fault(-105.0, 39.7), degree_fault(39.7, -105.0), degree_fault(282.0, 39.7)
    ('', 'longitude and latitude look swapped', 'longitude goes from -180 to 180, latitude from -90 to 90')
    >>> degree_fault(622751.8, 2352667.2)
    'the coordinates look projected: give their own crs'
    """
    if abs(lon) <= 180 and abs(lat) <= 90:
        return ""
    if abs(lat) <= 180 and abs(lon) <= 90:
        return "longitude and latitude look swapped"
    if max(abs(lon), abs(lat)) > 360:
        return "the coordinates look projected: give their own crs"
    return "longitude goes from -180 to 180, latitude from -90 to 90"


@lru_cache(maxsize=64)
def _transformer(source: str, target: str) -> pyproj.Transformer:
    # No run touches the network, and no grid that PROJ would fetch makes one machine's result another's.
    set_network_enabled(active=False)
    return pyproj.Transformer.from_crs(_parsed(source), _parsed(target), always_xy=True)


def _both_or_neither_local(source: str, target: str) -> None:
    if (source == LOCAL) != (target == LOCAL):
        raise DataError(
            Problem(
                item="coordinate reference systems",
                found=f"'{source}' and '{target}'",
                expected="both 'local', or both on the map",
                remedy="give gauges and basins in systems that can be brought together",
            )
        )


def transform(
    x: npt.NDArray[np.float64], y: npt.NDArray[np.float64], source: str, target: str
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Return positions of ``source`` in ``target``, both x first.

    Parameters
    ----------
    x, y : array of float, shape (n,)
    source, target : str
        Coordinate systems; one named in two ways returns the positions untouched, to the last bit.

    Raises
    ------
    DataError
        One is ``"local"`` and the other is not.

    Examples
    --------
    >>> x, y = transform(np.array([-157.8168]), np.array([21.2716]), "EPSG:4326", "EPSG:26904")
    >>> [round(float(v[0]), 1) for v in (x, y)]
    [622751.8, 2352667.2]
    """
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    _both_or_neither_local(source, target)
    if same_crs(source, target):
        return x, y
    moved_x, moved_y = _transformer(source, target).transform(x, y)
    return np.asarray(moved_x, dtype=float), np.asarray(moved_y, dtype=float)


def project(polygons: npt.NDArray[np.object_], source: str, target: str) -> npt.NDArray[np.object_]:
    """Return polygons of ``source`` in ``target``, their edges kept straight as ``source`` draws them.

    An edge between two longitudes and latitudes is straight in longitude and latitude (RFC 7946, section 3.1.1), which
    is a curve in any other plane. Longer edges get a point at least every 0.01 degree (1 km for a projected source)
    before projecting, so that the area is that of the edges meant: within 1e-6 of it for basins up to continental size.

    Parameters
    ----------
    polygons : array of shapely polygons, shape (n,)
        Valid.
    source, target : str
        Coordinate systems; one named in two ways returns the polygons untouched.

    Returns
    -------
    array of shapely polygons, shape (n,)
        Where a ring touches an edge between that edge's ends, the touch may come out as a crossing a hair wide; such a
        polygon is mended. A part that ``target`` cannot show leaves its polygon invalid.

    Examples
    --------
    >>> square = np.array([shapely.box(10, 50, 11, 51)])
    >>> int(shapely.get_num_coordinates(project(square, "EPSG:4326", "EPSG:3035"))[0])
    401
    """
    _both_or_neither_local(source, target)
    if same_crs(source, target):
        return polygons
    edge = (
        _EDGE_DEGREES if is_geographic(source) else _EDGE_METRES / _parsed(source).axis_info[0].unit_conversion_factor
    )
    mover = _transformer(source, target)

    def move(xy: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        return np.column_stack(mover.transform(xy[:, 0], xy[:, 1]))

    moved: npt.NDArray[np.object_] = shapely.transform(shapely.segmentize(polygons, edge), move)
    for place in np.flatnonzero(~shapely.is_valid(moved)):
        if np.isfinite(shapely.bounds(moved[place])).all():
            mended = shapely.make_valid(moved[place], method="structure", keep_collapsed=False)
            if abs(mended.area - moved[place].area) <= _HAIR * moved[place].area:
                moved[place] = mended
    return moved


def equal_area_plane(west: float, south: float, east: float, north: float) -> str:
    """Return a Lambert azimuthal equal-area plane centred on a box of longitudes and latitudes.

    Examples
    --------
    >>> equal_area_plane(10, 50, 12, 51)
    '+proj=laea +lat_0=50.5 +lon_0=11 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs'
    """
    # To a millionth of a degree, written so that people can read it.
    lat, lon = (
        np.format_float_positional(round(middle, 6) + 0.0, trim="-")
        for middle in ((south + north) / 2, (west + east) / 2)
    )
    return f"+proj=laea +lat_0={lat} +lon_0={lon} +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs"


def distances(
    from_x: npt.NDArray[np.float64],
    from_y: npt.NDArray[np.float64],
    to_x: npt.NDArray[np.float64],
    to_y: npt.NDArray[np.float64],
    crs: str,
) -> npt.NDArray[np.float64]:
    """Return distances in m from every position to every other, shape (n_from, n_to).

    Geodesic on the WGS 84 ellipsoid, planar when ``crs`` is ``"local"``.

    Examples
    --------
    >>> a, b = np.array([0.0]), np.array([0.0])
    >>> distances(a, b, np.array([3000.0]), np.array([4000.0]), "local")
    array([[5000.]])
    >>> degree = distances(a, b, np.array([0.0]), np.array([1.0]), "EPSG:4326")  # one degree along the meridian
    >>> round(float(degree[0, 0]), 1)
    110574.4
    """
    if crs == LOCAL:
        return np.hypot(from_x[:, None] - to_x[None, :], from_y[:, None] - to_y[None, :])
    lon1, lat1 = transform(from_x, from_y, crs, LONLAT)
    lon2, lat2 = transform(to_x, to_y, crs, LONLAT)
    shape = (len(lon1), len(lon2))
    lon_1, lat_1, lon_2, lat_2 = (
        np.broadcast_to(v, shape).ravel() for v in (lon1[:, None], lat1[:, None], lon2[None, :], lat2[None, :])
    )
    _, _, metres = pyproj.Geod(ellps="WGS84").inv(lon_1, lat_1, lon_2, lat_2)
    return np.asarray(metres, dtype=float).reshape(shape)


def azimuths(
    from_x: npt.NDArray[np.float64],
    from_y: npt.NDArray[np.float64],
    to_x: npt.NDArray[np.float64],
    to_y: npt.NDArray[np.float64],
    crs: str,
) -> npt.NDArray[np.float64]:
    """Return azimuths in degrees from every position to every other, shape (n_from, n_to).

    Clockwise from true north, 0 or more and below 360, at the start of the geodesic on the WGS 84 ellipsoid; clockwise
    from the y axis when ``crs`` is ``"local"``. Without meaning where the two positions are one.

    Examples
    --------
    >>> here = np.array([0.0])
    >>> azimuths(here, here, np.array([0.0, 5.0, 0.0, -5.0]), np.array([5.0, 0.0, -5.0, 0.0]), "local")
    array([[  0.,  90., 180., 270.]])
    >>> azimuths(here, here, np.array([1.0]), np.array([0.0]), "EPSG:4326")  # along the equator
    array([[90.]])
    """
    if crs == LOCAL:
        degrees = np.degrees(np.arctan2(to_x[None, :] - from_x[:, None], to_y[None, :] - from_y[:, None]))
        return np.asarray(degrees % 360.0 % 360.0, dtype=float)
    lon1, lat1 = transform(from_x, from_y, crs, LONLAT)
    lon2, lat2 = transform(to_x, to_y, crs, LONLAT)
    shape = (len(lon1), len(lon2))
    lon_1, lat_1, lon_2, lat_2 = (
        np.broadcast_to(v, shape).ravel() for v in (lon1[:, None], lat1[:, None], lon2[None, :], lat2[None, :])
    )
    forward, _, _ = pyproj.Geod(ellps="WGS84").inv(lon_1, lat_1, lon_2, lat_2)
    return np.asarray(forward, dtype=float).reshape(shape) % 360.0 % 360.0

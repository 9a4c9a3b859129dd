"""The ground: areas and distances against formulas of the ellipsoid and against pyproj's geodesics."""

import re
from collections.abc import Callable

import numpy as np
import pyproj
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from pyproj.network import is_network_enabled, set_network_enabled  # type: ignore[attr-defined]

from basinrain import ground
from basinrain.errors import DataError, JobError

# WGS 84: semi-major axis in m and flattening (NIMA TR8350.2).
A, F = 6378137.0, 1 / 298.257223563


def box_area(west: float, south: float, east: float, north: float) -> float:
    """Return the area in m2 between two meridians and two parallels (Snyder 1987, USGS PP 1395, equation 3-12)."""
    e = np.sqrt(F * (2 - F))
    s = np.sin(np.radians([south, north]))
    q = (1 - e**2) * (s / (1 - (e * s) ** 2) - np.log((1 - e * s) / (1 + e * s)) / (2 * e))
    return float(A**2 * np.radians(east - west) * (q[1] - q[0]) / 2)


def one(polygon: shapely.Geometry) -> np.ndarray:
    """Return an array of one polygon."""
    return np.array([polygon], dtype=object)


@given(
    st.floats(-170, 150),
    st.floats(-75, 60),
    st.floats(0.01, 20),
    st.floats(0.01, 15),
)
def test_boxes_of_degrees_have_the_area_of_the_ellipsoid(
    west: float, south: float, width: float, height: float
) -> None:
    """From 1 km to a continent, the plane's area of a box of degrees is that of Snyder's formula."""
    bounds = (west, south, west + width, south + height)
    plane = ground.equal_area_plane(*bounds)
    projected = ground.project(one(shapely.box(*bounds)), ground.LONLAT, plane)
    np.testing.assert_allclose(projected[0].area, box_area(*bounds), rtol=2e-6)


def test_corners_alone_would_have_another_area() -> None:
    """Without added points, the box of a continent would lose 3 % of its area: the check above can fail."""
    bounds = (-125.0, 25.0, -65.0, 50.0)
    x, y = shapely.get_coordinates(shapely.box(*bounds)).T
    corners = np.column_stack(ground.transform(x, y, ground.LONLAT, ground.equal_area_plane(*bounds)))
    assert abs(shapely.Polygon(corners).area / box_area(*bounds) - 1) > 0.03


def test_added_points_stay_few() -> None:
    """A box of a continent gets 17,000 points, and a polygon whose edges are short already gets none."""
    plane = ground.equal_area_plane(-125, 25, -65, 50)
    box = ground.project(one(shapely.box(-125, 25, -65, 50)), ground.LONLAT, plane)
    assert shapely.get_num_coordinates(box)[0] == 2 * (6000 + 2500) + 1
    turn = np.linspace(0, 2 * np.pi, 900, endpoint=False)
    round_one = one(shapely.Polygon(np.column_stack([0.5 * np.cos(turn) - 100, 0.5 * np.sin(turn) + 40])))
    projected = ground.project(round_one, ground.LONLAT, plane)
    assert shapely.get_num_coordinates(projected)[0] == 901


def test_edges_of_a_projected_source_are_straight_there() -> None:
    """A long edge in EPSG:5070 keeps its middle on the line between its ends, once it is elsewhere."""
    square = one(shapely.box(0, 1_000_000, 400_000, 1_400_000))
    moved = ground.project(square, "EPSG:5070", "EPSG:3857")
    middle = ground.transform(np.array([200_000.0]), np.array([1_000_000.0]), "EPSG:5070", "EPSG:3857")
    assert moved[0].boundary.distance(shapely.Point(middle[0][0], middle[1][0])) < 1.0
    # 1 km at most between points; feet in a system of feet.
    assert shapely.get_num_coordinates(moved)[0] == 4 * 400 + 1
    feet = ground.project(one(shapely.box(980_000, 190_000, 990_000, 200_000)), "EPSG:2263", "EPSG:3857")
    assert shapely.get_num_coordinates(feet)[0] == 4 * 4 + 1  # 10,000 ft are 3.05 km


@given(st.floats(0.05, 0.95))
def test_a_hole_that_touches_an_edge_stays_a_hole(at: float) -> None:
    """A touch between the ends of an edge would turn into a crossing; the polygon stays valid, with its area."""
    hole = [(at, 40), (at + 0.01, 41.5), (at - 0.01, 41.5)]
    polygon = shapely.Polygon([(0, 40), (1, 40), (1, 42), (0, 42)], [hole])
    assert polygon.is_valid
    plane = ground.equal_area_plane(*polygon.bounds)
    projected = ground.project(one(polygon), ground.LONLAT, plane)[0]
    assert projected.is_valid
    apart = ground.project(
        np.array([shapely.Polygon(polygon.exterior), shapely.Polygon(hole)], dtype=object), ground.LONLAT, plane
    )
    np.testing.assert_allclose(projected.area, apart[0].area - apart[1].area, rtol=1e-9)


def test_what_the_plane_cannot_show_is_left_invalid() -> None:
    """Mercator has no pole; a polygon over it is not mended into another one."""
    projected = ground.project(one(shapely.box(0, 80, 10, 90)), ground.LONLAT, "EPSG:32631")
    assert projected[0].is_valid
    lost = ground.project(one(shapely.box(100, 10, 110, 20)), ground.LONLAT, "+proj=gnom +lat_0=0 +lon_0=0 +units=m")
    assert not shapely.is_valid(lost)[0]


@pytest.mark.parametrize("other", ["EPSG:4326", "epsg:4326", "OGC:CRS84", pyproj.CRS("EPSG:4326").to_wkt()])
def test_one_system_under_several_names_moves_nothing(other: str) -> None:
    """Positions and polygons stay as they are, to the last bit."""
    x, y = np.array([0.1 + 0.2]), np.array([1 / 3])
    moved = ground.transform(x, y, ground.LONLAT, other)
    assert (moved[0][0], moved[1][0]) == (x[0], y[0])
    polygons = one(shapely.box(0, 0, 1, 1))
    assert ground.project(polygons, ground.LONLAT, other)[0] is polygons[0]


@given(st.floats(-1e5, 1e5), st.floats(-1e5, 1e5))
def test_there_and_back(x: float, y: float) -> None:
    """A position goes to longitude and latitude and back to within a millimetre, as PROJ's inverse allows."""
    plane = ground.equal_area_plane(8, 46, 10, 48)
    lon, lat = ground.transform(np.array([x]), np.array([y]), plane, ground.LONLAT)
    back = ground.transform(lon, lat, ground.LONLAT, plane)
    np.testing.assert_allclose([back[0][0], back[1][0]], [x, y], rtol=0, atol=1e-3)


def test_geodesic_distances() -> None:
    """Quarter circles of the ellipsoid: the equator's by a*pi/2, the meridian's of 10,001,965.729 m (WGS 84)."""
    zero, ninety = np.array([0.0]), np.array([90.0])
    np.testing.assert_allclose(ground.distances(zero, zero, ninety, zero, ground.LONLAT), [[A * np.pi / 2]], rtol=1e-12)
    np.testing.assert_allclose(
        ground.distances(zero, zero, zero, ninety, ground.LONLAT), [[10_001_965.729]], rtol=1e-10
    )


def test_distances_are_geodesic_from_any_plane() -> None:
    """A plane's positions have the distances of the places, and a site grid's those of Pythagoras."""
    lon, lat = np.array([-157.8168, -157.8015, -158.0]), np.array([21.2716, 21.4234, 21.5])
    x, y = ground.transform(lon, lat, ground.LONLAT, "EPSG:26904")
    expected = ground.distances(lon, lat, lon, lat, ground.LONLAT)
    np.testing.assert_allclose(ground.distances(x, y, x, y, "EPSG:26904"), expected, rtol=1e-7, atol=1e-3)
    assert (expected == expected.T).all()
    local = ground.distances(np.array([0.0, 3.0]), np.array([0.0, 4.0]), np.array([0.0]), np.array([0.0]), "local")
    assert local.tolist() == [[0.0], [5.0]]


@pytest.mark.parametrize(
    "move",
    [
        lambda source, target: ground.transform(np.array([1.0]), np.array([1.0]), source, target),
        lambda source, target: ground.project(one(shapely.box(0, 0, 1, 1)), source, target),
    ],
    ids=["positions", "polygons"],
)
def test_local_and_map_cannot_be_brought_together(move: Callable[[str, str], object]) -> None:
    """A site grid has no place on the map, neither way."""
    message = (
        r"^coordinate reference systems: found 'local' and 'EPSG:4326'; expected both 'local', or both on the map; "
        "give gauges and basins in systems that can be brought together$"
    )
    with pytest.raises(DataError, match=message):
        move("local", ground.LONLAT)
    with pytest.raises(DataError, match=message.replace("'local' and 'EPSG:4326'", "'EPSG:4326' and 'local'")):
        move(ground.LONLAT, "local")


@pytest.mark.parametrize(
    "crs", ["EPSG:0", "nonsense", "", "EPSG:4978", 'ENGCRS["a grid",EDATUM["site"],CS[Cartesian,2]]']
)
def test_systems_that_are_no_maps(crs: str) -> None:
    """Unknown codes, systems in space and systems without a place are refused by name."""
    message = f"coordinate reference system: found '{crs}'; expected 'local', or a map's system: an EPSG code"
    with pytest.raises(JobError, match=f"^{re.escape(message)}"):
        ground.parse_crs(crs)


@pytest.mark.parametrize(
    ("lon", "lat", "fault"),
    [
        (180, 90, ""),
        (-180, -90, ""),
        (90, 91, "swapped"),
        (-90, 180, "swapped"),
        (91, 91, "from -180 to 180"),
        (181, 0, "from -180 to 180"),
        (360, 0, "from -180 to 180"),
        (361, 0, "projected"),
        (0, 4e6, "projected"),
    ],
)
def test_what_is_wrong_with_degrees(lon: float, lat: float, fault: str) -> None:
    """The poles and the antimeridian are places; beyond them the likely slip is named."""
    said = ground.degree_fault(lon, lat)
    assert fault in said
    assert bool(fault) == bool(said)


def test_the_planes_name_keeps_its_centre() -> None:
    """A centre near Greenwich is written without an exponent, and to a millionth of a degree."""
    assert "+lat_0=-0.000001 +lon_0=0 " in ground.equal_area_plane(-1, -1.000001, 1, 0.999999)
    assert "+lat_0=-33.123457 +lon_0=179.654321 " in ground.equal_area_plane(
        179.154321, -33.623457, 180.154321, -32.623457
    )


def test_no_transformation_asks_the_network() -> None:
    """PROJ's fetching of grids is off, also where the surroundings have switched it on."""
    set_network_enabled(active=True)
    try:
        ground.transform(np.array([7.0]), np.array([51.0]), "EPSG:4326", "EPSG:31466")
        assert not is_network_enabled()
    finally:
        set_network_enabled(active=False)


def test_azimuths_are_those_of_the_geodesic() -> None:
    """Against pyproj's geodesics; due north along the meridian, and not due east along a parallel."""
    lon, lat = np.array([0.0, 0.0, 5.0, -3.0]), np.array([45.0, 46.0, 45.0, 40.0])
    found = ground.azimuths(lon, lat, lon, lat, ground.LONLAT)
    forward = pyproj.Geod(ellps="WGS84").inv(lon[1:], lat[1:], np.zeros(3), np.full(3, 45.0))[0]
    np.testing.assert_allclose(found[1:, 0], np.mod(forward, 360))
    assert found[0, 1] == 0
    assert 87 < found[0, 2] < 89


def test_azimuths_in_a_plane() -> None:
    """Of the eight points of the compass, and through another system as through its degrees."""
    ring = np.radians(np.arange(8) * 45)
    here = np.array([7.0])
    found = ground.azimuths(here, here, here + np.sin(ring), here + np.cos(ring), ground.LOCAL)
    np.testing.assert_allclose(found[0], np.arange(8) * 45, atol=1e-9)
    lon, lat = np.array([9.0, 9.2]), np.array([47.0, 47.1])
    x, y = ground.transform(lon, lat, ground.LONLAT, "EPSG:32632")
    expected = ground.azimuths(lon[:1], lat[:1], lon[1:], lat[1:], ground.LONLAT)
    np.testing.assert_allclose(ground.azimuths(x[:1], y[:1], x[1:], y[1:], "EPSG:32632"), expected, atol=1e-6)

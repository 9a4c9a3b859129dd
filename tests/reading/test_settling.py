"""Bringing gauges and basins onto one plane: which plane, how true it is, and what does not belong together."""

import os
import re
from pathlib import Path

import numpy as np
import pyproj
import pytest
import shapely

from basinrain.basins import Basins
from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork
from basinrain.reading.basins import read_basins
from basinrain.reading.gauges import read_gauges
from basinrain.reading.settling import check_near, settle, settle_basins

DATA = Path(__file__).parents[1] / "data"
LONLAT = "EPSG:4326"


def gauges(*places: tuple[float, float], crs: str = LONLAT) -> GaugeNetwork:
    """Return gauges A, B ... at these places."""
    x, y = np.array(places, dtype=float).T
    return GaugeNetwork(ids=tuple("ABCDEFGH"[: len(places)]), x=x, y=y, crs=crs)


def boxes(*bounds: tuple[float, float, float, float], crs: str = LONLAT, official: float = np.nan) -> Basins:
    """Return basins a, b ... of these boxes."""
    return Basins(
        ids=tuple("abcdefgh"[: len(bounds)]),
        polygons=np.array([shapely.box(*b) for b in bounds], dtype=object),
        crs=crs,
        official_areas=np.full(len(bounds), official),
    )


def geodesic_area(polygon: shapely.Geometry, step: float) -> float:
    """Return the area of a polygon of longitudes and latitudes by pyproj's geodesics, its edges divided first."""
    area, _ = pyproj.Geod(ellps="WGS84").geometry_area_perimeter(shapely.segmentize(polygon, step))
    return abs(float(area))


def test_local_coordinates_stay_where_they_are() -> None:
    """On a site grid nothing is moved, and the union is added."""
    network, basins, plane, notes = settle(
        gauges((1, 1), crs="local"), boxes((0, 0, 5, 10), (5, 0, 10, 10), crs="local"), plane=None
    )
    assert network.x.tolist() == [1]
    assert basins.ids == ("a", "b", "union")
    assert basins.areas.tolist() == [50, 50, 100]
    assert (plane.crs, plane.distortion, notes) == ("local", 0.0, ())


def test_the_plane_is_centred_on_the_basins() -> None:
    """The centre is the middle of the basins' box; a basin alone gets no row of its union."""
    network, basins, plane, notes = settle(gauges((8.1, 47.1)), boxes((8, 47, 8.5, 47.5)))
    assert plane.crs == "+proj=laea +lat_0=47.25 +lon_0=8.25 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs"
    assert network.crs == basins.crs == plane.crs
    assert basins.ids == ("a",)
    x, y = network.to_crs(LONLAT).x[0], network.to_crs(LONLAT).y[0]
    np.testing.assert_allclose((x, y), (8.1, 47.1), atol=1e-9)
    assert plane.distortion < 1e-4
    assert notes == ()


@pytest.mark.parametrize("shift", [0.0, 180.0, -180.0])
def test_basins_on_both_sides_of_the_antimeridian(shift: float) -> None:
    """Parts cut at 180 degrees lie side by side, as they would anywhere else."""
    west, east = (-0.5 + shift, 0.0 + shift), (0.0 + shift, 0.5 + shift)
    if shift:
        west, east = (179.5, 180.0), (-180.0, -179.5)
    _, basins, plane, _ = settle(
        gauges((east[0] + 0.1, -16.9)), boxes((west[0], -17, west[1], -16), (east[0], -17, east[1], -16))
    )
    _, elsewhere, reference, _ = settle(gauges((0.1, -16.9)), boxes((-0.5, -17, 0, -16), (0, -17, 0.5, -16)))
    np.testing.assert_allclose(basins.areas, elsewhere.areas, rtol=1e-9)
    np.testing.assert_allclose(plane.distortion, reference.distortion, rtol=1e-6)
    assert basins.polygons[2].geom_type == "Polygon"


def test_a_named_plane_that_the_files_are_in_moves_nothing() -> None:
    """However its system is written, a polygon in the plane keeps every vertex to the last bit."""
    basins, _ = read_basins(DATA / "oahu" / "basin_xy.geojson")
    network = read_gauges(DATA / "oahu" / "gauges.csv", crs="EPSG:26904")
    for name in ("EPSG:26904", "epsg:26904", pyproj.CRS("EPSG:26904").to_wkt()):
        settled_network, settled, plane, _ = settle(network, basins, plane=name)
        assert settled.polygons[0].wkb == basins.polygons[0].wkb
        np.testing.assert_array_equal(settled_network.x, network.x)
        assert "UTM zone 4N" in plane.name
        np.testing.assert_allclose(settled.areas, [1589.5673e6], rtol=1e-7)  # tests/data/polygons/areas.csv


@pytest.mark.parametrize(
    ("plane", "distortion"),
    [
        # The scale on the central meridian of a UTM zone is 0.9996 (EPSG parameter "scale factor at natural origin").
        ("EPSG:32632", 0.0004),
        # The scale of the spherical Mercator plane is 1/cos(latitude), here of 60 degrees, less the flattening of the
        # ellipsoid, along the parallel N/a = 1/sqrt(1 - e^2 sin^2) = 1.00252 (Snyder 1987, USGS PP 1395, section 7).
        ("EPSG:3857", 2 / 1.00252 - 1),
    ],
)
def test_distortion_is_that_of_the_projection(plane: str, distortion: float) -> None:
    """In a small network the distances are off by the projection's own scale, found on its theory."""
    basins = boxes((8.999, 59.9995, 9.001, 60.0005))
    _, _, used, notes = settle(gauges((9, 60), (9.001, 60)), basins, plane=plane)
    # The meridian is a little shorter of curvature than the parallel, so the largest is up to 0.7 % more.
    assert distortion - 1e-5 <= used.distortion <= 1.015 * distortion
    assert [note.code for note in notes] == (["plane-distortion"] if distortion > 0.01 else [])


def test_a_plane_that_distorts_is_warned_of() -> None:
    """The note says how far distances are off."""
    _, _, plane, notes = settle(gauges((9, 60)), boxes((8.9, 59.9, 9.1, 60.1)), plane="EPSG:3857")
    assert [note.text for note in notes] == [
        (
            f"Distances between gauges and basins in the plane EPSG:3857 (WGS 84 / Pseudo-Mercator) are up to "
            f"{100 * plane.distortion:.1f} % off those on the ground."
        )
    ]


@pytest.mark.parametrize(
    ("plane", "message"),
    [
        (LONLAT, "[job] plane: found 'EPSG:4326', which is in degrees; expected a projected system in metres; "),
        (
            "EPSG:2263",
            (
                "[job] plane: found 'EPSG:2263', which is in the unit US survey foot; "
                "expected a projected system in metres; "
            ),
        ),
        ("local", "[job] plane: found 'local', for coordinates on the map; expected a projected system in metres; "),
        ("EPSG:nothing", "[job] plane: found 'EPSG:nothing'; expected 'local', or a map's system: "),
        ("EPSG:4978", "[job] plane: found 'EPSG:4978'; expected 'local', or a map's system: "),
    ],
)
def test_planes_that_are_none(plane: str, message: str) -> None:
    """Degrees, feet, a system in space and a slip are refused by name."""
    with pytest.raises(JobError, match=f"^{re.escape(message)}"):
        settle(gauges((8.1, 47.1)), boxes((8, 47, 9, 48)), plane=plane)


def test_a_plane_on_the_map_for_local_coordinates() -> None:
    """A site grid has no place on the map."""
    with pytest.raises(
        JobError,
        match=r"^\[job\] plane: found 'EPSG:5070', for local coordinates; expected none, or 'local'; "
        "name another plane, or leave plane out$",
    ):
        settle(gauges((1, 1), crs="local"), boxes((0, 0, 2, 2), crs="local"), plane="EPSG:5070")


def test_one_local_and_the_other_not() -> None:
    """Both systems are shown."""
    with pytest.raises(
        DataError,
        match=r"^coordinate reference systems: found gauges in 'local', basins in 'EPSG:4326'; "
        "expected both 'local', or both on the map; give both crs so that they can be brought together$",
    ):
        settle(gauges((1, 1), crs="local"), boxes((0, 0, 2, 2)))


@pytest.mark.parametrize(
    ("network", "basins", "message"),
    [
        (
            gauges((20, 47), (30, 47)),
            boxes((8, 47, 8.1, 47.1)),
            (
                "gauges and basins: found them nowhere near each other: gauge A, the nearest, is 903 km away; "
                "expected a gauge within 100 km of the basins; check both files and their crs"
            ),
        ),
        (
            gauges((47.05, 8.05)),
            boxes((8, 47, 8.1, 47.1)),
            (
                "gauges and basins: found them nowhere near each other: gauge A, the nearest, is 5,679 km away; "
                "expected a gauge within 100 km of the basins; "
                "longitude and latitude of the gauges, or longitude and latitude of the basins look swapped"
            ),
        ),
        (
            gauges((5250000, 440000), crs="EPSG:32632"),
            boxes((8, 47, 8.5, 47.5)),
            "; x and y of the gauges look swapped",
        ),
        (
            gauges((440000, 5250000), crs="EPSG:32632"),
            boxes((47, 8, 47.5, 8.5)),
            "; longitude and latitude of the basins look swapped",
        ),
        (
            gauges((61, 0), crs="local"),
            boxes((0, 0, 6, 8), crs="local"),
            (
                "gauges and basins: found them nowhere near each other: gauge A, the nearest, is 0.055 km away; "
                "expected a gauge within 0.05 km of the basins; check both files and their crs"
            ),
        ),
        (
            gauges((1e30, 1e30), crs="EPSG:32632"),
            boxes((8, 47, 8.5, 47.5)),
            "gauge A, the nearest, is off the map; expected a gauge within ",
        ),
    ],
)
def test_gauges_and_basins_nowhere_near_each_other(network: GaugeNetwork, basins: Basins, message: str) -> None:
    """The distance is stated, and where swapped coordinates would explain it, that is said."""
    with pytest.raises(DataError, match=re.escape(message)):
        settle(network, basins)


def test_the_stated_distances_are_geodesic() -> None:
    """903 km and 5,679 km, as stated above, are the geodesics to the nearest corners (pyproj)."""
    geod = pyproj.Geod(ellps="WGS84")
    assert round(geod.inv(20, 47, 8.1, 47.1)[2] / 1000) == 903
    assert round(geod.inv(47.05, 8.05, 8.1, 47.0)[2] / 1000) == 5679


@pytest.mark.parametrize(("x", "near"), [(56.0, True), (56.1, False)])
def test_five_diagonals_are_near(x: float, near: bool) -> None:  # noqa: FBT001
    """A box of 6 by 8 has a diagonal of 10: a gauge 50 from its east side, at 6, is near, one farther is not."""
    network, basins = gauges((x, 4), crs="local"), boxes((0, 0, 6, 8), crs="local")
    if near:
        assert len(settle(network, basins)[0]) == 1
    else:
        with pytest.raises(DataError, match="nowhere near each other"):
            settle(network, basins)


def test_one_gauge_nearby_is_enough() -> None:
    """A far gauge beside a near one is the method's business."""
    assert len(settle(gauges((100, 4), (7, 4), crs="local"), boxes((0, 0, 6, 8), crs="local"))[0]) == 2


@pytest.mark.parametrize(("official", "warned"), [(100.0, False), (99.1, False), (98.9, True), (101.1, True)])
def test_an_area_that_differs_from_the_registers(official: float, warned: bool) -> None:  # noqa: FBT001
    """Over 1 % apart is warned of, with both figures."""
    basins = boxes((0, 0, 10_000, 10_000), crs="local", official=official * 1e6)
    *_, notes = settle(gauges((1, 1), crs="local"), basins)
    percent = f"{1e4 / official - 100:+.1f} %"
    text = f"Basin a has 100.000 km2 by its polygon and {official:.3f} km2 by its attribute: {percent}."
    assert [(note.code, note.basin, note.text) for note in notes] == ([("area-differs", "a", text)] if warned else [])


def test_real_subbasins_add_up() -> None:
    """71 sub-basins have 1321.405 km2, and so has their union, and each the area of pyproj's geodesics."""
    basins, _ = read_basins(DATA / "polygons" / "yahara_71_subbasins.geojson")
    outline, _ = read_basins(DATA / "polygons" / "yahara_outline.geojson")
    network = gauges((-89.4, 43.1))
    _, settled, _, notes = settle(network, basins)
    assert settled.ids[-1] == "union"
    np.testing.assert_allclose(settled.areas[:-1].sum(), 1321.405e6, rtol=1e-6)
    np.testing.assert_allclose(settled.areas[-1], settled.areas[:-1].sum(), rtol=1e-9)
    np.testing.assert_allclose(settle(network, outline)[1].areas, settled.areas[-1], rtol=1e-7)
    geodesic = [geodesic_area(polygon, 0.01) for polygon in basins.polygons]
    np.testing.assert_allclose(settled.areas[:-1], geodesic, rtol=1e-5)
    assert notes == ()


def test_register_units_have_their_stated_area() -> None:
    """The Watershed Boundary Dataset states 115.880 and 34.253 km2; the plane's areas agree to 0.01 %."""
    basins, _ = read_basins(DATA / "polygons" / "huc12_nc.geojson", id="huc12", area="areasqkm")
    _, settled, _, notes = settle(gauges((-80.45, 36.5)), basins)
    np.testing.assert_allclose(settled.areas[:-1], settled.official_areas[:-1], rtol=1e-4)
    assert notes == ()


@pytest.mark.parametrize(("name", "km2"), [("oahu", 1590.3888), ("nyc_hourly", 927.6655)])
def test_open_datasets_have_their_geodesic_area(name: str, km2: float) -> None:
    """Basins of short edges agree with the published geodesic area (areas.csv) to 0.01 %."""
    basins, _ = read_basins(DATA / name / "basin.geojson")
    _, settled, _, _ = settle(read_gauges(DATA / name / "gauges.csv"), basins)
    np.testing.assert_allclose(settled.areas, [km2 * 1e6], rtol=1e-4)


@pytest.mark.open_data
def test_long_edges_are_straight_in_degrees() -> None:
    """The Platte basin in Colorado has 54,205.3 km2; geodesics between its corners would make it 54,958.3."""
    folder = os.environ.get("BASINRAIN_CO_PLATTE")
    if not folder:
        pytest.skip("BASINRAIN_CO_PLATTE does not name the folder of the Colorado data")
    basins, _ = read_basins(Path(folder) / "basin.geojson")
    network, settled, plane, _ = settle(read_gauges(Path(folder) / "gauges.csv"), basins)
    assert len(network) == 136
    assert plane.distortion < 0.001
    np.testing.assert_allclose(settled.areas, [54_205.3e6], rtol=1e-5)
    np.testing.assert_allclose(settled.areas, [geodesic_area(basins.polygons[0], 0.001)], rtol=1e-6)
    np.testing.assert_allclose(geodesic_area(basins.polygons[0], 360), 54_958.3e6, rtol=1e-6)


def test_basins_without_gauges_have_the_same_plane() -> None:
    """Without gauges the basins lie as they do with gauges among them, the union's row added."""
    basins = boxes((8, 47, 8.2, 47.2), (8.2, 47, 8.4, 47.2), official=1e8)
    _, with_gauges, plane, notes = settle(gauges((8.1, 47.1)), basins)
    alone, own, own_notes = settle_basins(basins)
    assert (alone.ids, own.crs, own.name) == (with_gauges.ids, plane.crs, plane.name)
    assert alone.areas.tolist() == with_gauges.areas.tolist()
    assert [note.text for note in own_notes] == [note.text for note in notes]
    assert [note.code for note in own_notes] == ["area-differs"] * 2


def test_distortion_without_gauges_is_that_of_the_basins() -> None:
    """A plane that distorts is warned of in words that speak of basins alone; gauges farther out distort more."""
    basins = boxes((8, 47, 8.2, 47.2))
    _, plane, notes = settle_basins(basins, plane="EPSG:3857")
    assert plane.distortion == pytest.approx(1 / np.cos(np.radians(47.1)) - 1, rel=0.02)
    (note,) = notes
    assert note.text.startswith(
        "Distances between places in the basins in the plane EPSG:3857 (WGS 84 / Pseudo-Mercator)"
    )
    _, _, farther, _ = settle(gauges((8, 48)), basins, plane="EPSG:3857")
    assert farther.distortion > plane.distortion


def test_local_basins_without_gauges_stay_where_they_are() -> None:
    """One basin on a site grid is its own union and needs no row for it."""
    basins, plane, notes = settle_basins(boxes((0, 0, 10, 10), crs="local"))
    assert (basins.ids, basins.areas.tolist(), plane.crs, plane.distortion, notes) == (
        ("a",),
        [100.0],
        "local",
        0.0,
        (),
    )


@pytest.mark.parametrize(
    ("plane", "crs", "message"),
    [
        ("EPSG:3857", "local", r"^\[job\] plane: found 'EPSG:3857', for local coordinates; expected none, or 'local'"),
        (
            "local",
            LONLAT,
            r"^\[job\] plane: found 'local', for coordinates on the map; expected a projected system in metres",
        ),
        (
            LONLAT,
            LONLAT,
            r"^\[job\] plane: found 'EPSG:4326', which is in degrees; expected a projected system in metres",
        ),
        ("EPSG:99999", LONLAT, r"^\[job\] plane: found 'EPSG:99999'"),
    ],
)
def test_planes_that_are_none_without_gauges(plane: str, crs: str, message: str) -> None:
    """The same planes are refused as with gauges."""
    with pytest.raises(JobError, match=message):
        settle_basins(boxes((8, 47, 8.2, 47.2), crs=crs), plane=plane)


def test_other_points_are_called_what_they_are() -> None:
    """Points of depths that are swapped or far away are told as such."""
    basins = boxes((8, 47, 8.2, 47.2))
    check_near(gauges((8.1, 47.1)), basins, kind="depth point")
    with pytest.raises(
        DataError, match=r"; longitude and latitude of the depth points, or longitude and .* look swapped$"
    ):
        check_near(gauges((47.1, 8.1)), basins, kind="depth point")
    with pytest.raises(
        DataError, match=r"^depth points and basins: .*depth point A, the nearest, is .*check both files"
    ):
        check_near(gauges((20, 10)), basins, kind="depth point")

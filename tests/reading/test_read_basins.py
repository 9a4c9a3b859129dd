"""Basins as they come: real polygons, repaired or refused, merged or numbered."""

import json
import re
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from basinrain.basins import Basins
from basinrain.errors import JobError, ReadError
from basinrain.notes import Note
from basinrain.reading.basins import read_basins

POLYGONS = Path(__file__).parents[1] / "data" / "polygons"
YAHARA = POLYGONS / "yahara_71_subbasins.geojson"
SQUARE = "POLYGON ((0 0, 10 0, 10 10, 0 10, 0 0))"
BOW_TIE = "POLYGON ((0 0, 10 10, 10 0, 0 10, 0 0))"


def layer(
    folder: Path, shapes: list[str | None], columns: dict[str, list[Any]] | None = None, *, crs: str = ""
) -> Path:
    """Return a GeoJSON file of these shapes, given as well-known text."""
    path = folder / "basins.geojson"
    features = [
        {
            "type": "Feature",
            "properties": {name: values[place] for name, values in (columns or {}).items()},
            "geometry": None if shape is None else shapely.geometry.mapping(shapely.from_wkt(shape)),
        }
        for place, shape in enumerate(shapes)
    ]
    named = {"crs": {"type": "name", "properties": {"name": crs}}} if crs else {}
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features, **named}))
    return path


def local(folder: Path, shapes: list[str | None]) -> tuple[Basins, tuple[Note, ...]]:
    """Return basins of shapes in metres."""
    return read_basins(layer(folder, shapes), crs="local")


def refusal(path: Path, **options: Any) -> str:  # noqa: ANN401
    """Return the text of the error that reading the file raises."""
    with pytest.raises(ReadError, match=re.escape(path.name)) as caught:
        read_basins(path, **options)
    return str(caught.value).replace(f"{path.parent}/", "")


def test_real_subbasins_are_numbered_and_repaired() -> None:
    """71 real sub-basins, 8 of them invalid as published: numbered in file order, repaired, no area changed."""
    basins, notes = read_basins(YAHARA)
    assert basins.ids == tuple(str(number) for number in range(1, 72))
    assert basins.crs == "EPSG:4326"
    assert [note.basin for note in notes] == ["4", "22", "40", "42", "47", "49", "50", "52"]
    assert {(note.code, note.level) for note in notes} == {("basin-repaired", "info")}
    assert notes[0].text == (
        "Basin 4 was repaired: ring self-intersection at (-89.28839034, 43.30215417); "
        "its area changed by less than 0.0001 %."
    )
    assert shapely.is_valid(basins.polygons).all()
    features = json.loads(YAHARA.read_text())["features"]
    published = [shapely.geometry.shape(feature["geometry"]).area for feature in features]
    np.testing.assert_allclose(basins.areas, published, rtol=1e-12)


def test_real_subbasins_merged_by_their_code() -> None:
    """Joined by ``gridcode`` there are 55, of the same sum, in the order in which the codes first stand."""
    numbered, _ = read_basins(YAHARA)
    merged, notes = read_basins(YAHARA, id="gridcode", repeated="merge", area="area_km2_5070")
    assert len(merged) == 55
    assert merged.ids[:3] == ("55", "53", "54")
    assert len(notes) == 8
    np.testing.assert_allclose(merged.areas.sum(), numbered.areas.sum(), rtol=1e-12)
    # Parts with areas of their own: their sum, 1321.405 km2, as the register's areas add up.
    np.testing.assert_allclose(merged.official_areas.sum(), 1321.405e6, rtol=1e-6)


def test_repeated_ids_are_refused_unless_merged() -> None:
    """Every id that stands on several features is named with them."""
    lines = refusal(YAHARA, id="gridcode").splitlines()
    assert lines[0] == (
        "yahara_71_subbasins.geojson: basin 39: found the id on features 17, 18; expected each id once; "
        'correct the ids, or join the polygons of one id with repeated = "merge"'
    )
    assert len(lines) == 10  # codes that stand more than once in areas.csv


def test_merged_official_areas(tmp_path: Path) -> None:
    """Parts that state one area share it, parts that state their own add up, a part that states none leaves none."""
    squares: list[str | None] = [shapely.box(i, 0, i + 1, 1).wkt for i in range(6)]
    path = layer(tmp_path, squares, {"code": list("aabbcc"), "ha": [2, 2, 1, 3, 1, None]})
    basins, _ = read_basins(path, id="code", repeated="merge", crs="local", area="ha", area_unit="ha")
    assert basins.ids == ("a", "b", "c")
    np.testing.assert_array_equal(basins.official_areas, [20_000, 40_000, np.nan])
    assert basins.areas.tolist() == [2, 2, 2]


def test_register_units_with_text_ids() -> None:
    """Ids of digits keep their leading zero; official areas come in m2."""
    basins, notes = read_basins(POLYGONS / "huc12_nc.geojson", id="huc12", area="areasqkm")
    assert basins.ids == ("030101030106", "030101030107")
    np.testing.assert_allclose(basins.official_areas, [115.880118e6, 34.2526e6], rtol=1e-6)
    assert notes == ()


def test_local_coordinates_whatever_the_file_claims(tmp_path: Path) -> None:
    """A site grid in km kept as GeoJSON: 10 km by 10 km are 100 km2."""
    basins, _ = read_basins(layer(tmp_path, [SQUARE]), crs="local", length_unit="km")
    assert (basins.crs, basins.areas.tolist()) == ("local", [1e8])


@pytest.mark.parametrize("driver", ["GPKG", "ESRI Shapefile", "FlatGeobuf"])
def test_other_formats(tmp_path: Path, driver: str) -> None:
    """Coordinate system, whole-number ids and polygons come from every format; heights are dropped."""
    path = tmp_path / ("bassins é" + {"GPKG": ".gpkg", "ESRI Shapefile": ".shp", "FlatGeobuf": ".fgb"}[driver])
    polygon = shapely.force_3d(shapely.box(1000, 2000, 3000, 5000), 7.0)
    gpd.GeoDataFrame({"code": [17]}, geometry=[polygon], crs="EPSG:5070").to_file(path, driver=driver)
    basins, _ = read_basins(path, id="code")
    assert (basins.ids, basins.crs, basins.areas.tolist()) == (("17",), "EPSG:5070", [6e6])
    assert not shapely.has_z(basins.polygons).any()


def test_layers(tmp_path: Path) -> None:
    """With several layers one must be named, and a slip in its name is told."""
    path = tmp_path / "basins.gpkg"
    for name, size in (("upper", 1), ("lower", 2)):
        gpd.GeoDataFrame(geometry=[shapely.box(0, 0, size, 1)], crs="EPSG:5070").to_file(path, layer=name)
    assert read_basins(path, layer="lower")[0].areas.tolist() == [2]
    assert refusal(path) == ("basins.gpkg: layer: found 2 layers (upper, lower); expected one; name one with layer")
    assert refusal(path, layer="uper") == (
        "basins.gpkg: layer: found no layer 'uper'; expected a layer of the file; did you mean 'upper'?"
    )


def test_shapes_that_are_fine(tmp_path: Path) -> None:
    """Multipart, with a hole, nested and overlapping: each basin is what it is."""
    basins, notes = local(
        tmp_path,
        [
            "MULTIPOLYGON (((0 0, 2 0, 2 2, 0 2, 0 0)), ((5 5, 6 5, 6 6, 5 6, 5 5)))",
            "POLYGON ((0 0, 4 0, 4 4, 0 4, 0 0), (1 1, 2 1, 2 2, 1 2, 1 1))",
            "POLYGON ((1 1, 3 1, 3 3, 1 3, 1 1))",
        ],
    )
    assert basins.areas.tolist() == [5, 15, 4]
    assert notes == ()


@pytest.mark.parametrize(
    ("shape", "area", "reason"),
    [
        # A ring that touches itself at (5, 10): a hole drawn as part of the shell.
        (
            "POLYGON ((0 0, 10 0, 10 10, 5 10, 6 5, 4 5, 5 10, 0 10, 0 0))",
            95.0,
            "ring self-intersection",
        ),
        # A spike without area.
        ("POLYGON ((0 0, 10 0, 10 5, 14 5, 10 5, 10 10, 0 10, 0 0))", 100.0, "self-intersection"),
        # Two parts that share a side.
        (
            "MULTIPOLYGON (((0 0, 5 0, 5 10, 0 10, 0 0)), ((5 0, 10 0, 10 10, 5 10, 5 0)))",
            100.0,
            "self-intersection",
        ),
    ],
)
def test_repairs_that_change_nothing(tmp_path: Path, shape: str, area: float, reason: str) -> None:
    """Touches and spikes are repaired, with the area that can be counted on squared paper."""
    basins, notes = local(tmp_path, [shape])
    np.testing.assert_allclose(basins.areas, [area], rtol=1e-12)
    assert len(notes) == 1
    assert re.fullmatch(
        rf"Basin 1 was repaired: {reason} at \(\S+, \S+\); its area changed by less than 0\.0001 %\.", notes[0].text
    )


def test_a_small_change_is_stated(tmp_path: Path) -> None:
    """A crossing of 0.005 % of the area is repaired, and its share is said."""
    # The spike's tip is a triangle 0.1 high and 0.1 wide that the ring runs round the wrong way: 0.005 of 100.
    shape = "POLYGON ((0 0, 10 0, 10 5, 10.2 5.1, 10.2 5, 10 5.1, 10 10, 0 10, 0 0))"
    polygon = shapely.from_wkt(shape)
    basins, notes = local(tmp_path, [shape])
    change = abs(basins.areas[0] / polygon.area - 1)
    assert 1e-6 < change < 1e-4
    assert notes[0].text.endswith(f"its area changed by {100 * change:.4f} %.")


@pytest.mark.parametrize(
    "shape",
    [
        BOW_TIE,
        # Lobes of different size: the rings' area is their difference, not their sum.
        "POLYGON ((0 0, 20 20, 20 0, 0 15, 0 0))",
        # A square run round twice.
        "POLYGON ((0 0, 10 0, 10 10, 0 10, 0 0, 10 0, 10 10, 0 10, 0 0))",
        # A hole that lies outside the shell.
        "POLYGON ((0 0, 10 0, 10 10, 0 10, 0 0), (20 0, 21 0, 21 1, 20 1, 20 0))",
        # A figure-eight whose lobes cancel, as a hole.
        "POLYGON ((-5 -5, 15 -5, 15 15, -5 15, -5 -5), (0 0, 10 10, 10 0, 0 10, 0 0))",
        # Parts that overlap.
        "MULTIPOLYGON (((0 0, 10 0, 10 10, 0 10, 0 0)), ((5 0, 15 0, 15 10, 5 10, 5 0)))",
        # A pentagram: its core is run round twice.
        "POLYGON ((0 10, 6 -8, -9.5 3, 9.5 3, -6 -8, 0 10))",
    ],
)
def test_repairs_that_would_change_the_basin_are_refused(tmp_path: Path, shape: str) -> None:
    """Where rules of repair disagree on the area, the basin is refused by name, together with every other."""
    path = layer(tmp_path, [SQUARE, shape, shape], {"code": ["fine", "crossed", "again"]})
    with pytest.raises(ReadError, match=r"(?s)feature 2, basin crossed: .*feature 3, basin again: ") as caught:
        read_basins(path, id="code", crs="local")
    first = caught.value.problems[0]
    assert len(caught.value.problems) == 2
    assert first.basin == "crossed"
    assert re.fullmatch(
        r"a polygon that cannot be repaired without changing its area: "
        r"(ring |hole )?(self-intersection|lies outside shell) at \(\S+, \S+\)",
        first.found,
    )


@given(st.lists(st.tuples(st.integers(0, 6), st.integers(0, 6)), min_size=4, max_size=9))
def test_a_ring_that_is_read_has_its_shoelace_area(ring: list[tuple[int, int]]) -> None:
    """Whatever a ring does, it is refused or keeps the area of the shoelace formula."""
    import tempfile

    polygon = shapely.Polygon(ring)
    x, y = np.array([*ring, ring[0]], dtype=float).T
    shoelace = abs(float(np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]))) / 2
    with tempfile.TemporaryDirectory() as folder:
        try:
            basins, _ = local(Path(folder), [polygon.wkt])
        except ReadError:
            assert shoelace == 0 or not polygon.is_valid
        else:
            np.testing.assert_allclose(basins.areas, [shoelace], rtol=1e-4)


@pytest.mark.parametrize(
    ("shapes", "options", "columns", "message"),
    [
        (
            [None, "POLYGON EMPTY", "LINESTRING (0 0, 1 1)", "POLYGON ((0 0, 1 1, 2 2, 0 0))"],
            {},
            {},
            (
                "basins.geojson: feature 1: found no geometry; expected a polygon; correct or remove it\n"
                "basins.geojson: feature 2: found an empty geometry; expected a polygon; correct or remove it\n"
                "basins.geojson: feature 3: found a LineString; expected a polygon; correct or remove it\n"
                "basins.geojson: feature 4: found a polygon that encloses no area; expected a polygon with an area; "
                "correct or remove it"
            ),
        ),
        (
            [SQUARE, SQUARE],
            {"id": "code"},
            {"code": [None, "union"]},
            (
                "basins.geojson: column code: feature 1: found a blank id; expected an id for every basin\n"
                "basins.geojson: column code: feature 2: found the id 'union', which stands for all basins together; "
                "expected another id; rename the basin"
            ),
        ),
        (
            [SQUARE],
            {"id": "cod", "area": "km2"},
            {"code": ["a"], "sqkm": [1]},
            (
                "basins.geojson: columns.id: found no column 'cod'; expected a column of the file; "
                "did you mean 'code'?\n"
                "basins.geojson: columns.area: found no column 'km2'; expected a column of the file; "
                "one of: code, sqkm"
            ),
        ),
        (
            [SQUARE, SQUARE, SQUARE],
            {"area": "km2"},
            {"km2": ["large", "0", ""]},
            (
                "basins.geojson: column km2: feature 1: found 'large'; expected an area above 0, or none\n"
                "basins.geojson: column km2: feature 2: found '0'; expected an area above 0, or none"
            ),
        ),
    ],
)
def test_features_that_are_no_basins(
    tmp_path: Path, shapes: list[str | None], options: dict[str, Any], columns: dict[str, list[Any]], message: str
) -> None:
    """Each feature's fault is one line, all of them together."""
    assert refusal(layer(tmp_path, shapes, columns), crs="local", **options) == message


def test_a_projected_geojson_that_does_not_say_so(tmp_path: Path) -> None:
    """Coordinates that cannot be degrees are not taken for degrees."""
    path = layer(tmp_path, ["POLYGON ((570982 4499645, 578550 4501533, 570982 4501533, 570982 4499645))"])
    assert refusal(path) == (
        "basins.geojson: feature 1: found no CRS, and coordinates such as 578550 4501533; "
        "expected longitudes and latitudes, since the file names no other system; "
        'the coordinates look projected: give crs = "EPSG:...", or crs = "local"'
    )
    assert read_basins(path, crs="EPSG:26918")[0].crs == "EPSG:26918"
    assert refusal(path, crs="EPSG:4269").endswith("the coordinates look projected: give their own crs")


def test_a_geojson_that_names_its_system(tmp_path: Path) -> None:
    """The older ``crs`` member is heeded."""
    assert read_basins(layer(tmp_path, [SQUARE], crs="urn:ogc:def:crs:EPSG::5070"))[0].crs == "EPSG:5070"


def test_swapped_degrees(tmp_path: Path) -> None:
    """Latitude first is recognised where it cannot be right."""
    path = layer(tmp_path, ["POLYGON ((39 -105, 40 -105, 40 -104, 39 -105))"])
    assert refusal(path) == (
        "basins.geojson: feature 1: found longitude 40 and latitude -105; expected degrees that a place can have; "
        "longitude and latitude look swapped"
    )


def test_an_edge_round_the_globe(tmp_path: Path) -> None:
    """A basin across the antimeridian that is not cut there would be drawn round the globe."""
    path = layer(tmp_path, ["POLYGON ((179 -17, -179 -17, -179 -16, 179 -16, 179 -17))"])
    assert refusal(path) == (
        "basins.geojson: feature 1: found an edge across more than 180 degrees of longitude; "
        "expected polygons cut at the antimeridian (RFC 7946, section 3.1.9); "
        "cut it there, or give it in a projected system"
    )


def test_a_file_without_a_coordinate_system(tmp_path: Path) -> None:
    """A file that names no system needs one from the job."""
    path = tmp_path / "basins.shp"
    with pytest.warns(UserWarning, match="'crs' was not provided"):
        gpd.GeoDataFrame({"code": ["a"]}, geometry=[shapely.from_wkt(SQUARE)]).to_file(path)
    assert refusal(path) == (
        "basins.shp: the coordinates: found no CRS; expected their coordinate reference system; "
        'give crs = "EPSG:...", or crs = "local" for a site grid'
    )
    assert read_basins(path, crs="EPSG:5070")[0].areas.tolist() == [100.0]


def test_choices_are_checked_first(tmp_path: Path) -> None:
    """A slip in the job is told before the file is looked for."""
    path = tmp_path / "never_read.shp"
    with pytest.raises(JobError, match=r"repeated: found 'merged'") as caught:
        read_basins(
            path,
            repeated="merged",  # type: ignore[arg-type]
            length_unit="yard",
            area_unit="sqkm",
            elevation_unit="fathom",
            crs="EPSG:0",
        )
    assert [line.split(";")[0] for line in str(caught.value).splitlines()] == [
        f"{path}: [basins] {fault}"
        for fault in (
            "repeated: found 'merged'",
            "length_unit: found 'yard'",
            "area_unit: found 'sqkm'",
            "elevation_unit: found 'fathom'",
            "crs: found 'EPSG:0'",
        )
    ]
    assert caught.value.problems[0].expected == "one of: refuse, merge"
    assert caught.value.problems[2].expected.startswith("one of: m2, km2")

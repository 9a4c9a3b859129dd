"""Gauge networks as people keep them: tables and points, every column name, every slip."""

import json
import re
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
import shapely

from basinrain.errors import JobError, ReadError
from basinrain.reading.gauges import read_gauges

DATA = Path(__file__).parents[1] / "data"


def table(folder: Path, text: str) -> Path:
    """Return a gauge table with this text."""
    path = folder / "gauges.csv"
    path.write_text(text, encoding="utf-8")
    return path


def points(folder: Path, features: list[tuple[dict[str, Any], Any]], **members: Any) -> Path:  # noqa: ANN401
    """Return a GeoJSON file of points: properties and coordinates."""
    path = folder / "gauges.geojson"
    listed = [
        {"type": "Feature", "properties": properties, "geometry": at and {"type": "Point", "coordinates": at}}
        for properties, at in features
    ]
    path.write_text(json.dumps({"type": "FeatureCollection", "features": listed, **members}))
    return path


def refusal(path: Path, **options: Any) -> str:  # noqa: ANN401
    """Return the text of the error that reading the file raises."""
    with pytest.raises(ReadError, match=re.escape(path.name)) as caught:
        read_gauges(path, **options)
    return str(caught.value).replace(f"{path.parent}/", "")


def test_a_whole_table(tmp_path: Path) -> None:
    """Every quantity is found by its trade name; ids stay as written; units become m and mm."""
    network = read_gauges(
        table(
            tmp_path,
            "Station;Name;Longitude;Latitude;Elevation;Normal;Opened;Closed\n"
            "050109;Sankt Gällen;-105,5;39,25;1000;40,5;1990-05-01;\n"
            "050110;;-105,25;39;;;;2031-06\n",
        ),
        elevation_unit="ft",
        normal_unit="in",
        normal_period="1991-2020",
    )
    assert network.ids == ("050109", "050110")
    assert network.names == ("Sankt Gällen", "050110")
    assert network.crs == "EPSG:4326"
    assert (network.x.tolist(), network.y.tolist()) == ([-105.5, -105.25], [39.25, 39.0])
    np.testing.assert_allclose(network.elevation, [304.8, np.nan])
    assert network.normals is not None
    np.testing.assert_allclose(network.normals, [[40.5 * 25.4], [np.nan]])
    assert network.normal_period == "1991-2020"
    assert [str(t) for t in network.opened] == ["1990-05-01T00:00:00", "NaT"]
    assert [str(t) for t in network.closed] == ["NaT", "2031-07-01T00:00:00"]


def test_mapped_columns_win(tmp_path: Path) -> None:
    """Columns that the user names are used, though trade names are there."""
    path = table(tmp_path, "id,code2,lon,lat,e,n,jan,mean\nA,a1,1,2,500,600,3,40\n")
    network = read_gauges(path, columns={"id": "code2", "x": "e", "y": "n", "normal": "mean"}, crs="EPSG:5070")
    assert (network.ids, network.x.tolist(), network.y.tolist(), network.crs) == (("a1",), [500], [600], "EPSG:5070")
    assert network.normals is not None
    assert network.normals.tolist() == [[40.0]]
    months = read_gauges(path, columns={"normals": ["jan"] * 12}).normals
    assert months is not None
    assert months.tolist() == [[3.0] * 12]


@pytest.mark.parametrize(
    ("crs", "x", "used"),
    [
        (None, 1.0, "EPSG:4326"),
        ("EPSG:4269", 1.0, "EPSG:4269"),
        ("EPSG:5070", 500.0, "EPSG:5070"),
        ("EPSG:2263", 500.0, "EPSG:2263"),
        ("local", 500_000.0, "local"),
    ],
)
def test_both_pairs_of_coordinates(tmp_path: Path, crs: str | None, x: float, used: str) -> None:
    """The coordinate system says which pair is meant; only local coordinates have a unit of their own."""
    network = read_gauges(table(tmp_path, "id,lon,lat,x,y\nA,1,2,500,600\n"), crs=crs, length_unit="km")
    assert (network.x.tolist(), network.crs) == ([x], used)


def test_local_coordinates_in_feet(tmp_path: Path) -> None:
    """1000 ft are 304.8 m."""
    network = read_gauges(table(tmp_path, "id,x,y\nA,1000,0\n"), crs="local", length_unit="ft")
    np.testing.assert_allclose((network.x[0], network.y[0]), (304.8, 0.0), rtol=1e-15)


def test_an_elevation_in_another_unit_is_not_taken(tmp_path: Path) -> None:
    """A column that says feet is an elevation only where feet are declared."""
    path = table(tmp_path, "id,lon,lat,elev_ft\nA,1,2,1000\n")
    assert np.isnan(read_gauges(path).elevation).all()
    np.testing.assert_allclose(read_gauges(path, elevation_unit="ft").elevation, [304.8])


def test_excluded_gauges_are_not_read(tmp_path: Path) -> None:
    """What is wrong with an excluded gauge is no problem."""
    path = table(tmp_path, "id,lon,lat\nA,1,2\nB,,x\nC,3,4\nB,1,1\n")
    assert read_gauges(path, exclude=["B"]).ids == ("A", "C")
    assert refusal(path, exclude=["A", "B", "C"]) == (
        "gauges.csv: the gauges: found none left after exclude; expected at least one"
    )


def test_an_unknown_excluded_gauge_is_a_slip(tmp_path: Path) -> None:
    """The id that may have been meant is named."""
    path = table(tmp_path, "id,lon,lat\nWest1,1,2\nEast1,3,2\n")
    assert refusal(path, exclude=["Wets1"]) == (
        "gauges.csv: exclude: found 'Wets1', which is not in the file; expected ids of gauges; did you mean 'West1'?"
    )


def test_all_problems_of_a_table_come_together(tmp_path: Path) -> None:
    """Ids, coordinates, elevations, normals and dates are checked in one pass, each with line and column."""
    path = table(
        tmp_path,
        "id,lon,lat,elev,normal,from,to\n"
        "A,1,2,5,5,,\n"
        ",1,2,,,,\n"
        "A,3,2,,,,\n"
        "B,,x,high,-1,yesterday,2031-02-30\n"
        "C,inf,1,,0,2031-05-02,2031-05-01\n",
    )
    assert refusal(path).splitlines() == [
        "gauges.csv:3: column id: a gauge: found a blank id; expected an id for every gauge",
        (
            "gauges.csv:4: column id: gauge A: found the id again, first on line 2; expected each gauge once; "
            "rename or remove one of them"
        ),
        "gauges.csv:5: column lon: gauge B: found nothing; expected a number; correct the cell",
        "gauges.csv:6: column lon: gauge C: found 'inf'; expected a number; correct the cell",
        "gauges.csv:5: column lat: gauge B: found 'x'; expected a number; correct the cell",
        "gauges.csv:5: column elev: gauge B: found 'high'; expected a number; correct the cell",
        (
            "gauges.csv:5: column normal: gauge B: found a normal of -1; "
            "expected 0 or more, or a blank cell where it is not known"
        ),
        (
            "gauges.csv:5: column from: gauge B: found 'yesterday'; "
            "expected a date such as 2031-06-30, or a date and time such as 2031-06-30T08:00"
        ),
        (
            "gauges.csv:5: column to: gauge B: found '2031-02-30'; "
            "expected a date such as 2031-06-30, or a date and time such as 2031-06-30T08:00"
        ),
        (
            "gauges.csv:6: column to: gauge C: found in service to 2031-05-02T00:00:00, from 2031-05-02T00:00:00; "
            "expected an end after the start"
        ),
    ]


@pytest.mark.parametrize(
    ("text", "options", "message"),
    [
        (
            "id,x,y\nA,1,2\n",
            {},
            (
                "gauges.csv: the coordinates: found no CRS; expected their coordinate reference system; "
                'give crs = "EPSG:...", or crs = "local" for a site grid'
            ),
        ),
        (
            "id,lon,lat,x,y\nA,1,2,3,4\n",
            {"columns": {"x": "x", "y": "y"}},
            (
                "gauges.csv: the coordinates: found no CRS; expected their coordinate reference system; "
                'give crs = "EPSG:...", or crs = "local" for a site grid'
            ),
        ),
        (
            "id,lon,lat\nA,1,2\n",
            {"crs": "local"},
            (
                "gauges.csv: the gauges' positions: found no column for x among id, lon, lat; "
                "expected x and y, since crs is 'local'; name it with columns = { x = \"...\" }\n"
                "gauges.csv: the gauges' positions: found no column for y among id, lon, lat; "
                "expected x and y, since crs is 'local'; name it with columns = { y = \"...\" }"
            ),
        ),
        (
            "id,lon\nA,1\n",
            {},
            (
                "gauges.csv: the gauges' positions: found no column for lat among id, lon; expected lon and lat; "
                'name it with columns = { lat = "..." }'
            ),
        ),
        (
            "id,height\nA,1\n",
            {},
            (
                "gauges.csv: the gauges' positions: found no columns for them among id, height; "
                "expected columns such as lon and lat, or x and y; "
                'name them with columns = { lon = "...", lat = "..." } or { x = "...", y = "..." }'
            ),
        ),
        (
            "place,lon,lat\nA,1,2\n",
            {},
            (
                "gauges.csv: the gauges' ids: found no column for them among place, lon, lat; "
                'expected a column such as id, gauge or station; name it with columns = { id = "..." }'
            ),
        ),
        (
            "id,lon,lat\nA,1,2\n",
            {"columns": {"id": "idd", "elevation": "z"}},
            (
                "gauges.csv: columns.id: found no column 'idd'; expected a column of the file; did you mean 'id'?\n"
                "gauges.csv: columns.elevation: found no column 'z'; expected a column of the file; "
                "one of: id, lon, lat"
            ),
        ),
        (
            "id,lon,lat,jan,feb,mar,apr,may,jun,jul,aug,sep,oct,nov\nA,1,2,,,,,,,,,,,\n",
            {},
            (
                "gauges.csv: monthly normals: found no column 'dec'; expected all twelve months; "
                "add it, or name the columns with columns = { normals = [...] }"
            ),
        ),
        (
            "id,lon,lat\nA,39.7,-105\nB,39.7,-80\n",
            {},
            (
                "gauges.csv:2: column lat: gauge A: found longitude 39.7 and latitude -105; "
                "expected degrees that a place can have; longitude and latitude look swapped"
            ),
        ),
        (
            "id,lon,lat\nA,282,40\n",
            {},
            (
                "gauges.csv:2: column lon: gauge A: found longitude 282 and latitude 40; "
                "expected degrees that a place can have; longitude goes from -180 to 180, latitude from -90 to 90"
            ),
        ),
        (
            "id,lon,lat\nA,622751.8,2352667.2\n",
            {},
            (
                "gauges.csv:2: column lon: gauge A: found longitude 622751.8 and latitude 2352667.2; "
                "expected degrees that a place can have; the coordinates look projected: give their own crs"
            ),
        ),
    ],
)
def test_tables_that_do_not_say_enough(tmp_path: Path, text: str, options: dict[str, Any], message: str) -> None:
    """No coordinate system, column or degree is guessed."""
    assert refusal(table(tmp_path, text), **options) == message


@pytest.mark.parametrize(
    ("columns", "message"),
    [
        ({"elevatoin": "x"}, "[gauges] columns: found 'elevatoin'; expected a known key; did you mean 'elevation'?"),
        ({"normals": "jan"}, "[gauges] columns.normals: found 'jan'; expected a list of 12 columns, January first"),
        (
            {"normals": ["jan"]},
            "[gauges] columns.normals: found 1 columns; expected a list of 12 columns, January first",
        ),
        ({"id": ["a"]}, "[gauges] columns.id: found ['a']; expected the name of one column"),
    ],
)
def test_a_mapping_that_cannot_be(tmp_path: Path, columns: dict[str, Any], message: str) -> None:
    """Keys and values of the mapping are checked before the file is read."""
    with pytest.raises(JobError, match=f"^{re.escape(message)}$"):
        read_gauges(tmp_path / "never_read.csv", columns=columns)


def test_an_unknown_coordinate_system_or_unit_is_the_jobs_fault(tmp_path: Path) -> None:
    """The job is at fault, not the file."""
    path = table(tmp_path, "id,lon,lat\nA,1,2\n")
    with pytest.raises(JobError, match=r"crs: found 'EPSG:none'; expected 'local'") as caught:
        read_gauges(path, crs="EPSG:none", length_unit="yard", elevation_unit="feet", normal_unit="inch")
    assert [line.split(";")[0] for line in str(caught.value).splitlines()] == [
        f"{path}: [gauges] {fault}"
        for fault in (
            "length_unit: found 'yard'",
            "elevation_unit: found 'feet'",
            "normal_unit: found 'inch'",
            "crs: found 'EPSG:none'",
        )
    ]


def test_points_of_geojson(tmp_path: Path) -> None:
    """Attributes come as in a table: a whole number has no decimal point, a null is blank; heights are dropped."""
    network = read_gauges(
        points(tmp_path, [({"gauge": 17, "elev": 5.5, "to": "2031-06-30"}, [8, 47, 99]), ({"gauge": 4}, [9, 47])])
    )
    assert (network.ids, network.crs) == (("17", "4"), "EPSG:4326")
    assert (network.x.tolist(), network.y.tolist()) == ([8, 9], [47, 47])
    np.testing.assert_array_equal(network.elevation, [5.5, np.nan])
    assert [str(t) for t in network.closed] == ["2031-07-01T00:00:00", "NaT"]


@pytest.mark.parametrize("driver", ["GPKG", "ESRI Shapefile", "FlatGeobuf"])
def test_points_of_other_formats(tmp_path: Path, driver: str) -> None:
    """The coordinate system comes from the file, ids keep leading zeros, numbers all digits."""
    suffix = {"GPKG": ".gpkg", "ESRI Shapefile": ".shp", "FlatGeobuf": ".fgb"}[driver]
    path = tmp_path / f"gauges é{suffix}"
    frame = gpd.GeoDataFrame(
        {"station": ["0501", "0502"], "normal": [812.35, np.nan], "from": pd.to_datetime(["2001-02-03", ""])},
        geometry=gpd.points_from_xy([-603217.9, -605155.4], [1926486.7, 1923262.3]),
        crs="EPSG:5070",
    )
    if driver == "ESRI Shapefile":
        frame = frame.drop(columns="from")
    frame.to_file(path, driver=driver)
    network = read_gauges(path)
    assert (network.ids, network.crs) == (("0501", "0502"), "EPSG:5070")
    assert network.x.tolist() == [-603217.9, -605155.4]
    np.testing.assert_array_equal(network.normals, [[812.35], [np.nan]])
    if driver != "ESRI Shapefile":
        assert [str(t) for t in network.opened] == ["2001-02-03T00:00:00", "NaT"]


def test_a_given_system_wins_over_the_files(tmp_path: Path) -> None:
    """A GeoJSON that claims longitude and latitude may hold a site grid in km."""
    path = points(tmp_path, [({"id": "A"}, [500, 7.5])])
    network = read_gauges(path, crs="local", length_unit="km")
    assert (network.x.tolist(), network.y.tolist(), network.crs) == ([500_000.0], [7500.0], "local")


def test_points_that_cannot_be_gauges(tmp_path: Path) -> None:
    """Problems are told by feature: no point, no id, degrees that no place has."""
    path = tmp_path / "gauges.geojson"
    features = [
        ({"id": "A"}, shapely.LineString([(0, 0), (1, 1)])),
        ({"id": None}, shapely.Point(1, 1)),
        ({"id": "C"}, None),
        ({"id": "D"}, shapely.Point(39.7, -105)),
    ]
    listed = [
        {"type": "Feature", "properties": p, "geometry": None if g is None else shapely.geometry.mapping(g)}
        for p, g in features
    ]
    path.write_text(json.dumps({"type": "FeatureCollection", "features": listed}))
    assert refusal(path).splitlines() == [
        "gauges.geojson: column id: feature 2: a gauge: found a blank id; expected an id for every gauge",
        "gauges.geojson: feature 1: gauge A: found a LineString; expected a point",
        "gauges.geojson: feature 3: gauge C: found no geometry; expected a point",
        (
            "gauges.geojson: feature 4: gauge D: found longitude 39.7 and latitude -105; "
            "expected degrees that a place can have; longitude and latitude look swapped"
        ),
    ]


def test_points_without_a_coordinate_system(tmp_path: Path) -> None:
    """A file that names no system needs one from the job."""
    path = tmp_path / "gauges.gpkg"
    with pytest.warns(UserWarning, match="'crs' was not provided"):
        gpd.GeoDataFrame({"id": ["A"]}, geometry=[shapely.MultiPoint([(1, 2)])]).to_file(path)
    assert refusal(path) == (
        "gauges.gpkg: the coordinates: found no CRS; expected their coordinate reference system; "
        'give crs = "EPSG:...", or crs = "local" for a site grid'
    )
    assert read_gauges(path, crs="local").x.tolist() == [1.0]


def test_a_real_network() -> None:
    """The open Oahu network: 9 gauges, either pair of coordinates, the same places to a metre (through PROJ)."""
    by_degrees = read_gauges(DATA / "oahu" / "gauges.csv")
    by_metres = read_gauges(DATA / "oahu" / "gauges.csv", crs="EPSG:26904")
    assert len(by_degrees) == 9
    assert by_degrees.names[0] == "WAIKIKI 717.2, HI US"
    moved = by_degrees.to_crs("EPSG:26904")
    np.testing.assert_allclose(moved.x, by_metres.x, atol=1.0)
    np.testing.assert_allclose(moved.y, by_metres.y, atol=1.0)

"""Vector files: what is none is refused in words, and attributes come as text."""

import re
from pathlib import Path

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
import shapely

from basinrain.errors import ReadError
from basinrain.reading.vector import read_vector

EXPECTED = "expected GeoJSON, GeoPackage, Shapefile or another format that GDAL reads"
TRIANGLE = '{"type": "Polygon", "coordinates": [[[0, 0], [1, 0], [1, 1], [0, 0]]]}'


def refusal(path: Path) -> str:
    """Return the text of the error that reading the file raises."""
    with pytest.raises(ReadError, match=re.escape(path.name)) as caught:
        read_vector(path)
    return str(caught.value).replace(f"{path.parent}/", "")


def test_files_that_cannot_be_opened(tmp_path: Path) -> None:
    """Nothing there, a folder and an empty file are told apart."""
    (tmp_path / "folder.shp").mkdir()
    (tmp_path / "empty.gpkg").touch()
    assert refusal(tmp_path / "gone.shp") == (
        "gone.shp: the file: found nothing of that name; expected a file; correct the path"
    )
    assert refusal(tmp_path / "folder.shp") == "folder.shp: the file: found a folder; expected a file; name a file"
    assert refusal(tmp_path / "empty.gpkg") == "empty.gpkg: the file: found nothing in it; expected features"


@pytest.mark.parametrize(
    ("content", "reason"),
    [
        (b"hello", "not recognized as being in a supported file format"),
        (b"\x00\x01\x02\xff" * 40, "not recognized as being in a supported file format"),
        (b'{"type": "FeatureCollection", "features": [{"type": "Fea', "Failed to read GeoJSON data"),
    ],
)
def test_files_that_are_no_vector_files(tmp_path: Path, content: bytes, reason: str) -> None:
    """Text, binary content and a file cut short are refused with GDAL's own reason."""
    path = tmp_path / "basins.geojson"
    path.write_bytes(content)
    assert re.fullmatch(
        rf"basins\.geojson: the file: found that it cannot be read as a vector file \(.*{reason}.*\); {EXPECTED}",
        refusal(path),
    )


def test_a_layer_without_features(tmp_path: Path) -> None:
    """No features are no answer."""
    path = tmp_path / "basins.geojson"
    path.write_text('{"type": "FeatureCollection", "features": []}')
    assert refusal(path) == "basins.geojson: the file: found no features in it; expected features"


def test_attributes_as_text(tmp_path: Path) -> None:
    """Whole numbers have no decimal point, other numbers all their digits, nulls nothing, dates are ISO."""
    path = tmp_path / "table.gpkg"
    frame = gpd.GeoDataFrame(
        {
            "whole": pd.array([17, None], dtype="Int64"),
            "real": [0.1 + 0.2, np.nan],
            "real_whole": [4.0, 1e300],
            "text": [" 050109 ", None],
            "day": pd.to_datetime(["2031-06-30T08:00", ""]),
        },
        geometry=[shapely.Point(0, 0, 5), shapely.Point(1, 1, 6)],
        crs="EPSG:5070",
    )
    frame.to_file(path)
    before = path.read_bytes()
    table = read_vector(path)
    assert table.cells.frame.to_dict("list") == {
        "whole": ["17", ""],
        "real": ["0.30000000000000004", ""],
        "real_whole": ["4", "1e+300"],
        "text": ["050109", ""],
        "day": ["2031-06-30T08:00:00", ""],
    }
    assert table.cells.lines.tolist() == [1, 2]
    assert not shapely.has_z(table.geometry).any()
    assert path.read_bytes() == before
    assert [p.name for p in tmp_path.iterdir()] == ["table.gpkg"]


@pytest.mark.parametrize(
    ("member", "crs", "assumed"),
    [
        ("", "EPSG:4326", True),
        ('"crs": {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::5070"}},', "EPSG:5070", False),
    ],
)
def test_the_system_of_a_geojson(tmp_path: Path, member: str, crs: str, *, assumed: bool) -> None:
    """GeoJSON means longitude and latitude unless it names a system; a third coordinate does not change it."""
    path = tmp_path / "basins.geojson"
    solid = TRIANGLE.replace("[1, 0]", "[1, 0, 5]")
    for shape in (TRIANGLE, solid):
        path.write_text(
            f'{{"type": "FeatureCollection", {member} "features":'
            f' [{{"type": "Feature", "properties": {{}}, "geometry": {shape}}}]}}'
        )
        table = read_vector(path)
        assert (table.crs, table.assumed) == (crs, assumed)
        assert table.geometry[0].wkt == "POLYGON ((0 0, 1 0, 1 1, 0 0))"


def test_a_shapefile_names_its_system_by_code(tmp_path: Path) -> None:
    """The description in a .prj is recognised as the system that it is."""
    path = tmp_path / "basins.shp"
    gpd.GeoDataFrame({"a": [1]}, geometry=[shapely.box(0, 0, 1, 1)], crs="EPSG:26918").to_file(path)
    assert read_vector(path).crs == "EPSG:26918"
    path.with_suffix(".prj").unlink()
    assert read_vector(path).crs is None

"""The files of a run: its Thiessen polygons as GeoJSON by RFC 7946, and the tables beside the record."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from references import shoelace
from tiny import JOB, feature, geojson, write_tiny

from basinrain.job import run_storm
from basinrain.results import StormRun
from basinrain.writing.run import thiessen_text, write_run

# The two halves of a cell of one degree by one, with a hole in the western half around gauge A.
WEST = [[10.0, 50.0], [10.5, 50.0], [10.5, 51.0], [10.0, 51.0], [10.0, 50.0]]
EAST = [[10.5, 50.0], [11.0, 50.0], [11.0, 51.0], [10.5, 51.0], [10.5, 50.0]]
HOLE = [[10.1, 50.4], [10.4, 50.4], [10.4, 50.6], [10.1, 50.6], [10.1, 50.4]]
GAUGES = "id,lon,lat\nA,10.2,50.5\nB,10.3,50.95\nC,10.8,50.45\n"
MAP_JOB = JOB.replace('crs = "local"\nlength_unit = "km"\n', 'crs = "EPSG:4326"\n')

Positions = list[list[list[float]]]


def rings(document: dict[str, Any]) -> list[Positions]:
    """Return the rings of every polygon of the document, the outer one first."""
    polygons: list[Positions] = []
    for one in document["features"]:
        geometry = one["geometry"]
        assert geometry["type"] in {"Polygon", "MultiPolygon"}
        polygons += [geometry["coordinates"]] if geometry["type"] == "Polygon" else geometry["coordinates"]
    return polygons


@pytest.fixture(scope="module")
def on_the_map(tmp_path_factory: pytest.TempPathFactory) -> StormRun:
    hollow = feature(WEST, name="west")
    hollow["geometry"]["coordinates"].append(HOLE)
    folder = tmp_path_factory.mktemp("map")
    job = write_tiny(
        folder,
        job=MAP_JOB.replace("idw = { cell = 250 }", 'methods = ["thiessen"]'),
        gauges=GAUGES,
        basins=geojson(hollow, feature(EAST, name="east")),
    )
    return run_storm(job)


@pytest.fixture(scope="module")
def in_a_plane(tmp_path_factory: pytest.TempPathFactory) -> StormRun:
    return run_storm(write_tiny(tmp_path_factory.mktemp("plane")))


def test_outer_rings_run_counterclockwise_and_holes_clockwise(on_the_map: StormRun, in_a_plane: StormRun) -> None:
    """RFC 7946, section 3.1.6: right-hand rule. The shoelace area of outer rings is above 0, of holes below."""
    holes = 0
    for run in (on_the_map, in_a_plane):
        polygons = rings(json.loads(thiessen_text(run)))
        assert polygons
        for outer, *inner in polygons:
            assert outer[0] == outer[-1]
            assert shoelace(np.array(outer[:-1])) > 0
            holes += len(inner)
            assert all(shoelace(np.array(hole[:-1])) < 0 for hole in inner)
    # A's polygon has the hole in the western half and in the union.
    assert holes == 2


def test_positions_are_longitude_and_latitude_in_the_basins_box(on_the_map: StormRun) -> None:
    """RFC 7946, sections 3.1.1 and 4: longitude first, WGS 84 degrees; pieces reach the box of the basins, not over."""
    polygons = rings(json.loads(thiessen_text(on_the_map)))
    corners = np.array([place for polygon in polygons for ring in polygon for place in ring])
    assert corners.shape[1] == 2
    assert corners.min(axis=0) == pytest.approx([10.0, 50.0], abs=1e-6)
    assert corners.max(axis=0) == pytest.approx([11.0, 51.0], abs=1e-6)


@pytest.mark.parametrize("which", ["on_the_map", "in_a_plane"])
def test_no_foreign_coordinates_or_crs(which: str, request: pytest.FixtureRequest) -> None:
    """RFC 7946, sections 4 and 7.1: no `crs`, and no member of a geometry in a feature or the collection."""
    run: StormRun = request.getfixturevalue(which)
    document = json.loads(thiessen_text(run))
    assert document["type"] == "FeatureCollection"
    for one in document["features"]:
        assert set(one) == {"type", "properties", "geometry"}
        assert set(one["geometry"]) == {"type", "coordinates"}
    assert set(document) - {"plane"} == {"type", "features"}
    assert not {"coordinates", "geometries", "geometry", "properties", "crs"} & set(document)


def test_a_local_plane_is_said(on_the_map: StormRun, in_a_plane: StormRun) -> None:
    """Positions that are metres of a plane without a map say so; those on the map need no such word."""
    local = json.loads(thiessen_text(in_a_plane))
    assert local["plane"] == "local, metres"
    assert np.array([p for polygon in rings(local) for ring in polygon for p in ring]).max() == 10_000
    assert "plane" not in json.loads(thiessen_text(on_the_map))


def test_every_polygon_has_its_basin_gauge_area_and_weight(in_a_plane: StormRun) -> None:
    """The square's weights .500, .425 and .075, its areas 50, 42.5 and 7.5 km² by shoelace over the drawn rings."""
    document = json.loads(thiessen_text(in_a_plane))
    union = {f["properties"]["gauge"]: f for f in document["features"] if f["properties"]["basin"] == "union"}
    assert sorted(union) == ["A", "B", "C"]
    for gauge, weight in (("A", 0.5), ("B", 0.425), ("C", 0.075)):
        properties = union[gauge]["properties"]
        assert properties["weight"] == pytest.approx(weight)
        assert (properties["area"], properties["area_unit"]) == (pytest.approx(100 * weight), "km2")
        drawn = sum(shoelace(np.array(ring[:-1])) for p in rings({"features": [union[gauge]]}) for ring in p)
        assert drawn / 1e6 == pytest.approx(100 * weight)


def test_all_files_are_written_and_listed(in_a_plane: StormRun, tmp_path: Path) -> None:
    """The folder has what the record lists and the record itself; a table read back is the run's."""
    assert write_run(in_a_plane, str(tmp_path / "out")) == tmp_path / "out"
    names = {path.name for path in (tmp_path / "out").iterdir()}
    document = json.loads((tmp_path / "out" / "record.json").read_text(encoding="utf-8"))
    assert names == {*document["files"], "record.json"}
    assert {"basin_means.csv", "weights.csv", "thiessen.geojson", "report.html"} <= names
    pd.testing.assert_frame_equal(pd.read_csv(tmp_path / "out" / "basin_means.csv"), in_a_plane.basin_means)
    assert (tmp_path / "out" / "thiessen.geojson").read_text(encoding="utf-8") == thiessen_text(in_a_plane)

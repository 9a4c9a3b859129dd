"""The sample design: its table is what the script makes, its depths are those of other means, its files are whole."""

from __future__ import annotations

import subprocess
import sys
from functools import cache
from itertools import pairwise, product
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pandas as pd
import pytest
import shapely

from basinrain.design_job import run_design
from basinrain.jobfile import read_design_job
from basinrain.results_design import DesignRun

Floats = npt.NDArray[np.float64]

DEMO = Path(__file__).parents[1] / "demo_basins"
DESIGN = DEMO / "design"


@cache
def designed() -> DesignRun:
    return run_design(DESIGN / "job.toml")


def test_depths_of_the_design_are_what_the_script_makes(tmp_path: Path) -> None:
    """Run again, the script writes exactly the table that lies there, and nothing else."""
    subprocess.run([sys.executable, str(DEMO / "make_depths.py"), str(tmp_path)], check=True)
    assert [path.name for path in tmp_path.iterdir()] == ["depths.csv"]
    assert (tmp_path / "depths.csv").read_bytes() == (DESIGN / "depths.csv").read_bytes()


def test_depths_of_the_design_can_be() -> None:
    """Four points, ten durations, six probabilities: deeper when longer or rarer, less intense when longer."""
    table = pd.read_csv(DESIGN / "depths.csv")
    table["hours"] = pd.to_timedelta(table["duration"]) / pd.Timedelta(hours=1)
    cube = table.pivot_table(index=["point", "hours"], columns="aep", values="depth_mm", sort=True)
    assert cube.shape == (4 * 10, 6)
    assert (np.diff(cube.to_numpy(), axis=1) < 0).all()  # the columns rise from 0.01 to 0.5
    for _, rows in cube.groupby(level="point"):
        assert (np.diff(rows.to_numpy(), axis=0) > 0).all()
        intensity = rows.to_numpy() / rows.index.get_level_values("hours").to_numpy()[:, None]
        assert (np.diff(intensity, axis=0) < 0).all()


def test_the_design_of_the_demo() -> None:
    """Two points of interest, three probabilities, two durations; the observed pattern at 24 h alone; both storms."""
    run = designed()
    areal = run.design_depths.set_index(["point", "aep", "duration"])["areal_depth"].round(1)
    assert areal.to_dict() == {
        ("Teskel Bridge", 0.5, "6h"): 31.1,
        ("Teskel Bridge", 0.5, "24h"): 52.1,
        ("Teskel Bridge", 0.1, "6h"): 47.7,
        ("Teskel Bridge", 0.1, "24h"): 79.8,
        ("Teskel Bridge", 0.01, "6h"): 69.5,
        ("Teskel Bridge", 0.01, "24h"): 116.4,
        ("Ormavel Mouth", 0.5, "6h"): 27.1,
        ("Ormavel Mouth", 0.5, "24h"): 47.0,
        ("Ormavel Mouth", 0.1, "6h"): 41.5,
        ("Ormavel Mouth", 0.1, "24h"): 72.0,
        ("Ormavel Mouth", 0.01, "6h"): 60.5,
        ("Ormavel Mouth", 0.01, "24h"): 105.0,
    }
    storms = run.design_storms
    assert len(storms) == (2 + 4) * 3 * (2 + 3)
    assert storms[storms["pattern"] == "as the October front"]["duration"].unique().tolist() == ["24h"]
    volumes = storms.groupby(["point", "aep", "duration", "pattern"])["volume"].sum()
    for row in run.design_depths.to_dict("records"):
        case = (row["point"], row["aep"], row["duration"])
        for volume in volumes.loc[case]:
            assert volume == pytest.approx(row["areal_depth"] * row["area"] * 1e3, rel=1e-9)
    assert [found.storm for found in run.rarities] == ["October front", "Following wave"]
    front, wave = run.rarities
    assert "1 in 5 and 1 in 10 a year" in front.sentences[0]
    assert "over OV1 in 12 h" in front.sentences[0]
    assert wave.sentences[0].startswith("None of the depths compared is within the table")


def test_the_design_reads_what_it_names_and_needs_no_gauges_for_the_rest() -> None:
    """Without the observed pattern and the rarity the same depths come from the polygons and the table alone."""
    job = read_design_job(DESIGN / "job.toml")
    assert sorted(Path(name).name for name in designed().inputs) == [
        "basins.geojson",
        "depths.csv",
        "gauges.csv",
        "rain_daily.csv",
        "rain_hourly.csv",
    ]
    assert job.design is not None
    bare = job.design.model_copy(update={"rarity": None, "pattern": job.design.pattern[:2]})
    run = run_design(job.model_copy(update={"design": bare}))
    assert sorted(Path(name).name for name in run.inputs) == ["basins.geojson", "depths.csv"]
    pd.testing.assert_frame_equal(run.design_depths, designed().design_depths)
    assert run.rarities == ()


# The demo by other means: half planes for Thiessen, NumPy for the rest.


def thiessen(points: Floats, area: Any) -> Floats:  # noqa: ANN401 - a polygon
    """Return the share of an area that is nearest to each point, by cutting away what is nearer to another."""
    shares = []
    for k, one in enumerate(points):
        part = area
        for j, other in enumerate(points):
            if j != k:
                middle, along = (one + other) / 2, (other - one) / np.hypot(*(other - one))
                across = np.array([-along[1], along[0]])
                corners = [middle + 1e6 * across, middle - 1e6 * across]
                part = part.intersection(
                    shapely.Polygon([*corners, corners[1] - 1e6 * along, corners[0] - 1e6 * along])
                )
        shares.append(part.area / area.area)
    return np.array(shares)


def reduction(area: float, minutes: Floats) -> Floats:
    """Return the areal reduction of the demo's job: its formula, with its coefficients."""
    return np.asarray(1 - (1 - np.exp(-0.0028 * area / 1e6)) * np.exp(-0.90 * (minutes / 60) ** 0.27))


def test_the_demo_by_other_means() -> None:
    """Weights by half planes, straight lines on logarithms, the formula, nesting by sorting: all to 1e-6."""
    demo = designed()
    frame = gpd.read_file(DEMO / "basins.geojson").set_index("basin").to_crs(demo.plane.crs)
    table = pd.read_csv(DESIGN / "depths.csv")
    table["minutes"] = pd.to_timedelta(table["duration"]).dt.total_seconds() / 60
    names = table["point"].unique().tolist()
    at = table.drop_duplicates("point")
    positions = gpd.GeoSeries.from_xy(at["lon"], at["lat"], crs="EPSG:4326").to_crs(demo.plane.crs)
    places = np.column_stack([positions.x, positions.y])
    steps = np.arange(30.0, 1441, 30)
    above = {"Teskel Bridge": ["OV1", "OV2"], "Ormavel Mouth": ["OV1", "OV2", "OV3", "OV4"]}
    areal = demo.design_depths.set_index(["point", "aep", "duration"])["areal_depth"]
    hyetographs = demo.design_hyetographs.set_index(["point", "aep", "duration", "pattern", "basin"])["depth"]

    def point_depths(aep: float, minutes: Floats) -> Floats:
        curves = [table[(table["point"] == name) & (table["aep"] == aep)] for name in names]
        return np.array(
            [np.exp(np.interp(np.log(minutes), np.log(c["minutes"]), np.log(c["depth_mm"]))) for c in curves]
        )

    for (point, basins), aep, hours in product(above.items(), (0.5, 0.1, 0.01), (6, 24)):
        whole = frame.geometry.loc[basins].union_all()
        minutes = steps[steps <= 60 * hours]
        own = {basin: thiessen(places, frame.geometry[basin]) @ point_depths(aep, minutes) for basin in basins}
        curve = thiessen(places, whole) @ point_depths(aep, minutes) * 1.1 * reduction(whole.area, minutes)
        assert areal[point, aep, f"{hours}h"] == pytest.approx(curve[-1], rel=1e-6)
        fallen = np.sort(np.diff(curve, prepend=0))[::-1]
        middle, nested = len(fallen) // 2 - 1, np.zeros(len(fallen))
        for rank, depth in enumerate(fallen):
            nested[middle + (rank + 1) // 2 * (1 if rank % 2 else -1)] = depth
        volume = sum(own[basin][-1] * frame.geometry[basin].area for basin in basins)
        for basin in basins:
            share = own[basin][-1] * whole.area / volume
            found = hyetographs[point, aep, f"{hours}h", "nested", basin].to_numpy()
            np.testing.assert_allclose(found, nested * share, rtol=1e-6)
            # The corner at three quarters and the ends of all steps are among the places, so that this is exact.
            late = np.interp(np.linspace(0, 1, 4801), [0, 0.75, 1], [0, 1, 0])
            triangle = np.concatenate([[0], np.cumsum(late[1:] + late[:-1])])[:: 4800 // len(fallen)]
            found = hyetographs[point, aep, f"{hours}h", "triangular", basin].to_numpy()
            np.testing.assert_allclose(found, np.diff(triangle) / triangle[-1] * curve[-1] * share, rtol=1e-6)


def test_the_demo_s_weights_on_a_fine_grid() -> None:
    """Counting the squares of a grid of 100 m by their nearest point gives the weights to a few in a thousand."""
    demo = designed()
    frame = gpd.read_file(DEMO / "basins.geojson").set_index("basin").to_crs(demo.plane.crs)
    at = pd.read_csv(DESIGN / "depths.csv").drop_duplicates("point")
    positions = gpd.GeoSeries.from_xy(at["lon"], at["lat"], crs="EPSG:4326").to_crs(demo.plane.crs)
    west, south, east, north = frame.total_bounds
    x, y = (grid.ravel() for grid in np.meshgrid(np.arange(west, east, 100), np.arange(south, north, 100)))
    nearest = np.argmin([(x - point.x) ** 2 + (y - point.y) ** 2 for point in positions], axis=0)
    found = demo.point_weights.pivot_table(index="area_of", columns="depth_point", values="weight").fillna(0)
    for basin, polygon in frame.geometry.items():
        inside = shapely.contains_xy(polygon, x, y)
        counted = np.bincount(nearest[inside], minlength=len(at)) / inside.sum()
        np.testing.assert_allclose(found.loc[basin, at["point"].tolist()], counted, atol=4e-3)


def test_nested_depths_of_the_demo_are_inside_each_other() -> None:
    """The greatest 6 h of the nested 24 h over the whole have the areal depth of 6 h, and all 24 h theirs."""
    demo = designed()
    areal = demo.design_depths.set_index(["point", "aep", "duration"])["areal_depth"]
    table = demo.design_hyetographs
    areas = dict(zip(demo.basins.ids, demo.basins.areas, strict=True))
    for point, aep in product(("Teskel Bridge", "Ormavel Mouth"), (0.5, 0.1, 0.01)):
        rows = table[
            (table["point"] == point)
            & (table["aep"] == aep)
            & (table["duration"] == "24h")
            & (table["pattern"] == "nested")
        ]
        depth = rows.pivot_table(index="elapsed_min", columns="basin", values="depth")
        own = np.array([areas[str(basin)] for basin in depth])
        mean = pd.Series(depth.to_numpy() @ own / own.sum())
        assert mean.rolling(12).sum().max() == pytest.approx(areal[point, aep, "6h"], rel=1e-9)
        assert mean.sum() == pytest.approx(areal[point, aep, "24h"], rel=1e-9)


def test_depths_of_the_demo_grow_with_duration_and_rarity() -> None:
    """Rarer is deeper, longer is deeper, and a larger area has less of it."""
    demo = designed()
    areal = demo.design_depths.set_index(["point", "duration", "aep"])["areal_depth"]
    for point, duration in product(("Teskel Bridge", "Ormavel Mouth"), ("6h", "24h")):
        rising = [areal[point, duration, aep] for aep in (0.5, 0.1, 0.01)]
        assert all(a < b for a, b in pairwise(rising))
    for aep in (0.5, 0.1, 0.01):
        assert (
            areal["Ormavel Mouth", "6h", aep] < areal["Teskel Bridge", "6h", aep] < areal["Teskel Bridge", "24h", aep]
        )

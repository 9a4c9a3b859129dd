"""Whole runs on open data, against figures that were computed independently of this package."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest

from basinrain.job import run_storm
from basinrain.jobfile import parse_job
from basinrain.results import StormRun

DATA = Path(__file__).parent / "data"


def oahu(tmp_path: Path, **infill: object) -> StormRun:
    """Run the day of 25 July 2016; normals are each gauge's own mean, positions planar, all reporting gauges donate."""
    folder = DATA / "oahu"
    rain = pd.read_csv(folder / "rain.csv", index_col=0)
    gauges = pd.read_csv(folder / "gauges.csv")
    gauges["normal"] = gauges["id"].map(rain.mean())
    gauges.drop(columns=["lon", "lat"]).to_csv(tmp_path / "gauges.csv", index=False)
    job = parse_job(
        {
            "job": {"name": "Oahu"},
            "gauges": {"file": str(tmp_path / "gauges.csv"), "crs": "local"},
            "rainfall": {"file": str(folder / "rain.csv"), "unit": "mm", "interval": "1d"},
            "basins": {"file": str(folder / "basin_xy.geojson"), "crs": "local"},
            "storm": {"name": "July", "start": "2016-07-25", "end": "2016-07-25"},
            "infill": {"scale": "step", "nearest": "all", "min_donors": 1, "longest_gap": 10000, **infill},
            "averaging": {"methods": ["thiessen"]},
        }
    )
    return run_storm(job)


@pytest.mark.parametrize(
    ("method", "mean"),
    [("station-average", 152.70), ("inverse-distance", 174.11), ("normal-ratio", 170.35)],
)
def test_oahu_day_by_infill_method(tmp_path: Path, method: str, mean: float) -> None:
    """Thiessen mean of 2016-07-25 by infill method, and 214.9 mm with weights rebuilt from the gauges that report.

    NOAA GHCN-Daily (public domain); figures computed independently by half-plane clipping.
    """
    run = oahu(tmp_path, method=method)
    (row,) = run.basin_means.to_dict("records")
    assert row["depth"] == pytest.approx(mean, abs=5e-3)
    assert row["depth_reporting_only"] == pytest.approx(214.9, abs=0.05)
    assert 0.5 < row["share_infilled"] < 0.9


def inch_over_the_yahara(tmp_path: Path, **basins: str) -> StormRun:
    (tmp_path / "gauges.csv").write_text("id,lon,lat\nA,-89.5,43.0\nB,-89.3,43.2\n")
    (tmp_path / "rain.csv").write_text("gauge,depth\nA,1\nB,1\n")
    job: dict[str, Any] = {
        "job": {"name": "One inch", "depth_unit": "mm"},
        "gauges": {"file": str(tmp_path / "gauges.csv")},
        "rainfall": {"file": str(tmp_path / "rain.csv"), "layout": "totals", "unit": "in"},
        "basins": basins,
        "averaging": {"methods": ["thiessen", "idw"], "idw": {"cell": 1000}},
    }
    if "crs" in basins:
        job["job"]["plane"] = basins["crs"]
    return run_storm(parse_job(job))


def test_inch_over_71_sub_basins_is_a_volume(tmp_path: Path) -> None:
    """25.4 mm over the 71 sub-basins of the Yahara is 33,563,688 m³ to 1 m³, in parts and by the union.

    USGS (r-cran-ncdfgeom, CC0), in its source's own plane, EPSG:5070; 8 polygons are invalid as shipped and repaired.
    Their edges drawn straight in longitude and latitude instead, as GeoJSON means them, enclose 3 m³ more (1e-7).
    """
    shipped = DATA / "polygons" / "yahara_71_subbasins.geojson"
    gpd.read_file(shipped).to_crs(5070).to_file(tmp_path / "source.gpkg", driver="GPKG")
    in_plane = inch_over_the_yahara(tmp_path, file=str(tmp_path / "source.gpkg"), crs="EPSG:5070")
    in_degrees = inch_over_the_yahara(tmp_path, file=str(shipped))
    for run, expected in ((in_plane, 33_563_688), (in_degrees, 33_563_691)):
        assert run.basins.ids == (*map(str, range(1, 72)), "union")
        assert sum(note.code == "basin-repaired" for note in run.notes) == 8
        for _, rows in run.basin_means.groupby("method"):
            volume = rows.set_index("basin")["volume"]
            assert volume.drop("union").sum() == pytest.approx(expected, abs=1)
            assert volume["union"] == pytest.approx(expected, abs=1)


@pytest.mark.open_data
def test_platte_means_beside_the_agencys_own() -> None:
    """Monthly means 1951-1997 follow NOAA's divisional means (nClimDiv, public domain): correlation and ratio.

    NOAA grids with elevation, so the figures are near, not equal: their method differs (from memory). A change of
    the figures stated here is a change of our numbers.
    """
    if "BASINRAIN_CO_PLATTE" not in os.environ:
        pytest.skip("BASINRAIN_CO_PLATTE does not name the folder of the Platte data, which has another licence")
    folder = Path(os.environ["BASINRAIN_CO_PLATTE"])
    job = parse_job(
        {
            "job": {"name": "Platte", "plane": "EPSG:5070"},
            "gauges": {"file": str(folder / "gauges.csv"), "crs": "EPSG:5070"},
            "rainfall": {"file": str(folder / "rain.csv"), "unit": "mm", "interval": "1mo"},
            "basins": {"file": str(folder / "basin_xy.geojson"), "crs": "EPSG:5070"},
            "infill": {"method": "inverse-distance", "scale": "step", "longest_gap": 40000},
            "averaging": {"methods": ["arithmetic", "thiessen"]},
        }
    )
    run = run_storm(job)
    stated = {"arithmetic": (0.969, 0.984), "thiessen": (0.992, 0.912)}  # in docs/verification.md
    agency = pd.read_csv(folder / "ref_series.csv")["noaa_0504"].to_numpy()
    for method, result in run.storms[0].depths.items():
        ours = result.depth[:, 0]
        known = ~np.isnan(agency)
        correlation = float(np.corrcoef(ours[known], agency[known])[0, 1])
        ratio = float(ours[known].sum() / agency[known].sum())
        assert (round(correlation, 3), round(ratio, 3)) == stated[method]

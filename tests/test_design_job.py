"""Whole runs of design storms: from every origin of depths to files, and one chain by other means."""

from __future__ import annotations

import re
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import shapely.affinity
import xarray as xr
from design_jobs import DEPTHS, QUARTERS, TWO_POINTS, US_REDUCTION, design_tables, write_design_job
from rasterfiles import write_asc

from basinrain.design_job import run_design
from basinrain.errors import JobError, MethodError
from basinrain.jobfile import read_design_job

CASE = ["point", "return_period", "duration"]


def many(folder: Path, **changes: Any) -> Path:  # noqa: ANN401 - values of a job
    """Write a job of two points of interest, two frequencies, three durations and three patterns over two points."""
    given: dict[str, Any] = {
        "unit": "km",
        "depths": TWO_POINTS.replace(
            "6h,2,40",
            "1h,2,20\nwest,2500,5000,1h,10,30\nwest,2500,5000,24h,2,60\n"
            "west,2500,5000,24h,10,90\nwest,2500,5000,6h,2,40",
        ).replace(
            "6h,2,60",
            "1h,2,25\neast,7500,5000,1h,10,40\n"
            "east,7500,5000,24h,2,80\neast,7500,5000,24h,10,110\neast,7500,5000,6h,2,60",
        ),
        "design__depths": design_tables()["design"]["depths"] | {"crs": "local"},
        "design__return_periods": [2, 10],
        "design__durations": ["3h", "6h", "24h"],
        "design__areal_reduction": US_REDUCTION,
        "design__point": [
            {"name": "ford", "basins": ["nw", "ne"]},
            {"name": "mouth", "basins": ["nw", "ne", "sw", "se"]},
        ],
        "design__pattern": [
            {"shape": "uniform"},
            {"shape": "nrcs-type-ii", "durations": ["24h"]},
            {"shape": "triangular", "peak": 0.3},
        ],
    }
    return write_design_job(folder, **(given | changes))


def test_every_hyetograph_sums_to_the_areal_depth_of_its_row(tmp_path: Path) -> None:
    """With one depth for all basins every one of them has that of design_depths, in steps and as a total."""
    run = run_design(many(tmp_path))
    areal = run.design_depths.set_index(CASE)["areal_depth"]
    assert len(areal) == 2 * 2 * 3
    sums = run.design_hyetographs.groupby([*CASE, "pattern", "basin"], sort=False)
    assert len(sums) == (2 + 4) * 2 * (3 + 3 + 1)
    for case, total in sums["depth"].sum().items():
        assert total == pytest.approx(areal[case[:3]], rel=1e-9)  # type: ignore[index]
    for case, last in sums["cumulative"].last().items():
        assert last == pytest.approx(areal[case[:3]], rel=1e-9)  # type: ignore[index]
    storms = run.design_storms
    for row in storms.to_dict("records"):
        assert row["depth"] == pytest.approx(areal[tuple(row[name] for name in CASE)], rel=1e-9)
        assert row["volume"] == pytest.approx(row["depth"] * 25e3, rel=1e-9)


def test_links_multiply_to_the_areal_depth(tmp_path: Path) -> None:
    """Point depth times factor for intervals, uplift and reduction; the point depths are half west and half east."""
    uplift = {"factor": 1.2, "source": "invented", "horizon": "2080"}
    depths = design_tables()["design"]["depths"] | {
        "crs": "local",
        "interval_factor": "weiss",
        "observed_every": "1h",
    }
    run = run_design(many(tmp_path, design__uplift=uplift, design__depths=depths))
    table = run.design_depths
    product_of = table["point_depth"] * table["interval_factor"] * table["uplift"] * table["reduction"]
    np.testing.assert_allclose(table["areal_depth"], product_of, rtol=1e-12)
    six = table[table["duration"] == "6h"].set_index(["point", "return_period"])
    assert six["point_depth"].to_dict() == pytest.approx(
        {("ford", 2.0): 50, ("ford", 10.0): 70, ("mouth", 2.0): 50, ("mouth", 10.0): 70}
    )
    # Weiss (1964): 8n / (8n - 1) of n = 6 intervals.
    assert six["interval_factor"].unique().tolist() == pytest.approx([48 / 47])
    assert six["uplift"].unique().tolist() == [1.2]
    assert six["area"].to_dict() == pytest.approx(
        {(point, years): area for point, area in (("ford", 50), ("mouth", 100)) for years in (2.0, 10.0)}
    )


@pytest.mark.parametrize("shape", ["uniform", "triangular"])
def test_volumes_of_basins_with_their_own_depths_add_up(tmp_path: Path, shape: str) -> None:
    """The west's basins get less than the east's in proportion to their points; the whole keeps depth times area."""
    run = run_design(many(tmp_path, design__sub_basins="own-depth", design__pattern=[{"shape": shape}]))
    storms = run.design_storms.set_index([*CASE, "basin"]).sort_index()
    for row in run.design_depths.to_dict("records"):
        case = tuple(row[name] for name in CASE)
        assert storms.loc[case, "volume"].sum() == pytest.approx(row["areal_depth"] * row["area"] * 1e3, rel=1e-12)
    depth = storms["depth"]
    assert depth["mouth", 10.0, "6h", "sw"] / depth["mouth", 10.0, "6h", "se"] == pytest.approx(60 / 80)


def test_basins_reduced_by_their_own_area_are_more_than_the_whole(tmp_path: Path) -> None:
    """Each quarter has the reduction of its 25 km2, and a warning says that they belong to no one storm."""
    run = run_design(many(tmp_path, design__areal_reduction=US_REDUCTION | {"area": "own"}))
    single = run_design(
        many(tmp_path / "one", design__point=[{"name": "gate", "basins": ["nw"]}], design__areal_reduction=US_REDUCTION)
    )
    wanted = single.design_depths.set_index(CASE)["reduction"]
    for row in run.design_storms.to_dict("records"):
        assert row["reduction"] == pytest.approx(wanted["gate", row["return_period"], row["duration"]], rel=1e-12)
    whole = run_design(many(tmp_path / "whole", design__areal_reduction=US_REDUCTION))
    areal = whole.design_depths.set_index(CASE)["areal_depth"]
    totals = run.design_storms[run.design_storms["point"] == "mouth"]
    assert all(row["depth"] > areal[tuple(row[name] for name in CASE)] for row in totals.to_dict("records"))
    assert "own-area" in {note.code for note in run.warnings}


def test_by_own_area_every_basin_has_a_chain_of_its_own(tmp_path: Path) -> None:
    """One row a basin; its area decides, and a union beyond the method's range is not asked."""
    # Four squares of 144 square miles are 576 together: more than the 400 that the method reaches to.
    squares = {name: shapely.affinity.scale(square, 2.4, 2.4, origin=(0, 0)) for name, square in QUARTERS.items()}
    run = run_design(
        write_design_job(tmp_path, squares=squares, design__areal_reduction=US_REDUCTION | {"area": "own"})
    )
    table = run.design_depths[run.design_depths["duration"] == "6h"]
    assert table["basin"].tolist() == list(squares)
    assert table["area"].to_numpy() == pytest.approx(144.0)
    storms = run.design_storms.set_index("basin")["depth"]
    assert table.set_index("basin")["areal_depth"].to_dict() == pytest.approx(storms.to_dict())
    with pytest.raises(MethodError, match=r"found 1491.83 km² \(576 mi²\)"):
        run_design(write_design_job(tmp_path / "whole", squares=squares, design__areal_reduction=US_REDUCTION))


def test_every_format_reads_back_to_the_hyetographs(tmp_path: Path) -> None:
    """CSV, a CSV for every basin, Parquet and NetCDF hold what the run has, to the last digit."""
    formats = ["csv", "csv-per-basin", "parquet", "netcdf"]
    run = run_design(many(tmp_path, design__formats=formats, design__start="2031-05-04T06:00"))
    folder = run.write(tmp_path / "written")
    wanted = run.design_hyetographs
    table = pd.read_csv(folder / "design_hyetographs.csv")
    pd.testing.assert_frame_equal(table.drop(columns="time"), wanted, check_dtype=False)
    parquet = pd.read_parquet(folder / "design_hyetographs.parquet")
    assert parquet.columns.tolist() == table.columns.tolist()
    for name in wanted:
        assert parquet[name].tolist() == wanted[name].tolist()
    start = np.datetime64("2031-05-04T06:00")
    times = start + wanted["elapsed_min"].to_numpy() * np.timedelta64(1, "m")
    assert (parquet["time"].to_numpy() == times).all()
    assert (pd.to_datetime(table["time"]).to_numpy() == times).all()
    index = pd.read_csv(folder / "hyetographs" / "index.csv")
    assert len(index) == (2 + 4) * 3
    with xr.open_dataset(folder / "design_hyetographs.nc") as nc:
        basins = nc["basin_id"].values.astype(str).tolist()
        cases = list(
            zip(
                nc["point"].values.astype(str),
                nc["return_period"].values,
                nc["pattern"].values.astype(str),
                strict=True,
            )
        )
        for key, rows in wanted.groupby(["point", "return_period", "pattern", "duration", "basin"]):
            point, years, pattern, duration, basin = map(str, key)
            steps = len(rows)
            (entry,) = index[
                (index["point"] == point) & (index["basin"] == basin) & (index["duration"] == duration)
            ].to_dict("records")
            own = pd.read_csv(folder / "hyetographs" / entry["file"])
            column = f"depth_aep_{1 / float(years):g}_{pattern}"
            assert own[column].tolist() == rows["depth"].tolist()
            assert own["elapsed_min"].tolist() == rows["elapsed_min"].tolist()
            found = [
                k
                for k, case in enumerate(cases)
                if case == (point, float(years), pattern)
                and int(
                    nc["duration"].dt.total_seconds()[k] if nc["duration"].dtype.kind == "m" else 60 * nc["duration"][k]
                )
                == 3600 * steps
            ]
            assert len(found) == 1
            depth = nc["depth"].values[found[0], :, basins.index(basin)]
            assert depth[:steps].tolist() == rows["depth"].tolist()
            assert np.isnan(depth[steps:]).all()


def test_without_a_start_only_elapsed_time_is_written(tmp_path: Path) -> None:
    """A design storm has no date unless the job gives one."""
    folder = run_design(many(tmp_path)).write(tmp_path / "written")
    head = (folder / "design_hyetographs.csv").read_text(encoding="utf-8").splitlines()[0]
    assert "elapsed_min" in head
    assert "time" not in head.split(",")


def test_the_same_job_gives_the_same_bytes(tmp_path: Path) -> None:
    """Nothing that is written depends on when."""
    job = many(tmp_path, design__formats=["csv", "csv-per-basin", "parquet", "netcdf"])
    written = []
    for name in ("one", "two"):
        folder = run_design(job).write(tmp_path / name)
        files = sorted(path for path in folder.rglob("*") if path.is_file())
        written.append({str(path.relative_to(folder)): path.read_bytes() for path in files})
    assert written[0] == written[1]
    assert len(written[0]) == 1 + 4 + 1 + 2 + 2 + (2 + 4) * 3


def test_gauges_are_not_read_unless_something_asks_for_them(tmp_path: Path) -> None:
    """Neither a job without gauges nor one whose gauges' files are missing needs them for depths of a table."""
    without = run_design(write_design_job(tmp_path / "without"))
    job = write_design_job(
        tmp_path / "missing",
        gauges={"file": "nowhere.csv", "crs": "local"},
        rainfall=[{"file": "nowhere too.csv", "unit": "mm", "interval": "1h"}],
    )
    missing = run_design(job)
    pd.testing.assert_frame_equal(without.design_storms, missing.design_storms)
    assert sorted(missing.inputs) == ["basins.geojson", "depths.csv"]
    assert "infill" not in missing.settings or missing.from_record is None
    assert missing.zone == ""


@pytest.mark.parametrize("gauged", [False, True])
def test_a_job_without_a_design_is_one_clear_line(tmp_path: Path, *, gauged: bool) -> None:
    """The table that is missing is named."""
    changes: dict[str, Any] = {"design": None}
    if gauged:
        changes |= {
            "gauges": {"file": "gauges.csv", "crs": "local"},
            "rainfall": [{"file": "rain.csv", "unit": "mm", "interval": "1h"}],
        }
    text = "[design]: found no such table; expected it to be given"
    with pytest.raises(JobError, match=rf"(^|/job\.toml: ){re.escape(text)}[^\n]*; add it$"):
        run_design(write_design_job(tmp_path, **changes))


def test_inches_and_square_miles(tmp_path: Path) -> None:
    """2.5 in of a table in inches over 25 square miles: the same in every table, 53 1/3 acre-feet an inch and mile."""
    text = DEPTHS.replace("60\n24h", "2.5\n24h").replace("20\n", "1\n").replace("30\n", "1.2\n").replace("40\n", "2\n")
    depths = design_tables()["design"]["depths"] | {"unit": "in"}
    run = run_design(
        write_design_job(
            tmp_path,
            depths=text.replace("24h,2,60", "24h,2,3").replace("24h,10,90", "24h,10,4"),
            job={"name": "Four squares", "depth_unit": "in", "area_unit": "mi2"},
            design__depths=depths,
        )
    )
    (row,) = run.design_depths.to_dict("records")
    assert (row["depth_unit"], row["area_unit"]) == ("in", "mi2")
    assert row["area"] == pytest.approx(100)
    assert row["point_depth"] == pytest.approx(2.5)
    storms = run.design_storms
    assert storms["volume"].tolist() == pytest.approx([2.5 * 25 * 640 / 12] * 4)
    assert storms["volume_unit"].unique().tolist() == ["acre-ft"]
    assert storms["peak_intensity"].tolist() == pytest.approx([2.5 / 6] * 4)
    assert storms["intensity_unit"].unique().tolist() == ["in/h"]
    assert run.design_hyetographs["depth"].tolist() == pytest.approx([2.5 / 6] * 24)


def test_nominal_start_is_that_of_every_storm(tmp_path: Path) -> None:
    """The first step of two hours ends two hours after the start, whatever the duration; a clock is no part of it."""
    job = write_design_job(
        tmp_path, design__start="2031-12-31T23:00", design__step="2h", design__durations=["2h", "6h"]
    )
    folder = run_design(job).write(tmp_path / "written")
    table = pd.read_csv(folder / "design_hyetographs.csv")
    assert table[table["basin"] == "nw"]["time"].tolist() == [
        "2032-01-01T01:00",
        "2032-01-01T01:00",
        "2032-01-01T03:00",
        "2032-01-01T05:00",
    ]


def test_depths_of_rasters(tmp_path: Path) -> None:
    """Two columns of cells of 5 km: the left has 40 to 60 mm, the right 50 to 90; halves of the whole and quarters."""
    asked = {
        "from": "rasters",
        "unit": "mm",
        "series": "annual-maximum",
        "source": "invented",
        "date": "2031",
        "crs": "local",
    }
    files = [
        {"file": f"{k}.asc", "duration": duration, "return_period": years}
        for k, (duration, years) in enumerate(product(("1h", "6h"), (2, 10)))
    ]
    job = write_design_job(
        tmp_path,
        unit="km",
        design__depths=asked | {"raster": files},
        design__return_periods=[2, 10],
        design__durations=["1h", "6h"],
        design__sub_basins="own-depth",
    )
    cells = {0: (20, 30), 1: (30, 50), 2: (40, 50), 3: (60, 90)}
    for k, row in cells.items():
        write_asc(tmp_path / f"{k}.asc", [row, row], cell=5000.0)
    run = run_design(job)
    depths = run.design_depths.set_index(["duration", "return_period"])["areal_depth"]
    assert depths.to_dict() == pytest.approx({("1h", 2.0): 25, ("1h", 10.0): 40, ("6h", 2.0): 45, ("6h", 10.0): 75})
    own = run.design_storms.set_index(["duration", "return_period", "basin"])["depth"].sort_index()
    assert own["6h", 10.0].to_dict() == pytest.approx({"nw": 60, "ne": 90, "sw": 60, "se": 90})
    weights = run.point_weights
    assert weights[weights["area_of"] == "union"]["weight"].tolist() == pytest.approx([0.25] * 4)
    assert set(run.inputs) == {"basins.geojson", "0.asc", "1.asc", "2.asc", "3.asc"}


@pytest.mark.parametrize(
    ("equation", "coefficients", "depth"),
    [
        # The intensity is a / (t + b), in mm/h and minutes
        ("talbot", [{"a": 3000, "b": 20}, {"a": 4800, "b": 20}], 4800 / 80),
        # The intensity is k T^x / (t + b)^n
        ("sherman", [{"k": 600, "x": 0.2, "b": 10, "n": 0.7}], 600 * 10**0.2 / 70**0.7),
    ],
)
def test_depths_of_an_equation(
    tmp_path: Path, equation: str, coefficients: list[dict[str, float]], depth: float
) -> None:
    """60 min at 10 years: the intensity is the depth of the hour."""
    asked = {
        "from": "equation",
        "equation": equation,
        "coefficients": coefficients,
        "return_periods": [2, 10],
        "valid": ["5min", "3h"],
        "unit": "mm/h",
        "duration_unit": "min",
        "series": "annual-maximum",
        "source": "invented",
        "date": "2031",
    }
    job = write_design_job(
        tmp_path,
        design__depths=asked,
        design__durations=["1h"],
        design__step="5min",
        design__pattern=[{"shape": "alternating-block"}],
    )
    run = run_design(job)
    assert run.design_depths["areal_depth"].item() == pytest.approx(depth, rel=1e-9)
    one = run.design_hyetographs[run.design_hyetographs["basin"] == "nw"]
    assert one["depth"].sum() == pytest.approx(depth, rel=1e-9)
    with pytest.raises(
        MethodError, match=r"^union, AEP 0\.1 \(1 in 10\): duration 4 ?h: found that the depths are of "
    ):
        run_design(job, ["design.durations=4h"])


def test_what_cannot_be_made_is_told_once_with_how_many_cases(tmp_path: Path) -> None:
    """A duration outside the table, at two points of interest and two frequencies: one line."""
    job = many(tmp_path, design__durations=["2d"], design__pattern=[{"shape": "uniform"}])
    text = r"ford, AEP 0\.5 \(1 in 2\) and 3 more: duration 48 h: found that the depths are of 1 h to 24 h; [^\n]*"
    with pytest.raises(MethodError, match=f"^{text}$"):
        run_design(job)


def test_a_point_with_a_short_name_is_named_in_the_line(tmp_path: Path) -> None:
    """A point called A is not taken for the A of AEP, nor is the line begun by a colon."""
    point = [{"name": "A", "basins": ["nw", "ne"]}]
    job = write_design_job(tmp_path, design__point=point, design__return_periods=[500])
    with pytest.raises(MethodError, match=r"^A: AEP 0\.002 \(1 in 500\): found that the depths are of AEP 0\.5"):
        run_design(job)


def test_a_point_of_interest_called_after_another_basin_is_refused(tmp_path: Path) -> None:
    """Results could not tell them apart; after its own basin it may be called."""
    points = [{"name": "nw", "basins": ["nw", "ne"]}]
    with pytest.raises(JobError, match=r"^\[\[design.point\]\] nw: found the id of a basin that is not all that lies"):
        run_design(write_design_job(tmp_path, design__point=points))
    points = [{"name": "nw", "basins": ["nw"]}, {"name": "all", "basins": ["ne", "nw"]}]
    run = run_design(write_design_job(tmp_path, design__point=points, design__formats=["csv", "netcdf"]))
    assert run.areas.names == ("nw", "all", "ne")
    assert run.design_storms[["point", "basin", "area"]].to_numpy().tolist() == [
        ["nw", "nw", pytest.approx(25)],
        ["all", "ne", pytest.approx(25)],
        ["all", "nw", pytest.approx(25)],
    ]
    with xr.open_dataset(run.write(tmp_path / "written") / "design_hyetographs.nc") as nc:
        assert sorted(nc["basin_id"].values.astype(str)) == ["ne", "nw"]


def test_settings_go_with_a_path_only(tmp_path: Path) -> None:
    """Beside a job that is resolved they are refused."""
    path = write_design_job(tmp_path)
    assert run_design(path, ["design.step=30min"]).asked.step == 30
    with pytest.raises(JobError, match="found settings beside a job that is already resolved"):
        run_design(read_design_job(path), ["design.step=30min"])


def test_a_job_gives_what_its_path_gives(tmp_path: Path) -> None:
    """A run given as a job gives what its path gives."""
    path = many(tmp_path)
    one, other = run_design(path), run_design(read_design_job(path))
    pd.testing.assert_frame_equal(one.design_hyetographs, other.design_hyetographs)

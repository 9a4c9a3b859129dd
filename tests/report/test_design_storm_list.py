from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely
from report.design_run import bare, make_design, two_halves

from basinrain.report.design_storm_list import depth_tables, hyetograph_tables, peak_tables
from basinrain.report.table import Table
from basinrain.report.words import DASH
from basinrain.results_design import DesignRun


def sums(table: Table) -> list[float]:
    """Return the sums of the printed columns."""
    return [round(sum(float(row[k]) for row in table.rows), 6) for k in range(1, len(table.heads))]


def test_depths_of_the_basins_by_hand() -> None:
    """72.59 mm over all: 60/70 of it in the west half, 80/70 in the east, 25 km² x 62.22 mm = 1.556 million m³."""
    _, mouth = depth_tables(two_halves())
    assert mouth.rows[5:10] == [
        ("6 h", "nw", "25.00", "41.5", "62.2", "1\u202f555\u202f515"),
        ("6 h", "ne", "25.00", "62.2", "83.0", "2\u202f074\u202f021"),
        ("6 h", "sw", "25.00", "41.5", "62.2", "1\u202f555\u202f515"),
        ("6 h", "se", "25.00", "62.2", "83.0", "2\u202f074\u202f021"),
        ("6 h", "mean by area", "100.0", "51.9", "72.6", "7\u202f259\u202f072"),
    ]
    assert mouth.notes == ("The mean by area is the areal depth to the point of interest in section 1.",)
    assert mouth.heads == ("duration", "basin", "area, km²", "1 in 2", "1 in 10", "1 in 10")
    assert mouth.over == (("", 3), ("depth, mm", 2), ("volume, m³", 1))


def test_each_basins_own_area_has_its_own_reduction(tmp_path: Path) -> None:
    """More than the areal depth to the point, and it is said so."""
    run = make_design(
        tmp_path, design__areal_reduction={"method": "leclerc-schaake", "area": "own"}, design__durations=["6h"]
    )
    _, mouth = depth_tables(run)
    assert mouth.heads[3] == "reduction"
    assert mouth.rows[-1][3] == DASH
    # 25 km² keep more of 77 mm than 100 km² do of them.
    assert float(mouth.rows[-1][5]) > 72.6
    assert mouth.notes[0].startswith("The mean by area is more than the areal depth")


def test_basins_that_overlap_have_no_mean_by_area(tmp_path: Path) -> None:
    """The volume of what they share would count twice."""
    squares = two_halves().areas.basins.polygons
    overlapping = {"big": squares[1], "nw": squares[2]}
    run = make_design(
        tmp_path,
        squares={name: _in_km(shape) for name, shape in overlapping.items()},
        design__point=[{"name": "mouth", "basins": ["big", "nw"]}],
    )
    (table,) = depth_tables(run)
    assert {row[1] for row in table.rows} == {"big", "nw"}
    assert table.notes == ()


def _in_km(shape: shapely.Geometry) -> shapely.Geometry:
    return shapely.transform(shape, lambda xy: xy / 1000)


def test_peaks_by_hand() -> None:
    """A triangle of 63.9 mm in 6 h that peaks in its middle: 5/18 in the third hour; uniform a sixth in every hour."""
    ford, mouth = peak_tables(two_halves())
    assert ford.rows[2] == ("6 h, triangular", "all", "63.9", "17.8", "17.8", "3:00")
    assert float(ford.rows[2][3]) == pytest.approx(63.929 * 5 / 18, abs=0.05)
    assert ford.rows[3] == ("6 h, uniform", "all", "63.9", "10.7", "10.7", "1:00")
    assert ford.caption == "ford: peaks at AEP 0.1 (1 in 10)"
    assert ("6 h, triangular", "ne", "83.0", "23.0", "23.0", "3:00") in mouth.rows


def test_intensity_is_by_the_hour(tmp_path: Path) -> None:
    """30 mm in an hour of 10 min steps, uniform: 5 mm a step, 30 mm/h."""
    run = make_design(
        tmp_path,
        design__durations=["1h"],
        design__step="10min",
        design__uplift=None,
        design__areal_reduction=None,
        design__pattern=[{"shape": "uniform"}],
    )
    ford = peak_tables(run)[0]
    assert ford.rows == [("1 h, uniform", "all", "30.0", "5.0", "30.0", "0:10")]
    assert ford.heads[3:5] == ("greatest in 10 min, mm", "intensity, mm/h")


def test_printed_hyetographs_sum_to_the_printed_total() -> None:
    """Of every pattern and basin, at the rarest frequency, over the longest duration that is short enough."""
    ford, mouth = hyetograph_tables(two_halves())
    assert ford.caption == "ford, 24 h: hyetographs of every basin above it at AEP 0.1 (1 in 10), mm in 1 h"
    assert len(ford.rows) == 24
    assert (ford.rows[0][0], ford.rows[-1][0]) == ("1:00", "24:00")
    for table in (ford, mouth):
        assert sums(table) == [float(cell) for cell in table.foot[0][1:]]
    assert mouth.over == (("", 1), ("triangular", 4), ("uniform", 4))
    assert mouth.heads[1:] == ("nw", "ne", "sw", "se") * 2
    assert mouth.foot[0][:3] == ("total", "96.2", "128.3")


def test_where_there_is_no_room_the_basin_with_the_greatest_depth_is_printed(tmp_path: Path) -> None:
    """Three patterns of four basins are too many columns."""
    run = make_design(
        tmp_path,
        design__sub_basins="own-depth",
        design__pattern=[
            {"shape": "uniform"},
            {"shape": "triangular", "peak": "late"},
            {"shape": "huff-1", "basis": "point"},
        ],
    )
    mouth = hyetograph_tables(run)[-1]
    assert mouth.caption.startswith("mouth, 24 h: hyetographs of basin ne at ")
    assert mouth.heads[1:] == ("uniform", "triangular", "huff-1")
    assert "Of 4 basins it has the greatest depth." in mouth.notes


def test_long_hyetographs_are_not_printed(tmp_path: Path) -> None:
    """24 h of 10 min are 144 steps: 6 h are printed instead; of 1 min not even these."""
    run = make_design(tmp_path / "ten", design__step="10min", design__depths__extrapolate=True)
    assert [table.caption[:9] for table in hyetograph_tables(run)] == ["ford, 6 h", "mouth, 6 "]
    run = make_design(tmp_path / "one", design__step="1min", design__depths__extrapolate=True)
    assert hyetograph_tables(run) == []


def test_a_pattern_for_some_durations_is_in_their_rows_only(tmp_path: Path) -> None:
    """A duration without any storm has no row."""
    run = make_design(tmp_path, design__pattern=[{"shape": "uniform", "durations": ["6h"]}])
    assert {row[0] for row in depth_tables(run)[0].rows} == {"6 h"}
    assert {row[0] for row in peak_tables(run)[0].rows} == {"6 h, uniform"}


def strips(folder: Path, **changes: Any) -> DesignRun:  # noqa: ANN401 - values of a job
    """Return a run of twenty strips of 10 km²."""
    squares = {f"B{k:02d}": shapely.box(k, 0, k + 1, 10) for k in range(20)}
    points = [{"name": "mouth", "basins": list(squares)}]
    return make_design(folder, squares=squares, design__point=points, **changes)


def test_many_basins_are_shortened(tmp_path: Path) -> None:
    """The first dozen, with the file that holds the others, and of their durations as many as leave a table short."""
    run = strips(tmp_path, design__sub_basins="own-depth", design__durations=[f"{h}h" for h in (1, 2, 3, 6, 24)])
    (depths,) = depth_tables(run)
    assert [(row[0], row[1]) for row in depths.rows[11:14]] == [("1 h", "B11"), ("1 h", "mean by area"), ("3 h", "B00")]
    assert len(depths.rows) == 3 * 13
    assert depths.notes[1] == "Shown: 3 of 5 durations; all are in design_storms.csv."
    assert depths.notes[2] == "8 more basins are in design_storms.csv."
    assert peak_tables(run)[0].notes[-1] == "8 more basins are in design_storms.csv."


def test_many_basins_of_one_depth_share_a_line(tmp_path: Path) -> None:
    """200 km² with the areal depth of 6 h at 10 years: 70 x 1.1 mm, reduced by the area of all of them."""
    run = strips(tmp_path)
    (depths,) = depth_tables(run)
    factor = 1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-0.01 * 200 / 2.589988110336))
    assert [row[:2] for row in depths.rows] == [(hours, "each of 20") for hours in ("1 h", "6 h", "24 h")]
    assert depths.rows[1][2] == "200.0"
    # The east point is the nearer one of three quarters of the strips.
    assert float(depths.rows[1][4]) == pytest.approx((0.25 * 60 + 0.75 * 80) * 1.1 * factor, abs=0.06)
    assert depths.notes == (
        "Every basin has the areal depth to the point of interest; area and volume are those of all.",
    )


def test_one_basin_has_no_mean() -> None:
    """Of the least job: four squares that all have 60 mm, told once."""
    assert [row[1] for row in peak_tables(bare())[0].rows] == ["all"]

from __future__ import annotations

from pathlib import Path

import pytest
from report.design_run import bare, make_design, two_halves

from basinrain.report.design_point_list import depths_table, point_sentences, weights_table
from basinrain.report.words import DASH


def test_point_depths_as_the_source_has_them() -> None:
    """At the durations and frequencies that the job asks, without uplift or reduction."""
    table = depths_table(two_halves())
    assert table.heads == ("depth point", "duration", "1 in 2", "1 in 10")
    assert table.rows[1] == ("west point", "6 h", "40.0", "60.0")
    assert table.rows[4] == ("east point", "6 h", "60.0", "80.0")
    assert table.notes == ()


def test_weights_of_every_point_in_every_area() -> None:
    """The west half is the west point's; both halves count alike in all of it; no weight is a dash, never 0.000."""
    table = weights_table(two_halves())
    assert table is not None
    assert table.heads == ("depth point", "ford", "mouth", "nw", "sw", "ne", "se")
    assert table.rows == [
        ("west point", "1.000", "0.500", "1.000", "1.000", DASH, DASH),
        ("east point", DASH, "0.500", DASH, DASH, "1.000", "1.000"),
    ]
    assert set(table.foot[0][1:]) == {"1.000"}


def test_one_point_has_no_weights() -> None:
    """It is said that its depth is that of every area."""
    assert weights_table(bare()) is None
    assert point_sentences(bare())[-1] == "There is one point: its depth is that of every area."


def test_what_the_source_covers_and_what_is_interpolated(tmp_path: Path) -> None:
    """3 h and 5 years lie between what is tabulated; 6 h and 10 years do not."""
    assert point_sentences(two_halves())[:2] == [
        "invented table, dated 2031: 2 points, 1 h to 24 h, AEP 0.5 (1 in 2) to AEP 0.1 (1 in 10).",
        "All durations and frequencies asked for are tabulated: no depth is interpolated.",
    ]
    run = make_design(tmp_path, design__durations=["3h", "6h"], design__return_periods=[5, 10])
    assert point_sentences(run)[1] == "Not tabulated, so interpolated: 3 h, AEP 0.2 (1 in 5)."


def test_patterns_made_from_depths_by_duration_take_interpolated_ones(tmp_path: Path) -> None:
    """A nested storm of 6 h in steps of an hour takes 2 to 5 h, which the table does not have."""
    pattern = [{"shape": "nested", "smooth": True}, {"shape": "uniform"}]
    run = make_design(tmp_path, design__durations=["6h"], design__pattern=pattern)
    assert point_sentences(run)[1] == (
        "All durations and frequencies asked for are tabulated; other durations, taken for nested, are interpolated."
    )


def test_extrapolation_is_said(tmp_path: Path) -> None:
    """Where the job allows it and something is beyond the table."""
    run = make_design(
        tmp_path, design__durations=["2d"], design__depths__extrapolate=True, design__areal_reduction=None
    )
    assert point_sentences(run)[1] == "Not tabulated, so interpolated or extrapolated: 48 h."


def test_an_equation_has_one_point(tmp_path: Path) -> None:
    """20 mm/h at 2 years over 1 h."""
    depths = {
        "from": "equation",
        "equation": "talbot",
        "coefficients": [{"a": 40.0, "b": 1.0}],
        "return_periods": [2],
        "valid": ["10min", "24h"],
        "unit": "mm/h",
        "duration_unit": "h",
        "series": "annual-maximum",
        "source": "invented",
        "date": "2031",
    }
    run = make_design(tmp_path, design__depths=depths, design__return_periods=[2])
    assert "Depths are the equation's intensity times the duration." in point_sentences(run)
    assert depths_table(run).rows[0] == ("equation", "1 h", "20.0")


@pytest.mark.parametrize("average", ["idw", "arithmetic"])
def test_of_many_points_those_that_count_most(tmp_path: Path, average: str) -> None:
    """A dozen, the others together, so that every column still sums to 1."""
    rows = [
        f"P{k:02d},{500 + 1000 * (k % 10)},{2500 + 5000 * (k // 10)},{hours}h,{years},{depth}"
        for k in range(20)
        for hours, years, depth in ((1, 2, 20), (1, 10, 30), (24, 2, 60), (24, 10, 90))
    ]
    run = make_design(
        tmp_path,
        depths="\n".join(["point,x,y,duration,return_period,depth", *rows]) + "\n",
        design__depths__average=average,
    )
    table = weights_table(run)
    assert table is not None
    assert len(table.rows) == 13
    assert table.rows[-1][0] == "8 others"
    for column in range(1, len(table.heads)):
        cells = [row[column] for row in table.rows if row[column] != DASH]
        assert round(sum(map(float, cells)), 6) == 1
    assert depths_table(run).notes == ("8 more points are in point_depths.csv.",)
    assert table.notes[-1] == "All areas and points are in point_weights.csv."

"""The tables of a run hang together: sums, units, statuses."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from tiny import JOB, RAIN, write_tiny

from basinrain.job import run_storm
from basinrain.results import StormRun

STORMS = """
[[storm]]
name = "all"

[[storm]]
name = "first half"
end = 2031-05-04T02:00:00
pattern = "C"
"""
GAPS = RAIN.replace("4,9,50", "4,,50").replace("5,10,30", "5,,30").replace("0,5,0", "0,,0")


@pytest.fixture(scope="module")
def run(tmp_path_factory: pytest.TempPathFactory) -> StormRun:
    folder = tmp_path_factory.mktemp("tables")
    return run_storm(write_tiny(folder, job=JOB + STORMS, rain=GAPS))


def keyed(frame: pd.DataFrame) -> pd.DataFrame:
    return frame.set_index([c for c in ("storm", "basin", "method") if c in frame])


def test_contributions_and_hyetographs_sum_to_the_mean(run: StormRun) -> None:
    """For every storm, basin and method both sums are the basin's depth, and the mass curve ends there."""
    depth = keyed(run.basin_means)["depth"]
    keys = ["storm", "basin", "method"]
    for total in (
        run.weights.groupby(keys)["contribution"].sum(),
        run.hyetographs.groupby(keys)["depth"].sum(),
        run.hyetographs.groupby(keys)["cumulative"].last(),
    ):
        pd.testing.assert_series_equal(total.reindex(depth.index), depth, check_names=False, rtol=1e-12)
    shares = run.weights.groupby(keys)["share"].sum()
    assert len(shares) == 18
    np.testing.assert_allclose(shares, 1.0, rtol=1e-12)


def test_the_comparison_sums_to_the_mean(run: StormRun) -> None:
    """In every storm and basin the contributions of each method sum to its mean, the shares to 1."""
    compared = run.weights_compared.groupby(["storm", "basin"])
    for method in run.methods:
        depth = run.basin_means[run.basin_means["method"] == method].set_index(["storm", "basin"])["depth"]
        total = compared[f"contribution_{method}"].sum()
        np.testing.assert_allclose(total.reindex(depth.index), depth, rtol=1e-12)
        np.testing.assert_allclose(compared[f"share_{method}"].sum(), 1.0, rtol=1e-12)


def test_a_donor_without_weight_is_listed(tmp_path: Path) -> None:
    """With the arithmetic mean alone, C outside the square has no weight, but B's estimate rests on it."""
    run = run_storm(
        write_tiny(tmp_path, job=JOB.replace("[averaging]", "[averaging]\nmethods = ['arithmetic']"), rain=GAPS)
    )
    (row,) = run.weights_compared.query("basin == 'union' and gauge == 'C'").to_dict("records")
    assert (row["arithmetic"], row["difference"]) == (0.0, 0.0)
    assert row["contribution_arithmetic"] == pytest.approx(0.5 * 0.671141 * 100, abs=1e-3)


def test_silent_gauge_by_hand(run: StormRun) -> None:
    """B reports one hour of four: its total comes from A (5 km away) and C (3.5 km), and is at least its own 6 mm.

    Weights 1/25 and 1/12.25 of A's 10 and C's 100 mm: (10/25 + 100/12.25) / (1/25 + 1/12.25) = 70.40 mm.
    """
    expected = (10 / 25 + 100 / 12.25) / (1 / 25 + 1 / 12.25)
    (total,) = run.gauge_totals.query("storm == 'all' and gauge == 'B'").to_dict("records")
    assert (total["status"], total["steps_observed"], total["steps_total"]) == ("partly infilled", 1, 4)
    assert total["depth"] == pytest.approx(expected)
    (row,) = run.infilled[run.infilled["storm"] == "all"].to_dict("records")
    assert (row["gauge"], row["time"], row["scale"], row["method"]) == ("B", "", "storm", "inverse-distance")
    assert row["donors"] == "A:0.328859 C:0.671141"
    assert row["depth"] == pytest.approx(expected)
    depths = run.gauge_depths.query("storm == 'all' and gauge == 'B'")
    assert depths["status"].tolist() == ["observed", "infilled", "infilled", "infilled"]
    # The rest beyond the observed 6 mm follows C, the nearest recorder: 50, 30 and 0 of 80 mm.
    assert depths["depth"].tolist() == pytest.approx([6, *((expected - 6) * np.array([50, 30, 0]) / 80)])


def test_storm_with_a_gauges_pattern(run: StormRun) -> None:
    """The hyetograph of a storm timed by C has C's shares, 20 and 50 of 70 mm."""
    rows = run.hyetographs.query("storm == 'first half' and basin == 'union' and method == 'thiessen'")
    assert (rows["depth"] / rows["depth"].sum()).tolist() == pytest.approx([20 / 70, 50 / 70])


def test_peak_ratio_is_peak_of_mean_over_mean_of_peaks(run: StormRun) -> None:
    """The ratio is the quotient of the two columns and never above 1 where weights are not negative."""
    table = run.storm_table
    np.testing.assert_allclose(table["peak_ratio"], table["peak_of_mean"] / table["mean_of_peaks"])
    assert (table["peak_ratio"] <= 1 + 1e-12).all()
    assert set(table["end"]) == {"2031-05-04T04:00", "2031-05-04T02:00"}


def test_inches_and_miles_are_the_same_rain(tmp_path: Path, run: StormRun) -> None:
    """25.4 mm = 1 in, 2.589988 km² = 1 mi², 1233.4818 m³ = 1 acre-ft: the same job gives the same rain."""
    job = (JOB + STORMS).replace('name = "Two halves"', 'name = "x"\ndepth_unit = "in"\narea_unit = "mi2"')
    inches = run_storm(write_tiny(tmp_path, job=job, rain=GAPS))
    ours, theirs = keyed(run.basin_means), keyed(inches.basin_means)
    np.testing.assert_allclose(theirs["depth"] * 25.4, ours["depth"])
    np.testing.assert_allclose(theirs["area"] * 2.589988110336, ours["area"])
    np.testing.assert_allclose(theirs["volume"] * 1233.48183754752, ours["volume"])
    assert set(theirs["volume_unit"]) == {"acre-ft"}
    np.testing.assert_allclose(inches.weights["contribution"] * 25.4, run.weights["contribution"])
    np.testing.assert_allclose(inches.gauge_depths["depth"] * 25.4, run.gauge_depths["depth"])


def test_a_method_without_a_number_is_blank_not_zero(tmp_path: Path) -> None:
    """With all gauges outside the basin, the arithmetic row has no depth, and the others have."""
    gauges = "id,x,y\nA,12,5\nB,14,5\nC,15,9\n"
    run = run_storm(write_tiny(tmp_path, gauges=gauges))
    means = keyed(run.basin_means).xs("union", level="basin")["depth"]
    assert np.isnan(means["whole record", "arithmetic"])
    assert means["whole record", "thiessen"] > 0
    assert "no-gauge-inside" in {note.code for note in run.warnings}
    run.write(tmp_path / "out")
    assert "whole record,union,arithmetic,,mm,100.0,km2,,m3,0," in (tmp_path / "out" / "basin_means.csv").read_text()

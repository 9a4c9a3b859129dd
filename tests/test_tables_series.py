"""Tables of a series run, on figures that can be followed by hand."""

from __future__ import annotations

from collections.abc import Hashable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tiny import JOB, write_tiny

from basinrain.results_series import SeriesRun
from basinrain.series_job import run_series

DAYS = JOB.replace('interval = "1h"', 'interval = "1d"')
# West is A's alone. B is out for two days, longer than the one that may be infilled.
RAIN = """date,A,B,C
2031-09-29,10,20,30
2031-09-30,0,0,0
2031-10-01,4,,8
2031-10-02,6,,2
2031-10-03,0,0,0
2031-10-04,,,
"""
SETTINGS = [
    "averaging.methods=thiessen",
    "infill.method=station-average",
    "infill.longest_gap=1",
    "series.gaps=['reweight', 'infill']",
    "series.durations=['1d', '2d']",
    "series.complete=0.001",
    "storms.dry_gap=1d",
]


@pytest.fixture(scope="module")
def run(tmp_path_factory: pytest.TempPathFactory) -> SeriesRun:
    return run_series(write_tiny(tmp_path_factory.mktemp("run"), rain=RAIN, job=DAYS), SETTINGS)


def row(frame: pd.DataFrame, **wanted: str) -> dict[Hashable, Any]:
    """Return the one row with these values."""
    for name, value in wanted.items():
        frame = frame[frame[name] == value]
    (found,) = frame.to_dict("records")
    return found


def test_means(run: SeriesRun) -> None:
    """West has A's 20 mm in five days; the sixth day, without any gauge, is missing."""
    west = row(run.series_means, basin="west", gaps="reweight")
    assert west["depth"] == pytest.approx(20)
    assert (west["steps"], west["steps_missing"], west["steps_infilled"], west["steps_reweighted"]) == (5, 1, 0, 0)
    # Five days are no year.
    assert np.isnan(west["mean_annual_of_steps"])
    assert west["observed_share"] == 1
    assert np.isnan(west["difference_percent"])


def test_difference_to_the_first_policy(run: SeriesRun) -> None:
    """East without B is A's to x = 6.75 and C's beyond; infilled B has the mean of both."""
    base = 0.85 * 20 + 0.15 * 30
    reweighted = base + 0.35 * (4 + 6) + 0.65 * (8 + 2)
    infilled = base + 0.85 * (6 + 4) + 0.15 * (8 + 2)
    east = row(run.series_means, basin="east", gaps="infill")
    assert east["depth"] == pytest.approx(infilled)
    assert east["difference_percent"] == pytest.approx(100 * (infilled / reweighted - 1))
    assert east["steps_infilled"] == 2


def test_left_out(run: SeriesRun) -> None:
    """Without A the western half is B's, and C's while B is out: 20 + 8 + 2 over the five days."""
    found = row(run.left_out_means, basin="west", gaps="reweight", gauge="A")
    assert found["mean_with"] == pytest.approx(4)
    assert found["mean_without"] == pytest.approx(30 / 5)
    assert found["change_percent"] == pytest.approx(50)


def test_changes(run: SeriesRun) -> None:
    """B falls silent for longer than a day and comes back; the last day is a short gap."""
    assert run.network_changes.to_numpy().tolist() == [
        ["2031-10-01T00:00", "B", "falls silent", 2],
        ["2031-10-03T00:00", "B", "reports again", 3],
    ]


def test_period_totals(run: SeriesRun) -> None:
    """September has two days of thirty, October three; the water years are cut between them."""
    table = run.period_totals
    west = table[(table["basin"] == "west") & (table["gaps"] == "reweight")].set_index(["period", "name"])
    assert west["depth"]["month", "2031-09"] == pytest.approx(10)
    assert west["share"]["month", "2031-09"] == pytest.approx(2 / 30)
    assert west["depth"]["water-year", "2031"] == pytest.approx(10)
    assert west["depth_present"]["water-year", "2032"] == pytest.approx(10)
    assert west["depth"]["year", "2031"] == pytest.approx(20)
    assert west["start"]["water-year", "2032"] == "2031-10-01T00:00"


def test_greatest_depths(run: SeriesRun) -> None:
    """The greatest two days end on 2 October, 4 + 6; counted from the first day, the windows are 10, 4, 0."""
    found = row(run.greatest_depths, basin="west", gaps="reweight", duration="2d")
    assert (found["sliding"], found["sliding_end"]) == (pytest.approx(10), "2031-10-01T00:00")
    assert found["aligned"] == pytest.approx(10)
    assert (found["windows"], found["sliding_left_out"]) == (5, 1)
    assert (found["aligned_windows"], found["aligned_left_out"]) == (3, 1)


def test_storms(run: SeriesRun) -> None:
    """Two storms of the union a day apart; the one of October is the larger, and 5 days before it are not all there."""
    table = run.storms_found
    assert table["start"].tolist() == ["2031-09-29T00:00", "2031-10-01T00:00"]
    assert table["rank"].tolist() == [1, 2]
    assert table["depth_present"].tolist() == pytest.approx(
        [0.5 * 10 + 0.425 * 20 + 0.075 * 30, 0.675 * 10 + 0.325 * 10]
    )
    assert table["before_5d"].isna().all()
    assert table["antecedent_index"].tolist()[1] == pytest.approx(table["depth"].tolist()[0] * 0.9)
    assert table["antecedent_days"].tolist() == [0, 2]


def test_the_series_themselves(run: SeriesRun) -> None:
    """One row per policy, method, basin and step; what is missing has no number and says so."""
    table = run.series
    assert len(table) == 2 * 3 * 6
    last = row(table, basin="west", gaps="infill", time="2031-10-05T00:00")
    assert np.isnan(last["depth"])
    assert last["flags"] == "missing"


def test_units(tmp_path: Path) -> None:
    """In inches every depth is a 25.4th, and percentages are the same."""
    job = write_tiny(tmp_path, rain=RAIN, job=DAYS)
    inch, mm = run_series(job, [*SETTINGS, "job.depth_unit=in"]), run_series(job, SETTINGS)
    for table in ("series_means", "left_out_means", "period_totals", "greatest_depths", "storms_found", "series"):
        one, other = getattr(inch, table), getattr(mm, table)
        assert set(one["depth_unit"]) == {"in"}
        for name in one.columns:
            if name in {"depth", "mean_annual_of_steps", "mean_with", "sliding", "peak", "antecedent_index"}:
                np.testing.assert_allclose(one[name] * 25.4, other[name])
            elif name.endswith("percent"):
                np.testing.assert_allclose(one[name], other[name])


@pytest.mark.parametrize("wet_depth", [[], ["storms.wet_depth=0.04"]])
def test_storms_and_differences_in_inches(tmp_path: Path, wet_depth: list[str]) -> None:
    """Half a mm between two wet days is dry, by 1 mm a day or 0.04 in; A's silent day is in one policy's mean alone."""
    depth = ["0,0,0"] * 40
    depth[20], depth[28], depth[29], depth[30] = ",0,0", "25.4,25.4,25.4", "0.5,0.5,0.5", "50.8,50.8,50.8"
    rain = "date,A,B,C\n" + "".join(f"{np.datetime64('2031-05-04') + k},{row}\n" for k, row in enumerate(depth))
    job = write_tiny(tmp_path, rain=rain, job=JOB.replace('"1h"', '"1d"') + "[storms]\ncount = 1\n")
    settings = ["job.depth_unit=in", "averaging.methods=['thiessen', 'arithmetic']", "infill.method=station-average"]
    run = run_series(job, [*settings, "series.gaps=['reweight', 'infill']", *wet_depth])
    (storm,) = run.storms_found.to_dict("records")
    assert (storm["method"], storm["gaps"], storm["hours"]) == ("thiessen", "reweight", 24)
    assert storm["depth"] == pytest.approx(2.0)
    assert storm["before_5d"] == pytest.approx(25.9 / 25.4)
    means = run.series_means.set_index(["basin", "method", "gaps"])["difference_percent"]
    # The same depth over 40 days instead of 39; by Thiessen polygons B has A's half meanwhile, and no day is lost.
    assert means["west", "arithmetic", "infill"] == pytest.approx(-2.5)
    assert means["west", "thiessen", "infill"] == pytest.approx(0, abs=1e-9)

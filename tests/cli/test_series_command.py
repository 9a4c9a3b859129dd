"""Whole runs of ``basinrain series``: printed, written, interrupted, gone on with."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import jsonschema
import numpy as np
import pandas as pd
import pytest
from click.testing import CliRunner
from tiny import GAUGES, JOB, RAIN, write_tiny

import basinrain.series_job as module
from basinrain.cli import main
from basinrain.series.engine import SeriesEngine

ROOT = Path(__file__).parents[2]
COMMAND = Path(sys.executable).with_name("basinrain")

# B is silent in the second hour; A and C are 1.5 and 50 mm then.
GAP = RAIN.replace("02:00,4,9,50", "02:00,4,,50")
STEP = '\n[infill]\nmethod = "station-average"\nscale = "step"\n'


def basinrain(*arguments: str | Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [COMMAND, *map(str, arguments)], capture_output=True, text=True, encoding="utf-8", check=False
    )


def test_the_series_by_hand(tmp_path: Path) -> None:
    """The west is A's. The east is B's to x = 9.25 and C's beyond; without B it is A's to x = 6.75."""
    job = write_tiny(tmp_path, rain=GAP, job=JOB + STEP + '[series]\ngaps = ["reweight", "infill"]\n')
    done = basinrain("series", job, "--set", "averaging.methods=thiessen")
    assert (done.returncode, done.stderr) == (0, "")
    table = pd.read_csv(tmp_path / "output" / "series" / "series.csv", keep_default_na=False)
    assert table.columns.tolist() == [
        "basin",
        "method",
        "gaps",
        "time",
        "depth",
        "depth_unit",
        "observed_share",
        "flags",
    ]
    second = table[table["time"] == "2031-05-04T02:00"].set_index(["basin", "gaps"])
    depth = second["depth"].astype(float)
    assert depth["west", "reweight"] == pytest.approx(4)
    assert depth["east", "reweight"] == pytest.approx((1.75 * 4 + 3.25 * 50) / 5)
    assert depth["east", "infill"] == pytest.approx((4.25 * 27 + 0.75 * 50) / 5)
    assert second["observed_share"].astype(float)["east", "infill"] == pytest.approx(0.15)
    assert second["flags"]["east", "reweight"] == "reweighted"
    assert second["flags"]["east", "infill"] == "infilled"
    assert second["flags"]["west", "infill"] == ""
    first = table[(table["time"] == "2031-05-04T01:00") & (table["basin"] == "union") & (table["gaps"] == "infill")]
    assert first["depth"].astype(float).item() == pytest.approx(0.5 * 1 + 0.425 * 6 + 0.075 * 20)


def test_what_is_printed(tmp_path: Path) -> None:
    """Means by policy and method, the storms, the warnings, the caution and where the files are."""
    job = write_tiny(tmp_path, rain=GAP, job=JOB + STEP)
    done = basinrain("series", job, "--set", "averaging.methods=thiessen", "--set", "storms.dry_gap=1h")
    assert (done.returncode, done.stderr) == (0, "")
    lines = done.stdout.splitlines()
    assert lines[0] == "4 steps of 1h, 2031-05-04T00:00 to 2031-05-04T04:00: depth of the record, mm"
    assert lines[1].split("┃")[0].strip() == "basin"
    (union,) = [line for line in lines if line.startswith("union")]
    assert [cell.strip() for cell in union.split("│")][1:3] == ["thiessen", "infill-then-reweight"]
    assert "Largest storms of union by total (thiessen, infill-then-reweight; dry gap 1 h)" in lines
    assert lines[-2] == "For a qualified engineer's judgement; local codes and licensed practice govern design."
    assert (
        lines[-1]
        == f"Written to {tmp_path / 'output' / 'series'}: report.html, record.json and the files of series and tables"
    )


def test_the_files_are_these_and_the_record_keeps_its_schema(tmp_path: Path) -> None:
    """--json prints what record.json holds, and docs/record.schema.json describes it."""
    done = basinrain("series", write_tiny(tmp_path, rain=GAP), "--json")
    assert (done.returncode, done.stderr) == (0, "")
    document = json.loads(done.stdout)
    folder = tmp_path / "output" / "series"
    assert document == json.loads((folder / "record.json").read_text(encoding="utf-8"))
    jsonschema.validate(document, json.loads((ROOT / "docs" / "record.schema.json").read_text(encoding="utf-8")))
    assert sorted(path.name for path in folder.iterdir()) == [
        "edits.csv",
        "findings.csv",
        "greatest_depths.csv",
        "left_out_means.csv",
        "network_changes.csv",
        "period_totals.csv",
        "record.json",
        "report.html",
        "series.csv",
        "series_means.csv",
        "storms_found.csv",
    ]
    assert [path.name for path in folder.parent.iterdir()] == ["series"]


def test_every_format_and_another_step_and_clock(tmp_path: Path) -> None:
    """Two hours a step, in UTC, in every format; a file that was written before is replaced."""
    job = write_tiny(tmp_path, job=JOB.replace('interval = "1h"', 'interval = "1h"\ntimezone = "+02:00"'))
    asked = ["series.step=2h", "series.timezone=UTC", "series.formats=['csv', 'csv-per-basin', 'parquet', 'netcdf']"]
    sets = [part for setting in [*asked, "averaging.methods=thiessen"] for part in ("--set", setting)]
    for _ in range(2):
        done = basinrain("series", job, *sets)
        assert (done.returncode, done.stderr) == (0, "")
    folder = tmp_path / "output" / "series"
    table = pd.read_csv(folder / "series.csv")
    union = table[table["basin"] == "union"]
    assert union["time"].tolist() == ["2031-05-04T00:00Z", "2031-05-04T02:00Z"]
    hours = [0.5 * a + 0.425 * b + 0.075 * c for a, b, c in ((1, 6, 20), (4, 9, 50), (5, 10, 30), (0, 5, 0))]
    np.testing.assert_allclose(union["depth"], [hours[0] + hours[1], hours[2] + hours[3]])
    parquet = pd.read_parquet(folder / "series.parquet")
    np.testing.assert_array_equal(parquet["depth"].to_numpy(), table["depth"].to_numpy())
    assert sorted(path.name for path in (folder / "hyetographs").iterdir()) == [
        "east.csv",
        "index.csv",
        "union.csv",
        "west.csv",
    ]
    assert (folder / "series.nc").stat().st_size > 0


@pytest.mark.parametrize(
    ("setting", "line"),
    [
        ("series.step=90min", "[series] step"),
        (
            "series.durations=['90min']",
            "[series] durations: found '90min'; expected a whole number of the record's steps",
        ),
        ("series.timezone=UTC", "[series] timezone"),
        ("series.leave_out=['Q']", "[series] leave_out: found 'Q'; expected the id of a gauge"),
        ("series.on=there", "[series] on: found 'there'; expected here, threads, processes or an address"),
        ("storms.basin=wst", "[storms] basin: found 'wst'; expected the id of a basin; did you mean 'west'?"),
        ("storms.rank=90min", "[storms] rank: found '90min'; expected a whole number of the record's steps of 1h"),
        ("series.gaps=infil", "[series] gaps"),
        ("series.weigh=ratio", "[series] weigh: found 'ratio'; expected one of: depths, ratios"),
    ],
)
def test_what_cannot_be_is_told_before_any_work(tmp_path: Path, setting: str, line: str) -> None:
    """One line, exit 1, nothing written, nothing left."""
    done = basinrain("series", write_tiny(tmp_path), "--set", setting)
    assert done.returncode == 1
    assert done.stdout == ""
    assert (
        done.stderr.splitlines()[0].split(" no. ")[0].startswith(line.split(" no. ", maxsplit=1)[0])
        or line in done.stderr
    )
    assert "Traceback" not in done.stderr
    assert not (tmp_path / "output").exists() or list((tmp_path / "output").iterdir()) == []


def test_all_of_it_together(tmp_path: Path) -> None:
    """Several faults of one job come in one answer."""
    sets = [part for s in ("series.step=90min", "series.on=there", "storms.basin=wst") for part in ("--set", s)]
    done = basinrain("series", write_tiny(tmp_path), *sets)
    assert done.returncode == 1
    assert [line.split(":")[0] for line in done.stderr.splitlines()] == [
        "[series] step",
        "[series] on",
        "[storms] basin",
    ]


def daily(years: int) -> str:
    rng = np.random.default_rng(8)
    days = np.datetime64("2029-01-01") + np.arange(365 * years)
    depth = np.round(rng.gamma(0.3, 12, (len(days), 3)), 1)
    text = ["date,A,B,C"]
    for day, row in zip(days, depth, strict=True):
        text.append(f"{day}," + ",".join("" if rng.random() < 0.1 else f"{value}" for value in row))
    return "\n".join(text) + "\n"


def test_an_interrupted_run_goes_on_with_the_same_bytes(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Stopped after one chunk of several, the run keeps it, says so, and ends as one that was never stopped."""
    job = write_tiny(tmp_path, rain=daily(3), job=JOB.replace('interval = "1h"', 'interval = "1d"') + STEP)
    monkeypatch.setattr(module, "borders_of", lambda *_: np.array([0, 300, 600, 900, 1095]))
    runner = CliRunner()
    whole = runner.invoke(main, ["series", str(job), "--quiet"])
    assert (whole.exit_code, whole.output) == (0, "")
    expected = (tmp_path / "output" / "series" / "series.csv").read_bytes()
    computed: list[int] = []
    compute = SeriesEngine.compute

    def stopped(self: SeriesEngine, *given: object) -> object:
        if len(computed) == 2:
            raise KeyboardInterrupt
        computed.append(1)
        return compute(self, *given)  # type: ignore[arg-type]

    monkeypatch.setattr(SeriesEngine, "compute", stopped)
    done = runner.invoke(main, ["series", str(job), "--output", str(tmp_path / "other")])
    assert done.exit_code == 130
    assert done.stderr == "Stopped; the parts that are finished are kept: run it again to go on from them.\n"
    assert [path.name for path in (tmp_path / "other").iterdir()] == [".series.unfinished"]
    computed.clear()

    def counted(self: SeriesEngine, *given: object) -> object:
        computed.append(1)
        return compute(self, *given)  # type: ignore[arg-type]

    monkeypatch.setattr(SeriesEngine, "compute", counted)
    again = runner.invoke(main, ["series", str(job), "--output", str(tmp_path / "other"), "--quiet"])
    assert (again.exit_code, again.output) == (0, "")
    assert len(computed) == 2
    assert (tmp_path / "other" / "series" / "series.csv").read_bytes() == expected
    assert [path.name for path in (tmp_path / "other").iterdir()] == ["series"]


def test_a_storm_run_of_the_largest_storms(tmp_path: Path) -> None:
    """[storms] makes storms of the largest; the total that is found is that of the storm run."""
    job = write_tiny(
        tmp_path,
        gauges=GAUGES,
        rain=daily(1),
        job=JOB.replace('interval = "1h"', 'interval = "1d"') + STEP + "[storms]\ncount = 2\n",
    )
    sets = ("--set", "averaging.methods=thiessen")
    assert basinrain("series", job, *sets).returncode == 0
    done = basinrain("storm", job, *sets)
    assert (done.returncode, done.stderr) == (0, "")
    found = pd.read_csv(tmp_path / "output" / "series" / "storms_found.csv").iloc[:2]
    means = pd.read_csv(tmp_path / "output" / "storm" / "basin_means.csv")
    union = means[means["basin"] == "union"]
    assert union["storm"].tolist() == [
        f"No. {k}, {start[:10]}" for k, start in zip((1, 2), found["start"], strict=True)
    ]
    np.testing.assert_allclose(union["depth"], found["depth"], rtol=1e-9)

"""Whole runs of the command line, on exact text."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import jsonschema
import pytest
from tiny import GAUGES, JOB, RAIN, write_tiny

ROOT = Path(__file__).parents[2]
COMMAND = Path(sys.executable).with_name("basinrain")

SHOWN = """\
whole record: basin means in mm
basin ┃ area km2 ┃ arithmetic ┃ thiessen ┃  idw ┃ spread ┃ spread % ┃ infilled %
━━━━━━╇━━━━━━━━━━╇━━━━━━━━━━━━╇━━━━━━━━━━╇━━━━━━╇━━━━━━━━╇━━━━━━━━━━╇━━━━━━━━━━━
west  │     50.0 │       10.0 │     10.0 │ 21.2 │   11.2 │     81.6 │          0
east  │     50.0 │       30.0 │     40.5 │ 45.0 │   15.0 │     39.0 │          0
union │    100.0 │       20.0 │     25.3 │ 33.1 │   13.1 │     50.2 │          0

Warning: whole record: Gauge A has over half of the weight in basin west: 100 % by arithmetic, 100 % by thiessen, \
72 % by idw.
Warning: whole record: Gauge B has over half of the weight in basin east: 100 % by arithmetic, 85 % by thiessen, \
57 % by idw.
Warning: whole record: The methods give basin west from 10.0 to 21.2 mm, 11.2 mm or 82 % apart.
Warning: whole record: The methods give basin east from 30.0 to 45.0 mm, 15.0 mm or 39 % apart.
Warning: whole record: The methods give basin union from 20.0 to 33.1 mm, 13.1 mm or 50 % apart.
Warning: Only gauge A lies inside basin west.
Warning: Only gauge B lies inside basin east.
For a qualified engineer's judgement; local codes and licensed practice govern design.
Written to {folder}: report.html, record.json and the CSV files
"""

MEANS = """\
storm,basin,method,depth,depth_unit,area,area_unit,volume,volume_unit,gauges_used,share_infilled,covered_share,depth_reporting_only
whole record,west,thiessen,10.0,mm,50.0,km2,500000.0,m3,1,0.0,1.0,10.0
whole record,east,thiessen,40.5,mm,50.0,km2,2025000.0,m3,2,0.0,1.0,40.5
whole record,union,thiessen,25.25,mm,100.0,km2,2525000.0,m3,3,0.0,1.0,25.25
"""


def basinrain(*arguments: str | Path, cwd: Path | None = None) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [COMMAND, *map(str, arguments)], capture_output=True, text=True, encoding="utf-8", cwd=cwd, check=False
    )


def test_storm_from_another_folder_with_spaces_and_letters_of_other_alphabets(tmp_path: Path) -> None:
    """The printed page is exactly this, wherever the command is run and whatever the path is called."""
    folder = tmp_path / "Überlauf am Fluß – プロジェクト"
    write_tiny(folder)
    done = basinrain("storm", folder / "job.toml", cwd=tmp_path)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == SHOWN.format(folder=folder / "output" / "storm")
    assert sorted(path.name for path in (folder / "output" / "storm").iterdir()) == [
        "basin_means.csv",
        "edits.csv",
        "findings.csv",
        "gauge_depths.csv",
        "gauge_totals.csv",
        "hyetographs.csv",
        "infill_effect.csv",
        "infilled.csv",
        "record.json",
        "report.html",
        "series_check.csv",
        "spread.csv",
        "storms.csv",
        "thiessen.geojson",
        "weights.csv",
        "weights_compared.csv",
    ]


def test_files_hold_full_digits(tmp_path: Path) -> None:
    """basin_means.csv is exactly this: 10, 40.5 and 25.25 mm over 50, 50 and 100 km²."""
    done = basinrain(
        "storm", write_tiny(tmp_path), "--set", "averaging.methods=['thiessen']", "--output", tmp_path / "out"
    )
    assert done.returncode == 0
    assert (tmp_path / "out" / "storm" / "basin_means.csv").read_bytes().decode() == MEANS


def test_two_runs_write_the_same_bytes(tmp_path: Path) -> None:
    """Nothing in the output depends on when it was made."""
    job = write_tiny(tmp_path)
    written = []
    for _ in range(2):
        assert basinrain("storm", job, "--quiet").returncode == 0
        written.append({p.name: p.read_bytes() for p in (tmp_path / "output" / "storm").iterdir()})
    assert written[0] == written[1]


def windows(text: str) -> bytes:
    return b"\xef\xbb\xbf" + text.replace("\n", "\r\n").encode()


def test_windows_line_ends_mark_semicolon_and_decimal_comma(tmp_path: Path) -> None:
    """Files as a Windows spreadsheet writes them give the same bytes of results as the plain ones."""
    plain = write_tiny(tmp_path / "plain")
    spreadsheet = write_tiny(
        tmp_path / "spreadsheet",
        gauges__csv=windows(GAUGES.replace(",", ";").replace(".", ",")),
        rain__csv=windows(RAIN.replace(",", ";").replace(";5;10;", ";5,0;10,00;")),
        job__toml=windows(JOB),
    )
    results = []
    for job in (plain, spreadsheet):
        assert basinrain("storm", job, "--quiet").returncode == 0
        folder = job.parent / "output" / "storm"
        results.append({p.name: p.read_bytes() for p in folder.iterdir() if p.suffix in {".csv", ".geojson"}})
    assert results[0] == results[1]
    assert len(results[0]) == 14


def test_json_is_one_document_that_keeps_its_schema(tmp_path: Path) -> None:
    """--json prints the record and nothing else; record.json holds the same, docs/record.schema.json describes it."""
    done = basinrain("storm", write_tiny(tmp_path), "--json")
    assert (done.returncode, done.stderr) == (0, "")
    document = json.loads(done.stdout)
    assert done.stdout == (tmp_path / "output" / "storm" / "record.json").read_text(encoding="utf-8")
    schema = json.loads((ROOT / "docs" / "record.schema.json").read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator(schema).validate(document)
    depths = {(r["basin"], r["method"]): r["depth"] for r in document["results"]["basin_means"]}
    assert (depths["union", "thiessen"], depths["east", "thiessen"]) == (25.25, 40.5)
    assert document["job"]["averaging"]["idw"] == {"power": 2.0, "cell": 250.0, "allow_uncovered": False}


def test_the_schema_can_fail(tmp_path: Path) -> None:
    """A document with a field too many does not keep the schema."""
    schema = json.loads((ROOT / "docs" / "record.schema.json").read_text(encoding="utf-8"))
    with pytest.raises(jsonschema.ValidationError, match="Additional properties are not allowed"):
        jsonschema.Draft202012Validator({**schema, "required": []}).validate({"odd": 1})


def test_quiet_prints_nothing(tmp_path: Path) -> None:
    """--quiet leaves both streams empty."""
    done = basinrain("storm", write_tiny(tmp_path), "--quiet")
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")


def test_one_problem_is_one_line(tmp_path: Path) -> None:
    """The messages of a run with two faults are exactly these two lines."""
    job = write_tiny(tmp_path, rain=RAIN.replace("4,9,50", "4,nine,-1"))
    done = basinrain("storm", job)
    rain, remedy = tmp_path / "rain.csv", "correct the cell, or declare it in missing"
    assert (done.returncode, done.stdout) == (1, "")
    assert done.stderr.splitlines() == [
        f"{rain}:3: column {gauge}: gauge {gauge}: found '{cell}'; expected a depth of 0 or more; {remedy}"
        for gauge, cell in (("B", "nine"), ("C", "-1"))
    ]


def test_start_makes_a_job_that_runs(tmp_path: Path) -> None:
    """`start` copies the sample; the sample runs; the printed lines name both folders."""
    folder = tmp_path / "my basin"
    done = basinrain("start", folder)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == f"Made {folder}. Next: basinrain storm {folder / 'job.toml'}\n"
    assert sorted(path.name for path in folder.iterdir()) == [
        "README.md",
        "basins.geojson",
        "design",
        "gauges.csv",
        "handbook",
        "job.toml",
        "rain_daily.csv",
        "rain_hourly.csv",
        "record",
    ]
    assert basinrain("screen", folder / "record" / "job.toml", "--quiet").returncode == 0
    ran = basinrain("storm", folder / "job.toml")
    assert (ran.returncode, ran.stderr) == (0, "")
    assert ran.stdout.startswith("October front: basin means in mm\n")
    assert "\nFollowing wave: basin means in mm\n" in ran.stdout
    assert f"Written to {folder / 'output' / 'storm'}: " in ran.stdout


def test_every_command_and_option_is_documented() -> None:
    """README names every command, and every option of `storm`."""
    from basinrain.cli import main

    text = (ROOT / "README.md").read_text(encoding="utf-8")
    assert [name for name in main.commands if f"basinrain {name}" not in text] == []
    options = [opt for p in main.commands["storm"].params for opt in p.opts if opt.startswith("--")]
    assert [opt for opt in options if opt not in text] == []


def test_every_column_is_documented(tmp_path: Path) -> None:
    """docs/outputs.md names every column of every file."""
    assert basinrain("storm", write_tiny(tmp_path), "--quiet").returncode == 0
    text = (ROOT / "docs" / "outputs.md").read_text(encoding="utf-8")
    columns = {
        column
        for path in (tmp_path / "output" / "storm").glob("*.csv")
        for column in path.read_text(encoding="utf-8").splitlines()[0].split(",")
    }
    # weights_compared.csv has columns of every method.
    methods = ("arithmetic", "thiessen", "idw")
    by_method = {f"{what}{method}" for what in ("", "contribution_", "share_") for method in methods}
    assert {column for column in columns if f"`{column}`" not in text} - by_method == set()

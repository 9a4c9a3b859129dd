"""Whole runs of ``basinrain design``: printed, written, refused."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import jsonschema
import pandas as pd
import pytest
from click.testing import CliRunner, Result
from design_jobs import US_REDUCTION, write_design_job
from record_jobs import daily_record, write_record_job

from basinrain.cli import main
from basinrain.errors import Problem, WriteError

ROOT = Path(__file__).parents[2]
COMMAND = Path(sys.executable).with_name("basinrain")

SHOWN = """\
Point depths: invented table (2031)

point of interest ┃ how often         ┃ duration ┃ point depth ┃ uplift ┃ reduction ┃ areal depth mm
━━━━━━━━━━━━━━━━━━╇━━━━━━━━━━━━━━━━━━━╇━━━━━━━━━━╇━━━━━━━━━━━━━╇━━━━━━━━╇━━━━━━━━━━━╇━━━━━━━━━━━━━━━
union, 100.0 mi²  │ AEP 0.5 (1 in 2)  │ 1 h      │        20.0 │   1.00 │     0.790 │           15.8
                  │ AEP 0.5 (1 in 2)  │ 6 h      │        40.0 │   1.00 │     0.887 │           35.5
                  │ AEP 0.1 (1 in 10) │ 1 h      │        30.0 │   1.00 │     0.790 │           23.7
                  │ AEP 0.1 (1 in 10) │ 6 h      │        60.0 │   1.00 │     0.887 │           53.2

Hyetographs, AEP 0.1 (1 in 10), steps of 1 h
point of interest ┃ duration ┃ pattern    ┃ depth of basins mm ┃ largest step ┃ mm/h ┃ ends after
━━━━━━━━━━━━━━━━━━╇━━━━━━━━━━╇━━━━━━━━━━━━╇━━━━━━━━━━━━━━━━━━━━╇━━━━━━━━━━━━━━╇━━━━━━╇━━━━━━━━━━━
union             │ 1 h      │ uniform    │               23.7 │         23.7 │ 23.7 │        1 h
union             │ 1 h      │ triangular │               23.7 │         23.7 │ 23.7 │        1 h
union             │ 6 h      │ uniform    │               53.2 │          8.9 │  8.9 │        1 h
union             │ 6 h      │ triangular │               53.2 │         14.8 │ 14.8 │        3 h

Inputs for the judgement of a licensed engineer, not a design. Local criteria govern: which depths, areal reduction, \
duration, pattern and probability apply is theirs to say. A design storm is no storm that has fallen, and the \
probability of its depth is not that of the flood it causes. Climate change is not included: the depths are those of \
the source, and the job gives no uplift.
For a qualified engineer's judgement; local codes and licensed practice govern design.
Written to {folder}: report.html, record.json and the CSV files
"""

# 60 mm in 6 h at 10 years over 100 square miles of 2 589 988.110336 m2, uplifted by nothing, reduced by nothing.
DEPTHS = """\
point,basin,area,area_unit,aep,return_period,return_period_in,duration,point_depth,interval_factor,uplift,\
reduction,areal_depth,depth_unit,reduction_method,from
union,,100.0,km2,0.1,10.0,annual-maximum,6h,60.0,1.0,1.0,1.0,60.0,mm,none,invented table
"""
STORMS = """\
point,aep,return_period,return_period_in,duration,pattern,basin,area,area_unit,reduction,depth,depth_unit,volume,\
volume_unit,peak_depth,peak_intensity,intensity_unit,peak_ends_min,step_min
union,0.1,10.0,annual-maximum,6h,uniform,{basin},25.0,km2,1.0,60.0,mm,1500000.0,m3,10.0,10.0,mm/h,60,60
"""

TABLES = {"design_depths", "design_hyetographs", "design_storms", "point_depths", "point_weights"}


def files(*more: str) -> list[str]:
    """Return the names of the files of a run that has more tables than every run."""
    return sorted([*(f"{name}.csv" for name in (*TABLES, *more)), "record.json", "report.html"])


def basinrain(*arguments: str | Path, cwd: Path | None = None) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [COMMAND, *map(str, arguments)], capture_output=True, text=True, encoding="utf-8", cwd=cwd, check=False
    )


def inside(*arguments: str | Path) -> Result:
    """Run the command in this process, which is sooner done."""
    return CliRunner().invoke(main, ["design", *map(str, arguments)])


def several(folder: Path, **changes: Any) -> Path:  # noqa: ANN401 - values of a job
    """Write a job of two frequencies, durations and patterns, an areal reduction and another beside it."""
    return write_design_job(
        folder,
        design__return_periods=[2, 10],
        design__durations=["1h", "6h"],
        design__areal_reduction=US_REDUCTION | {"compare": ["keers-wescott"]},
        design__pattern=[{"shape": "uniform"}, {"shape": "triangular"}],
        **changes,
    )


def schema() -> dict[str, Any]:
    found: dict[str, Any] = json.loads((ROOT / "docs" / "record.schema.json").read_text(encoding="utf-8"))
    return found


def from_record(folder: Path) -> Path:
    """Write a job of depths from 15 years of record and of a storm in it."""
    return write_record_job(
        folder,
        daily_record(),
        storm=[{"name": "Reed", "start": "2010-06-01", "end": "2010-06-05"}],
        design__rarity={"average": "thiessen"},
        design__durations=["1d", "2d"],
    )


def test_what_is_printed(tmp_path: Path) -> None:
    """The printed page is exactly this, wherever the command is run and whatever the path is called."""
    folder = tmp_path / "Überlauf am Fluß – プロジェクト"
    done = basinrain("design", several(folder), cwd=tmp_path)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == SHOWN.format(folder=folder / "output" / "design")
    assert sorted(path.name for path in (folder / "output" / "design").iterdir()) == files("reductions_compared")
    assert [path.name for path in (folder / "output").iterdir()] == ["design"]


def test_files_hold_full_digits_and_settings_change_the_job(tmp_path: Path) -> None:
    """design_depths.csv and design_storms.csv are exactly this; --output names the folder above the command's."""
    job = write_design_job(tmp_path, unit="km", design__step="2h")
    done = inside(job, "--set", "design.step=1h", "--output", tmp_path / "out", "--quiet")
    assert (done.exit_code, done.stdout, done.stderr) == (0, "", "")
    folder = tmp_path / "out" / "design"
    assert (folder / "design_depths.csv").read_bytes().decode() == DEPTHS
    head, row = STORMS.splitlines()
    lines = [head, *(row.format(basin=basin) for basin in ("nw", "ne", "sw", "se"))]
    assert (folder / "design_storms.csv").read_bytes().decode() == "\n".join(lines) + "\n"
    assert not (tmp_path / "output").exists()


def test_two_runs_write_the_same_bytes(tmp_path: Path) -> None:
    """Nothing in the output, the report included, depends on when it was made."""
    job = several(tmp_path)
    written = []
    for _ in range(2):
        assert basinrain("design", job, "--quiet").returncode == 0
        written.append({p.name: p.read_bytes() for p in (tmp_path / "output" / "design").iterdir()})
    assert written[0] == written[1]
    assert sorted(written[0]) == files("reductions_compared")


@pytest.mark.parametrize("write", [several, from_record], ids=["table", "record"])
def test_json_is_one_document_that_keeps_its_schema(tmp_path: Path, write: Any) -> None:  # noqa: ANN401 - either
    """--json prints the record and nothing else; record.json holds the same, docs/record.schema.json describes it."""
    done = basinrain("design", write(tmp_path), "--json")
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == (tmp_path / "output" / "design" / "record.json").read_text(encoding="utf-8")
    document = json.loads(done.stdout)
    jsonschema.Draft202012Validator(schema()).validate(document)
    results = document["results"]
    for name in set(results) - {"design_hyetographs"}:
        table = pd.read_csv(tmp_path / "output" / "design" / f"{name}.csv")
        assert len(table) == len(results[name]) > 0, name
        assert table.columns.tolist() == list(results[name][0])
    others = {"storm_rarity", "record_fits", "annual_maxima"}
    assert set(results) == TABLES | (others if write is from_record else {"reductions_compared"})


def test_the_schema_can_fail(tmp_path: Path) -> None:
    """A column too many in a table of designs, or the clock of a record, does not keep the schema."""
    assert inside(several(tmp_path), "--quiet").exit_code == 0
    document = json.loads((tmp_path / "output" / "design" / "record.json").read_text(encoding="utf-8"))
    validator = jsonschema.Draft202012Validator(schema())
    assert validator.is_valid(document)
    assert not validator.is_valid(document | {"clock": "UTC"})
    document["results"]["design_depths"][0]["odd"] = 1
    with pytest.raises(jsonschema.ValidationError, match="Additional properties are not allowed"):
        validator.validate(document)


def test_every_column_is_documented(tmp_path: Path) -> None:
    """The section of docs/outputs.md on this command names every file and every column."""
    formats = "design.formats=['csv', 'csv-per-basin', 'parquet', 'netcdf']"
    paths: list[Path] = []
    for write in (several, from_record):
        job = write(tmp_path / write.__name__)
        done = inside(job, "--set", formats, "--set", "design.start=2031-05-04", "--quiet")
        assert done.exit_code == 0
        paths += (job.parent / "output" / "design").iterdir()
    text = (ROOT / "docs" / "outputs.md").read_text(encoding="utf-8")
    section = text.partition("\n# `basinrain design`\n")[2].partition("\n# Of every command\n")[0]
    headings = "\n".join(line for line in section.splitlines() if line.startswith("#"))
    known = {"record.json", "report.html"}
    assert {path.name for path in paths if path.name not in headings} == known
    tables = [path / "index.csv" if path.is_dir() else path for path in paths if path.suffix in {"", ".csv"}]
    columns = {column for table in tables for column in pd.read_csv(table)}
    assert {column for column in columns if f"`{column}`" not in section} == set()


def test_one_problem_is_one_line(tmp_path: Path) -> None:
    """What cannot be is told in the job's words, exit 1, and nothing is written."""
    job = write_design_job(
        tmp_path,
        design__step="25min",
        design__depths__source=None,
        design__pattern=[{"shape": "triangular", "peak": "middle"}],
    )
    done = inside(job)
    assert (done.exit_code, done.stdout) == (1, "")
    lines = [line.removeprefix(f"{job}: ") for line in done.stderr.splitlines()]
    assert [line.partition(": found")[0] for line in lines] == [
        "[design.depths] source",
        "[design] durations",
        "[[design.pattern]] no. 1 peak",
    ]
    assert not (tmp_path / "output").exists()


REFUSED: dict[str, tuple[dict[str, Any], str]] = {
    "no design": ({"design": None}, "[design]: found no such table; expected it to be given; add it"),
    "a file of depths that is not there": ({"design__depths__file": "nowhere.csv"}, "nowhere.csv"),
    "rarity without gauges": ({"design__rarity": {}}, "[design.rarity]: found it in a job without gauges"),
    "a basin that there is not": (
        {"design__point": [{"name": "mouth", "basins": ["nw", "nx"]}]},
        "[[design.point]] mouth, basins: found 'nx'; expected the id of a basin; one of: nw, ne, sw, se",
    ),
    "a frequency outside the table": ({"design__return_periods": [1000]}, "AEP 0.001 (1 in 1000)"),
    "a format that there is not": ({"design__formats": ["xls"]}, "[design] formats no. 1: found 'xls'"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_what_is_refused_leaves_the_earlier_output_whole(tmp_path: Path, name: str) -> None:
    """Exit 1, one line on the error stream, no traceback, and the results of the run before are as they were."""
    changes, text = REFUSED[name]
    assert inside(write_design_job(tmp_path), "--quiet").exit_code == 0
    folder = tmp_path / "output" / "design"
    before = {path.name: path.read_bytes() for path in folder.iterdir()}
    done = inside(write_design_job(tmp_path, **changes))
    assert (done.exit_code, done.stdout) == (1, "")
    (line,) = done.stderr.splitlines()
    assert text in line
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == before
    assert [path.name for path in folder.parent.iterdir()] == ["design"]


def test_a_write_that_fails_leaves_nothing_half_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The tables are there when the hyetographs fail, but not in the folder of the results."""
    job = write_design_job(tmp_path)

    def fail(folder: Path, *_: object, **__: object) -> None:
        assert (folder / "design_depths.csv").exists()
        raise WriteError(Problem(item="design_hyetographs.csv", found="no space", expected="some"))

    monkeypatch.setattr("basinrain.writing.run.write_design_files", fail)
    done = inside(job)
    assert (done.exit_code, done.stdout) == (1, "")
    assert done.stderr == "design_hyetographs.csv: found no space; expected some\n"
    assert not (tmp_path / "output").exists()


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        (["--set", "design"], "--set: found 'design'; expected TABLE.KEY=VALUE"),
        (["--set", "design.aep.one=0.1"], "'one' inside a plain value"),
        (["--sett", "design.step=1h"], "No such option"),
    ],
)
def test_wrong_usage(tmp_path: Path, arguments: list[str], text: str) -> None:
    """What the command line itself has wrong is exit 2."""
    job = write_design_job(tmp_path, design__return_periods=None, design__aep=0.1)
    done = inside(job, *arguments)
    assert (done.exit_code, done.stdout) == (2, "")
    assert text in done.stderr
    assert not (tmp_path / "output").exists()


def test_inputs_are_not_written_over(tmp_path: Path) -> None:
    """An output folder that holds an input, or anything that no run wrote, is refused before anything is computed."""
    job = write_design_job(tmp_path / "results" / "design")
    before = {path.name: path.read_bytes() for path in job.parent.iterdir()}
    done = inside(job, "--output", tmp_path / "results")
    assert (done.exit_code, done.stdout) == (1, "")
    assert {path.name: path.read_bytes() for path in job.parent.iterdir()} == before


def test_depths_from_the_record_and_rarity_are_printed(tmp_path: Path) -> None:
    """The source says how many years and which distribution; every storm has its sentences, every warning its line."""
    done = inside(from_record(tmp_path))
    assert (done.exit_code, done.stderr) == (0, "")
    lines = done.stdout.splitlines()
    assert lines[0] == (
        "Point depths: annual maxima of the record, 15 years, Gumbel distribution by L-moments (2002 to 2016)"
    )
    at = lines.index("How rare Reed was")
    assert lines[at + 1].startswith("  None of the depths compared is within the table: ")
    assert lines[at + 2].startswith("  Searched: 2 durations over 3 basins, 6 depths.")
    assert any(line.startswith("Warning: Depths from the record are sums of its steps of 24 h") for line in lines)
    names = files("annual_maxima", "record_fits", "storm_rarity")
    assert sorted(path.name for path in (tmp_path / "output" / "design").iterdir()) == names


def test_long_tables_are_cut_when_printed(tmp_path: Path) -> None:
    """Of 42 rows of depths and 42 storms 40 are printed; how many more stand in the files is said."""
    points = [{"name": f"gate {k}", "basins": ["nw", "ne"]} for k in range(1, 22)]
    patterns = [{"shape": "uniform"}, {"shape": "triangular"}]
    job = write_design_job(tmp_path, design__return_periods=[2, 10], design__point=points, design__pattern=patterns)
    done = inside(job)
    assert (done.exit_code, done.stderr) == (0, "")
    lines = done.stdout.splitlines()
    assert "2 more rows stand in design_depths.csv" in lines
    assert "2 more storms stand in design_storms.csv" in lines
    assert len([line for line in lines if line.startswith("Warning: gate ")]) == 3
    assert "Warning: 18 more of this kind stand in report.html" in lines

"""Whole runs of ``basinrain infill``: every method scored, one taken, the record completed."""

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
from tiny import JOB, write_tiny

from basinrain.cli import main
from basinrain.job import run_infill

ROOT = Path(__file__).parents[2]
COMMAND = Path(sys.executable).with_name("basinrain")

# A cross: arms 3 km from Mid, 3√2 and 6 km from each other.
CROSS = """id,name,x,y
M,Mid Cross,5,5
N,North Arm,5,8
E,East Arm,8,5
S,South Arm,5,2
W,West Arm,2,5
"""
NORMALS = "id,name,x,y,normal\n" + "".join(
    f"{row},{normal}\n" for row, normal in zip(CROSS.splitlines()[1:], (900, 700, 1000, 800, 950), strict=True)
)
DAILY = JOB.replace('interval = "1h"', 'interval = "1d"')
MONTHLY = JOB.replace('interval = "1h"', 'interval = "1mo"')
RATIOS = "inverse-distance-ratios (power 2)"
GAUGES = ("M", "N", "E", "S", "W")

# Mid 20 mm and the arms 10 mm on every other day. Errors at Mid and at each arm, mm:
#   nearest gauge     -10 and 20 - 10 = 10:                                  RMSE 10, MAE 10, bias (4 x 10 - 10)/5 = 6
#   mean              -10 and (20 + 3 x 10)/4 - 10 = 2.5:                    RMSE √((100 + 4 x 6.25)/5) = 5
#   distance, power 1 -10 and 10/(1 + 2/√2 + 1/2) = 3.431:                   RMSE √((100 + 4 x 11.775)/5) = 5.424
#   distance, power 2 -10 and 10/(1 + 2/2 + 1/4) = 4.444:                    RMSE √((100 + 4 x 19.753)/5) = 5.984
#   quadrants         -10 and 10 x 2/3 = 6.667 (Mid, and one arm at √2):     RMSE √((100 + 4 x 44.444)/5) = 7.454
#   by correlation    all are 1: the mean
#   regression        slopes 2 and 1/2: no error
SHOWN = """\
Infill methods compared, each gauge left out in turn; mm by day
method                     ┃  RMSE ┃ worse by ┃  95 % interval ┃   MAE ┃ bias ┃ correlation ┃ cases
━━━━━━━━━━━━━━━━━━━━━━━━━━━╇━━━━━━━╇━━━━━━━━━━╇━━━━━━━━━━━━━━━━╇━━━━━━━╇━━━━━━╇━━━━━━━━━━━━━╇━━━━━━
nearest-gauge              │ 10.00 │    10.00 │ 10.00 to 10.00 │ 10.00 │ 6.00 │      −1.000 │   150
station-average            │  5.00 │     5.00 │   5.00 to 5.00 │  4.00 │ 0.00 │      −1.000 │   150
inverse-distance (power 1) │  5.42 │     5.42 │   5.42 to 5.42 │  4.75 │ 0.75 │      −1.000 │   150
inverse-distance (power 2) │  5.98 │     5.98 │   5.98 to 5.98 │  5.56 │ 1.56 │      −1.000 │   150
four-quadrant              │  7.45 │     7.45 │   7.45 to 7.45 │  7.33 │ 3.33 │      −1.000 │   150
correlation-weighting      │  5.00 │     5.00 │   5.00 to 5.00 │  4.00 │ 0.00 │      −1.000 │   150
regression                 │  0.00 │     0.00 │           best │  0.00 │ 0.00 │       1.000 │   150

Not compared: normal-ratio: it needs normals, and the gauges have none
Not compared: ten-percent-rule: it needs normals, and the gauges have none
Not compared: inverse-distance-ratios (power 2): it needs normals, and the gauges have none
Not compared: ratio-regression: it needs normals, and the gauges have none
regression has the least RMSE, 0.00 mm over 150 cases, and every simpler method is distinguishably worse (95 % \
intervals, days drawn anew and so too narrow), so it is taken.
"""


def daily(depths: np.ndarray, *, first: str = "2031-03-01") -> str:
    days = np.datetime64(first) + np.arange(len(depths))
    rows = [
        ",".join([str(day), *("" if np.isnan(v) else f"{v:g}" for v in row)])
        for day, row in zip(days, depths, strict=True)
    ]
    return "\n".join([",".join(["time", *GAUGES]), *rows]) + "\n"


def cross_depths() -> np.ndarray:
    """Sixty days, every other one dry; the west arm is silent on the second, which is dry."""
    depths = np.outer(np.arange(60) % 2 == 0, [20.0, 10.0, 10.0, 10.0, 10.0])
    depths[1, 4] = np.nan
    return depths


def seeded_depths() -> np.ndarray:
    """Sixty days of rain that the gauges share in part, rounded to 0.1 mm, with some holes."""
    rng = np.random.default_rng(12)
    depths = rng.gamma(0.7, 12.0, (60, 1)) * rng.gamma(9.0, 0.11, (60, 5)) * (rng.random((60, 1)) < 0.7)
    depths[rng.random(depths.shape) < 0.05] = np.nan
    return np.asarray(depths.round(1))


def basinrain(*arguments: str | Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [COMMAND, *map(str, arguments)], capture_output=True, text=True, encoding="utf-8", check=False
    )


def refused(command: str, job: Path, *settings: str) -> str:
    """Return what a run prints that ends with 1 and writes nothing to stdout."""
    done = CliRunner().invoke(main, [command, str(job), *(part for one in settings for part in ("--set", one))])
    assert (done.exit_code, done.stdout) == (1, "")
    return done.stderr


def test_the_printed_table_is_that_of_the_hand(tmp_path: Path) -> None:
    """Every error of the cross, the winner, and the job's own method beside it."""
    job = write_tiny(tmp_path, job=DAILY, gauges=CROSS, rain=daily(cross_depths()))
    done = basinrain("infill", job)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.startswith(SHOWN)
    assert done.stdout[len(SHOWN) :].splitlines()[:2] == [
        'The comparison takes regression; the job infills by inverse-distance (power 2) (method = "inverse-distance").',
        "The completed record: 1 depth estimated by inverse-distance (power 2).",
    ]
    assert done.stdout.endswith(
        f"Written to {tmp_path / 'output' / 'infill'}: report.html, record.json and the CSV files\n"
    )


def test_the_winner_completes_the_record_where_the_job_says_so(tmp_path: Path) -> None:
    """It is printed once that comparison and job agree, and every warning of the comparison once."""
    job = write_tiny(tmp_path, job=DAILY, gauges=CROSS, rain=daily(cross_depths()))
    done = basinrain("infill", job, "--set", "infill.method=leave-one-out")
    assert (done.returncode, done.stderr) == (0, "")
    assert "\nThe comparison takes regression; the job infills by it too.\n" in done.stdout
    assert done.stdout.count("so days were drawn anew for the intervals") == 1
    infilled = pd.read_csv(tmp_path / "output" / "infill" / "infilled.csv")
    assert infilled[["gauge", "depth", "method"]].to_numpy().tolist() == [["W", 0.0, "regression"]]


def test_an_inch_job_is_in_inches_throughout(tmp_path: Path) -> None:
    """5 mm are 0.197 in, in the table and in the sentences."""
    job = write_tiny(tmp_path, job=DAILY, gauges=CROSS, rain=daily(cross_depths()))
    done = basinrain("infill", job, "--set", "job.depth_unit=in")
    lines = done.stdout.splitlines()
    assert lines[0].endswith("; in by day")
    (row,) = [line for line in lines if line.startswith("station-average")]
    assert [cell.strip() for cell in row.split("│")][1:5] == ["0.197", "0.197", "0.197 to 0.197", "0.157"]
    assert "regression has the least RMSE, 0.000 in over 150 cases" in done.stdout
    said = [line for line in lines if not line.startswith("Warning: Screening")]
    assert not [line for line in said if " mm" in line.replace("(1 mm)", "").replace("(0.2 mm)", "")]


def test_the_files_are_these_and_the_record_keeps_its_schema(tmp_path: Path) -> None:
    """--json prints what record.json holds, and docs/record.schema.json describes it."""
    job = write_tiny(tmp_path, job=DAILY, gauges=CROSS, rain=daily(cross_depths()))
    done = basinrain("infill", job, "--json")
    assert (done.returncode, done.stderr) == (0, "")
    document = json.loads(done.stdout)
    folder = tmp_path / "output" / "infill"
    assert document == json.loads((folder / "record.json").read_text(encoding="utf-8"))
    schema = json.loads((ROOT / "docs" / "record.schema.json").read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator(schema).validate(document)
    assert sorted(path.name for path in folder.iterdir()) == [
        "completed_mm.csv",
        "completed_status.csv",
        "edits.csv",
        "findings.csv",
        "infill_cases.csv",
        "infill_differences.csv",
        "infill_effect.csv",
        "infill_scores.csv",
        "infilled.csv",
        "record.json",
        "report.html",
        "series_check.csv",
    ]
    (mean,) = [
        score
        for score in document["results"]["infill_scores"]
        if (score["infill_method"], score["gauge"]) == ("station-average", "")
    ]
    assert (mean["cases"], mean["mae"], mean["hits"]) == (150, pytest.approx(4), 150)
    assert mean["rmse"] == pytest.approx(5)


def test_the_winner_by_name_gives_the_same_storm(tmp_path: Path) -> None:
    """Every CSV file has the same bytes but the scores, which only a comparison has."""
    job = write_tiny(tmp_path, job=DAILY, gauges=NORMALS, rain=daily(seeded_depths()))
    scored = tmp_path / "scored"
    assert (
        basinrain("storm", job, "--quiet", "--output", scored, "--set", "infill.method=leave-one-out").returncode == 0
    )
    settings = json.loads((scored / "storm" / "record.json").read_text(encoding="utf-8"))["job"]["infill"]
    named = [f"infill.{key}={settings[key]}" for key in ("method", "power") if key in settings]
    told = [argument for setting in named for argument in ("--set", setting)]
    assert basinrain("storm", job, "--quiet", "--output", tmp_path / "named", *told).returncode == 0
    files = [
        {path.name: path.read_bytes() for path in (folder / "storm").glob("*.csv")}
        for folder in (scored, tmp_path / "named")
    ]
    assert len(files[0].pop("infill_scores.csv").splitlines()) > 20
    assert len(files[0].pop("infill_differences.csv").splitlines()) > 5
    assert not {"infill_scores.csv", "infill_differences.csv"} & set(files[1])
    assert files[0] == files[1]
    assert len(pd.read_csv(scored / "storm" / "infilled.csv")) > 5


def test_normals_from_twelve_years(tmp_path: Path) -> None:
    """A missing July by normal ratio: each neighbour times the quotient of the Julys that both have, 11 years."""
    rng = np.random.default_rng(5)
    depths = (rng.gamma(4.0, 15.0, (144, 1)) * rng.gamma(9.0, 0.11, (144, 5))).round(1)
    lost = 6 + 12 * 7
    depths[lost, 0] = np.nan
    months = np.datetime64("2020-01") + np.arange(144)
    rows = [
        ",".join([str(m), *("" if np.isnan(v) else f"{v:g}" for v in row)])
        for m, row in zip(months, depths, strict=True)
    ]
    rain = "\n".join([",".join(["time", *GAUGES]), *rows]) + "\n"
    job = write_tiny(
        tmp_path, job=MONTHLY + '\n[infill]\nmethod = "normal-ratio"\nnormals = "record"\n', gauges=CROSS, rain=rain
    )
    run = run_infill(job)
    assert {"normal-ratio", "ten-percent-rule", RATIOS, "ratio-regression"} <= set(run.comparison.candidates)
    assert "normals-see-the-case" in {note.code for note in run.comparison.notes}
    assert "normals-from-short-record" in {note.code for note in run.warnings}
    julys = np.delete(depths[6::12], 7, axis=0)
    means = julys.mean(axis=0)
    filled = np.mean(means[0] / means[1:] * depths[lost, 1:])
    assert run.infilled[["gauge", "method", "depth"]].to_numpy().tolist() == [
        ["M", "normal-ratio", pytest.approx(filled)]
    ]


ONE = "\n".join(CROSS.splitlines()[:2]) + "\n"
LONELY = "time,M\n2031-03-01,4\n2031-03-02,\n"
ALONE = (
    "leave-one-out comparison: found 1 gauge; expected two gauges or more, since each is estimated from the others; "
)
DRY = "leave-one-out comparison: found no wet day; expected wet days on which several gauges have values; "


OF_DISTANCE = "inverse-distance, inverse-distance-ratios"
OF_NEAREST = (
    "station-average, inverse-distance, normal-ratio, ten-percent-rule, inverse-distance-ratios, "
    "correlation-weighting, regression, ratio-regression"
)


@pytest.mark.parametrize(
    ("method", "option", "takers"),
    [("normal-ratio", "power", OF_DISTANCE), ("four-quadrant", "nearest", OF_NEAREST)],
)
@pytest.mark.parametrize("command", ["infill", "storm"])
def test_options_of_another_method(tmp_path: Path, command: str, method: str, option: str, takers: str) -> None:
    """One line, exit 1, nothing written."""
    job = write_tiny(tmp_path, job=DAILY, gauges=CROSS, rain=daily(cross_depths()))
    assert refused(command, job, f"infill.method={method}", f"infill.{option}=2") == (
        f"[infill] {option}: found it beside method '{method}'; expected one of the methods that take it: {takers}; "
        f"remove {option}, or choose one of these\n"
    )
    assert not (tmp_path / "output").exists()


@pytest.mark.parametrize("method", ["inverse-distance", "leave-one-out"])
@pytest.mark.parametrize("command", ["infill", "storm"])
def test_an_elevation_limit_without_an_elevation(tmp_path: Path, command: str, method: str) -> None:
    """The one gauge that has none is named in one line."""
    rows = [f"{row},{'' if k == 2 else 100}" for k, row in enumerate(CROSS.splitlines()[1:])]
    gauges = "\n".join(["id,name,x,y,elevation", *rows]) + "\n"
    job = write_tiny(tmp_path, job=DAILY, gauges=gauges, rain=daily(seeded_depths()))
    assert refused(command, job, "infill.elevation_limit=100", f"infill.method={method}") == (
        "gauge E: found no elevation; expected one, since [infill] elevation_limit is set; give it, leave the gauge "
        "out, or remove elevation_limit\n"
    )


@pytest.mark.parametrize(
    ("command", "method", "gauges", "rain", "expected"),
    [
        ("storm", "leave-one-out", ONE, LONELY, ALONE + "give further gauges, or name the infill method"),
        (
            "infill",
            "leave-one-out",
            ONE,
            LONELY,
            ALONE + "give further gauges, or use 'basinrain storm', with the infill method named",
        ),
        (
            "infill",
            "regression",
            CROSS,
            daily(0 * cross_depths()),
            DRY + "give a longer record, or use 'basinrain storm', which infills without comparing",
        ),
        (
            "storm",
            "leave-one-out",
            CROSS,
            daily(0 * cross_depths()),
            DRY + "give a longer record, or name the infill method",
        ),
    ],
)
def test_nothing_to_compare(  # noqa: PLR0917 - the cases of a table
    tmp_path: Path, command: str, method: str, gauges: str, rain: str, expected: str
) -> None:
    """One gauge, or no wet day: one line that advises what would help, and not to do what the job does already."""
    job = write_tiny(tmp_path, job=DAILY, gauges=gauges, rain=rain)
    assert refused(command, job, f"infill.method={method}") == expected + "\n"


def test_storm_totals_without_dates(tmp_path: Path) -> None:
    """Three storms: single cases are drawn, it is warned of, and the missing total is estimated."""
    rows = ["gauge,storm,depth"]
    for storm, depths in (("one", "20 10 10 10 10"), ("two", "22 11 11 - 11"), ("three", "18 9 9 9 9")):
        rows += [f"{gauge},{storm},{depth.strip('-')}" for gauge, depth in zip(GAUGES, depths.split(), strict=True)]
    totals = JOB.replace('interval = "1h"', 'layout = "totals"')
    job = write_tiny(tmp_path, job=totals, gauges=CROSS, rain="\n".join(rows) + "\n")
    run = run_infill(job, ["infill.method=leave-one-out"])
    assert run.comparison.drawn == "case"
    assert next(str(note) for note in run.warnings if note.code == "intervals-too-narrow").startswith(
        "Cases lie on 3 storm totals only, fewer than 5, so single cases, a gauge's storm total each, were drawn anew"
    )
    # Storms one and three as on the cross; of storm two Mid, North and West, whose three donors give (22 + 2 x 11)/3.
    # East sees all its donors in one quadrant then, so it is no case.
    errors = [k * e for k in (1.0, 0.9) for e in (-10, 2.5, 2.5, 2.5, 2.5)] + [1.1 * e for e in (-10, 10 / 3, 10 / 3)]
    score = run.comparison.score("station-average")
    assert score.n == 13
    assert score.rmse == pytest.approx(np.sqrt(np.mean(np.square(errors))))
    # The mean of four donors has the least error; the nearest gauge is worse at every arm.
    assert run.comparison.chosen == "station-average"
    assert run.infilled[["gauge", "depth"]].to_numpy().tolist() == [["S", pytest.approx((22 + 3 * 11) / 4)]]


def test_storm_totals_keep_their_names(tmp_path: Path) -> None:
    """Two storms without dates: every table says which is which; in Quill too few gauges are left to be compared."""
    rain = "storm,gauge,depth\nQuill,A,10\nQuill,B,\nQuill,C,30\nReed,A,4\nReed,B,6\nReed,C,8\n"
    job = write_tiny(tmp_path, job=JOB.replace('interval = "1h"', 'layout = "totals"'), rain=rain)
    done = basinrain("infill", job, "--set", "infill.method=station-average")
    assert (done.returncode, done.stderr) == (0, "")
    folder = tmp_path / "output" / "infill"
    assert (folder / "completed_mm.csv").read_text(
        encoding="utf-8"
    ) == "storm,A,B,C\nQuill,10.0,20.0,30.0\nReed,4.0,6.0,8.0\n"
    assert (folder / "completed_status.csv").read_text(encoding="utf-8").splitlines()[
        1
    ] == "Quill,observed,infilled,observed"
    assert (folder / "infilled.csv").read_text(encoding="utf-8").splitlines()[1].startswith("Quill,B,,storm,20.0,mm,")
    cases = (folder / "infill_cases.csv").read_text(encoding="utf-8").splitlines()
    assert [line.split(",")[1] for line in cases] == ["storm", "Reed", "Reed", "Reed"]

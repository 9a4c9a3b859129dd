"""Bad input: a clear line a problem, exit 1, nothing written, no input touched, no traceback."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner
from tiny import EAST, GAUGES, JOB, RAIN, WEST, feature, geojson, write_tiny

from basinrain.cli import main

STORM = '\n[[storm]]\nname = "Q"\nstart = {}\nend = {}\n'
LONLAT_GAUGES = "id,lon,lat\nA,10.1,50.1\nB,10.2,50.2\nC,10.3,50.1\n"
LONLAT_JOB = JOB.replace('crs = "local"\nlength_unit = "km"\n', "").replace("cell = 250", "cell = 1000")
LONLAT_BASIN = geojson(feature([[10, 50], [10.4, 50], [10.4, 50.3], [10, 50.3], [10, 50]], name="only"))


def fingerprints(folder: Path) -> dict[str, str]:
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def with_storm(start: str, end: str) -> dict[str, str]:
    return {"job": JOB + STORM.format(f"{start}:00", f"{end}:00")}


CASES: dict[str, tuple[dict[str, Any], str]] = {
    "no CRS": (
        {"job": JOB.replace('crs = "local"\nlength_unit = "km"\n\n[[rain', "\n[[rain")},
        r"gauges\.csv.*crs",
    ),
    "lon and lat swapped": (
        {"job": LONLAT_JOB, "basins": LONLAT_BASIN, "gauges": "id,lon,lat\nA,50.1,10.1\nB,50.2,10.2\nC,50.1,10.3\n"},
        r"(?i)swapped",
    ),
    "latitude beyond the pole": (
        {"job": LONLAT_JOB, "basins": LONLAT_BASIN, "gauges": "id,lon,lat\nA,10,150.1\nB,10.2,50.2\nC,10.3,50.1\n"},
        r"gauges\.csv:2: .*gauge A.*(?i:swapped)",
    ),
    "nowhere near": (
        {"job": LONLAT_JOB, "basins": LONLAT_BASIN, "gauges": "id,lon,lat\nA,-70,-30\nB,-70.1,-30\nC,-70.2,-30\n"},
        r"(?i)km",
    ),
    "gauge in rain but not in gauges": ({"rain": RAIN.replace("time,A,B,C", "time,A,B,X")}, r"gauge X"),
    "gauge in gauges but not in rain": (
        {"rain": "\n".join(line.rsplit(",", 1)[0] for line in RAIN.splitlines()) + "\n"},
        r"gauge C",
    ),
    "gauge id twice": ({"gauges": GAUGES.replace("C,", "A,")}, r"gauges\.csv:4: .*gauge A"),
    "basin id twice": ({"basins": geojson(feature(WEST, name="w"), feature(EAST, name="w"))}, r"basin w.*merge"),
    "time twice": ({"rain": RAIN.replace("T03:00", "T02:00")}, r"rain\.csv:4: .*2031-05-04T02:00"),
    "times out of order": ({"rain": RAIN.replace("T02:00", "T05:00")}, r"rain\.csv:\d: "),
    "undeclared gap in time": (
        {"rain": RAIN.replace("2031-05-04T03:00,5,10,30\n", "")},
        r"rain\.csv.*gaps",
    ),
    "text in a depth": ({"rain": RAIN.replace("4,9,50", "4,nine,50")}, r"rain\.csv:3: column B: .*'nine'"),
    "infinite depth": ({"rain": RAIN.replace("4,9,50", "4,inf,50")}, r"rain\.csv:3: column B: .*inf"),
    "negative depth": ({"rain": RAIN.replace("4,9,50", "4,-0.2,50")}, r"rain\.csv:3: column B: .*-0\.2"),
    "undeclared -999": ({"rain": RAIN.replace("4,9,50", "4,-999,50")}, r"rain\.csv:3: column B: .*-999.*missing"),
    "undeclared -9999": ({"rain": RAIN.replace("4,9,50", "4,-9999,50")}, r"rain\.csv:3: column B: .*-9999.*missing"),
    "undeclared 9999": ({"rain": RAIN.replace("4,9,50", "4,9999,50")}, r"rain\.csv:3: column B: .*9999.*missing"),
    "unit missing": (
        {"job": JOB.replace('unit = "mm"\n', "")},
        r"job\.toml:\d+: \[\[rainfall\]\] no\. 1 unit: found no",
    ),
    "interval missing": ({"job": JOB.replace('interval = "1h"\n', "")}, r"\[\[rainfall\]\] no\. 1: found no interval"),
    "normals missing": (
        {
            "job": JOB + '\n[infill]\nmethod = "normal-ratio"\n',
            "gauges": GAUGES.replace(",1000", ",").replace(",1200", ",0"),
            "rain": RAIN.replace("4,9,50", "4,,50"),
        },
        r"gauge B.*\n.*gauge C|gauge C.*\n.*gauge B",
    ),
    "two gauges at one place": ({"gauges": GAUGES.replace("11,5", "7.5,5")}, r"B.*C.*mean"),
    "empty basin": (
        {
            "basins": geojson(
                {"type": "Feature", "properties": {"name": "gone"}, "geometry": None}, feature(EAST, name="e")
            )
        },
        r"basin gone",
    ),
    "bow-tie basin": (
        {"basins": geojson(feature([[0, 0], [5, 10], [5, 0], [0, 10], [0, 0]], name="tie"))},
        r"basin tie",
    ),
    "basin without area": (
        {"basins": geojson(feature([[0, 0], [5, 5], [10, 10], [0, 0]], name="flat"))},
        r"basin flat",
    ),
    "no gauge reporting in the storm": (
        {
            "rain": re.sub(r"T02:00,.*", "T02:00,,,", RAIN),
            **with_storm("2031-05-04T01:00", "2031-05-04T02:00"),
        },
        r"storm Q: found no gauge reporting in it",
    ),
    "storm outside the record": (with_storm("2031-06-04T01:00", "2031-06-04T02:00"), r"storm Q: .*inside the record"),
    "storm ends before it starts": (
        with_storm("2031-05-04T03:00", "2031-05-04T02:00"),
        r"storm Q: .*end after the start",
    ),
    "unknown key": ({"job": JOB.replace("id = ", "idd = ")}, r"\[basins\] idd: .*did you mean 'id'\?"),
    "unknown method": ({"job": JOB + '\n[infill]\nmethod = "nomal-ratio"\n'}, r"did you mean 'normal-ratio'\?"),
    "unknown unit": ({"job": JOB.replace('unit = "mm"', 'unit = "inches"')}, r"unit: found 'inches'; expected one of"),
    "unknown CRS": ({"job": JOB.replace('crs = "local"', 'crs = "EPSG:1"', 1)}, r"found 'EPSG:1'"),
    "file missing": (
        {"job": JOB.replace("rain.csv", "rian.csv")},
        r"rian\.csv: the file: found nothing of that name; expected a file; correct the path",
    ),
    "file is a folder": ({"job": JOB.replace("rain.csv", ".")}, r"folder|directory"),
    "empty file": ({"rain": ""}, r"rain\.csv: .*empty|rain\.csv: .*nothing"),
    "binary file": ({"rain__csv": b"\x00\x01\x02" * 50}, r"rain\.csv: .*binary|rain\.csv: .*NUL"),
    "file that is not UTF-8": ({"rain__csv": RAIN.encode() + b"\xe9"}, r"rain\.csv.*UTF-8"),
    "basins that are no map file": ({"basins": "not a map"}, r"basins\.geojson"),
    "common step that does not fit": ({"job": JOB + '\n[step]\ncommon = "45min"\n'}, r"45min.*1h|1h.*45min"),
    "unknown catch factor": (
        {
            "job": JOB.replace(
                'length_unit = "km"\n\n[[rain', 'length_unit = "km"\ncatch_factor = { Z = 1.1 }\n\n[[rain'
            )
        },
        r"catch_factor of Z: found a gauge that is not in the network",
    ),
    "basin called union": ({"basins": geojson(feature(WEST, name="union"))}, r"union"),
    "storm pattern of an unknown gauge": (
        {"job": JOB + '\n[[storm]]\nname = "Q"\npattern = "Z9"\n'},
        r"storm Q pattern: found 'Z9'",
    ),
    "storm named twice": (
        {"job": JOB + '\n[[storm]]\nname = "Q"\n\n[[storm]]\nname = "Q"\n'},
        r"storm Q: found the name twice",
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_bad_input_is_refused_with_a_clear_line(tmp_path: Path, name: str) -> None:
    """Exit 1, the problem named on stderr, nothing on stdout, no folder, every input as it was."""
    files, message = CASES[name]
    job = write_tiny(tmp_path / "work", **files)
    before = fingerprints(tmp_path)
    result = CliRunner().invoke(main, ["storm", str(job)])
    assert result.exit_code == 1, result.output
    assert re.search(message, result.stderr), result.stderr
    assert result.stdout == ""
    assert "Traceback" not in result.stderr
    assert all(": found " in line for line in result.stderr.splitlines()), result.stderr
    assert fingerprints(tmp_path) == before


def test_the_tiny_job_itself_is_sound(tmp_path: Path) -> None:
    """Unchanged, the job of the cases above runs: what fails there is what was changed."""
    result = CliRunner().invoke(main, ["storm", str(write_tiny(tmp_path))])
    assert (result.exit_code, result.stderr) == (0, "")


def test_problems_of_all_files_come_together(tmp_path: Path) -> None:
    """A run tells what is wrong in gauges, rain and basins at once, not one file at a time."""
    job = write_tiny(
        tmp_path,
        gauges=GAUGES.replace("2.5,5", "two,5"),
        rain=RAIN.replace("4,9,50", "4,x,-1"),
        basins=geojson(feature([[0, 0], [5, 10], [5, 0], [0, 10], [0, 0]], name="tie")),
    )
    result = CliRunner().invoke(main, ["storm", str(job)])
    assert result.exit_code == 1
    text = result.stderr
    assert [
        bool(re.search(p, text))
        for p in (r"gauges\.csv:2: ", r"rain\.csv:3: column B", r"rain\.csv:3: column C", "tie")
    ] == [True] * 4


def test_unreadable_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A file without the right to read is named (shown by the system's answer, since root may read everything)."""
    job = write_tiny(tmp_path)
    real = Path.open

    def refuse(self: Path, *args: Any, **kwargs: Any) -> Any:  # noqa: ANN401 - stands in for Path.open
        if self.name == "rain.csv":
            raise PermissionError(13, "Permission denied")
        return real(self, *args, **kwargs)

    monkeypatch.setattr(Path, "open", refuse)
    result = CliRunner().invoke(main, ["storm", str(job)])
    assert result.exit_code == 1
    assert re.search(r"rain\.csv: the file: found that it cannot be read \(Permission denied\)", result.stderr)


def test_output_folder_with_an_input_is_refused(tmp_path: Path) -> None:
    """Results never replace the folder that holds an input."""
    job = write_tiny(tmp_path / "storm")
    before = fingerprints(tmp_path)
    result = CliRunner().invoke(main, ["storm", str(job), "--output", str(tmp_path)])
    assert result.exit_code == 1
    assert "found the input job.toml inside it; expected a folder without inputs" in result.stderr
    assert fingerprints(tmp_path) == before


def test_output_that_cannot_be_written(tmp_path: Path) -> None:
    """A file where the folder should be is refused before anything is computed."""
    job = write_tiny(tmp_path / "work")
    (tmp_path / "out").write_text("a file")
    result = CliRunner().invoke(main, ["storm", str(job), "--output", str(tmp_path / "out")])
    assert result.exit_code == 1
    assert f"found the file {tmp_path / 'out'} on the way to it; expected a folder" in result.stderr


@pytest.mark.parametrize("arguments", [["storm"], ["strom", "x"], ["storm", "job.toml", "--colour"]])
def test_wrong_usage_leaves_with_two(arguments: list[str]) -> None:
    """What the command line itself gets wrong is usage, exit 2."""
    assert CliRunner().invoke(main, arguments).exit_code == 2


def test_a_setting_that_cannot_be_placed_is_wrong_usage(tmp_path: Path) -> None:
    """A --set without a value leaves with 2; one with a wrong value with 1, and is not blamed on a line of the file."""
    job = str(write_tiny(tmp_path))
    placed = CliRunner().invoke(main, ["storm", job, "--set", "infill"])
    assert (placed.exit_code, placed.stderr) == (
        2,
        "--set: found 'infill'; expected TABLE.KEY=VALUE; write infill.method=normal-ratio\n",
    )
    valued = CliRunner().invoke(main, ["storm", job, "--set", "infill.power=steep"])
    assert (valued.exit_code, valued.stderr) == (
        1,
        "[infill] power: found 'steep'; expected a number; correct the value\n",
    )


def test_interrupted_run_says_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Ctrl-C leaves with 130, one line, and nothing written."""
    from basinrain import job as running

    def interrupt(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    job = write_tiny(tmp_path)
    before = fingerprints(tmp_path)
    monkeypatch.setattr(running, "run_storm", interrupt)
    result = CliRunner().invoke(main, ["storm", str(job)])
    assert (result.exit_code, result.stdout, result.stderr) == (130, "", "Stopped; nothing was written.\n")
    assert fingerprints(tmp_path) == before


def test_start_refuses_a_folder_with_something_in_it(tmp_path: Path) -> None:
    """`start` never writes into what is there."""
    (tmp_path / "mine.txt").write_text("x")
    run: Callable[[str], Any] = lambda folder: CliRunner().invoke(main, ["start", folder])  # noqa: E731
    result = run(str(tmp_path))
    assert (result.exit_code, result.stdout) == (1, "")
    assert "found something there already; expected a new or empty folder" in result.stderr
    assert [path.name for path in tmp_path.iterdir()] == ["mine.txt"]

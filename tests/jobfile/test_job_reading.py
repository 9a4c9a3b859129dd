"""Reading a job: every wrong key and value named, all together, with the place where it stands."""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

import pytest

from basinrain.errors import JobError, ReadError, SettingError
from basinrain.jobfile import Job, parse_job, read_job

SMALL = """
[job]
name = "Small"

[gauges]
file = "gauges.csv"

[[rainfall]]
file = "hourly.csv"
unit = "mm"
interval = "1h"

[[rainfall]]
files = ["a.csv", "b.csv"]
unit = "in"
interval = "1d"

[basins]
file = "basins.geojson"

[[storm]]
name = "Quill"
start = 2031-05-03T18:00:00
end = 2031-05-05
"""


def job_file(folder: Path, text: str = SMALL) -> Path:
    path = folder / "job.toml"
    path.write_text(text, encoding="utf-8")
    return path


def tables() -> dict[str, Any]:
    return {
        "job": {"name": "x"},
        "gauges": {"file": "g.csv"},
        "rainfall": {"file": "r.csv", "unit": "mm", "interval": "1h"},
        "basins": {"file": "b.geojson"},
    }


def test_defaults_are_resolved(tmp_path: Path) -> None:
    """A small file gives a whole job, with the design's defaults and paths that start at the file."""
    job = read_job(job_file(tmp_path))
    assert job.averaging.methods == ("arithmetic", "thiessen", "idw")
    assert (job.infill.method, job.infill.power, job.infill.min_donors, job.infill.longest_gap) == (
        "inverse-distance",
        None,
        None,
        31.0,
    )
    assert job.storm[0].start == "2031-05-03T18:00:00"
    assert job.storm[0].end == "2031-05-05"
    assert [path.name for path in job.inputs] == ["gauges.csv", "hourly.csv", "a.csv", "b.csv", "basins.geojson"]
    assert job.path("gauges.csv") == tmp_path / "gauges.csv"


def test_a_setting_by_number_of_a_table_written_once() -> None:
    """rainfall.1 is the table that stands in single brackets."""
    assert parse_job(tables(), settings=["rainfall.1.stamp=start"]).rainfall[0].stamp == "start"


def test_a_table_given_once_may_stand_in_single_brackets() -> None:
    """[rainfall] and [storm] are lists of one."""
    job = parse_job({**tables(), "storm": {"name": "Quill"}})
    assert (len(job.rainfall), len(job.storm)) == (1, 1)


def test_every_problem_is_listed_with_its_line(tmp_path: Path) -> None:
    """Unknown keys, wrong units, wrong types and missing keys come in one error, each on its own line of text."""
    text = SMALL.replace('unit = "in"\n', 'unit = "inch"\n').replace('name = "Small"', 'nam = "Small"')
    text = text.replace('name = "Quill"', 'name = "Quill"\npatern = "mean"') + '\n[infil]\nmethod = "x"\n'
    path = job_file(tmp_path, text)
    with pytest.raises(JobError) as caught:
        read_job(path)
    unknown = "found a key that is not known; expected one of:"
    units = "mm, cm, m, in, 0.1 mm, 0.01 mm, 0.1 in, 0.01 in, 0.001 in, kg m-2"
    names = "job, basins, gauges, rainfall, step, screening, edit, storm, infill, averaging, series, storms, design"
    expected = [
        f"{path}:2: [job] name: found no such key; expected it to be given; add it",
        f"{path}:3: [job] nam: {unknown} name, depth_unit, area_unit, output, plane; did you mean 'name'?",
        f"{path}:15: [[rainfall]] no. 2 unit: found 'inch'; expected one of: {units}; did you mean 'in'?",
        f"{path}:23: [[storm]] no. 1 patern: {unknown} name, start, end, pattern; did you mean 'pattern'?",
        f"{path}:27: [infil]: {unknown} {names}; did you mean 'infill'?",
    ]
    assert sorted(str(caught.value).splitlines()) == sorted(expected)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            {"averaging": {"methods": ["theissen"]}},
            r"\[averaging\] methods.no. 1: found 'theissen'.*did you mean 'thiessen'",
        ),
        (
            {"infill": {"method": "normal ratio"}},
            r"\[infill\] method: found 'normal ratio'.*did you mean 'normal-ratio'",
        ),
        ({"infill": {"power": -1}}, r"\[infill\] power: found -1; expected a number above 0"),
        ({"infill": {"min_donors": 0}}, r"\[infill\] min_donors: found 0; expected a number of at least 1"),
        ({"infill": {"nearest": 2.5}}, r"\[infill\] nearest: found 2.5; expected a whole number"),
        ({"infill": {"power": "two"}}, r"\[infill\] power: found 'two'; expected a number"),
        ({"infill": {"power": float("inf")}}, r"\[infill\] power: found inf; expected a finite number"),
        ({"averaging": {"idw": {"powr": 2}}}, r"\[averaging\] idw.powr: found a key that is not known.*'power'"),
        (
            {"storm": {"name": "q", "start": "May 3"}},
            r"\[\[storm\]\] no. 1 start: found 'May 3'; expected a month, a date",
        ),
        (
            {"rainfall": {"unit": "mm", "interval": "1h"}},
            r"\[\[rainfall\]\] no. 1: found both or neither; .*file or files",
        ),
        (
            {"rainfall": {"file": "r.csv", "unit": "mm"}},
            r"\[\[rainfall\]\] no. 1: found no interval; expected interval",
        ),
        ({"rainfall": {"file": "r.csv", "interval": "1h"}}, r"\[\[rainfall\]\] no. 1 unit: found no such key"),
        ({"averaging": {"methods": []}}, r"\[averaging\] methods: found an empty list; expected at least one"),
        (
            {"rainfall": {"file": "r.csv", "unit": "mm", "interval": "1h", "intervall": "1h"}},
            r"\[\[rainfall\]\] no. 1 intervall: found a key that is not known; .*did you mean 'interval'\?",
        ),
        (
            {"rainfall": {"file": "r.csv", "unit": "mm", "interval": 60}},
            r"\[\[rainfall\]\] no. 1 interval: found 60; expected text in quotes",
        ),
        ({"rainfall": []}, r"\[\[rainfall\]\]: found no table; expected at least one"),
        (
            {"gauges": {"file": "g.csv", "catch_factor": {"R01": 0}}},
            r"^\[gauges\] catch_factor.R01: found 0; expected a number above 0; correct the value$",
        ),
        (
            {"averaging": {"arithmetic": {"gauges": "insid"}}},
            r"^\[averaging\] arithmetic.gauges: found 'insid'; expected .*'inside' or 'all'.*$",
        ),
        ({"gauges": 3}, r"\[gauges\]: found 3; expected a table"),
        ({"job": {"name": 5}}, r"\[job\] name: found 5; expected text in quotes"),
    ],
)
def test_a_wrong_value_says_what_is_accepted(change: dict[str, Any], message: str) -> None:
    """Each kind of wrong value is named with what was found and what is accepted."""
    with pytest.raises(JobError, match=message):
        parse_job({**tables(), **change})


def test_settings_change_the_job(tmp_path: Path) -> None:
    """--set speaks the job's words: numbers, lists and plain text; repeated tables are counted from 1."""
    job = read_job(
        job_file(tmp_path),
        [
            "infill.method=normal-ratio",
            "infill.power=3",
            "averaging.methods=['idw']",
            "averaging.idw.cell=500",
            "rainfall.2.stamp=start",
            "storm.pattern=nearest-recorder",
            "step.common='1h'",
        ],
    )
    assert (job.infill.method, job.infill.power, job.averaging.methods) == ("normal-ratio", 3.0, ("idw",))
    assert job.averaging.options("idw") == {"power": 2.0, "cell": 500.0, "allow_uncovered": False}
    assert [source.stamp for source in job.rainfall] == ["end", "start"]
    assert (job.storm[0].pattern, job.step.common) == ("nearest-recorder", "1h")


@pytest.mark.parametrize(
    ("setting", "message"),
    [
        ("infill", "--set: found 'infill'; expected TABLE.KEY=VALUE"),
        ("infill.=3", "--set: found 'infill.=3'"),
        (
            "rainfall.unit=mm",
            r"found 2 such tables; expected the number of one of them, .*; write rainfall\.1\.unit=\.\.\.",
        ),
        ("rainfall.7.unit=mm", "found '7'; expected the number of a table that the job has, 1 to 2"),
        ("job.name.deep.er=1", "found 'deep' inside a plain value of the key before it; expected a table there"),
        (
            "job.name.deep=1",
            r"found 'deep' inside a plain value of name; .*give the whole value as a table, \{deep=\.\.\.\}",
        ),
    ],
)
def test_a_wrong_setting_is_refused(tmp_path: Path, setting: str, message: str) -> None:
    """A --set that cannot be placed says why."""
    with pytest.raises(SettingError, match=message):
        read_job(job_file(tmp_path), [setting])


def test_a_file_that_is_not_toml_is_refused(tmp_path: Path) -> None:
    """Syntax errors carry the line; missing files, folders and binary files are named."""
    path = job_file(tmp_path, '[job]\nname = "a\n')
    with pytest.raises(ReadError, match=r"job.toml:2: job file: found .*; expected TOML; correct the line"):
        read_job(path)
    job_file(tmp_path, SMALL.replace("T18:00:00", "T18:00"))
    with pytest.raises(ReadError, match=r"job.toml:23: .*a time in TOML has seconds: write 2031-05-03T18:00:00, or"):
        read_job(path)
    with pytest.raises(ReadError, match="job file: found no such file or directory; expected a TOML file"):
        read_job(tmp_path / "none.toml")
    with pytest.raises(ReadError, match="job file: found is a directory"):
        read_job(tmp_path)
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(ReadError, match="found bytes that are not UTF-8 text"):
        read_job(path)


def test_byte_order_mark_and_windows_line_ends(tmp_path: Path) -> None:
    """A job written by a Windows editor reads the same."""
    path = tmp_path / "job.toml"
    path.write_bytes(b"\xef\xbb\xbf" + SMALL.replace("\n", "\r\n").encode())
    assert read_job(path).job.name == "Small"


def test_the_schema_in_docs_is_that_of_the_code() -> None:
    """docs/job.schema.json is what the models say."""
    written = json.loads((Path(__file__).parents[2] / "docs" / "job.schema.json").read_text(encoding="utf-8"))
    assert written == Job.model_json_schema()


def test_every_key_is_in_the_documentation() -> None:
    """docs/job-file.md names every key of every table."""
    text = (Path(__file__).parents[2] / "docs" / "job-file.md").read_text(encoding="utf-8")
    schema = Job.model_json_schema()
    keys = {key for table in schema["$defs"].values() for key in table.get("properties", {})}
    assert {key for key in keys if not re.search(rf"[`.]{key}`", text)} == set()

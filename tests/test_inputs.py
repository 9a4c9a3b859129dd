"""What a job's files hold once they are read, edited, screened and brought into the working plane."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tiny import GAUGES, JOB, write_tiny

from basinrain.errors import ReadError
from basinrain.inputs import Inputs, input_digests, read_inputs
from basinrain.jobfile import read_job

FOUR = GAUGES + "D,Dene Head,5,9,200,950\n"
DAILY = """
[[rainfall]]
file = "daily.csv"
layout = "long"
unit = "mm"
interval = "1d"
"""


def hours(burst: float) -> str:
    """Return a day of two wet hours at B and C, and at A of one with ``burst`` mm."""
    rows = ["time,A,B,C"]
    for k in range(1, 25):
        rest = 2 if k in {3, 4} else 0
        rows += [f"2031-05-{4 + k // 24:02d}T{k % 24:02d}:00,{burst if k == 7 else 0},{rest},{rest}"]
    return "\n".join(rows) + "\n"


def given(job: Path, *settings: str) -> tuple[Inputs, list[str]]:
    said: list[str] = []
    return read_inputs(read_job(job, settings), said.append), said


def test_the_raw_record_keeps_what_the_job_rejects(tmp_path: Path) -> None:
    """The checks see 500 mm in an hour; what is computed with does not."""
    job = write_tiny(
        tmp_path, gauges=FOUR, rain=hours(500), job=JOB + DAILY, daily__csv="gauge,date,depth\nD,2031-05-04,9\n"
    )
    inputs, said = given(job, "screening.reject=['greatest-depths A']")
    assert said == ["reading", "screening"]
    assert inputs.raw.depth[6, 0] == 500
    assert np.isnan(inputs.record.depth[6, 0])
    assert {found.state for found in inputs.screening.findings if found.check == "greatest-depths"} == {"rejected"}


def test_a_note_on_times_that_were_rejected_does_not_stay(tmp_path: Path) -> None:
    """With every recorder dry D is spread evenly, said so; with a true burst left, the times are its own."""
    daily = {"daily__csv": "gauge,date,depth\nD,2031-05-04,9\n"}
    dry = write_tiny(tmp_path / "dry", gauges=FOUR, rain=hours(0).replace(",2", ",0"), job=JOB + DAILY, **daily)
    inputs, _ = given(dry)
    assert [note.code for note in inputs.notes if note.code == "spread-evenly"] == ["spread-evenly"]
    wet = write_tiny(tmp_path / "wet", gauges=FOUR, rain=hours(500), job=JOB + DAILY, **daily)
    inputs, _ = given(wet, "screening.reject=['greatest-depths A']")
    assert [note.code for note in inputs.notes if note.code == "spread-evenly"] == []
    d = inputs.record.gauges.index("D")
    assert inputs.record.depth[:, d].nonzero()[0].tolist() == [2, 3]
    assert inputs.record.depth[:, d].sum() == pytest.approx(9, rel=1e-12)


def test_options_of_the_job_are_told_with_the_faults_of_its_files(tmp_path: Path) -> None:
    """A negative depth and a power beside the normal ratio: both lines at once."""
    job = write_tiny(tmp_path, rain=hours(-1))
    with pytest.raises(ReadError) as caught:
        given(job, "infill.method=normal-ratio", "infill.power=2")
    lines = str(caught.value).splitlines()
    assert len(lines) == 2
    assert "gauge A: found '-1'" in lines[0]
    assert lines[1].startswith("[infill] power: found it beside method 'normal-ratio'")


def test_every_input_has_its_fingerprint(tmp_path: Path) -> None:
    """The same bytes give the same text, another byte another."""
    job = read_job(write_tiny(tmp_path))
    before = input_digests(job)
    assert set(before) == {"gauges.csv", "rain.csv", "basins.geojson"}
    (tmp_path / "rain.csv").write_text("time,A,B,C\n2031-05-04T01:00,1,6,21\n", encoding="utf-8")
    after = input_digests(job)
    assert {name for name in before if before[name] != after[name]} == {"rain.csv"}

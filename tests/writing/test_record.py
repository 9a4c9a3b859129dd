"""The record of a run is JSON as every reader takes it: what does not exist is null."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any, NoReturn

import numpy as np
import pytest
from tiny import JOB, RAIN, write_tiny

from basinrain.job import run_storm
from basinrain.results import StormRun
from basinrain.writing.record import record_text, run_record, run_tables


@pytest.fixture(scope="module")
def run(tmp_path_factory: pytest.TempPathFactory) -> StormRun:
    """Without a gauge inside the basins, and without any gauge in the second hour: totals and shares do not exist."""
    gauges = "id,x,y\nA,12,5\nB,14,5\nC,15,5\n"
    folder = tmp_path_factory.mktemp("record")
    return run_storm(write_tiny(folder, job=JOB, gauges=gauges, rain=RAIN.replace("4,9,50", ",,")))


def refuse(name: str) -> NoReturn:
    raise AssertionError(f"{name} is no JSON")


def parsed(run: StormRun) -> dict[str, Any]:
    document: dict[str, Any] = json.loads(record_text(run, ["a.csv"]), parse_constant=refuse)
    return document


def numbers(value: object) -> list[float]:
    if isinstance(value, dict | list):
        return [n for item in (value.values() if isinstance(value, dict) else value) for n in numbers(item)]
    return [value] if isinstance(value, float) else []


def test_no_nan_in_the_record(run: StormRun) -> None:
    """The run's tables have NaN, the record has none: every number in it is finite."""
    assert run.basin_means["depth"].isna().all()
    text = record_text(run, [])
    assert "NaN" not in text
    assert "Infinity" not in text
    found = numbers(parsed(run))
    assert len(found) > 100
    assert all(math.isfinite(number) for number in found)


def test_null_stands_for_what_does_not_exist(run: StormRun) -> None:
    """A total that misses an hour is null, as are its volume and share, beside the hours that do exist."""
    results = parsed(run)["results"]
    for row in results["basin_means"]:
        assert (row["depth"], row["volume"], row["share_infilled"]) == (None, None, None)
        assert row["area"] > 0
    hours = [r["depth"] for r in results["hyetographs"] if (r["basin"], r["method"]) == ("union", "thiessen")]
    # On the line of gauges A, at 12 km, is nearest to all of the square: its own 1, 5 and 0 mm.
    assert hours == [pytest.approx(1), None, pytest.approx(5), pytest.approx(0)]
    silent = [r["depth"] for r in results["hyetographs"] if (r["basin"], r["method"]) == ("union", "arithmetic")]
    assert silent == [None] * 4


def test_every_cell_of_every_table_is_in_the_record(run: StormRun) -> None:
    """Rows and columns of the record are those of the tables, and null exactly where a cell is NaN."""
    results = parsed(run)["results"]
    tables = run_tables(run)
    assert list(results) == list(tables)
    nulls = 0
    for name, frame in tables.items():
        assert len(results[name]) == len(frame)
        for column in frame.columns:
            cells = [row[column] for row in results[name]]
            empty = frame[column].isna().to_numpy()
            assert [cell is None for cell in cells] == empty.tolist(), (name, column)
            nulls += int(np.count_nonzero(empty))
            assert [c for c in cells if c is not None] == frame[column][~empty].tolist(), (name, column)
    assert nulls > 10


def test_warnings_and_remarks_have_only_the_fields_that_apply(run: StormRun) -> None:
    """A note of one basin names the basin and nothing that is empty; all of the run's notes are there."""
    document = parsed(run)
    assert len(document["warnings"]) + len(document["remarks"]) == len(run.notes)
    assert len(document["warnings"]) == len(run.warnings) > 0
    outside = [note for note in document["warnings"] if note["code"] == "no-gauge-inside"]
    assert {note["basin"] for note in outside} == {"west", "east", "union"}
    assert all(value for note in document["warnings"] for value in note.values())


def test_the_record_says_what_was_asked_and_read(run: StormRun) -> None:
    """The resolved job, the fingerprint of every input, the clock and the files beside it."""
    document = run_record(run, ["a.csv"])
    assert document["files"] == ["a.csv"]
    assert document["job"]["infill"]["power"] == 2.0
    assert set(document["inputs"]) == {"gauges.csv", "rain.csv", "basins.geojson"}
    assert all(len(entry["sha256"]) == 64 for entry in document["inputs"].values())
    assert (document["clock"], document["step"], document["plane"]["crs"]) == ("as in the files", "1h", "local")


def test_names_keep_their_letters(tmp_path: Path) -> None:
    """Letters beyond ASCII are written as they are, not as codes."""
    job = write_tiny(tmp_path, job=JOB.replace("Two halves", "Größe für Ørsund"))
    assert '"name": "Größe für Ørsund"' in record_text(run_storm(job), [])

"""Which infill method a job uses, on a cross of five gauges drawn by hand."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from tiny import JOB, write_tiny

from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork
from basinrain.infill_choice import choose_infill, compare, infill_options
from basinrain.jobfile import Job, read_job
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")
CROSS = GaugeNetwork(
    ids=("M", "N", "E", "S", "W"), x=1e3 * np.array([5.0, 5, 8, 5, 2]), y=1e3 * np.array([5.0, 8, 5, 2, 5]), crs="local"
)


def job_with(folder: Path, *settings: str) -> Job:
    return read_job(write_tiny(folder, job=JOB), [f"infill.{setting}" for setting in settings])


def record_of(depths: object, step: str = "1d") -> RainRecord:
    values = np.asarray(depths, dtype=float)
    length = np.timedelta64(86400 if step == "1d" else 3600, "s")
    ends = np.datetime64("2031-03-01", "s") + np.arange(1, len(values) + 1) * length
    return RainRecord.from_depths(CROSS.ids, ends - length, ends, values, step=step)


# Every other day 20 mm in the middle and 10 mm at the arms: only the regressions get it right.
RECORD = record_of(np.outer(np.arange(60) % 2 == 0, [20.0, 10.0, 10.0, 10.0, 10.0]))


def quiet(_: str) -> None:
    """Say nothing."""


def test_a_named_method_is_taken_without_comparing(tmp_path: Path) -> None:
    """Its numbers are the job's, and the others its own defaults."""
    said: list[str] = []
    infill = choose_infill(job_with(tmp_path, "method=inverse-distance", "power=1"), RECORD, CROSS, said.append)
    assert infill.comparison is None
    assert said == []
    assert infill.settings == {
        "method": "inverse-distance",
        "longest_gap": 31.0,
        "nearest": 5,
        "min_donors": 2,
        "power": 1.0,
    }


@pytest.mark.parametrize("normals", ["given", "record"])
def test_the_source_of_normals_is_a_setting_where_normals_are_needed(tmp_path: Path, normals: str) -> None:
    """Of the normal ratio, and of no method that needs none (above)."""
    infill = choose_infill(job_with(tmp_path, "method=normal-ratio", f"normals={normals}"), RECORD, CROSS, quiet)
    assert infill.settings["normals"] == normals


def test_normals_from_the_record_beside_a_method_that_needs_none(tmp_path: Path) -> None:
    """They are refused with all else that does not belong; beside a comparison, which may take one that does, not."""
    wrong = job_with(tmp_path, "method=station-average", "normals=record", "power=2")
    with pytest.raises(JobError, match=r"\[infill\] power: found it beside method 'station-average'") as caught:
        choose_infill(wrong, RECORD, CROSS, quiet)
    assert str(caught.value.problems[1]) == (
        "[infill] normals: found 'record' beside method 'station-average'; expected one of the methods that need "
        "normals: normal-ratio, ten-percent-rule, inverse-distance-ratios, ratio-regression, leave-one-out; remove "
        "normals, or choose one of these"
    )
    infill_options(job_with(tmp_path, "method=ratio-regression", "normals=record"))
    infill = choose_infill(job_with(tmp_path, "method=leave-one-out", "normals=record"), RECORD, CROSS, quiet)
    assert infill.options.method == "regression"
    assert infill.ratios is not None
    assert "normals" not in infill.settings


def test_what_the_job_asked_is_kept_beside_what_was_chosen(tmp_path: Path) -> None:
    """Regression takes no power; other methods are to be tried with the job's."""
    job = job_with(tmp_path, "method=leave-one-out", "power=3", "nearest=3")
    infill = choose_infill(job, RECORD, CROSS, quiet, whole_record=True)
    assert (infill.options.label, infill.options.power, infill.asked.power) == ("regression", None, 3)
    assert (infill.asked.nearest, infill.asked.scale, infill.options.scale) == (3, "day", "day")


def test_leave_one_out_takes_the_winner(tmp_path: Path) -> None:
    """With the job's own limits, and the comparison's remarks; every method is named as it is tried."""
    said: list[str] = []
    job = job_with(tmp_path, "method=leave-one-out", "radius=9000", "longest_gap=5")
    infill = choose_infill(job, RECORD, CROSS, said.append)
    assert infill.comparison is not None
    assert infill.options.label == infill.comparison.chosen == "regression"
    assert (infill.options.radius, infill.options.longest_gap) == (9000, 5)
    assert set(infill.comparison.notes) <= set(infill.notes)
    assert said[0] == "comparing"
    assert {"regression", "inverse-distance (power 1)"} < set(said)


def test_a_comparison_that_has_been_made_is_not_made_again(tmp_path: Path) -> None:
    """Nothing is said, and the same one is kept."""
    job = job_with(tmp_path, "method=leave-one-out")
    made = compare(job, RECORD, CROSS, quiet)
    said: list[str] = []
    assert choose_infill(job, RECORD, CROSS, said.append, comparison=made).comparison is made
    assert said == []


def test_a_comparison_beside_a_named_method_does_not_choose(tmp_path: Path) -> None:
    """The job's method stays, and the comparison's remarks are not those of the infill."""
    job = job_with(tmp_path, "method=station-average")
    infill = choose_infill(job, RECORD, CROSS, quiet, comparison=compare(job, RECORD, CROSS, quiet))
    assert infill.options.label == "station-average"
    assert infill.comparison is None
    assert infill.notes == ()


def test_the_words_of_a_comparison_are_in_the_jobs_unit(tmp_path: Path) -> None:
    """Numbers stay in mm."""
    path = write_tiny(tmp_path, job=JOB)
    inches, metric = (
        compare(read_job(path, [f"job.depth_unit={unit}"]), RECORD, CROSS, quiet) for unit in ("in", "mm")
    )
    assert [score.rmse for score in inches.scores] == [score.rmse for score in metric.scores]
    assert "least RMSE, 0.000 in over 150 cases" in inches.reason
    assert "least RMSE, 0.00 mm over 150 cases" in metric.reason


@pytest.mark.parametrize(
    ("method", "whole", "given", "scale"),
    [
        ("station-average", True, None, "day"),
        ("leave-one-out", True, None, "day"),
        ("station-average", False, None, None),
        ("station-average", True, "step", "step"),
    ],
)
def test_a_whole_record_is_filled_day_by_day_unless_the_job_says(
    tmp_path: Path, method: str, *, whole: bool, given: str | None, scale: str | None
) -> None:
    """The total of a record is no storm's."""
    job = job_with(tmp_path, f"method={method}", *([] if given is None else [f"scale={given}"]))
    assert choose_infill(job, RECORD, CROSS, quiet, whole_record=whole).options.scale == scale


@pytest.mark.parametrize(
    ("settings", "doubted"),
    [
        (["method=normal-ratio"], ["E"]),
        (["method=station-average"], ["E"]),
        (["method=leave-one-out"], ["E"]),
        (["method=normal-ratio", "normals=record"], []),
    ],
)
def test_given_normals_are_doubted_whatever_the_method(tmp_path: Path, settings: list[str], doubted: list[str]) -> None:
    """Methods that need normals are compared with the job's own; not where normals come from the record."""
    network = replace(CROSS, normals=np.array([[900.0], [950.0], [36.0], [1000.0], [920.0]]))
    notes = choose_infill(job_with(tmp_path, *settings), RECORD, network, quiet).notes
    assert [note.gauge for note in notes if note.code == "normal-unit"] == doubted


def test_relations_are_those_of_the_whole_record(tmp_path: Path) -> None:
    """A window of one day is filled by slopes of sixty: the middle is twice an arm."""
    infill = choose_infill(job_with(tmp_path, "method=regression"), RECORD, CROSS, quiet)
    done = infill.complete(record_of([[NAN, 7.0, 7.0, 7.0, 7.0]]))
    assert done.record.depth[0, 0] == pytest.approx(14)
    assert done.record.status[0, 0] == Status.INFILLED


@pytest.mark.parametrize(
    ("method", "advice"),
    [
        ("leave-one-out", "use 'basinrain storm', with the infill method named"),
        ("regression", "use 'basinrain storm', which infills without comparing"),
    ],
)
def test_a_record_that_cannot_be_compared(tmp_path: Path, method: str, advice: str) -> None:
    """The advice is what the job has not done yet."""
    dry = record_of(np.zeros((40, 5)))
    with pytest.raises(DataError, match=rf"found no wet day; .*; give a longer record, or {advice}$"):
        compare(job_with(tmp_path, f"method={method}"), dry, CROSS, quiet)


def test_normals_from_the_record_need_dates(tmp_path: Path) -> None:
    """Asked for beside totals without times they are refused."""
    undated = np.full(3, "NaT", dtype="datetime64[s]")
    record = RainRecord(
        CROSS.ids, undated, undated, np.ones((3, 5)), np.full((3, 5), Status.OBSERVED, dtype=np.uint8), step="storm"
    )
    job = job_with(tmp_path, "method=normal-ratio", "normals=record")
    with pytest.raises(DataError, match="normals from the record: found no dates; expected a record of several years"):
        choose_infill(job, record, CROSS, quiet)

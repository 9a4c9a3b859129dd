"""The temporal patterns that a job asks for, with their options and the files that they name."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from design_jobs import design_tables, write_design_job

from basinrain.design_job import run_design
from basinrain.design_patterns import pattern_choices
from basinrain.designstorm.design_storms import PatternChoice
from basinrain.designstorm.patterns import PATTERNS, Ordinates
from basinrain.errors import JobError, MethodError, Problem
from basinrain.jobfile import parse_design_job

CURVE = "time,share\n0,0\n0.5,0.7\n1,1\n"
STRAIGHT = Ordinates(time=np.array([0.0, 1.0]), share=np.array([0.0, 1.0]))


def never(name: str) -> Ordinates:
    raise AssertionError(name)


def choices(
    folder: Path, patterns: Sequence[dict[str, Any]], observed: Any = never  # noqa: ANN401 - a callable
) -> tuple[PatternChoice, ...]:  # fmt: skip
    job = parse_design_job(design_tables(design__pattern=patterns), folder=folder)
    assert job.design is not None
    return pattern_choices(job, job.design, observed)


def test_only_what_the_job_says_is_handed_on(tmp_path: Path) -> None:
    """Options that the job leaves out are the pattern's own."""
    found = choices(
        tmp_path,
        [
            {"shape": "uniform"},
            {"shape": "triangular", "name": "early one", "peak": "early"},
            {"shape": "chicago"},
            {"shape": "huff-2", "basis": "area"},
            {"shape": "nested", "peak": 0.4, "smooth": True},
        ],
    )
    assert [choice.label for choice in found] == ["uniform", "early one", "chicago", "huff-2", "nested"]
    assert [choice.pattern.name for choice in found] == ["uniform", "triangular", "chicago", "huff-2", "nested"]
    assert [dict(choice.options) for choice in found] == [
        {},
        {"peak": "early"},
        {},
        {"basis": "area"},
        {"peak": 0.4, "smooth": True},
    ]


@pytest.mark.parametrize("shape", sorted(set(PATTERNS) - {"table", "observed"}))
def test_every_shape_makes_a_storm_through_a_whole_job(tmp_path: Path, shape: str) -> None:
    """60 mm in 6 h, or 90 mm in 24 h, fall in the basins whatever the shape."""
    job = write_design_job(
        tmp_path, design__durations=["24h"], design__pattern=[{"shape": shape}], design__sub_basins="own-depth"
    )
    storms = run_design(job).design_storms
    assert storms["depth"].tolist() == pytest.approx([90] * 4, rel=1e-12)


def test_a_table_is_read_from_its_file(tmp_path: Path) -> None:
    """The curve of the file beside the job, in fractions, or in percent and by its own columns where that is said."""
    (tmp_path / "curve.csv").write_text(CURVE)
    (tmp_path / "percent.csv").write_text("minutes,rain\n0,0\n50,70\n100,100\n")
    found = choices(
        tmp_path,
        [
            {"shape": "table", "file": "curve.csv"},
            {
                "shape": "table",
                "name": "percent",
                "file": "percent.csv",
                "percent": True,
                "columns": {"time": "minutes", "share": "rain"},
            },
        ],
    )
    for choice in found:
        ordinates = choice.options["ordinates"]
        assert (ordinates.time.tolist(), ordinates.share.tolist()) == ([0, 0.5, 1], [0, 0.7, 1])


def test_a_storm_of_the_record_gives_its_ordinates(tmp_path: Path) -> None:
    """The storm's name is asked for, and no other."""
    asked: list[str] = []

    def observed(name: str) -> Ordinates:
        asked.append(name)
        return STRAIGHT

    found = choices(tmp_path, [{"shape": "uniform"}, {"shape": "observed", "storm": "Quill"}], observed)
    assert asked == ["Quill"]
    assert found[1].options == {"ordinates": STRAIGHT}


def test_all_patterns_that_cannot_be_are_told_together(tmp_path: Path) -> None:
    """Two files and a storm with faults make one error."""
    (tmp_path / "percent.csv").write_text("time,share\n0,0\n50,70\n100,100\n")

    def observed(name: str) -> Ordinates:
        raise JobError(Problem(item=f"storm {name}", found="no rain", expected="some"))

    with pytest.raises(JobError, match="found") as caught:
        choices(
            tmp_path,
            [
                {"shape": "table", "file": "none.csv"},
                {"shape": "table", "name": "percent", "file": "percent.csv"},
                {"shape": "observed", "storm": "Quill"},
            ],
            observed,
        )
    lines = str(caught.value).splitlines()
    assert [line.partition("; ")[0].removeprefix(f"{tmp_path}/") for line in lines] == [
        "none.csv: the file: found nothing of that name",
        "percent.csv:4: column time: the pattern: found that it ends at 100",
        "percent.csv:4: column share: the pattern: found that it ends at 100",
        "storm Quill: found no rain",
    ]
    assert lines[1].endswith("expected 1; declare percent = true")


def test_a_table_through_a_whole_job(tmp_path: Path) -> None:
    """70 % of 60 mm in the first half: 14 mm an hour, then 6 mm an hour."""
    job = write_design_job(
        tmp_path, files={"curve.csv": CURVE}, design__pattern=[{"shape": "table", "file": "curve.csv"}]
    )
    (storm,) = run_design(job).storms
    assert storm.depth[:, 0] == pytest.approx([14, 14, 14, 6, 6, 6], rel=1e-12)


def test_a_shape_of_one_duration_names_it(tmp_path: Path) -> None:
    """A 24-hour distribution on 6 h says how to keep it to 24 h, and that is obeyed."""
    job = write_design_job(
        tmp_path,
        design__durations=["6h", "24h"],
        design__pattern=[{"shape": "nrcs-type-ii"}, {"shape": "uniform"}],
    )
    with pytest.raises(
        MethodError, match=r'found a duration of 6h?.*; give the pattern durations = \["24h"\], or choose'
    ):
        run_design(job)
    run = run_design(job, ["design.pattern.1.durations=24h"])
    assert [(storm.minutes, storm.choice.label) for storm in run.storms] == [
        (360, "uniform"),
        (1440, "nrcs-type-ii"),
        (1440, "uniform"),
    ]

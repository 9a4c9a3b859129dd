from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from report.design_run import bare, from_record, make_design, two_halves, two_storms

from basinrain.report.design_facts import asked_facts, files_table, plane_facts, points_table, sub_basins_words


def test_what_was_asked() -> None:
    """Every answer of the job, with source and date of the depths."""
    assert asked_facts(two_halves()) == [
        ("Annual exceedance", "AEP 0.5 (1 in 2), AEP 0.1 (1 in 10)"),
        ("Durations", "1 h, 6 h, 24 h"),
        ("Step", "1 h"),
        ("Depths", "from a table, annual maximum series"),
        ("Their source", "invented table; dated 2031"),
        ("Jurisdiction", "United States"),
        ("Climate", "depths × 1.1 for 2070-2099; Quill Climate Note (invented)"),
        ("Areal reduction", "Leclerc and Schaake 1972 (curves of TP-29 and TP-40)"),
        ("Patterns", "triangular, uniform"),
        (
            "Basins above a point",
            "each has its own depth in proportion to its point depths, the volume of all of them kept",
        ),
        ("Units", "depths in mm, areas in km², volumes in m³"),
    ]


def test_what_was_not_asked_is_said() -> None:
    """No uplift, no reduction, no place; of the record that it is areal."""
    facts = dict(asked_facts(bare()))
    assert facts["Climate"] == "no uplift: climate change is not included"
    assert facts["Areal reduction"] == "none"
    assert dict(asked_facts(from_record()))["Areal reduction"] == "none: the depths are areal already"


def test_a_nominal_start_and_a_partial_duration_series_are_told(tmp_path: Path) -> None:
    """The start with what it is for; return periods are not called exceedance probabilities."""
    run = make_design(
        tmp_path,
        design__depths__series="partial-duration",
        design__start="2031-05-04T06:00:00",
        design__jurisdiction=None,
        design__areal_reduction=None,
    )
    facts = dict(asked_facts(run))
    assert facts["Return periods"] == "2-year, partial duration, 10-year, partial duration"
    assert facts["Depths"] == "from a table, partial duration series"
    assert facts["Nominal start"].startswith("2031-05-04 06:00, ")
    assert facts["Jurisdiction"] == "not stated"


@pytest.mark.parametrize(
    ("sub_basins", "area", "words"),
    [
        ("same-depth", "to-point", "all have the areal depth of all of them together"),
        ("same-depth", "own", "each has the point depths of all of them, reduced by its own area; "),
        ("own-depth", "own", "each has its own point depths, reduced by its own area; not one storm over all of them"),
    ],
)
def test_which_depth_the_basins_have(tmp_path: Path, sub_basins: str, area: str, words: str) -> None:
    """In the words of the job's two choices together."""
    run = make_design(
        tmp_path,
        design__sub_basins=sub_basins,
        design__areal_reduction={"method": "leclerc-schaake", "area": area},
    )
    assert sub_basins_words(run).startswith(words)


def test_points_of_interest_with_their_area() -> None:
    """Two squares of 25 km² are 50, four are 100."""
    assert points_table(two_halves()).rows == [("ford", "nw, sw", "50.00"), ("mouth", "nw, ne, sw, se", "100.0")]


def test_of_many_points_the_first(tmp_path: Path) -> None:
    """The others are in a file."""
    run = make_design(tmp_path, design__point=[{"name": f"P{k}", "basins": ["nw"]} for k in range(14)])
    table = points_table(run)
    assert len(table.rows) == 12
    assert table.notes[-1] == "2 more are in design_depths.csv."


def test_files_are_those_that_the_run_writes(tmp_path: Path) -> None:
    """Every file beside the page has its line, and no line is of a file that there is not."""
    for name, run in {"halves": two_halves(), "record": from_record(), "storms": two_storms()}.items():
        written = {path.name for path in run.write(tmp_path / name).iterdir()}
        assert {row[0].rstrip("/") for row in files_table(run).rows} == written - {"report.html"}


def test_folders_and_other_formats_have_lines_of_their_own() -> None:
    """One a format, in the job's order."""
    run = bare()
    design = run.asked.design.model_copy(update={"formats": ("parquet", "csv-per-basin")})
    rows = files_table(replace(run, asked=replace(run.asked, design=design))).rows
    assert [row[0] for row in rows[:3]] == ["design_hyetographs.parquet", "hyetographs/", "design_depths.csv"]


def test_distances_between_gauges_are_of_jobs_with_gauges() -> None:
    """The plane is told of every job."""
    assert [name for name, _ in plane_facts(bare())] == ["Plane"]
    run = replace(two_storms(), plane=two_storms().plane)
    assert plane_facts(run)[0][0] == "Plane"

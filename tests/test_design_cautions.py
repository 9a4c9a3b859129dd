"""What a reviewer of design storms would ask about is said where it belongs, and not elsewhere."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
import shapely
from design_jobs import TWO_POINTS, US_REDUCTION, write_design_job

from basinrain.design_cautions import DESIGN_CAUTION, climate_sentence
from basinrain.design_job import run_design
from basinrain.jobfile.design_tables import UpliftTable
from basinrain.notes import Note

SMALL = {"small": shapely.box(0, 0, 3, 3)}
UPLIFT = {"factor": 1.15, "source": "invented note", "horizon": 2070}
OWN: dict[str, Any] = {
    "method": "exponential",
    "coefficients": {"c1": 0.01, "c2": 0.9, "c3": 0.27},
    "source": "invented study",
}


def notes_of(folder: Path, **changes: Any) -> dict[str, list[Note]]:  # noqa: ANN401 - values of a job
    """Return the notes of a run by their code."""
    found: dict[str, list[Note]] = {}
    for note in run_design(write_design_job(folder, **changes)).notes:
        found.setdefault(note.code, []).append(note)
    return found


def test_a_plain_job_says_that_climate_change_is_left_out(tmp_path: Path) -> None:
    """A small basin with point depths has that one remark."""
    found = notes_of(tmp_path, squares=SMALL)
    assert list(found) == ["climate"]
    assert found["climate"][0].level == "info"
    assert found["climate"][0].text == (
        "Climate change is not included: the depths are those of the source, and the job gives no uplift."
    )


def test_an_uplift_is_said_with_its_source_and_horizon(tmp_path: Path) -> None:
    """The factor is made, and named with where it is from and for when."""
    sentence = "Depths were multiplied by 1.15 for the climate of 2070 (invented note)."
    run = run_design(write_design_job(tmp_path, squares=SMALL, design__uplift=UPLIFT))
    assert [note.text for note in run.notes] == [sentence]
    assert run.design_storms["depth"].tolist() == pytest.approx([69])
    assert run.caution == f"{DESIGN_CAUTION} {sentence}"
    assert climate_sentence(UpliftTable.model_validate(UPLIFT)) == sentence


def test_the_caution_names_the_engineer_and_the_local_criteria(tmp_path: Path) -> None:
    """Every output says that it is an input for a licensed engineer, and that local criteria govern."""
    run = run_design(write_design_job(tmp_path))
    assert run.caution.startswith(
        "Inputs for the judgement of a licensed engineer, not a design. Local criteria govern: which depths, areal "
    )
    assert run.caution.endswith(climate_sentence(None))


@pytest.mark.parametrize("reduction", [None, {"method": "none"}])
def test_point_depths_over_a_large_area_are_warned_of(tmp_path: Path, reduction: dict[str, str] | None) -> None:
    """36 mi² without a reduction are over 25 km²; 9 mi² (23 km²) are not."""
    squares = {"large": shapely.box(0, 0, 6, 6)}
    (note,) = notes_of(tmp_path / "a", squares=squares, design__areal_reduction=reduction)["not-reduced"]
    assert note.level == "warning"
    assert note.text.startswith(
        "large: point depths are used over 36 mi2 without an areal reduction, which overstates "
    )
    assert "not-reduced" not in notes_of(tmp_path / "b", squares=SMALL, design__areal_reduction=reduction)
    assert "not-reduced" not in notes_of(tmp_path / "c", squares=squares, design__areal_reduction=US_REDUCTION)


def test_evidence_of_a_method_and_own_coefficients_are_said(tmp_path: Path) -> None:
    """What was not seen in print, where coefficients are from, and that no range was stated."""
    assert notes_of(tmp_path / "a", design__areal_reduction=US_REDUCTION)["reduction-evidence"]
    found = notes_of(tmp_path / "b", design__areal_reduction=OWN, design__durations=["1h", "6h"])
    assert [note.text for note in found["areal-reduction"]] == [
        "The coefficients of the areal reduction were given with the job: invented study.",
        "No range of areas or durations was stated for the coefficients of the areal reduction: none was held.",
    ]


def test_a_reduction_by_own_areas_is_warned_of(tmp_path: Path) -> None:
    """Together the basins have more rain than the areal depth to the point of interest."""
    (note,) = notes_of(tmp_path, design__areal_reduction={**US_REDUCTION, "area": "own"})["own-area"]
    assert note.level == "warning"
    assert "together they are more rain than the areal depth" in note.text


def test_what_was_clamped_is_warned_of_with_its_area(tmp_path: Path) -> None:
    """The area to the point, each basin's own, and the durations within a nested storm, each once."""
    clamp = {**OWN, "valid_areas": [30, 60], "area_unit": "mi2", "outside": "clamp"}
    found = notes_of(tmp_path / "a", design__areal_reduction=clamp)["reduction-clamped"]
    assert [(note.level, note.text.partition(": ")[0]) for note in found] == [("warning", "union")]
    found = notes_of(tmp_path / "b", design__areal_reduction={**clamp, "area": "own"})["reduction-clamped"]
    assert [note.text.split(": ")[:2] for note in found] == [["union", basin] for basin in ("nw", "ne", "sw", "se")]
    found = notes_of(
        tmp_path / "c",
        design__areal_reduction={**OWN, "valid": ["2h", "6h"], "outside": "clamp"},
        design__pattern=[{"shape": "nested", "smooth": True}, {"shape": "uniform"}],
        design__durations=["3h", "6h"],
    )["reduction-clamped"]
    assert [note.text.partition(": ")[0] for note in found] == ["union"]
    assert "1 h" in found[0].text


def test_probabilities_of_a_partial_duration_series_are_said_to_be_converted(tmp_path: Path) -> None:
    """Only where the job allows it; every probability stands beside its return period of that series."""
    series: dict[str, Any] = {"design__depths__series": "partial-duration"}
    assert "series-converted" not in notes_of(tmp_path / "a", **series)
    series |= {"design__depths__convert": True}
    # 1 - exp(-1/10) = 0.09516; -1 / ln(1 - 0.1) = 9.491
    for changes, words in (
        ({}, "AEP 0.09516 (1 in 10.51) is 10 years."),
        ({"design__return_periods": None, "design__aep": 0.1}, "AEP 0.1 (1 in 10) is 9.491 years."),
    ):
        (note,) = notes_of(tmp_path / words[4:9], **series, **changes)["series-converted"]
        assert note.level == "info"
        assert note.text.endswith(f"AEP = 1 - exp(-1/T) (Langbein 1949): {words}")


def test_depths_over_all_that_were_ever_measured_are_warned_of(tmp_path: Path) -> None:
    """A table in mm that is declared to be in inches has 60 x 25.4 = 1524 mm in 6 h; 422 x 6^0.475 = 988 (memory)."""
    (note,) = notes_of(tmp_path / "in", design__depths__unit="in")["beyond-envelope"]
    assert note.level == "warning"
    assert "union, 6 h: 1524 mm. Check unit and duration_unit." in note.text
    assert "beyond-envelope" not in notes_of(tmp_path / "mm")


def test_points_that_count_nowhere_are_named(tmp_path: Path) -> None:
    """A third point 40 km north of the squares has no part of them by Thiessen."""
    third = TWO_POINTS.replace("west", "far").replace("2500,5000", "5000,50000").split("\n")[1:3]
    depths = TWO_POINTS + "\n".join(third) + "\n"
    (note,) = notes_of(tmp_path, unit="km", depths=depths, design__depths__crs="local")["points-not-counted"]
    assert note.text == "Depth points that count in no area: far."


def test_a_depth_that_falls_with_duration_is_warned_of(tmp_path: Path) -> None:
    """30 mm by 1.13 in 1 h and 31 mm by 1.04 in 2 h: 33.9 mm, and 4.9 % less."""
    place = write_design_job(
        tmp_path,
        design__durations=["1h", "2h"],
        design__depths__interval_factor="hershfield",
        design__depths__observed_every="1h",
        design__areal_reduction=None,
    )
    (tmp_path / "depths.csv").write_text("duration,return_period,depth\n1h,10,30\n2h,10,31\n")
    (note,) = (note for note in run_design(place).notes if note.code == "depth-falls")
    assert note.level == "warning"
    assert note.text.startswith("union: the areal depth of 2 h is up to 4.9 % less than that of 1 h, ")
    assert "depth-falls" not in notes_of(tmp_path / "b", design__durations=["1h", "6h"])


def test_what_was_extrapolated_is_warned_of(tmp_path: Path) -> None:
    """Frequencies and durations beyond the table; steps below it only where a shape asks for them."""
    extrapolate = {"design__depths__extrapolate": True}
    assert "extrapolated" not in notes_of(tmp_path / "a", **extrapolate, design__step="30min")
    found = notes_of(
        tmp_path / "b", **extrapolate, design__return_periods=[10, 50], design__durations=["6h", "48h"]
    )  # fmt: skip
    (note,) = found["extrapolated"]
    assert note.level == "warning"
    assert note.text.startswith("Depths were extrapolated beyond their source, since the job says so: ")
    assert "AEP 0.02 (1 in 50)" in note.text
    assert "48" in note.text
    assert "steps" not in note.text
    curves = notes_of(
        tmp_path / "c",
        **extrapolate,
        design__step="30min",
        design__pattern=[{"shape": "alternating-block", "smooth": True}],
    )
    assert "steps of 30" in curves["extrapolated"][0].text


def test_factors_for_fixed_intervals_are_said(tmp_path: Path) -> None:
    """They are made only where the job says so."""
    found = notes_of(tmp_path, design__depths__interval_factor="weiss", design__depths__observed_every="1h")
    assert found["interval-factor"][0].text == (
        "Depths were multiplied by factors for fixed intervals (weiss), since the job says so."
    )


def test_a_duration_without_a_pattern_is_warned_of(tmp_path: Path) -> None:
    """Where every pattern's own durations leave one out, it has depths and no hyetograph."""
    durations = {"design__durations": ["6h", "24h"]}
    assert "no-pattern" not in notes_of(tmp_path / "a", **durations)
    found = notes_of(tmp_path / "b", **durations, design__pattern=[{"shape": "uniform", "durations": ["6h"]}])
    (note,) = found["no-pattern"]
    assert note.level == "warning"
    assert note.text == "No hyetograph is made for 24 h: every pattern's own durations leave it out."


def test_remarks_of_a_pattern_stand_with_its_name(tmp_path: Path) -> None:
    """Curves from memory are said so under the name of the pattern."""
    found = notes_of(tmp_path, design__pattern=[{"shape": "huff-1", "name": "first", "basis": "area"}])
    assert all(note.text.startswith("first, 6") for note in found["pattern"])
    assert any("from memory" in note.text for note in found["pattern"])

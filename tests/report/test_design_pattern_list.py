from __future__ import annotations

from pathlib import Path

from report.design_run import make_design, two_halves

from basinrain.report.design_pattern_list import pattern_facts


def test_every_pattern_with_source_and_evidence() -> None:
    """What is from memory is said to be; options as the job has them."""
    triangular, uniform = pattern_facts(two_halves())
    assert triangular.name == "triangular"
    assert triangular.facts == (
        ("Shape", "Triangular; peak 0.5"),
        ("Source", "Yen and Chow (1980), Journal of the Hydraulics Division, ASCE, 106"),
        ("Evidence", "The formula is from memory."),
    )
    assert uniform.facts == (("Shape", "Uniform"), ("Source", "common practice"))


def test_files_durations_and_names_of_the_job(tmp_path: Path) -> None:
    """A table's file, the durations that it is for, and what the job calls it."""
    pattern = {"name": "Quill", "shape": "table", "file": "quill.csv", "durations": ["6h"]}
    text = "time,share\n0,0\n0.5,0.8\n1,1\n"
    run = make_design(tmp_path, design__pattern=[pattern, {"shape": "uniform"}], files={"quill.csv": text})
    quill = pattern_facts(run)[-1] if pattern_facts(run)[-1].name == "Quill" else pattern_facts(run)[0]
    assert [facts.name for facts in pattern_facts(run)].count("Quill") == 1
    assert dict(quill.facts)["Shape"] == "The user's own table; of quill.csv"
    assert dict(quill.facts)["Durations"] == "6 h"


def test_remarks_with_the_durations_that_they_are_of(tmp_path: Path) -> None:
    """Huff's second quartile is for storms of over 6 to 12 h: remarked of 1 h and of 24 h, each by itself."""
    run = make_design(tmp_path, design__pattern=[{"shape": "huff-2", "basis": "point"}])
    remarks = dict(pattern_facts(run)[0].facts)["Remarks"]
    assert "1 h: " in remarks
    assert "24 h: " in remarks
    assert dict(pattern_facts(run)[0].facts)["Shape"] == "Huff quartile 2, median; basis point"


def test_an_option_that_is_off_is_not_told(tmp_path: Path) -> None:
    """One that is on is, by its name."""
    depths = {"design__durations": ["6h"], "design__uplift": None, "design__areal_reduction": None}
    run = make_design(tmp_path, design__pattern=[{"shape": "nested", "peak": "centre", "smooth": True}], **depths)
    assert dict(pattern_facts(run)[0].facts)["Shape"] == "Nested (balanced); peak centre, smooth"
    run = make_design(tmp_path, design__pattern=[{"shape": "alternating-block", "peak": "late"}], **depths)
    assert "smooth" not in dict(pattern_facts(run)[0].facts)["Shape"]

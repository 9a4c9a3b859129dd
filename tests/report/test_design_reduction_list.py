from __future__ import annotations

from pathlib import Path

import pytest
from report.design_run import bare, from_record, make_design, two_halves

from basinrain.report.design_reduction_list import compared_tables, reduction_facts
from basinrain.report.words import DASH

EXPONENTIAL = {"method": "exponential", "coefficients": {"c1": 0.0021, "c2": 0.53, "c3": 0.25}, "source": "Quill study"}


def test_the_method_with_where_it_holds() -> None:
    """Title, region beside that of the design, source, evidence, range, and the area that decides: the union."""
    facts = dict(reduction_facts(two_halves()))
    assert facts["Method"] == "Leclerc and Schaake 1972 (curves of TP-29 and TP-40)"
    assert facts["For"] == "the United States; the design is for United States"
    assert facts["Evidence"] == "formula and range from memory"
    assert facts["Range"] == "durations 30 min to 24 h; areas up to 1036 km² (400 mi²)"
    assert facts["Area that decides"] == (
        "that of all basins above the point of interest as one: ford 50.00 km², mouth 100.0 km²"
    )
    assert (facts["Outside the range"], facts["Taken at an end"]) == ("refused", "nothing was outside the range")


def test_no_reduction_no_facts() -> None:
    """Neither of a job without one, nor of areal depths."""
    assert reduction_facts(bare()) == reduction_facts(from_record()) == []
    assert compared_tables(bare()) == []


def test_the_jobs_own_values_have_the_jobs_range(tmp_path: Path) -> None:
    """Its source, what was stated of the range, and that nobody checked them."""
    ranges = {"valid": ["1h", "24h"], "valid_areas": [10.0, 500.0], "area_unit": "km2"}
    facts = dict(reduction_facts(make_design(tmp_path / "stated", design__areal_reduction=EXPONENTIAL | ranges)))
    assert facts["Range"] == "durations 1 to 24 h; areas 10 to 500 km²"
    assert (facts["Source"], facts["Evidence"]) == ("Quill study", "the job's own values, not checked")
    facts = dict(reduction_facts(make_design(tmp_path / "silent", design__areal_reduction=EXPONENTIAL)))
    assert facts["Range"] == "durations: none is stated; areas: none is stated"


def test_a_table_holds_as_far_as_its_file(tmp_path: Path) -> None:
    """The file is named."""
    table = {"method": "table", "file": "factors.csv", "source": "Quill study", "area_unit": "km2"}
    text = "area,duration,factor\n10,1h,0.9\n10,24h,0.97\n200,1h,0.8\n200,24h,0.95\n"
    run = make_design(tmp_path, design__areal_reduction=table, files={"factors.csv": text})
    assert dict(reduction_facts(run))["Range"] == "the durations and areas of factors.csv"


def test_a_region_is_named_and_its_range_taken(tmp_path: Path) -> None:
    """Of Australian Rainfall and Runoff 2019."""
    run = make_design(
        tmp_path,
        design__jurisdiction="Australia",
        design__areal_reduction={"method": "arr-2019", "region": "SE Coast"},
    )
    facts = dict(reduction_facts(run))
    assert facts["Region"] == "SE Coast"
    assert "AEP 0.0005 to 0.5" in facts["Range"]


def test_what_was_taken_at_an_end_is_told(tmp_path: Path) -> None:
    """15 min lie below the method's half hour."""
    run = make_design(
        tmp_path,
        design__durations=["15min", "6h"],
        design__step="15min",
        design__depths__extrapolate=True,
        design__areal_reduction={"method": "leclerc-schaake", "outside": "clamp"},
    )
    facts = dict(reduction_facts(run))
    assert facts["Outside the range"] == "taken at its nearest end, with a warning"
    assert "the factor of 15 min is that of 30 min" in facts["Taken at an end"]


def test_each_basins_own_area_is_told(tmp_path: Path) -> None:
    """Where the job says so."""
    run = make_design(tmp_path, design__areal_reduction={"method": "leclerc-schaake", "area": "own"})
    assert dict(reduction_facts(run))["Area that decides"] == "that of each basin by itself, since the job says so"


def test_others_stand_under_the_heading_that_they_must_have() -> None:
    """0.9427 of Leclerc and Schaake for 100 km² in 6 h; what is of another region is for comparison only."""
    ((heading, table),) = compared_tables(two_halves())
    assert heading == "Outside their region, for comparison only"
    assert table.heads == ("point of interest", "duration", "leclerc-schaake, of the design", "keers-wescott")
    assert table.rows[4][:3] == ("mouth", "6 h", "0.9427")
    # 1 - 0.0627 A^0.254 t^-a with a = 0.40 - 0.00382 (4.6 - ln A)², A = 100 (from memory).
    assert float(table.rows[4][3]) == pytest.approx(1 - 0.0627 * 100**0.254 * 6**-0.4, abs=1e-4)
    assert table.notes[0] == "The factors are the same at every frequency."


def test_one_of_the_region_stands_apart_from_those_outside(tmp_path: Path) -> None:
    """Each table with its own heading; a design without a reduction is compared with none."""
    run = make_design(
        tmp_path, design__areal_reduction={"method": "none", "compare": ["leclerc-schaake", "keers-wescott"]}
    )
    outside, inside = compared_tables(run)
    assert (outside[0], inside[0]) == (
        "Outside their region, for comparison only",
        "Others for the region, for comparison",
    )
    assert outside[1].heads[2:] == ("no reduction, of the design", "keers-wescott")
    assert {row[2] for row in inside[1].rows} == {"1.0000"}


def test_without_an_answer_there_is_a_dash_and_the_reason(tmp_path: Path) -> None:
    """48 h lie beyond a day."""
    run = make_design(
        tmp_path,
        design__durations=["6h", "2d"],
        design__depths__extrapolate=True,
        design__areal_reduction=EXPONENTIAL | {"compare": ["leclerc-schaake"]},
    )
    ((_, table),) = compared_tables(run)
    assert [row[3] == DASH for row in table.rows] == [False, True, False, True]
    assert any("leclerc-schaake, ford, 48 h: " in note for note in table.notes)


def test_frequencies_stand_apart_where_a_factor_depends_on_them(tmp_path: Path) -> None:
    """As those of Australian Rainfall and Runoff do."""
    run = make_design(
        tmp_path,
        design__jurisdiction="Australia",
        design__areal_reduction={"method": "arr-2019", "region": "SE Coast", "compare": ["keers-wescott"]},
    )
    ((_, table),) = compared_tables(run)
    assert len(table.rows) == 2 * 2 * 3
    assert table.rows[0][0] == "ford, AEP 0.5 (1 in 2)"

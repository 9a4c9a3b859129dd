from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
from report.series_run import four_days, four_years, make_series_run, read_by_chunks, widened

from basinrain.report import long_term_list
from basinrain.report.words import DASH, NARROW_SPACE


def test_means_of_four_days_by_hand() -> None:
    """40.75 mm by infill, 41.5 by reweighting, 1.8 % more; .575 of the weight on the third of four days."""
    table = long_term_list.means_table(four_days())
    assert table.rows[2] == ("union", "thiessen", "40.8", "41.5", "4", "1.8", f"89.4{NARROW_SPACE}%")
    assert table.caption == "Depth of the record, mm, by averaging method and policy for gaps"
    assert table.notes[0].startswith("No water year is complete: depths are sums of the steps that have a number.")


def test_means_of_years_are_those_of_complete_ones() -> None:
    """Three water years of four calendar years are whole, and the caption says what is shown."""
    run = four_years()
    table = long_term_list.means_table(run)
    assert table.caption.startswith("Mean annual depth, mm")
    found = run.summaries["reweight", "idw"].annual
    assert table.rows[-1][3] == f"{found.of_years[-1]:.1f}"
    assert {row[5] for row in table.rows} == {"3"}
    assert table.over[3] == ("difference to infill-then-reweight, %", 2)


def test_depths_of_other_steps_are_told_apart() -> None:
    """Three steps by one policy and four by the other."""
    run = four_days()
    terms = run.summaries["reweight", "thiessen"].terms
    summary = replace(run.summaries["reweight", "thiessen"], terms=replace(terms, steps=terms.steps - 1))
    table = long_term_list.means_table(replace(run, summaries={**run.summaries, ("reweight", "thiessen"): summary}))
    assert table.rows[0][4] == f"3{DASH}4"
    assert table.notes[-1] == "Where steps differ between policies, the depths are not of the same steps."


def test_one_policy_has_no_difference(tmp_path: Path) -> None:
    """Nothing to compare, no line above the heads."""
    run = make_series_run(tmp_path, [[10, 20, 20]], gaps=["reweight"], methods=["thiessen"])
    table = long_term_list.means_table(run)
    assert table.heads == ("basin", "method", "depth of the record, mm", "steps", "observed share")
    assert table.over == ()
    assert table.rows[2][2] == "15.0"


def test_of_many_basins_those_that_differ_most_are_shown() -> None:
    """Every second basin is east, which differs by 2.9 %; twelve of these stand before the union."""
    table = long_term_list.means_table(widened(four_days(), 100))
    assert [row[0] for row in table.rows] == [*(f"B{k:04d}" for k in range(1, 25, 2)), "union"]
    assert {row[5] for row in table.rows[:-1]} == {"2.9"}
    assert table.notes[-1] == (
        "Shown: the union and the 12 basins whose means differ most between policies; the 88 others are in "
        "series_means.csv."
    )


def test_what_the_series_rest_on() -> None:
    """One step of four rests on an infilled value, or is reweighted; a mean per year is not told of four days."""
    table = long_term_list.rests_table(four_days())
    assert table.rows[0] == ("thiessen", "infill", "4", "0", "1", "0", f"89.4{NARROW_SPACE}%")
    assert table.rows[1][2:6] == ("4", "0", "0", "1")
    assert "mean of all steps, mm a year" in long_term_list.rests_table(four_years()).heads


def test_gauges_left_out_by_hand() -> None:
    """Without A, B has 92.5 % and C the rest: 20 and 40 mm instead of 15 and 26.5, 44.6 % more by reweighting."""
    table = long_term_list.left_out_table(four_days())
    assert table is not None
    assert table.rows[0] == ("A", "47.2", "44.6", "100.0", "west")
    assert [row[0] for row in table.rows] == ["A", "C", "B"]
    assert long_term_list.left_out_sentence(four_days()).startswith("3 gauges were left out, one at a time")


def test_no_number_without_the_gauge_is_a_dash(tmp_path: Path) -> None:
    """A is the only gauge that reports."""
    nan = np.nan
    run = make_series_run(tmp_path, [[3, nan, nan], [1, nan, nan]], gaps=["reweight"], methods=["thiessen"])
    table = long_term_list.left_out_table(run)
    assert table is not None
    assert table.rows == [("A", DASH, DASH, DASH)]
    assert table.notes[0] == f"{DASH}: without the gauge there is no number to compare."


def test_why_nothing_was_left_out() -> None:
    """Read chunk by chunk, or the job names no gauge."""
    run = read_by_chunks(four_days())
    assert long_term_list.left_out_table(run) is None
    assert "the record was read chunk by chunk" in long_term_list.left_out_sentence(run)
    none = {**run.settings, "series": {**run.settings["series"], "leave_out": []}}
    named = replace(run, settings=none)
    assert long_term_list.left_out_sentence(named) == "No gauge was left out in turn: the job names none."


def test_many_gauges_are_shortened() -> None:
    """Twenty of the 30 that were left out are listed."""
    run = four_days()
    more = tuple(replace(found, gauge=f"{found.gauge}{k:02d}") for found in run.left_out for k in range(10))
    table = long_term_list.left_out_table(replace(run, left_out=more))
    assert table is not None
    assert len(table.rows) == long_term_list.GAUGES
    assert "Shown: the 20 of 30 gauges that move this basin's mean most." in table.notes

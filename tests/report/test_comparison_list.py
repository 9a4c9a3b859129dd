from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from report.comparison_pieces import METHODS, make_comparison

from basinrain.report import limits
from basinrain.report.comparison_list import (
    choice_tables,
    comparison_facts,
    gauge_table,
    score_table,
    skipped_table,
    step_table,
)

COMPARISON = make_comparison()


def test_scores_stand_in_the_stated_order_and_are_judged_in_words() -> None:
    """From simple to complex; the one taken, the best and those worse say so."""
    table = score_table(COMPARISON, depth_unit="mm")
    assert tuple(row[0] for row in table.rows) == METHODS
    words = {row[0]: row[1] for row in table.rows}
    assert words["station-average"] == "taken"
    assert words[COMPARISON.best] == "best"
    assert set(words.values()) <= {"taken", "best", "worse", "not told apart"}


def test_a_line_by_hand() -> None:
    """Error, difference with its interval, shares of wet cases from the counts of the score."""
    score = COMPARISON.score("nearest-gauge")
    between = COMPARISON.differences[0]
    row = [cell.replace("\u202f", " ") for cell in score_table(COMPARISON, depth_unit="mm").rows[0]]
    low = f"{between.low:.2f}".replace("-", "−")
    assert row[2:5] == [f"{score.rmse:.2f}", f"{between.difference:.2f}", f"{low} to {between.high:.2f}"]
    assert row[8] == f"{100 * score.hits / (score.hits + score.misses):.1f} %"


def test_the_best_has_no_difference_to_itself() -> None:
    """Two dashes, not 0.00."""
    row = next(row for row in score_table(COMPARISON, depth_unit="mm").rows if row[0] == COMPARISON.best)
    assert row[3:5] == ("–", "–")


def test_an_interval_that_is_not_known_is_a_dash() -> None:
    """The difference stands alone."""
    bare = tuple(replace(d, low=np.nan, high=np.nan) for d in COMPARISON.differences)
    row = score_table(replace(COMPARISON, differences=bare), depth_unit="mm").rows[0]
    assert row[3] != "–"
    assert row[4] == "–"


def test_inches() -> None:
    """Errors in inches have three decimals."""
    row = score_table(COMPARISON, depth_unit="in").rows[0]
    assert row[2] == f"{COMPARISON.score('nearest-gauge').rmse / 25.4:.3f}"


def test_the_steps_have_a_table_only_where_they_are_finer() -> None:
    """A comparison of steps has no second one."""
    table = step_table(COMPARISON, depth_unit="mm")
    assert table is not None
    assert len(table.rows) == len(METHODS)
    assert step_table(make_comparison(scale="step"), depth_unit="mm") is None


def test_gauges_with_the_largest_error_come_first() -> None:
    """And each names the method that would do best there."""
    table = gauge_table(COMPARISON, depth_unit="mm")
    assert table is not None
    errors = [float(row[2]) for row in table.rows]
    assert errors == sorted(errors, reverse=True)
    for row in table.rows:
        least = min(METHODS, key=lambda m: COMPARISON.score(m, gauge=row[0]).rmse)
        assert row[9] == least


def test_many_gauges_are_shortened() -> None:
    """Of 70 gauges 60 are printed; the file is named."""
    table = gauge_table(make_comparison(tuple(f"G{k:02d}" for k in range(70))), depth_unit="mm")
    assert table is not None
    assert len(table.rows) == limits.GAUGES
    assert table.notes[-1] == "Shown: 60 of 70 gauges. All are in infill_scores.csv."


def test_gauges_without_a_score_have_no_table() -> None:
    """Only the pooled scores are there."""
    pooled = tuple(s for s in COMPARISON.scores if not s.gauge)
    assert gauge_table(replace(COMPARISON, scores=pooled), depth_unit="mm") is None


def test_skipped_methods_say_why() -> None:
    """None skipped, no table."""
    table = skipped_table(tuple(COMPARISON.skipped.items()))
    assert table is not None
    assert table.rows == [("normal-ratio", "no normals are given")]
    assert skipped_table(()) is None


def test_the_facts_in_short() -> None:
    """What is taken, of how many, on how many cases, with which donors."""
    facts = dict(comparison_facts(COMPARISON))
    assert facts["Taken"] == "station-average"
    assert facts["Least error"] == COMPARISON.best
    assert facts["Cases"] == f"{COMPARISON.score('station-average').n} values at 6 gauges, rainfall days"
    assert facts["Donors"] == "5 donors at most"


@pytest.mark.parametrize(("comparison", "count"), [(None, 0), (COMPARISON, 3), (make_comparison(skipped={}), 2)])
def test_what_a_storm_report_prints(comparison: object, count: int) -> None:
    """Scores, steps, and the methods that could not take part, as far as there are any."""
    assert len(choice_tables(comparison, depth_unit="mm")) == count  # type: ignore[arg-type]

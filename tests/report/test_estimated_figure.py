from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from report.comparison_pieces import make_comparison
from report.markup import svg_texts, svg_tree

from basinrain.report import estimated_figure
from basinrain.report.estimated_figure import estimated_picture


def test_the_caption_holds_the_numbers() -> None:
    """Method, number of cases and errors can be read without the figure."""
    comparison = make_comparison()
    picture = estimated_picture(comparison, depth_unit="mm")
    assert picture is not None
    score = comparison.score("station-average")
    assert f"{score.n} cases (days at gauges)" in picture.caption
    assert f"RMSE {score.rmse:.2f}" in picture.caption
    assert "observed, mm (square-root scale)" in svg_texts(picture.svg)


def test_inches_have_one_decimal_more_than_depths() -> None:
    """An error of some millimetres is told to the thousandth of an inch."""
    comparison = make_comparison()
    picture = estimated_picture(comparison, depth_unit="in")
    assert picture is not None
    assert f"RMSE {comparison.score('station-average').rmse / 25.4:.3f}" in picture.caption


def test_many_points_become_their_density(monkeypatch: pytest.MonkeyPatch) -> None:
    """Beyond the limit cells are drawn, their legend counts cases, and the figure stays small."""
    monkeypatch.setattr(estimated_figure, "MOST_POINTS", 100)
    picture = estimated_picture(make_comparison(cases=2000), depth_unit="mm")
    assert picture is not None
    assert "Darker: more cases" in picture.caption
    assert any(text.endswith(" cases") for text in svg_texts(picture.svg))
    assert "a case" not in svg_texts(picture.svg)
    assert len(picture.svg) < 250_000


def test_without_cases_there_is_no_figure() -> None:
    """A comparison in which no value takes part has nothing to draw."""
    comparison = make_comparison()
    empty = replace(comparison, observed=np.full_like(comparison.observed, np.nan))
    assert estimated_picture(empty, depth_unit="mm") is None


@pytest.mark.parametrize("top", [0.1, 0.9, 3.0, 47.0, 1200.0])
def test_ticks_are_round_and_apart(top: float) -> None:
    """From 0 up, at least a ninth of the axis between two, at least three of them."""
    ticks = estimated_figure._ticks(top)
    assert ticks[0] == 0
    assert len(ticks) >= 3
    assert ticks[-1] <= top
    assert np.diff(np.sqrt(ticks)).min() >= 0.109 * np.sqrt(top)


def test_one_case_is_a_figure() -> None:
    """A single point on well-formed axes."""
    picture = estimated_picture(make_comparison(("A",), cases=1, scale="step"), depth_unit="mm")
    assert picture is not None
    svg_tree(picture.svg)

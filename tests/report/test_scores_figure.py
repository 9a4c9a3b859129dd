from __future__ import annotations

from dataclasses import replace

import numpy as np
from report.comparison_pieces import METHODS, make_comparison
from report.markup import svg_texts

from basinrain.report.scores_figure import _MARKS, scores_picture


def test_every_method_stands_with_its_error() -> None:
    """Names and numbers are text, from simple to complex."""
    comparison = make_comparison()
    picture = scores_picture(comparison, depth_unit="mm")
    assert picture is not None
    texts = svg_texts(picture.svg)
    places = [texts.index(method) for method in METHODS]
    assert places == sorted(places)
    for method in METHODS:
        assert f"{comparison.score(method).rmse:.2f}" in texts


def test_words_stand_beside_every_mark() -> None:
    """Chosen, best, not told apart and worse have marks of their own and a line in the legend."""
    picture = scores_picture(make_comparison(), depth_unit="mm")
    assert picture is not None
    texts = svg_texts(picture.svg)
    for words in ("chosen", "best", "worse than the best", "95 % interval", "error of the best"):
        assert words in texts
    assert len({(mark["marker"], mark["markerfacecolor"]) for mark in _MARKS.values()}) == len(_MARKS)


def test_the_description_says_what_the_marks_say() -> None:
    """Who does not see the figure reads error and judgement."""
    comparison = make_comparison()
    picture = scores_picture(comparison, depth_unit="mm")
    assert picture is not None
    assert f"station-average: {comparison.score('station-average').rmse:.2f} (chosen)" in picture.svg


def test_without_intervals_none_is_drawn_or_spoken_of() -> None:
    """Too few cases for a bootstrap: the caption says so, the legend has no interval."""
    comparison = make_comparison()
    bare = tuple(
        replace(d, low=np.nan, high=np.nan, distinguishable=False) if d.candidate != comparison.best else d
        for d in comparison.differences
    )
    picture = scores_picture(replace(comparison, differences=bare), depth_unit="mm")
    assert picture is not None
    assert "too few for intervals" in picture.caption
    assert "95 % interval" not in svg_texts(picture.svg)


def test_the_best_may_be_the_chosen_one() -> None:
    """Then the best has no line of its own in the legend."""
    comparison = make_comparison()
    picture = scores_picture(replace(comparison, chosen=comparison.best), depth_unit="mm")
    assert picture is not None
    assert "best" not in svg_texts(picture.svg)

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
from report.markup import svg_texts
from report.series_run import four_days, four_years, make_series_run

from basinrain.report.left_out_figure import left_out_picture


def test_gauges_and_policies_are_named() -> None:
    """A row a gauge, the one that matters most first, and the numbers for a reader who does not see it."""
    picture = left_out_picture(four_days())
    assert picture is not None
    texts = svg_texts(picture.svg)
    assert [text for text in texts if text in "ABC"] == ["A", "C", "B"]
    assert {"infill", "reweight", "thiessen"} <= set(texts)
    assert "A: 47.2 % by thiessen (infill), 44.6 % by thiessen (reweight)" in picture.svg


def test_every_method_has_a_panel() -> None:
    """Two methods, their names above."""
    picture = left_out_picture(four_years())
    assert picture is not None
    assert {"thiessen", "idw"} <= set(svg_texts(picture.svg))


def test_a_gauge_without_which_there_is_no_number_says_so() -> None:
    """B's row has words instead of marks."""
    run = four_days()
    blank = tuple(replace(found, without=np.full(3, np.nan)) if found.gauge == "B" else found for found in run.left_out)
    picture = left_out_picture(replace(run, left_out=blank))
    assert picture is not None
    assert svg_texts(picture.svg).count("no number") == 1


def test_nothing_to_draw(tmp_path: Path) -> None:
    """No gauge was left out, or the record stayed dry, so that no change has a number."""
    assert left_out_picture(replace(four_days(), left_out=())) is None
    assert left_out_picture(make_series_run(tmp_path, np.zeros((5, 3)))) is None


def test_a_repeat_is_identical() -> None:
    """The same run gives the same bytes."""
    assert left_out_picture(four_years()) == left_out_picture(four_years())

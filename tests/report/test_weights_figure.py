from __future__ import annotations

from dataclasses import replace

import numpy as np
from report.markup import svg_texts
from report.small_run import make_run

from basinrain.report.figures import MARKS
from basinrain.report.weights_figure import weights_pictures
from basinrain.results import StormRun


def test_one_panel_a_basin_with_gauges_and_methods(run: StormRun) -> None:
    """Two basins and their union; each names the methods and the gauges with weight."""
    pictures = weights_pictures(run)
    assert [p.name for p in pictures] == ["weights-1-1", "weights-1-2", "weights-1-3"]
    texts = svg_texts(pictures[0].svg)
    for text in ("west", "arithmetic", "thiessen", "idw", "A", "B", "weight"):
        assert text in texts
    assert "F" not in texts  # no depth, hence no weight


def test_the_description_holds_the_numbers(run: StormRun) -> None:
    """Who does not see the figure reads the weights: A and B one half each by the arithmetic mean."""
    svg = str(weights_pictures(run)[0].svg)
    assert "A: arithmetic 0.500" in svg
    assert "B: arithmetic 0.500" in svg


def test_a_method_without_a_number_says_so() -> None:
    """The arithmetic mean of a basin without gauges is named as missing, not drawn at zero."""
    run = make_run()
    result = run.storms[0]
    table = result.depths["arithmetic"].table
    weights = table.weights.copy()
    weights[0] = np.nan
    depths = {
        **result.depths,
        "arithmetic": replace(result.depths["arithmetic"], table=replace(table, weights=weights)),
    }
    picture = weights_pictures(replace(run, storms=(replace(result, depths=depths),)))[0]
    assert "arithmetic: no number" in svg_texts(picture.svg)
    assert "A: arithmetic –" in str(picture.svg)


def test_marks_differ_without_colour() -> None:
    """Shape and grey tell the methods apart in black and white print."""
    assert len({(m["marker"], m["markerfacecolor"]) for m in MARKS}) == len(MARKS)
    assert {m["markerfacecolor"] for m in MARKS} <= {"white", "black", "#9a9a9a"}


def test_storms_with_the_same_weights_share_their_panels() -> None:
    """Two storms with one set of weights are drawn once."""
    assert len(weights_pictures(make_run(storms=("Quill", "Sedge")))) == 3

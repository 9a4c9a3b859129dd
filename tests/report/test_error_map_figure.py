from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely
from report.comparison_pieces import make_comparison, make_network
from report.markup import svg_texts, svg_tree

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.ground import equal_area_plane
from basinrain.report.error_map_figure import error_map_picture

SQUARE = Basins(ids=("west",), polygons=np.array([shapely.box(5e3, 2e3, 20e3, 15e3)]), crs="local")


def test_gauges_are_labelled_with_error_and_bias() -> None:
    """The number beside a gauge is its own score by the chosen method."""
    comparison = make_comparison()
    picture = error_map_picture(comparison, make_network(), SQUARE, depth_unit="mm")
    assert picture is not None
    score = comparison.score("station-average", gauge="B")
    sign = "+" if score.bias > 0 else "−"
    assert f"{score.rmse:.2f} ({sign}{abs(score.bias):.2f})" in svg_texts(picture.svg)


def test_too_low_and_too_high_are_told_by_fill_and_words() -> None:
    """Both kinds occur in the sample, so both stand in the legend, with two sizes and the basin."""
    comparison = make_comparison()
    down = tuple(replace(s, bias=-1.0) if s.gauge == "A" else replace(s, bias=1.0) for s in comparison.scores)
    picture = error_map_picture(replace(comparison, scores=down), make_network(), SQUARE, depth_unit="mm")
    assert picture is not None
    texts = svg_texts(picture.svg)
    for words in ("too low on average", "estimates not too low on average", "basin boundary"):
        assert words in texts
    assert any(text.startswith("error of ") for text in texts)


def test_without_basins_the_gauges_are_the_map() -> None:
    """A job without basins has no boundary, in the figure or in its legend."""
    picture = error_map_picture(make_comparison(), make_network(), None, depth_unit="mm")
    assert picture is not None
    assert "basin boundary" not in svg_texts(picture.svg)


def test_a_gauge_without_a_score_is_a_cross_and_no_zero() -> None:
    """It is named in the caption's count and has no number."""
    comparison = make_comparison(("A", "B", "C", "D", "E"))
    picture = error_map_picture(comparison, make_network(), SQUARE, depth_unit="mm")
    assert picture is not None
    assert "1 gauge without a score is a cross" in picture.caption
    assert "0.00" not in " ".join(svg_texts(picture.svg))
    none = replace(comparison, scores=())
    assert error_map_picture(none, make_network(), SQUARE, depth_unit="mm") is None


@pytest.mark.parametrize("ids", [("A",), tuple(f"Upper Wintermill Gauge No. {k:02d}" for k in range(40))])
def test_one_gauge_and_forty_long_names(ids: tuple[str, ...]) -> None:
    """Both are well-formed; names that begin alike keep what tells them apart."""
    picture = error_map_picture(make_comparison(ids), make_network(ids), None, depth_unit="in")
    assert picture is not None
    svg_tree(picture.svg)
    labels = [text for text in svg_texts(picture.svg) if text.startswith("Upper")]
    assert len(labels) == len(set(labels))


def test_only_a_map_has_a_north_arrow() -> None:
    """On a plane of the earth the arrow is there and spoken of."""
    network = make_network()
    earth = GaugeNetwork(ids=network.ids, x=network.x, y=network.y, crs=equal_area_plane(10, 50, 12, 51))
    picture = error_map_picture(make_comparison(), earth, None, depth_unit="mm")
    assert picture is not None
    assert "N" in svg_texts(picture.svg)
    assert "true north" in picture.caption

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from matplotlib.patches import Polygon
from report.markup import svg_texts
from report.small_run import make_run

from basinrain.gauges import GaugeNetwork
from basinrain.ground import Plane, equal_area_plane
from basinrain.report import map_figure, map_parts
from basinrain.report.map_figure import map_pictures
from basinrain.results import StormRun

EARTH = Plane(equal_area_plane(10, 50, 12, 51), "Lambert azimuthal equal-area plane", 1e-4)


def test_marks_tell_what_is_known_of_each_gauge(run: StormRun) -> None:
    """The legend has one mark for each status that occurs, inside and outside the basins."""
    texts = svg_texts(map_pictures(run)[0].svg)
    for words in (
        "gauge, observed",
        "gauge, partly infilled",
        "gauge, infilled",
        "gauge, no total",
        "gauge outside, observed",
        "edge of Thiessen cells",
    ):
        assert words in texts
    assert "gauge outside, infilled" not in texts


def test_marks_differ_by_shape_and_fill_not_by_colour() -> None:
    """Every status has its own mark, in black, white and grey only."""
    styles = [map_figure._mark_style(status, inside) for status in map_figure._FILLS for inside in (True, False)]
    looks = {
        (s["marker"], s.get("markerfacecolor"), s.get("fillstyle"), s["markersize"] if s["marker"] in "x+" else None)
        for s in styles
    }
    assert len(looks) == len(styles)


def test_gauges_and_basins_are_labelled_with_totals(run: StormRun) -> None:
    """A fell 12 mm; F has no total, which is a dash and not a zero; both basins have their names."""
    texts = svg_texts(map_pictures(run)[0].svg)
    for text in ("A", "12.0", "F", "–", "west", "east"):
        assert text in texts
    assert "0.0" not in texts


def test_only_a_map_has_a_north_arrow(run: StormRun) -> None:
    """A flat plane without a place on the map has no north; both have a scale bar."""
    local = svg_texts(map_pictures(run)[0].svg)
    earth = svg_texts(map_pictures(make_run(plane=EARTH))[0].svg)
    assert "N" in earth
    assert "N" not in local
    assert "5 km" in earth
    assert "5 km" in local


def test_the_scale_bar_is_as_long_as_it_says(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """The bar's two halves are 2.5 km each on the map's own axes."""
    drawn: list[float] = []
    real = Polygon

    def spy(corners: list[tuple[float, float]], **style: Any) -> object:  # noqa: ANN401 - handed on
        drawn.append(corners[1][0] - corners[0][0])
        return real(corners, **style)

    monkeypatch.setattr(map_parts, "Polygon", spy)
    map_pictures(run)
    assert drawn == pytest.approx([2500.0, 2500.0])


def test_a_gauge_far_away_is_named_but_does_not_shrink_the_map(run: StormRun) -> None:
    """A gauge 500 km off is in the caption, and the basins keep the map."""
    network = run.network
    x = network.x.copy()
    x[4] = 5e5
    far = replace(run, network=GaugeNetwork(ids=network.ids, x=x, y=network.y, crs=network.crs))
    picture = map_pictures(far)[0]
    assert "Beyond the map: 1 gauge (E)." in picture.caption
    assert "25" not in svg_texts(picture.svg)


def test_an_edge_of_two_basins_is_drawn_once(run: StormRun) -> None:
    """The line between the squares, 10 km long, stands once among the borders: 60 km rim and 10 km."""
    ground = map_figure._Ground(run)
    assert ground.borders.length == pytest.approx(70_000)


def test_cell_edges_stay_inside_the_basins(run: StormRun) -> None:
    """Thiessen edges are drawn inside only, and the rim is no cell edge."""
    ground = map_figure._Ground(run)
    assert ground.cells.length > 10_000
    assert ground.cells.difference(ground.area.buffer(1)).length < 1
    assert ground.cells.intersection(ground.area.boundary.buffer(1)).length < 200


def test_one_map_for_storms_with_the_same_statuses() -> None:
    """Two storms that look the same share a map that names both."""
    pictures = map_pictures(make_run(storms=("Quill", "Sedge")))
    assert len(pictures) == 1
    assert "(Quill, Sedge)" in pictures[0].caption


def test_true_north_is_not_the_planes_north(monkeypatch: pytest.MonkeyPatch) -> None:
    """Far from a plane's meridian the arrow leans by the convergence, (λ - λ0) sin φ (common practice)."""
    tips: list[list[np.ndarray[tuple[int], np.dtype[np.float64]]]] = []
    real = Polygon

    def spy(corners: list[np.ndarray[tuple[int], np.dtype[np.float64]]], **style: Any) -> object:  # noqa: ANN401 - handed on
        tips.append(corners)
        return real(corners, **style)

    monkeypatch.setattr(map_parts, "Polygon", spy)
    crs = "+proj=tmerc +lat_0=50 +lon_0=0 +x_0=-214000 +datum=WGS84 +units=m"  # x = 10 km lies near 3 degrees east
    map_pictures(make_run(plane=Plane(crs, "Far plane", 0.0)))
    tip, _, notch = tips[2]
    lean = math.degrees(math.atan2(tip[0] - notch[0], tip[1] - notch[1]))
    assert lean == pytest.approx(-3.1 * math.sin(math.radians(50)), abs=0.15)

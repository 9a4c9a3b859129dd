from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from matplotlib.collections import PolyCollection
from report.markup import svg_texts, svg_tree
from report.spying import drawn_by
from small_hyetographs import COMMON, RARE, drawn_content, hyetograph

from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.designstorm.exceedance import Frequency
from basinrain.report import design_hyetographs_figure
from basinrain.report.design_hyetographs_figure import design_pictures


@pytest.fixture
def figures(monkeypatch: pytest.MonkeyPatch) -> list[Any]:
    """Return the figures that are drawn."""
    return drawn_by(design_hyetographs_figure, monkeypatch)


def storm(**changed: Any) -> DesignHyetograph:  # noqa: ANN401 - handed on
    """Return half an hour over one basin: 25.4, 76.2 and 25.4 mm, that is 1, 3 and 1 in."""
    return hyetograph([[25.4], [76.2], [25.4]], **{"basins": ("west",), "step": 10, **changed})


def corners(axes: Any) -> Any:  # noqa: ANN401 - matplotlib's axes
    """Return left, right and height of every bar."""
    bars = next(item for item in axes.collections if isinstance(item, PolyCollection))
    paths = np.array([np.asarray(path.vertices)[:4] for path in bars.get_paths()])
    return np.column_stack([paths[:, 0, 0], paths[:, 2, 0], paths[:, 1, 1]])


def test_bars_stand_on_their_steps_and_the_line_is_their_share(figures: list[Any]) -> None:
    """In inches and hours: 1, 3 and 1 in of 5 in; after 10 minutes a fifth, after 20 four fifths."""
    one = design_pictures([storm()], "in")[0]
    axes, share = figures[0].axes
    assert corners(axes) == pytest.approx(np.array([[0, 1, 6], [1, 2, 18], [2, 3, 6]]) / 6)
    hours, shares = share.lines[0].get_data()
    assert (hours, shares) == (pytest.approx(np.arange(4) / 6), pytest.approx([0, 0.2, 0.8, 1.0]))
    texts = svg_texts(one.svg)
    for text in ("inches in 10 min", "elapsed time, hours", "share of the total, %", "nrcs-type-ii"):
        assert text in texts
    assert "bridge, 30 min, basin west" in texts
    assert one.caption == (
        "bridge, 30 min: design hyetographs of basin west by pattern; bars and their share of the total at "
        "AEP 0.01 (1 in 100)."
    )
    assert svg_tree(one.svg)[1].text == (
        "inches; nrcs-type-ii, AEP 0.01 (1 in 100): total 5.00, greatest step 3.00, ending after 20 min"
    )


def test_the_rarest_has_the_bars_and_the_others_are_outlines(figures: list[Any]) -> None:
    """Whatever order they come in, and whatever series they are counted in."""
    common = hyetograph([[1.0], [2.0], [1.0]], basins=("west",), step=10, frequency=COMMON)
    one = design_pictures([common, storm()], "mm")[0]
    axes = figures[0].axes[0]
    assert corners(axes)[:, 2] == pytest.approx([25.4, 76.2, 25.4])
    outlines = [patch for patch in axes.patches if patch.get_linestyle() not in ("-", "solid")]
    assert [outline.get_data().values.tolist() for outline in outlines] == [[1.0, 2.0, 1.0]]
    assert {"AEP 0.01 (1 in 100)", "2-year", "cumulative share"} <= set(svg_texts(one.svg))


def test_patterns_stand_side_by_side_in_one_scale(figures: list[Any]) -> None:
    """A panel for each; a pattern that the rarest frequency does not have says so and is no bar."""
    level = hyetograph([[40.0]] * 3, basins=("west",), step=10, pattern="uniform")
    late = hyetograph([[1.0], [1.0], [9.0]], basins=("west",), step=10, pattern="late", frequency=COMMON)
    one = design_pictures([storm(), level, late], "mm")[0]
    panels = [axes for axes in figures[0].axes if axes.get_title(loc="left")]
    assert [panel.get_title(loc="left") for panel in panels] == ["nrcs-type-ii", "uniform", "late"]
    assert [panel.get_ylim() for panel in panels] == [(0.0, pytest.approx(76.2 * 1.06))] * 3
    assert corners(panels[1])[:, 2].tolist() == [40.0] * 3
    assert not [item for item in panels[2].collections if isinstance(item, PolyCollection)]
    assert svg_texts(one.svg).count("not at AEP 0.01 (1 in 100)") == 1


def test_the_basin_with_the_greatest_depth_is_drawn(figures: list[Any]) -> None:
    """And named, with how many there are; where all have the same depth it stands for every one."""
    own = hyetograph([[1.0, 2.0], [3.0, 5.0]], basins=("west", "east"))
    assert design_pictures([own], "mm")[0].caption == (
        "bridge, 2 h: design hyetographs of basin east by pattern; bars and their share of the total at "
        "AEP 0.01 (1 in 100). Of 2 basins it has the greatest depth."
    )
    assert corners(figures[0].axes[0])[:, 2].tolist() == [2.0, 5.0]
    same = hyetograph([[1.0, 1.0], [3.0, 3.0]], basins=("west", "east"))
    one = design_pictures([same], "mm")[0]
    assert "bridge, 2 h, every basin above it" in svg_texts(one.svg)
    assert "greatest depth" not in one.caption


def test_many_steps_share_bars(figures: list[Any]) -> None:
    """Of 241 steps three share a bar, the last has one; the line goes through every step."""
    one = design_pictures([hyetograph(np.ones((241, 1)), basins=("west",), step=5)], "mm")[0]
    bars = corners(figures[0].axes[0])
    assert (len(bars), bars[0].tolist(), bars[-1]) == (81, [0, 0.25, 3], pytest.approx([20, 241 / 12, 1]))
    assert len(figures[0].axes[1].lines[0].get_xdata()) == 242
    assert "mm in 3 × 5 min" in svg_texts(one.svg)
    assert one.caption.endswith(" A bar adds up 3 steps.")


def test_what_is_not_drawn_is_counted() -> None:
    """Of nine patterns six, of six frequencies four."""
    frequencies = [Frequency(years, "annual-maximum") for years in (100.0, 50.0, 20.0, 10.0, 5.0, 2.0)]
    many = [storm(pattern=f"pattern {k}", frequency=frequency) for k in range(9) for frequency in frequencies]
    one = design_pictures(many, "mm")[0]
    texts = svg_texts(one.svg)
    assert [text for text in texts if text.startswith("pattern ")] == [f"pattern {k}" for k in range(6)]
    labels = [text for text in texts if "1 in" in text]
    assert labels == ["AEP 0.01 (1 in 100)", "1 in 50", "1 in 10", "1 in 2"]
    assert "Drawn: 6 of 9 patterns. 2 more frequencies are not drawn." in one.caption


def test_a_large_run_has_a_handful_of_pictures() -> None:
    """Of three points by five durations the shortest and the longest of each; the last caption counts."""
    many = [
        hyetograph(np.ones((steps, 1)), basins=("west",), point=point, step=10)
        for point in ("bridge", "old weir", "mill")
        for steps in (1, 3, 6, 12, 288)
    ]
    pictures = design_pictures(many, "mm")
    heads = [one.caption.split(":")[0] for one in pictures]
    assert heads == [f"{point}, {words}" for point in ("bridge", "old weir", "mill") for words in ("10 min", "48 h")]
    assert [one.name for one in pictures] == [f"design-hyetographs-{k}" for k in range(1, 7)]
    assert [" Drawn: 6 of 15 points and durations." in one.caption for one in pictures] == [False] * 5 + [True]


def test_of_very_many_points_the_longest_storm_is_drawn() -> None:
    """One picture of each of the first six."""
    many = [
        hyetograph(np.ones((steps, 1)), basins=("west",), point=f"p{k}", step=10) for k in range(9) for steps in (6, 1)
    ]
    assert [one.caption.split(":")[0] for one in design_pictures(many, "mm")] == [f"p{k}, 1 h" for k in range(6)]


def test_a_storm_without_rain_is_drawn(figures: list[Any]) -> None:
    """It has no share of nothing."""
    one = design_pictures([hyetograph([[0.0], [0.0]], basins=("west",))], "mm")[0]
    assert figures[0].axes[0].get_ylim() == (0, pytest.approx(1.06))
    assert not figures[0].axes[1].lines
    assert "total 0.0" in (svg_tree(one.svg)[1].text or "")


def test_nothing_to_draw() -> None:
    """No hyetograph, no picture."""
    assert design_pictures([], "mm") == ()


def test_a_repeat_is_identical() -> None:
    """The same hyetographs give the same bytes."""
    hyetographs = drawn_content().hyetographs
    assert design_pictures(hyetographs, "mm") == design_pictures(hyetographs, "mm")
    assert {RARE, COMMON} == {one.frequency for one in hyetographs}

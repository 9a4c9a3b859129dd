from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st

from basinrain.report.labels import Box, LabelPlacer

FRAME = Box(0, 0, 300, 200)


def test_a_free_mark_has_its_label_on_the_right() -> None:
    """With nothing around, the first place is taken."""
    label = LabelPlacer(FRAME).beside(100, 100, ["R01"], 6, gap=5)
    assert label is not None
    assert (label.side, label.x, label.y) == ("left", 105, 100)


def test_a_label_moves_off_a_mark_beside_it() -> None:
    """A mark on the right sends the label to the left."""
    label = LabelPlacer(FRAME, [Box(105, 96, 113, 104)]).beside(100, 100, ["R01"], 6, gap=5)
    assert label is not None
    assert label.side == "right"


def test_a_label_stays_inside_the_map() -> None:
    """At the right edge the label goes to the left."""
    label = LabelPlacer(FRAME).beside(298, 100, ["R01"], 6, gap=5)
    assert label is not None
    assert label.box.right <= 300


def test_no_room_is_said() -> None:
    """Where everything is taken there is no label."""
    assert LabelPlacer(FRAME, [FRAME]).beside(100, 100, ["R01"], 6, gap=5) is None
    assert LabelPlacer(FRAME, [FRAME]).over([(10, 10), (50, 50)], "Upper", 8) is None


@given(st.lists(st.tuples(st.floats(20, 280), st.floats(20, 180)), max_size=60))
def test_labels_hardly_cover_each_other(points: list[tuple[float, float]]) -> None:
    """No label shares more than an eighth of its area with those placed before it."""
    placer = LabelPlacer(FRAME)
    placed: list[Box] = []
    for x, y in points:
        label = placer.beside(x, y, ["R01", "12.3"], 6, gap=5)
        if label is not None:
            assert sum(label.box.shared(box) for box in placed) <= 0.125 * label.box.area
            placed.append(label.box)
    assert len(placed) > 0 or not points

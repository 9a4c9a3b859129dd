from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from matplotlib.figure import Figure

from basinrain.report.duration_axis import duration_axis, words_with_room


def test_room_is_left_in_points() -> None:
    """Of 200 points 50 lie before the first duration and 30 after the last; the middle of 1 and 100 is 10."""
    axes = Figure().add_axes((0, 0, 1, 1))
    duration_axis(axes, np.array([1.0, 10.0, 100.0]), ["one", "ten", "hundred"], points=200, left=50, right=30)
    low, high = np.log(axes.get_xlim())
    places = (np.log([1, 10, 100]) - low) / (high - low) * 200
    assert places == pytest.approx([50, 110, 170])
    assert [label.get_text() for label in axes.get_xticklabels()] == ["one", "ten", "hundred"]
    assert axes.get_xscale() == "log"


def test_one_duration_stands_where_the_first_would() -> None:
    """An axis without a span has a place for its only mark."""
    axes = Figure().add_axes((0, 0, 1, 1))
    duration_axis(axes, np.array([60.0]), ["1 h"], points=200, left=50, right=30)
    low, high = np.log(axes.get_xlim())
    assert (np.log(60) - low) / (high - low) == pytest.approx(0.25)


@given(st.lists(st.floats(0, 500), min_size=1, max_size=12).map(sorted), st.integers(1, 12))
def test_no_word_meets_the_one_before(places: list[float], letters: int) -> None:
    """The first always stands; those that stand are 17 points apart or more, and 4.2 a letter."""
    shown = words_with_room(places, ["x" * letters] * len(places))
    stand = [place for place, word in zip(places, shown, strict=True) if word]
    assert shown[0]
    assert all(gap >= max(17, 4.2 * letters) for gap in np.diff(stand))

"""Windows over a series."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plain_series import Floats, depths

from basinrain.series.windows import Windows, greatest_sums


@st.composite
def windows(draw: st.DrawFn) -> Windows:
    """Draw windows that slide or follow each other, from any step on."""
    length = draw(st.integers(1, 20))
    return Windows(length, draw(st.integers(0, 25)), draw(st.sampled_from([1, length])))


@given(st.integers(0, 50), windows())
def test_windows_lie_whole_in_the_series(n: int, drawn: Windows) -> None:
    """All beginnings leave room for a window, and one more would not."""
    beginnings = drawn.beginnings(n)
    assert len(beginnings) == drawn.count(n)
    assert (beginnings + drawn.length <= n).all()
    assert drawn.first + drawn.count(n) * drawn.every + drawn.length > n


@given(st.lists(depths(at_least=40, at_most=40), min_size=1, max_size=3), st.lists(windows(), min_size=1, max_size=4))
def test_equal_to_adding_up_every_window(rows: list[Floats], kinds: list[Windows]) -> None:
    """Every window added up by itself, exactly, in two stretches, gives the same depths, places and counts."""
    values = np.column_stack(rows)
    edges = [np.array([0, kind.count(40) // 3, kind.count(40)]) for kind in kinds]
    sums, places, counted = greatest_sums(values, kinds, edges)
    for k, kind in enumerate(kinds):
        for column in range(values.shape[1]):
            every = [math.fsum(values[first : first + kind.length, column]) for first in kind.beginnings(40)]
            for stretch in range(2):
                part = range(edges[k][stretch], edges[k][stretch + 1])
                known = [place for place in part if not math.isnan(every[place])]
                assert counted[k][stretch, column] == len(known)
                if known:
                    top = max(every[place] for place in known)
                    earliest = next(place for place in known if every[place] >= top - 1e-9)
                    assert sums[k][stretch, column] == pytest.approx(top, rel=1e-14, abs=0)
                    assert places[k][stretch, column] == earliest
                else:
                    assert math.isnan(sums[k][stretch, column])
                    assert places[k][stretch, column] == -1


def test_a_small_depth_after_a_huge_one_is_exact() -> None:
    """What went before leaves no trace: differences of running totals would lose all of 3e-9 after 1e9."""
    values = np.zeros((100, 1))
    values[10] = 1e9
    values[60:63] = 1e-9
    edges = [np.array([0, 50, 98])]
    sums, _, _ = greatest_sums(values, [Windows(3)], edges)
    assert sums[0][0, 0] == 1e9
    assert sums[0][1, 0] == pytest.approx(3e-9, rel=1e-15)


def test_no_window_where_the_series_is_too_short() -> None:
    """A window longer than the series has no sum, no place and no count."""
    sums, places, counted = greatest_sums(
        np.ones((3, 2)), [Windows(4), Windows(3)], [np.array([0, 0]), np.array([0, 1])]
    )
    assert np.isnan(sums[0]).all()
    assert (places[0] == -1).all()
    assert (counted[0] == 0).all()
    assert (sums[1] == 3.0).all()

"""Depths that contradict each other by duration, raised as little as possible."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from basinrain.designstorm.monotone_depths import monotone_depths

Floats = npt.NDArray[np.float64]

MINUTES = np.array([30.0, 60.0, 180.0, 1440.0])
TABLES = arrays(np.float64, (4, 3), elements=st.integers(1, 400).map(float))


def agrees(depth: Floats) -> bool:
    """Whether depths do not fall with duration or rarity, nor intensities rise with duration."""
    rate = depth / MINUTES[:, None]
    return bool(
        np.all(np.diff(depth, axis=0) >= -1e-9)
        and np.all(np.diff(depth, axis=1) >= -1e-9)
        and np.all(np.diff(rate, axis=0) <= 1e-9)
    )


@given(TABLES)
def test_agrees_and_is_not_below(depth: Floats) -> None:
    """Any table is made to agree, no entry falls, and doing it again changes nothing."""
    found = monotone_depths(depth, MINUTES)
    assert agrees(found)
    assert np.all(found >= depth)
    np.testing.assert_allclose(monotone_depths(found, MINUTES), found, rtol=1e-14)


@given(TABLES)
def test_is_the_closed_form(depth: Floats) -> None:
    """An entry is the greatest of all no rarer ones, those of longer durations in proportion to duration."""
    expected = np.empty_like(depth)
    for d, t in np.ndindex(depth.shape):
        expected[d, t] = max(
            depth[q, s] * min(1.0, MINUTES[d] / MINUTES[q]) for q in range(len(MINUTES)) for s in range(t + 1)
        )
    np.testing.assert_allclose(monotone_depths(depth, MINUTES), expected, rtol=1e-14)


@given(TABLES, TABLES)
def test_is_the_least_table_that_agrees(depth: Floats, more: Floats) -> None:
    """No table that agrees and is nowhere below the one given is anywhere below the result."""
    other = monotone_depths(depth + more, MINUTES)
    assert np.all(monotone_depths(depth, MINUTES) <= other * (1 + 1e-12))


def test_a_table_that_agrees_keeps_every_digit() -> None:
    """Nothing is changed where nothing need be, whole stacks of tables at once, and the input is left alone."""
    depth = np.broadcast_to(0.1 * MINUTES[:, None] ** 0.3 * np.array([3.0, 5.0, 7.0]), (5, 4, 3))
    assert np.array_equal(monotone_depths(depth, MINUTES), depth)


def test_no_depth_for_one_duration_is_none_for_all() -> None:
    """A duration without a fit leaves nothing to compare the others with."""
    assert np.isnan(monotone_depths(np.array([[10.0], [np.nan], [20.0]]), MINUTES[:3])).all()


def test_one_duration_has_only_rarity() -> None:
    """Of one duration a rarer depth is at least the more frequent one."""
    assert monotone_depths(np.array([[10.0, 9.0, 12.0]]), MINUTES[:1]).tolist() == [[10.0, 10.0, 12.0]]

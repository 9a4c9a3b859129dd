"""Spans, the parts of them that gauges have which come or go, and sums over both."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from basinrain.infill.intervals import intervals_of, span_sums


def test_spans_are_cut_for_the_gauge_that_comes_or_goes() -> None:
    """Of three spans the second gauge leaves within the first and is back with the third; the third comes within it."""
    absent = np.zeros((9, 3), dtype=bool)
    absent[2:6, 1] = True
    absent[:7, 2] = True
    found = intervals_of(np.array([0, 3, 6]), absent)
    assert list(zip(found.first.tolist(), found.stop.tolist(), strict=True)) == [
        *((0, 3), (3, 6), (6, 9)),
        *((0, 2), (2, 3), (6, 7), (7, 9)),
    ]
    assert found.n_spans == 3
    parts = zip(found.gauge.tolist(), found.span.tolist(), found.row.tolist(), strict=True)
    assert sorted(parts) == [(1, 0, 3), (1, 0, 4), (2, 2, 5), (2, 2, 6)]


def test_a_gauge_that_comes_and_goes_several_times_in_a_span() -> None:
    """Each stretch is a part of its own; two gauges with the same stretch share it."""
    absent = np.array([[0, 0], [1, 0], [0, 0], [1, 1]], dtype=bool)
    found = intervals_of(np.array([0]), absent)
    of = {g: sorted(found.first[found.row[found.gauge == g]].tolist()) for g in (0, 1)}
    assert of == {0: [0, 1, 2, 3], 1: [0, 3]}
    assert len(found.first) == 1 + 5


@given(st.integers(0, 2**32 - 1), st.booleans())
def test_sums_over_spans_and_parts(seed: int, even: bool) -> None:  # noqa: FBT001 - drawn
    """They are the plain sums of their steps, of spans as long as each other and of others, of depths and of counts."""
    rng = np.random.default_rng(seed)
    n_steps = 600
    first = np.arange(0, n_steps, 300) if even else np.unique([0, *rng.integers(0, n_steps, 5)])
    absent = np.arange(n_steps)[:, None] < rng.integers(0, n_steps, 3)
    found = intervals_of(first, absent)
    for values in (rng.random((n_steps, 3)), rng.random((n_steps, 3)) < 0.9):
        sums = span_sums(values, found)
        for row, (begin, stop) in enumerate(zip(found.first, found.stop, strict=True)):
            np.testing.assert_allclose(sums[row], values[begin:stop].sum(axis=0), rtol=1e-12)


def test_counts_above_255_steps() -> None:
    """A span of 300 steps has 300 of them, not 44."""
    found = intervals_of(np.array([0, 300]), np.zeros((600, 1), dtype=bool))
    assert span_sums(np.ones((600, 1), dtype=bool), found).ravel().tolist() == [300, 300]

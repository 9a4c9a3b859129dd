"""Stretches of steps, and corrections over long and short ones."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from thiessen_rounds import scattered

from basinrain.averaging import thiessen_corrections
from basinrain.averaging.thiessen_corrections import Corrections, Spans
from basinrain.averaging.thiessen_epochs import Holes
from basinrain.averaging.thiessen_removal import Removals


@given(st.lists(st.lists(st.booleans(), min_size=6, max_size=6), min_size=1, max_size=5))
def test_spans_cover_what_the_mask_says(rows: list[list[bool]]) -> None:
    """Steps of all spans are the mask's, with every run as long as it is; runs next to each other are one span."""
    mask, borders = np.array(rows), np.array([3, 4, 6, 7, 10, 11, 15])
    spans = Spans.where(mask, borders)
    painted = np.zeros((len(mask), 15), dtype=int)
    np.add.at(painted, (np.repeat(spans.of, spans.lengths), spans.steps()), 1)
    assert painted[:, :3].sum() == 0
    assert (painted[:, 3:] == np.repeat(mask, np.diff(borders), axis=1)).all()
    assert len(spans.of) == (np.diff(mask.astype(int), axis=1, prepend=0) == 1).sum()


def test_spans_within_some_steps() -> None:
    """What begins before or ends behind is cut, and steps are counted anew; no lots are no spans."""
    spans = Spans(np.array([4, 5, 6]), np.array([0, 3, 8]), np.array([4, 6, 9]))
    assert [some.tolist() for some in spans.within(3, 8)] == [[4, 5], [0, 0], [1, 3]]
    joined = Spans.join([spans, spans.within(3, 8)])
    assert [some.tolist() for some in joined] == [[4, 5, 6, 4, 5], [0, 3, 8, 0, 0], [4, 6, 9, 1, 3]]
    assert len(Spans.join([]).steps()) == 0


def corrected(missing: npt.NDArray[np.bool_], holes: Holes | None = None) -> npt.NDArray[np.float64]:
    """Return means of 3 steps a run, from the weights of all gauges and corrections, 20 steps at a time."""
    made = scattered()
    borders = np.arange(len(missing) + 1) * 3
    depth = np.random.default_rng(6).uniform(1, 50, (20, int(borders[-1])))
    depth[np.repeat(missing, 3, axis=0).T] = 0.0
    none = Holes(np.empty(0, dtype=np.int64), [])
    corrections = Corrections(made, Removals(made), missing.copy(), holes or none, borders)
    assert not len(corrections.own)
    means = np.empty((5, depth.shape[1]))
    for first in range(0, depth.shape[1], 20):
        stop = min(first + 20, depth.shape[1])
        known = np.ascontiguousarray(depth[:, first:stop])
        part = np.ascontiguousarray(made.weights @ known)
        corrections.add_to(part, known, first, stop)
        means[:, first:stop] = part
    return means


def test_long_and_short_corrections_agree(monkeypatch: pytest.MonkeyPatch) -> None:
    """As products or gathered, unpacked at once or one by one: the same means."""
    missing = np.random.default_rng(4).random((30, 20)) < 0.15
    missing[:, :3] = True
    means = corrected(missing)
    for name, value in (("_LONG", 1), ("_LONG", 10**9), ("_BITS", 1)):
        monkeypatch.setattr(thiessen_corrections, name, value)
        np.testing.assert_allclose(corrected(missing), means, rtol=1e-12)


def test_means_are_those_of_the_gauges_that_report() -> None:
    """Every mean is the one of a tessellation of the gauges that report."""
    missing = np.random.default_rng(7).random((12, 20)) < 0.3
    means, made = corrected(missing), scattered()
    depth = np.random.default_rng(6).uniform(1, 50, (20, 36))
    for run in range(12):
        alone = made.without(missing[run])
        assert alone is not None
        np.testing.assert_allclose(
            means[:, 3 * run : 3 * run + 3], alone.weights @ depth[:, 3 * run : 3 * run + 3], rtol=1e-12
        )


def test_dear_holes_and_lost_removals_ask_for_weights_of_their_own(monkeypatch: pytest.MonkeyPatch) -> None:
    """A hole dearer than a tessellation, a hole that is lost, and a removal that is lost name their runs."""
    made = scattered()
    missing = np.zeros((6, 20), dtype=bool)
    group = (3, *sorted(made.neighbours[3]))
    missing[2, list(group)] = True
    missing[4, 7] = True
    missing[5] = [g in group or g == 7 for g in range(20)]
    holes = Holes(np.array([2, 5]), [group, group])
    borders = np.arange(7)

    def own(removals: Removals) -> list[int]:
        return [int(run) for run in Corrections(made, removals, missing.copy(), holes, borders).own]

    assert own(Removals(made)) == []
    removals = Removals(made)
    removals.holes([group])[0].lost = True
    assert own(removals) == [2, 5]
    removals = Removals(made)
    ((some, _),) = removals.asked(np.packbits(missing[[4]].T, axis=1))
    some[0].lost = True
    assert own(removals) == ([4] if 7 in group else [4, 5])
    monkeypatch.setattr(thiessen_corrections, "DEAR", made.burden_of(group) * 0.4)
    assert own(Removals(made)) == [2, 5]
    monkeypatch.setattr(thiessen_corrections, "DEAR", made.burden_of(group) * 0.6)
    assert own(Removals(made)) == []  # two runs share the cost

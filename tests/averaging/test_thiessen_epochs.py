"""Stretches over which gauges are absent, and large groups of missing neighbours."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from basinrain.averaging import thiessen_epochs
from basinrain.averaging.thiessen_epochs import LARGE, epochs_of, large_holes

Bools = npt.NDArray[np.bool_]

SIDE = 8


def lattice(absent: Bools | None = None) -> npt.NDArray[np.int64]:
    """Return the neighbours on a lattice of 8 x 8 gauges, those next to each other in a row or a column."""
    at = np.arange(SIDE * SIDE).reshape(SIDE, SIDE)
    across = np.column_stack((at[:, :-1].ravel(), at[:, 1:].ravel()))
    edges = np.concatenate([across, np.column_stack((at[:-1].ravel(), at[1:].ravel()))])
    return edges if absent is None else edges[~absent[edges].any(axis=1)]


def flooded(missing: Bools) -> list[tuple[int, ...]]:
    """Return the large groups of one run by walking from gauge to gauge."""
    left = set(np.flatnonzero(missing).tolist())
    near: dict[int, set[int]] = {g: set() for g in range(SIDE * SIDE)}
    for one, other in lattice().tolist():
        near[one].add(other)
        near[other].add(one)
    found = []
    while left:
        group, todo = set(), [left.pop()]
        while todo:
            here = todo.pop()
            group.add(here)
            todo += near[here] & left
            left -= near[here]
        found.append(tuple(sorted(group)))
    return sorted(group for group in found if len(group) > LARGE)


@pytest.mark.parametrize("together", [3, 8192])
def test_groups_are_those_of_walking(monkeypatch: pytest.MonkeyPatch, together: int) -> None:
    """Sparse to crowded, whether runs are looked at three by three or all at once."""
    monkeypatch.setattr(thiessen_epochs, "_RUNS", together)
    rng = np.random.default_rng(1)
    missing = rng.random((40, SIDE * SIDE)) < np.linspace(0.05, 0.7, 40)[:, None]
    holes = large_holes(missing, lattice())
    expected = [(run, group) for run in range(40) for group in flooded(missing[run])]
    assert len(expected) > 20
    assert list(zip(holes.run.tolist(), holes.gauges, strict=True)) == expected


def borders(present: Bools) -> list[tuple[int, int, int]]:
    """Return first and stop of every epoch and how many gauges it leaves out."""
    return [(e.first, e.stop, int(e.absent.sum())) for e in epochs_of(present, lattice)]


def flickering(runs: int, seed: int) -> Bools:
    """Return which of 64 gauges report, one in forty silent in turns."""
    present = np.ones((runs, SIDE * SIDE), dtype=bool)
    present[np.arange(runs), np.random.default_rng(seed).integers(0, SIDE * SIDE, runs)] = False
    return present


def test_late_and_early_gauges_are_left_out_where_they_are_absent() -> None:
    """20 that open together at run 100 and 16 that close at run 250 make three stretches; no hole is left in them."""
    present = flickering(400, 2)
    present[:100, :20] = False
    present[250:, -16:] = False
    epochs = list(epochs_of(present, lattice))
    assert [(e.first, e.stop) for e in epochs] == [(0, 100), (100, 250), (250, 400)]
    assert [np.flatnonzero(e.absent).tolist() for e in epochs] == [list(range(20)), [], list(range(48, 64))]
    assert all(not len(e.holes.run) for e in epochs)


def test_a_regional_outage_is_a_stretch_of_its_own() -> None:
    """16 neighbours silent from run 60 to 90 are left out there, and nowhere else."""
    present = flickering(200, 3)
    present[60:90, 16:32] = False
    assert borders(present) == [(0, 60, 0), (60, 90, 16), (90, 200, 0)]


def test_a_short_outage_stays_a_hole() -> None:
    """Over 5 runs it is not worth a tessellation: the stretch is whole and the holes are named, run by run."""
    present = np.ones((100, SIDE * SIDE), dtype=bool)
    present[40:45, 16:32] = False
    (epoch,) = epochs_of(present, lattice)
    assert (epoch.first, epoch.stop, int(epoch.absent.sum())) == (0, 100, 0)
    assert epoch.holes.run.tolist() == [40, 41, 42, 43, 44]
    assert epoch.holes.gauges == [tuple(range(16, 32))] * 5


def test_gauges_that_close_one_by_one_divide_by_halves() -> None:
    """Where no border has many changes the middle is taken, until few runs are left or holes are few."""
    present = np.ones((320, SIDE * SIDE), dtype=bool)
    for gauge in range(40):
        present[8 * gauge :, gauge] = False
    epochs = list(epochs_of(present, lattice))
    assert [e.first for e in epochs[1:]] == [e.stop for e in epochs[:-1]]
    assert (epochs[0].first, epochs[-1].stop) == (0, 320)
    assert 4 < len(epochs) < 20
    for e in epochs:
        assert not present[e.first : e.stop, e.absent].any()
        assert len(set(e.holes.run.tolist())) <= 8


def test_nobody_reports() -> None:
    """Steps without any gauge ask for nothing; no runs have no stretch."""
    assert borders(np.zeros((30, SIDE * SIDE), dtype=bool)) == [(0, 30, 0)]
    assert borders(np.zeros((0, SIDE * SIDE), dtype=bool)) == []


def test_runs_at_random_end() -> None:
    """Nearly half missing at random, every run anew: they are divided down to stretches of under 16 runs, in order."""
    present = np.random.default_rng(5).random((70, SIDE * SIDE)) > 0.45
    epochs = list(epochs_of(present, lattice))
    assert [e.first for e in epochs] == [0, *(e.stop for e in epochs[:-1])]
    assert epochs[-1].stop == 70
    assert max(e.stop - e.first for e in epochs) < 16

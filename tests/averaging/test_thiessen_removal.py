"""Removals: who takes over when gauges fall silent, by hand and whatever was asked before."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import KM, basins_of, gauges_at
from thiessen_rounds import scattered

from basinrain.averaging import thiessen_removal
from basinrain.averaging.thiessen_removal import Removal, Removals
from basinrain.averaging.thiessen_tessellation import Tessellation, whole_tessellation
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

ROW = gauges_at((1, 5), (3, 5), (7, 5), (9, 5), unit=KM)
HALVES = basins_of(KM, west=shapely.box(0, 0, 5, 10), east=shapely.box(5, 0, 10, 10))


def tessellation(network: GaugeNetwork, basins: Basins) -> Tessellation:
    return whole_tessellation(network, basins, np.ones(len(network), dtype=bool), len(basins))


def times(*silent: set[int], n: int = 4) -> npt.NDArray[np.uint8]:
    """Return when each of n gauges is missing, packed, from the gauges missing at each time."""
    return np.packbits([[g in some for some in silent] for g in range(n)], axis=1)


def entries(removal: Removal) -> list[tuple[int, int, float]]:
    return list(zip(removal.basin.tolist(), removal.gauge.tolist(), removal.share.round(12).tolist(), strict=True))


def test_one_gauge_and_then_its_neighbour() -> None:
    """Cells 0-2, 2-5, 5-8 and 8-10 km: the second's is divided at x = 4; what its heir has of it goes further on."""
    levels = list(Removals(tessellation(ROW, HALVES)).asked(times({1}, {1, 2})))
    assert [[removal.receivers.tolist() for removal in some] for some, _ in levels] == [[[0, 2], [1, 3]], [[0, 3]]]
    (second, third), (both,) = (some for some, _ in levels)
    assert entries(second) == [(0, 0, 0.4), (0, 2, 0.2)]
    assert entries(third) == [(1, 1, 0.2), (1, 3, 0.4)]
    # Nearest to both, in either order: 4-5 of the second's cell and 5-6 of the third's; the middle x = 5 divides them.
    assert entries(both) == [(0, 0, 0.2), (1, 3, 0.2)]
    assert [np.unpackbits(when, axis=1, count=2).tolist() for _, when in levels] == [[[1, 1], [0, 1]], [[0, 1]]]


def test_a_hole_is_what_its_parts_come_to() -> None:
    """Sharing the second and third gauges' cells at once: 2-5 to the first, 5-8 to the fourth."""
    (hole,) = Removals(tessellation(ROW, HALVES)).holes([(1, 2)])
    assert entries(hole) == [(0, 0, 0.6), (1, 3, 0.6)]
    assert hole.table.round(12).tolist() == [[0.6, 0.0], [0.0, 0.6]]
    assert (hole.basins.tolist(), hole.gauges.tolist(), hole.lost) == ([0, 1], [0, 3], False)


def test_a_gauge_without_a_part_of_the_basins() -> None:
    """A gauge too far to count has nothing to hand on; nobody is asked where nobody is missing."""
    far = gauges_at((1, 5), (3, 5), (40, 5), unit=KM)
    removals = Removals(tessellation(far, HALVES))
    ((some, _),) = removals.asked(times({2}, n=3))
    assert entries(some[0]) == []
    assert list(removals.asked(times(set(), n=3))) == []


def bytes_of(removals: Removals, missing: npt.NDArray[np.uint8]) -> list[tuple[bytes, ...]]:
    return [
        (removal.basin.tobytes(), removal.gauge.tobytes(), removal.share.tobytes(), removal.receivers.tobytes())
        for some, _ in removals.asked(missing)
        for removal in some
    ]


def test_what_was_asked_before_changes_no_bit(monkeypatch: pytest.MonkeyPatch) -> None:
    """Asked at once, piece by piece in another order, or in small lots, removals come alike and in the same order."""
    rng = np.random.default_rng(9)
    silent = rng.random((20, 64)) < 0.3
    fresh = bytes_of(Removals(scattered()), np.packbits(silent, axis=1))
    assert len(fresh) > 100
    used = Removals(scattered())
    for k in rng.permutation(64):
        list(used.asked(np.packbits(silent[:, [k]], axis=1)))
    assert bytes_of(used, np.packbits(silent, axis=1)) == fresh
    monkeypatch.setattr(thiessen_removal, "_CORNERS", 100)
    assert bytes_of(Removals(scattered()), np.packbits(silent, axis=1)) == fresh


def test_shares_of_every_removal_are_areas_taken_over() -> None:
    """What one gauge loses is what its neighbours gain: shares of single removals sum to its own weights."""
    made = scattered()
    weights = made.weights.toarray()
    ((some, _), *_) = Removals(made).asked(times(*({g} for g in range(20)), n=20))
    for gauge, removal in enumerate(some):
        gained = np.bincount(removal.basin, removal.share, minlength=5)
        np.testing.assert_allclose(gained, weights[:, gauge], rtol=0, atol=1e-13)

"""Tessellations as rings: gauges left out, neighbours, and how a wrong triangulation is met."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import KM, basins_of, gauges_at
from hypothesis import given, settings
from scipy.spatial import Delaunay
from strategies import Case, cases

from basinrain.averaging import thiessen_tessellation, thiessen_weights
from basinrain.averaging.thiessen_tessellation import (
    Tessellation,
    candidates_of,
    edges_among,
    groups_of,
    whole_tessellation,
)
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

SQUARE = basins_of(KM, square=shapely.box(0, 0, 10, 10))


def whole(network: GaugeNetwork, basins: Basins) -> Tessellation:
    return whole_tessellation(network, basins, np.ones(len(network), dtype=bool), len(basins))


def mask(n: int, *gauges: int) -> npt.NDArray[np.bool_]:
    return np.isin(np.arange(n), gauges)


@settings(max_examples=40, deadline=None)
@given(case=cases())
def test_leaving_gauges_out_is_a_tessellation_without_them(case: Case) -> None:
    """Weights after taking gauges out are the Thiessen weights of those that stay, to 1e-12."""
    tessellation = whole(case.network, case.basins).without(~case.present)
    assert tessellation is not None
    weights = tessellation.weights.toarray()
    np.testing.assert_allclose(
        weights, thiessen_weights(case.network, case.basins, case.present).weights, rtol=0, atol=1e-12
    )
    assert not weights[:, ~case.present].any()
    assert not any(tessellation.neighbours[g] for g in np.flatnonzero(~case.present))


def test_neighbours_of_a_cross() -> None:
    """The middle gauge of a cross touches the four arms, and these their neighbours round it."""
    cross = whole(gauges_at((5, 5), (9, 5), (5, 9), (1, 5), (5, 1), unit=KM), SQUARE)
    assert cross.neighbours[0] == {1, 2, 3, 4}
    assert {2, 4, 0} <= cross.neighbours[1]
    assert cross.parts_of([3, 1]).tolist() == [*np.flatnonzero(cross.gauge == 3), *np.flatnonzero(cross.gauge == 1)]


def test_one_gauge_has_no_neighbours_and_cannot_be_left_out() -> None:
    """Without its only gauge there is no tessellation."""
    one = whole(gauges_at((5, 5), unit=KM), SQUARE)
    assert one.edges.shape == (0, 2)
    assert one.without(mask(1, 0)) is None


def test_a_triangulation_that_is_not_shown_to_be_right_makes_all_neighbours(monkeypatch: pytest.MonkeyPatch) -> None:
    """With corners exchanged, or a gauge left out, every pair of gauges is a pair of neighbours."""
    rng = np.random.default_rng(1)
    network = gauges_at(*rng.uniform(0, 10, (12, 2)).tolist(), unit=KM)
    ground = whole(network, SQUARE).ground
    right = edges_among(ground, np.ones(12, dtype=bool))
    assert len(right) < 40

    class Flipped:
        """The triangulation of other points than those asked for: the first gauge stands elsewhere."""

        def __init__(self, points: npt.NDArray[np.float64]) -> None:
            moved = points.copy()
            moved[0] = -points[0] + 0.3
            made = Delaunay(moved)
            self.simplices, self.neighbors = made.simplices, made.neighbors

    class Short:
        """A triangulation that has no corner at the first gauge."""

        def __init__(self, points: npt.NDArray[np.float64]) -> None:
            made = Delaunay(points[1:])
            self.simplices, self.neighbors = made.simplices + 1, made.neighbors

    for wrong in (Flipped, Short):
        monkeypatch.setattr(thiessen_tessellation, "Delaunay", wrong)
        edges = edges_among(ground, mask(12, 0, 2, 3, 4, 7))
        assert edges.tolist() == [[i, j] for i in (0, 2, 3, 4, 7) for j in (2, 3, 4, 7) if i < j]


def test_what_is_dear_or_lost_is_not_shared(monkeypatch: pytest.MonkeyPatch) -> None:
    """A tessellation without some gauges is refused where it would cost more than one from the outlines."""
    row = whole(gauges_at((1, 5), (4, 5), (6, 5), (9, 5), unit=KM), SQUARE)
    assert row.burden_of([1]) == pytest.approx(4 * 2 / 16)  # a cell of 4 corners of 16, compared with 2 gauges
    assert row.without(mask(4, 1)) is not None
    monkeypatch.setattr(thiessen_tessellation, "DEAR", 0.4)
    assert row.without(mask(4, 1)) is None


def test_candidates_in_rising_order() -> None:
    """The gauges next to a group are those next to any of it, without the group, filled up with -1."""
    neighbours = [frozenset({1}), frozenset({0, 2}), frozenset({1, 3}), frozenset({2})]
    assert candidates_of(neighbours, [(1, 2), (0,)]).tolist() == [[0, 3], [1, -1]]
    assert candidates_of(neighbours, []).shape == (0, 0)


def test_groups() -> None:
    """Gauges fall into connected groups; none are no group."""
    edges = np.array([[0, 1], [1, 2], [3, 4]])
    assert groups_of(edges, np.array([0, 1, 4])) == [[0, 1], [4]]
    assert groups_of(edges, np.empty(0, dtype=int)) == []

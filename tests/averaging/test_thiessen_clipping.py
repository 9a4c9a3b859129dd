"""Rings shared among gauges, beside half-plane clipping one gauge at a time."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from hypothesis import given, settings
from references import nearest_areas
from strategies import Case, cases

from basinrain.averaging import thiessen_clipping
from basinrain.averaging.thiessen_clipping import Rings, join_rings, ring_areas, rings_of, share_rings, take_rings

HOLLOW = shapely.union_all([shapely.box(0, 0, 10, 10) - shapely.box(2, 2, 6, 7), shapely.box(13, 1, 16, 3)])


def polygons(*shapes: shapely.Geometry) -> npt.NDArray[np.object_]:
    return np.array(shapes, dtype=object)


def shares(shape: shapely.Geometry, places: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return the area that each gauge takes of one polygon, after making sure that nothing is lost."""
    rings, _ = rings_of(polygons(shape), (0.0, 0.0))
    n = len(rings.first) - 1
    x, y = places.T
    shared = share_rings(rings, np.tile(np.arange(len(places)), (n, 1)), x, y, np.full(n, shapely.area(shape)))
    assert not shared.lost.any()
    taken: npt.NDArray[np.float64] = np.zeros(len(places))
    np.add.at(taken, shared.gauge, shared.area)
    return taken


def test_rings_turn_by_what_they_are() -> None:
    """Islands count 100 and 6, the hole -20, whichever way they were drawn; corners are measured from the origin."""
    for shape in (HOLLOW, shapely.reverse(HOLLOW)):
        rings, polygon = rings_of(polygons(shapely.box(0, 0, 1, 1), shape), (1.0, 2.0))
        assert sorted(ring_areas(rings).tolist()) == [-20.0, 1.0, 6.0, 100.0]
        assert polygon.tolist() == [0, 1, 1, 1]
        assert (rings.x.min(), rings.y.min()) == (-1.0, -2.0)


def test_lines_and_points_beside_polygons_are_left_out() -> None:
    """A collection of a square and a line has one ring."""
    both = shapely.GeometryCollection([shapely.box(0, 0, 2, 2), shapely.LineString([(5, 5), (6, 6)])])
    assert ring_areas(rings_of(polygons(both), (0.0, 0.0))[0]).tolist() == [4.0]


def test_take_and_join() -> None:
    """Rings taken in another order, joined, are the same rings; no lots are no rings."""
    rings, _ = rings_of(polygons(shapely.box(0, 0, 1, 1), shapely.Polygon([(0, 0), (4, 0), (0, 4)])), (0.0, 0.0))
    turned = join_rings([take_rings(rings, np.array([1])), take_rings(rings, np.array([0]))])
    assert ring_areas(turned).tolist() == [8.0, 1.0]
    assert turned.counts.tolist() == [3, 4]
    assert ring_areas(join_rings([])).tolist() == []


def test_hollow_square_between_two_gauges() -> None:
    """The bisector x = 5 gives the west 50 less 3 x 5 of the hole, the east 50 less 1 x 5 and the island of 6."""
    np.testing.assert_allclose(shares(HOLLOW, np.array([[0.0, 5.0], [10.0, 5.0]])), [35.0, 51.0], rtol=1e-14)


def test_a_cell_that_holds_no_corner_is_found() -> None:
    """A gauge amid four others takes a square of 2 x 2 out of one of 6 x 6, none of whose corners is nearest to it."""
    places = np.array([[0.0, 0.0], [2.0, 0.0], [-2.0, 0.0], [0.0, 2.0], [0.0, -2.0]])
    ring = shapely.box(-3, -3, 3, 3)
    np.testing.assert_allclose(shares(ring, places), [4.0, 8.0, 8.0, 8.0, 8.0], rtol=1e-14)


def test_a_border_along_a_bisector_gives_no_sliver() -> None:
    """A square that ends on the bisector x = 5 belongs to one gauge alone."""
    assert shares(shapely.box(0, 0, 5, 5), np.array([[0.0, 0.0], [10.0, 0.0]])).tolist() == [25.0, 0.0]


@settings(max_examples=60, deadline=None)
@given(case=cases())
def test_equals_clipping_gauge_by_gauge(case: Case) -> None:
    """Areas are those of cutting each polygon by all bisectors of each gauge, to 1e-12 of the polygon."""
    places = np.column_stack((case.network.x, case.network.y))
    for polygon, area in zip(case.basins.polygons, case.basins.areas, strict=True):
        np.testing.assert_allclose(shares(polygon, places), nearest_areas(polygon, places), rtol=0, atol=1e-12 * area)


def test_rings_do_not_depend_on_each_other(monkeypatch: pytest.MonkeyPatch) -> None:
    """Shared one at a time, all at once, or in lots, every ring gives the same parts to the last bit."""
    rng = np.random.default_rng(3)
    shapes = polygons(*(shapely.Point(*rng.uniform(0, 100, 2)).buffer(rng.uniform(5, 40)) for _ in range(12)))
    rings, _ = rings_of(shapes, (0.0, 0.0))
    x, y = rng.uniform(0, 100, (2, 15))
    gauges = np.full((12, 15), -1)
    for row in gauges:
        some = np.sort(rng.choice(15, rng.integers(1, 16), replace=False))
        row[: len(some)] = some
    unit = shapely.area(shapes)
    whole = share_rings(rings, gauges, x, y, unit)
    monkeypatch.setattr(thiessen_clipping, "_AT_ONCE", 2000)
    assert_same(whole, share_rings(rings, gauges, x, y, unit))
    for k in range(12):
        one = share_rings(take_rings(rings, np.array([k])), gauges[[k]], x, y, unit[[k]])
        here = whole.source == k
        assert one.area.tobytes() == whole.area[here].tobytes()
        assert one.gauge.tolist() == whole.gauge[here].tolist()
        assert one.rings.x.tobytes() == take_rings(whole.rings, np.flatnonzero(here)).x.tobytes()


def assert_same(one: thiessen_clipping.SharedRings, other: thiessen_clipping.SharedRings) -> None:
    assert one.rings.x.tobytes() == other.rings.x.tobytes()
    assert one.rings.y.tobytes() == other.rings.y.tobytes()
    assert one.area.tobytes() == other.area.tobytes()
    assert one.gauge.tolist() == other.gauge.tolist()


def test_no_rings_have_no_parts() -> None:
    """Nothing to share gives nothing."""
    shared = share_rings(join_rings([]), np.empty((0, 3), dtype=int), np.zeros(3), np.zeros(3), np.empty(0))
    assert len(shared.area) == len(shared.lost) == 0


def test_parts_that_do_not_sum_are_told(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where cutting fails (every second part is dropped here) the ring is lost, and one in a single cell is not."""
    rings, _ = rings_of(polygons(shapely.box(0, 0, 10, 10), shapely.box(0, 0, 1, 1)), (0.0, 0.0))
    right = thiessen_clipping._cut_out

    def wrong(*args: object) -> tuple[Rings, npt.NDArray[np.int64]]:
        parts, pair = right(*args)  # type: ignore[arg-type]  # passed through
        return take_rings(parts, np.arange(0, len(pair), 2)), pair[::2]

    monkeypatch.setattr(thiessen_clipping, "_cut_out", wrong)
    shared = share_rings(rings, np.array([[0, 1]] * 2), np.array([0.0, 10.0]), np.zeros(2), np.array([100.0, 1.0]))
    assert shared.lost.tolist() == [True, False]

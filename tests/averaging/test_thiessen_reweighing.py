"""Thiessen means of records whose gauges come and go, beside a tessellation made anew for every step."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from benchmarks.networks import scattered_gauges, wiggled_basins
from benchmarks.series_records import record_two
from drawn import KM, basins_of, gauges_at
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_sets import Reference, every_set
from strategies import any_basins, networks

from basinrain.averaging import thiessen_corrections, thiessen_reweighing, thiessen_tessellation
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.thiessen import prepare_thiessen
from basinrain.averaging.thiessen_reweighing import ThiessenReweigher, prepare_thiessen_reweigher
from basinrain.basins import Basins
from basinrain.errors import DataError, MethodError
from basinrain.gauges import GaugeNetwork

Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]


def step_by_step(network: GaugeNetwork, basins: Basins, depth: Floats, present: Bools) -> Floats:
    """Return the means by weights made anew for every set of gauges that report."""
    weigh = prepare_thiessen(network, basins)
    means = np.full((len(depth), len(basins)), np.nan)
    sets, which = np.unique(present, axis=0, return_inverse=True)
    for k in np.flatnonzero(sets.any(axis=1)):
        rows = which.ravel() == k
        means[rows] = weigh(sets[k]).apply(np.where(sets[k], depth[rows], 0.0))
    return means


def assert_exact(network: GaugeNetwork, basins: Basins, present: Bools, *, seed: int = 0) -> ThiessenReweigher:
    """Make sure that means of random depths are those of weights made anew, to 1e-9 of the greatest depth."""
    depth = np.random.default_rng(seed).uniform(0.0, 1.0, present.shape)
    reweigh = prepare_thiessen_reweigher(network, basins)
    assert isinstance(reweigh, ThiessenReweigher)
    means = reweigh(depth, ReportingRuns.of(present))
    np.testing.assert_allclose(means, step_by_step(network, basins, depth, present), rtol=0, atol=1e-9)
    return reweigh


def test_square_with_a_gauge_outside() -> None:
    """.5, .425, .075 of the square; without the second .675 and .325 (bisector 6.75); without the third .5 and .5."""
    network = gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM)
    basins = basins_of(KM, square=shapely.box(0, 0, 10, 10))
    depth = np.array([[10.0, 30.0, 100.0]] * 4)
    present = np.array([[1, 1, 1], [1, 0, 1], [1, 1, 0], [0, 0, 0]], dtype=bool)
    means = prepare_thiessen_reweigher(network, basins)(depth, ReportingRuns.of(present))
    np.testing.assert_allclose(means, [[25.25], [6.75 + 32.5], [20.0], [np.nan]], rtol=1e-12)


def test_union_is_the_sum_of_parts_by_area() -> None:
    """Halves of 10 and 40 km² by one gauge and by two: the union's mean is (10 x west + 40 x east) / 50."""
    network = gauges_at((1, 2), (8, 2), (9, 4), unit=KM)
    halves = basins_of(KM, west=shapely.box(0, 0, 2, 5), east=shapely.box(2, 0, 10, 5)).with_union()
    depth = np.array([[8.0, 20.0, 50.0]] * 3)
    present = np.array([[1, 1, 1], [0, 1, 1], [1, 0, 1]], dtype=bool)
    means = prepare_thiessen_reweigher(network, halves)(depth, ReportingRuns.of(present))
    np.testing.assert_allclose(means[:, 2], (10 * means[:, 0] + 40 * means[:, 1]) / 50, rtol=1e-12)
    np.testing.assert_allclose(means, step_by_step(network, halves, depth, present), rtol=1e-12)


def test_what_stands_at_silent_gauges_does_not_count() -> None:
    """NaN, a number or infinity at a gauge that does not report: the same bytes; depths are left as they were."""
    network = gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM)
    basins = basins_of(KM, square=shapely.box(0, 0, 10, 10))
    runs = ReportingRuns.of(np.array([[1, 1, 0]] * 30 + [[0, 1, 1]] * 2, dtype=bool))
    reweigh = prepare_thiessen_reweigher(network, basins)
    found = set()
    for nothing in (np.nan, 7.0, np.inf):
        depth = np.full((32, 3), 5.0)
        depth[:30, 2] = depth[30:, 0] = nothing
        depth.flags.writeable = False
        found.add(reweigh(depth, runs).tobytes())
    assert len(found) == 1


@settings(max_examples=80, deadline=None)
@given(network=networks(at_most=14), basins=any_basins(), data=st.data())
def test_equals_new_weights_at_every_step(network: GaugeNetwork, basins: Basins, data: st.DataObject) -> None:
    """Gauges in any place, in line or not, basins of any kind, any of the gauges missing, all of them included."""
    missing = data.draw(st.lists(st.sets(st.integers(0, len(network) - 1)), min_size=1, max_size=8))
    present = np.array([[g not in some for g in range(len(network))] for some in missing])
    assert_exact(network, basins, present)


def silence(steps: int, gauges: int, share: float, *, seed: int) -> Bools:
    return np.random.default_rng(seed).random((steps, gauges)) >= share


@pytest.mark.parametrize("share", [0.05, 0.3, 0.7])
def test_squares_along_the_cells_of_a_lattice(share: float) -> None:
    """36 gauges on a lattice, basins whose borders run along the edges of their cells and through their gauges."""
    lattice = gauges_at(*((i + 0.5, j + 0.5) for i in range(6) for j in range(6)), ids=[f"G{k}" for k in range(36)])
    squares = basins_of(
        cell=shapely.box(2, 2, 3, 3), block=shapely.box(1, 0, 4, 3), half=shapely.box(0.5, 0.5, 5.5, 3.5)
    )
    assert_exact(lattice, squares.with_union(), silence(40, 36, share, seed=1))


def test_gauges_in_line_and_on_a_circle() -> None:
    """Thirteen in line, then twelve on a circle about one more: bisectors that are parallel, or meet in a point."""
    turn = np.arange(12) * np.pi / 6
    circle = [(0.0, 0.0), *zip(np.cos(turn), np.sin(turn), strict=True)]
    basins = basins_of(round=shapely.Point(0, 0).buffer(1.4), corner=shapely.box(0, 0, 2, 1))
    ids = [f"G{k}" for k in range(13)]
    for places in (circle, [(0.3 * k - 2, 0.1 * k) for k in range(13)]):
        assert_exact(gauges_at(*places, ids=ids), basins, silence(60, 13, 0.4, seed=2))


def test_gauges_far_outside() -> None:
    """Four near gauges and four from 300 to 20,000 km away, any of them missing."""
    near, far = [(2, 3), (7, 4), (5, 9), (6, 6)], [(300, 0), (-2e3, 90), (0, 2e4), (10, -500)]
    network = gauges_at(*near, *far, unit=KM)
    assert_exact(network, basins_of(KM, square=shapely.box(0, 0, 10, 10)), silence(60, 8, 0.5, seed=3))


def test_nested_hollow_and_parted_basins_in_a_country_s_plane() -> None:
    """A basin with a hole, its island, one in two parts and one that holds all, far from the plane's origin."""
    rng = np.random.default_rng(4)
    places = rng.uniform((498, 4498), (512, 4512), (40, 2))
    network = gauges_at(*places.tolist(), ids=[f"G{k}" for k in range(40)], unit=KM)
    hole = shapely.Point(504, 4505).buffer(2)
    basins = basins_of(
        KM,
        ring=shapely.box(500, 4500, 510, 4510) - hole,
        island=hole,
        parted=shapely.union_all([shapely.box(500, 4500, 501, 4509), shapely.box(507, 4501, 508, 4502)]),
        all=shapely.box(499, 4499, 511, 4511),
    )
    for share in (0.05, 0.5):
        assert_exact(network, basins, silence(40, 40, share, seed=5))


def test_late_gauges_closed_gauges_and_a_regional_outage() -> None:
    """60 gauges over 12 basins: the stretches get tessellations of their own, and every 17th step is right."""
    network, basins = scattered_gauges(60, seed=6), wiggled_basins(4, 3, 120, seed=7).with_union()
    depth = record_two(network, 12_000)
    present = ~np.isnan(depth)
    reweigh = prepare_thiessen_reweigher(network, basins)
    assert isinstance(reweigh, ThiessenReweigher)
    means = reweigh(depth, ReportingRuns.of(present))
    steps = np.r_[3590:3610, 5990:6010, 6230:6250, 8390:8410, 0:12_000:307]
    np.testing.assert_allclose(
        means[steps], step_by_step(network, basins, depth[steps], present[steps]), rtol=1e-9, atol=1e-9
    )
    assert len(reweigh._kept) > 1


def test_any_division_into_calls_gives_the_same_means() -> None:
    """Step by step, in stretches, at once: equal to 1e-12; one stretch gives the same bytes whatever came first."""
    network, basins = scattered_gauges(50, seed=8), wiggled_basins(4, 2, 80, seed=9)
    present = silence(240, 50, 0.15, seed=10)
    present[:, 0] = True
    depth = np.random.default_rng(11).uniform(0, 60, present.shape)
    used = prepare_thiessen_reweigher(network, basins)
    whole = used(depth, ReportingRuns.of(present))
    for size in (1, 7, 64):
        for first in reversed(range(0, 240, size)):
            rows = slice(first, first + size)
            runs = ReportingRuns.of(present[rows])
            part = used(depth[rows], runs)
            np.testing.assert_allclose(part, whole[rows], rtol=1e-12)
            if first % 60 < size:
                assert prepare_thiessen_reweigher(network, basins)(depth[rows], runs).tobytes() == part.tobytes()


def test_a_full_store_is_cut_down_without_changing_a_bit(monkeypatch: pytest.MonkeyPatch) -> None:
    """With room for next to nothing, the same bytes come, and what is kept is little."""
    network, basins = scattered_gauges(60, seed=6), wiggled_basins(4, 3, 120, seed=7)
    depth = record_two(network, 6000)
    runs = ReportingRuns.of(~np.isnan(depth))
    expected = prepare_thiessen_reweigher(network, basins)(depth, runs)
    monkeypatch.setattr(thiessen_reweighing, "CACHE_BYTES", 1000)
    monkeypatch.setattr(thiessen_corrections, "DEAR", 1.0)
    monkeypatch.setattr(thiessen_reweighing, "_RUNS", 50)
    tight = prepare_thiessen_reweigher(network, basins)
    assert isinstance(tight, ThiessenReweigher)
    np.testing.assert_allclose(tight(depth, runs), expected, rtol=1e-12, atol=1e-12)
    first = tight(depth[:700], ReportingRuns.of(~np.isnan(depth[:700])))
    assert tight(depth[:700], ReportingRuns.of(~np.isnan(depth[:700]))).tobytes() == first.tobytes()
    assert len(tight._kept) <= 2
    assert len(tight._own) <= 1


def test_threads_share_one_reweigher() -> None:
    """Four threads that ask at once for stretches of a record get the bytes that one gets alone."""
    network, basins = scattered_gauges(60, seed=6), wiggled_basins(4, 3, 120, seed=7)
    present = silence(400, 60, 0.2, seed=12)
    depth = np.random.default_rng(13).uniform(0, 60, present.shape)
    parts = [slice(k, k + 50) for k in range(0, 400, 50)]

    def means(reweigh: object, rows: slice) -> bytes:
        assert isinstance(reweigh, ThiessenReweigher)
        return reweigh(depth[rows], ReportingRuns.of(present[rows])).tobytes()

    alone = prepare_thiessen_reweigher(network, basins)
    expected = [means(alone, rows) for rows in parts]
    shared = prepare_thiessen_reweigher(network, basins)
    with ThreadPoolExecutor(4) as pool:
        assert list(pool.map(lambda rows: means(shared, rows), parts)) == expected


@pytest.mark.parametrize("dear", [0.0, 2.0, 1e9])
def test_most_gauges_missing(monkeypatch: pytest.MonkeyPatch, dear: float) -> None:
    """Holes shared at once, tessellations of their own, or some of both: the same means."""
    monkeypatch.setattr(thiessen_corrections, "DEAR", dear)
    monkeypatch.setattr(thiessen_tessellation, "DEAR", dear)
    network, basins = scattered_gauges(80, seed=14), wiggled_basins(3, 3, 60, seed=15)
    present = np.vstack([silence(12, 80, share, seed=16) for share in (0.2, 0.4, 0.6, 0.9)])
    reweigh = assert_exact(network, basins, present)
    assert bool(reweigh._own) == (dear < 1e9)


def test_what_is_lost_gets_a_tessellation_of_its_own(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where no shares are ever taken for complete, means are still those of new weights."""
    monkeypatch.setattr("basinrain.averaging.thiessen_clipping.EXACT", -1.0)
    network, basins = scattered_gauges(30, seed=17), wiggled_basins(2, 2, 60, seed=18)
    reweigh = assert_exact(network, basins, silence(12, 30, 0.2, seed=19))
    assert len(reweigh._own) == 12


def test_no_steps_and_one_gauge() -> None:
    """A record without steps has no means; one gauge is everything when it reports."""
    basins = basins_of(KM, square=shapely.box(0, 0, 10, 10))
    reweigh = prepare_thiessen_reweigher(gauges_at((50, 5), unit=KM), basins)
    assert reweigh(np.empty((0, 1)), ReportingRuns.of(np.empty((0, 1), dtype=bool))).shape == (0, 1)
    means = reweigh(np.array([[4.0], [np.nan]]), ReportingRuns.of(np.array([[True], [False]])))
    np.testing.assert_array_equal(means, [[4.0], [np.nan]])


def test_two_gauges_at_one_place_may_follow_each_other() -> None:
    """The second replaces the first at its site: each counts in its time; together they are refused by name."""
    network = gauges_at((2, 5), (2, 5), (8, 5), unit=KM)
    reweigh = prepare_thiessen_reweigher(network, basins_of(KM, square=shapely.box(0, 0, 10, 10)))
    present = np.array([[1, 0, 1], [0, 1, 1]], dtype=bool)
    means = reweigh(np.array([[10.0, 0.0, 30.0], [0.0, 20.0, 30.0]]), ReportingRuns.of(present))
    np.testing.assert_allclose(means, [[20.0], [25.0]], rtol=1e-12)
    with pytest.raises(DataError, match="gauges A and B: found one place for both"):
        reweigh(np.ones((1, 3)), ReportingRuns.of(np.ones((1, 3), dtype=bool)))


def test_refusals() -> None:
    """Gauges and basins in two planes, and pieces that do not sum to their basin, are refused when it is prepared."""
    network = gauges_at((2, 5), (8, 5), unit=KM)
    basins = basins_of(KM, square=shapely.box(0, 0, 10, 10))
    with pytest.raises(DataError, match="expected the same plane for both"):
        prepare_thiessen_reweigher(network, Basins(ids=basins.ids, polygons=basins.polygons, crs="EPSG:3035"))
    wrong = Basins(ids=basins.ids, polygons=basins.polygons, crs="local")
    object.__setattr__(wrong, "areas", np.array([1.1e8]))
    with pytest.raises(MethodError, match="expected pieces that sum to the basin's 110000000 m²"):
        prepare_thiessen_reweigher(network, wrong)


@every_set
def test_every_step_of_real_records(name: str) -> None:
    """Days of Oahu (28 % missing), hours of New York, months of the Platte (35 %, 136 gauges): those of new weights."""
    data = Reference(name)
    present = ~np.isnan(data.depth)
    means = prepare_thiessen_reweigher(data.network, data.basins)(data.depth, ReportingRuns.of(present))
    expected = step_by_step(data.network, data.basins, data.depth, present)
    np.testing.assert_allclose(means, expected, rtol=1e-9, atol=1e-9)

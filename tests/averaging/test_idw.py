"""Gridded inverse distance: hand cases, options, the choice of the cell, and other ways to the same numbers."""

from __future__ import annotations

import tracemalloc
from dataclasses import replace

import numpy as np
import pytest
import shapely
from benchmarks.networks import SIDE, scattered_gauges
from drawn import KM, basins_of, gauges_at
from hypothesis import given, settings
from hypothesis import strategies as st
from references import raster, raster_idw
from sklearn.neighbors import KNeighborsRegressor
from strategies import Case, cases

from basinrain.averaging import choose_grid, grid, idw, idw_weights, make_grid
from basinrain.averaging.idw import prepare_idw
from basinrain.errors import DataError, JobError, MethodError

SQUARE = shapely.box(0, 0, 10, 10)
IN_A_ROW = gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM)
RAIN = np.array([10.0, 30.0, 100.0])


@pytest.mark.parametrize(
    ("power", "weights", "mean"),
    [(2.0, [0.44349, 0.38513, 0.17138], 33.127), (1.0, [0.39573, 0.36970, 0.23457], 38.505)],
)
def test_square_with_a_gauge_outside(power: float, weights: list[float], mean: float) -> None:
    """The square of 10 km on a grid of 50 m: .44349 x 10 + .38513 x 30 + .17138 x 100 = 33.127 mm, and for power 1."""
    table = idw_weights(IN_A_ROW, basins_of(KM, square=SQUARE), power=power, cell=50.0)
    assert table.weights[0].round(5).tolist() == weights
    assert round(float(table.apply(RAIN)[0]), 3) == mean


def test_one_cell_by_hand() -> None:
    """At a centre 1 and 2 km from two gauges, power 2 gives 4 : 1, power 1 gives 2 : 1, power 3 gives 8 : 1."""
    one_cell = basins_of(KM, cell=shapely.box(0, 0, 1, 1))
    network = gauges_at((-0.5, 0.5), (2.5, 0.5), unit=KM)
    for power, share in ((2.0, 4 / 5), (1.0, 2 / 3), (3.0, 8 / 9)):
        weights = idw_weights(network, one_cell, power=power, cell=KM).weights
        np.testing.assert_allclose(weights, [[share, 1 - share]], rtol=1e-12)


def test_a_boundary_cell_counts_by_its_share() -> None:
    """One cell and a half: (1 x 4/5 + 1/2 x 1/2) / 1.5 of the nearer gauge, at centres 1, 2 and 1.5, 1.5 km away."""
    strip = basins_of(KM, strip=shapely.box(0, 0, 0.75, 0.5))
    network = gauges_at((-0.75, 0.25), (2.25, 0.25), unit=KM)
    weights = idw_weights(network, strip, cell=500.0).weights
    near = (1.0 * 4 / 5 + 0.5 * 1 / 2) / 1.5
    np.testing.assert_allclose(weights, [[near, 1 - near]], rtol=1e-12)


def test_a_centre_on_a_gauge_takes_it() -> None:
    """A gauge on the centre of the only cell has the whole weight, also after a move that rounds its place.

    With a small power even a distance of rounding size would leave weight to the other gauge.
    """
    for shift in (0.0, 1234567.1):
        cell = basins_of(cell=shapely.box(shift, shift, shift + 100, shift + 100))
        network = gauges_at((shift + 50 + 1e-9, shift + 50), (shift + 51, shift + 50))
        for power in (0.25, 1.0, 2.0):
            assert idw_weights(network, cell, cell=100.0, power=power).weights.tolist() == [[1.0, 0.0]]


def test_of_equally_near_gauges_the_first_by_id_are_taken() -> None:
    """Four gauges 1 km round a centre, two wanted: A and B, in whatever order they are listed and wherever they are."""
    around = [(1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.0, -1.0)]
    for ids in ("DCBA", "ABCD", "CADB"):
        for shift in (0.0, 1111.1, 98765.4321):
            middle = 0.05 + shift
            network = gauges_at(*((x + middle, y + middle) for x, y in around), ids=ids, unit=KM)
            cell = basins_of(KM, cell=shapely.box(shift, shift, shift + 0.1, shift + 0.1))
            weights = idw_weights(network, cell, cell=100.0, max_gauges=2).weights[0]
            assert {ids[k] for k in np.flatnonzero(weights)} == {"A", "B"}
            assert weights.max() == pytest.approx(0.5)


def test_max_gauges_takes_the_nearest_at_every_cell() -> None:
    """With one gauge a cell, weights are those of nearest cells: 50 + 42.5 + 7.5 %, as Thiessen's on the square."""
    weights = idw_weights(IN_A_ROW, basins_of(KM, square=SQUARE), cell=500.0, max_gauges=1).weights
    np.testing.assert_allclose(weights, [[0.5, 0.425, 0.075]], atol=0.026)
    everyone = idw_weights(IN_A_ROW, basins_of(KM, square=SQUARE), cell=500.0).weights
    more_than_there_are = idw_weights(IN_A_ROW, basins_of(KM, square=SQUARE), cell=500.0, max_gauges=9).weights
    np.testing.assert_array_equal(more_than_there_are, everyone)


def test_cells_out_of_reach_are_refused_by_basin_and_share() -> None:
    """Gauges reach 4 km: all of a box about them, part of the square; refused with the share, to two decimals."""
    basins = basins_of(KM, square=SQUARE, middle=shapely.box(2, 4, 8, 6))
    reach = shapely.union_all(shapely.buffer(shapely.points([[2.5, 5], [7.5, 5], [11, 5]]), 4.0, quad_segs=64))
    share = 100 * reach.intersection(SQUARE).area / 100
    with pytest.raises(
        MethodError, match=r"basin square: found a gauge within 4000 m of (\d+\.\d\d) % of its area"
    ) as e:
        idw_weights(IN_A_ROW, basins, cell=50.0, radius=4000.0)
    assert len(e.value.problems) == 1
    assert float(e.value.problems[0].found.split(" of ")[1].split(" %")[0]) == pytest.approx(share, abs=0.05)
    assert e.value.problems[0].remedy == "give a larger radius, or set allow_uncovered"


def test_cells_out_of_reach_may_be_allowed() -> None:
    """Three discs of 1.5 km that lie apart, one cut by the border: weights by their areas; a far basin is NaN."""
    basins = basins_of(KM, square=SQUARE, far=shapely.box(50, 0, 51, 1))
    table = idw_weights(IN_A_ROW, basins, cell=50.0, radius=1500.0, allow_uncovered=True)
    disc = np.pi * 1.5**2
    segment = 1.5**2 * np.arccos(1 / 1.5) - np.sqrt(1.5**2 - 1)
    reached = np.array([disc, disc, segment])
    np.testing.assert_allclose(table.weights[0], reached / reached.sum(), atol=2e-3)
    assert table.weights[0].sum() == pytest.approx(1.0, rel=1e-12)
    assert np.isnan(table.weights[1]).all()
    assert table.covered == pytest.approx([reached.sum() / 100, 0.0], abs=1e-3)
    assert [note.code for note in table.notes] == ["grid", "covered-in-part", "covered-in-part"]
    assert table.notes[1].text.startswith("Basin square has a gauge within 1500 m of ")


@settings(max_examples=40, deadline=None)
@given(case=cases(), power=st.sampled_from([0.5, 1.0, 2.0, 3.7]), cell=st.sampled_from([500.0, 731.0]))
def test_equals_the_plain_sum_over_cells(case: Case, power: float, cell: float) -> None:
    """Every row is the sum over cells of the share that GEOS finds inside times plain inverse-distance weights."""
    network = case.network.subset(case.present)
    table = idw_weights(case.network, case.basins, case.present, power=power, cell=cell)
    west, south, east, north = case.basins.bounds
    x, y = np.meshgrid(np.arange(west, east, cell), np.arange(south, north, cell))
    x, y = x.ravel(), y.ravel()
    boxes = shapely.box(x, y, x + cell, y + cell)
    centres = np.column_stack((x + cell / 2, y + cell / 2))
    distance = np.hypot(centres[:, :1] - network.x, centres[:, 1:] - network.y)
    lent = np.maximum(distance, 1e-9) ** -power
    lent /= lent.sum(axis=1, keepdims=True)
    for k, polygon in enumerate(case.basins.polygons):
        held = shapely.area(shapely.intersection(boxes, shapely.set_precision(polygon, 0.0)))
        np.testing.assert_allclose(table.weights[k, case.present], held @ lent / held.sum(), atol=1e-6)


@pytest.mark.parametrize("power", [1.0, 2.0])
def test_close_to_a_dense_raster(power: float) -> None:
    """A basin with a hole and an island: within 2e-3 of 250,000 raster points, the cell chosen by halving."""
    shape = shapely.union_all([SQUARE - shapely.box(2, 2, 6, 7), shapely.box(13, 1, 16, 3)])
    basin = basins_of(KM, archipelago=shape)
    network = gauges_at((1.1, 1.2), (4, 4), (9, 8), (3, 9), (15, 2), (8, 1), unit=KM)
    by_raster = raster_idw(raster(basin.polygons[0], 18.0), np.column_stack((network.x, network.y)), power)
    assert np.abs(idw_weights(network, basin, power=power).weights[0] - by_raster).max() < 2e-3


def test_the_surface_is_that_of_a_general_regression_library() -> None:
    """scikit-learn's neighbours regression, weighting by 1/d² over all gauges or the four nearest, gives the same."""
    rng = np.random.default_rng(3)
    places = rng.uniform(0, 10, (12, 2))
    network = gauges_at(*map(tuple, places), unit=KM)
    basin = basins_of(KM, triangle=shapely.Polygon([(1, 1), (9, 2), (4, 9)]))
    laid = make_grid(basin, 200.0)
    for count in (None, 4):
        model = KNeighborsRegressor(n_neighbors=count or 12, weights=lambda d: 1 / d**2)
        model.fit(np.column_stack((network.x, network.y)), np.eye(12))
        theirs = laid.shares @ model.predict(laid.centres) / laid.shares.sum()
        mine = idw_weights(network, basin, grid=laid, max_gauges=count).weights
        np.testing.assert_allclose(mine, theirs, atol=1e-12)


def test_the_cell_chosen_is_the_largest_that_has_settled() -> None:
    """Of 10, 5, 2, 1 km ... the chosen cell is the first whose halving moves at most 0.001 of the weight."""
    basins = basins_of(KM, west=shapely.box(0, 0, 5, 10), east=shapely.box(5, 0, 10, 10)).with_union()
    chosen = choose_grid(IN_A_ROW, basins)
    moves = {}
    for cell in (10000.0, 5000.0, 2000.0, 1000.0, 500.0, 200.0, 100.0):
        one, half = (idw_weights(IN_A_ROW, basins, grid=make_grid(basins, size)).weights for size in (cell, cell / 2))
        moves[cell] = np.abs(one - half).sum(axis=1).max() / 2
    settled = [cell for cell, move in moves.items() if move <= 0.001]
    assert chosen.cell == settled[0]
    assert len(settled) < len(moves)
    assert chosen.halving_change.max() == pytest.approx(moves[chosen.cell], rel=1e-9)
    assert chosen.settled


def test_a_size_that_settles_by_accident_is_passed_over(monkeypatch: pytest.MonkeyPatch) -> None:
    """With the nearest gauge alone and the border at 8.8 km, cells of 1 km and of 500 m both put it at 9 km.

    Halving 500 m moves it to 8.75 km; 200 and 100 m put it at 8.8 km. Where sizes under 500 m may not be laid, nothing
    has settled; where those under 1 km may not, the 1 km that did is all there is.
    """
    network = gauges_at((7.8, 5), (9.8, 5), unit=KM)
    basins = basins_of(KM, square=SQUARE)
    by_size = [choose_grid(network, basins, max_gauges=1, cell=size).settled for size in (1000.0, 500.0, 200.0, 100.0)]
    assert by_size == [True, False, True, True]
    chosen = choose_grid(network, basins, max_gauges=1)
    assert (chosen.cell, chosen.settled) == (200.0, True)
    np.testing.assert_allclose(idw_weights(network, basins, max_gauges=1).weights, [[0.88, 0.12]], rtol=1e-12)
    monkeypatch.setattr(grid, "MOST_CELLS", 1000)
    with pytest.raises(MethodError, match=r"idw grid of 200 m: found at least 2,500 cells; .* give cell"):
        choose_grid(network, basins, max_gauges=1)
    monkeypatch.setattr(grid, "MOST_CELLS", 399)
    assert choose_grid(network, basins, max_gauges=1).cell == 1000.0


def test_the_median_basin_has_a_hundred_cells() -> None:
    """One gauge has all the weight at any size: 4, 25 and 900 km² get cells of 500 m, 100 in 25 km², union or not."""
    steps = {"small": shapely.box(0, 0, 2, 2), "middle": shapely.box(2, 0, 7, 5), "large": shapely.box(7, 0, 37, 30)}
    for basins in (basins_of(KM, **steps), basins_of(KM, **steps).with_union()):
        chosen = choose_grid(gauges_at((1, 1), unit=KM), basins)
        assert chosen.cell == 500.0
        assert chosen.shares.toarray()[1].sum() == pytest.approx(100)
    a_little_less = basins_of(KM, basin=shapely.box(0, 0, 4.99, 5))
    assert choose_grid(gauges_at((1, 1), unit=KM), a_little_less).cell == 200.0


def test_the_cell_chosen_follows_the_reach_too() -> None:
    """Gauges reach 4 km, 75 % of the square: no coarse cell that finds all centres in reach passes for settled."""
    basins = basins_of(KM, square=SQUARE)
    with pytest.raises(MethodError, match=r"found a gauge within 4000 m of (74\.9\d|75\.0\d) % of its area"):
        idw_weights(IN_A_ROW, basins, radius=4000.0)
    reach = shapely.union_all(shapely.buffer(shapely.points([[2.5, 5], [7.5, 5], [11, 5]]), 4.0, quad_segs=64))
    table = idw_weights(IN_A_ROW, basins, radius=4000.0, allow_uncovered=True)
    assert table.covered == pytest.approx([reach.intersection(SQUARE).area / 100], abs=1e-3)
    chosen = choose_grid(IN_A_ROW, basins, radius=4000.0, allow_uncovered=True)
    half = idw_weights(IN_A_ROW, basins, radius=4000.0, allow_uncovered=True, cell=chosen.cell / 2)
    assert chosen.halving_change[0] >= abs(float(half.covered[0] - table.covered[0])) > 0


def test_small_basins_do_not_hold_the_cell_down_and_have_their_own_figure() -> None:
    """A basin of 0.0001 of the median's area, near a gauge, has its own figure and is left out of the choice."""
    network = gauges_at((2.5, 5), (7.5, 5), (7.9, 5), (11, 5), unit=KM)
    halves = {"west": shapely.box(0, 0, 5, 10), "east": shapely.box(5, 0, 10, 10)}
    dot = shapely.box(7.64, 4.97, 7.71, 5.04)
    with_dot = choose_grid(network, basins_of(KM, **halves, dot=dot).with_union())
    without = choose_grid(network, basins_of(KM, **halves).with_union())
    assert with_dot.cell == without.cell
    assert with_dot.counted.tolist() == [True, True, False, True]
    assert with_dot.halving_change[2] > 0.001
    assert f"in basins under 1 % of the median area: dot {with_dot.halving_change[2]:.2g}." in with_dot.sentence


def test_a_given_cell_is_measured_too() -> None:
    """A cell of 5 km is taken as given, and what halving it changes is stated, though it is much."""
    table = idw_weights(IN_A_ROW, basins_of(KM, square=SQUARE), cell=5000.0)
    laid = choose_grid(IN_A_ROW, basins_of(KM, square=SQUARE), cell=5000.0)
    assert table.notes[0].text == laid.sentence
    assert not laid.settled
    assert laid.sentence.startswith("Grid of 4 cells of 5000 m; halving the cell moves at most 0.0")


def test_too_many_cells_are_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    """Choosing ends with a request for a cell; a given one that is too small is refused, a large one not measured."""
    basins = basins_of(KM, square=SQUARE)
    monkeypatch.setattr(grid, "MOST_CELLS", 90)
    with pytest.raises(
        MethodError, match=r"idw grid of 1000 m: found at least 100 cells; .* choose the size yourself: give cell"
    ):
        choose_grid(IN_A_ROW, basins)
    with pytest.raises(MethodError, match=r"idw grid of 500 m: found at least 400 cells; .*give a larger cell"):
        idw_weights(IN_A_ROW, basins, cell=500.0)
    laid = choose_grid(IN_A_ROW, basins, cell=2000.0)
    assert laid.sentence == "Grid of 25 cells of 2000 m; what halving the cell would change was not measured."


def test_blocks_do_not_change_the_weights(monkeypatch: pytest.MonkeyPatch) -> None:
    """Worked off in blocks of two cells, the weights are the same."""
    basins = basins_of(KM, square=SQUARE)
    whole = idw_weights(IN_A_ROW, basins, cell=500.0).weights
    monkeypatch.setattr(idw, "_BLOCK", 6)
    np.testing.assert_allclose(idw_weights(IN_A_ROW, basins, cell=500.0).weights, whole, rtol=1e-12)


def test_memory_does_not_grow_with_cells_times_gauges() -> None:
    """200,000 cells x 300 gauges are 480 MB of distances; the peak stays under a fifth of that."""
    basins = basins_of(square=shapely.box(0, 0, SIDE, SIDE))
    network = scattered_gauges(300, seed=5)
    laid = make_grid(basins, SIDE / 447)
    weigh = prepare_idw(network, basins, grid=laid)
    tracemalloc.start()
    weigh(np.ones(300, dtype=bool))
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert laid.n_cells * 300 * 8 > 475e6
    assert peak < 96e6


@settings(max_examples=40, deadline=None)
@given(case=cases(), block=st.sampled_from([7, 50, 500_000]))
def test_no_more_than_all_of_a_basin_is_covered(case: Case, block: int) -> None:
    """Where every cell has a gauge the covered share is 1 and never a hair more, however the sum is rounded."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(idw, "_BLOCK", block)
        covered = idw_weights(case.network, case.basins, cell=731.0).covered
    assert covered.max() <= 1
    np.testing.assert_allclose(covered, 1, rtol=1e-12)


def test_one_grid_serves_any_present_gauges() -> None:
    """A grid laid once gives each set of gauges the weights that it has by itself on that grid."""
    basins = basins_of(KM, square=SQUARE)
    laid = choose_grid(IN_A_ROW, basins)
    weigh = prepare_idw(IN_A_ROW, basins, grid=laid)
    for present in ([True, True, False], [False, True, True], [True, False, False]):
        mask = np.array(present)
        alone = idw_weights(IN_A_ROW.subset(mask), basins, grid=laid).weights
        np.testing.assert_allclose(weigh(mask).weights[:, mask], alone, rtol=1e-12)


def test_a_grid_of_other_basins_is_refused() -> None:
    """A grid serves the basins that it was laid for, and does not go together with a cell."""
    square = basins_of(KM, square=SQUARE)
    with pytest.raises(DataError, match="idw grid: found a grid of basins square; expected a grid of basins other"):
        idw_weights(IN_A_ROW, basins_of(KM, other=SQUARE), grid=make_grid(square, 1000.0))
    with pytest.raises(DataError, match="idw grid: found a grid and a cell; expected one of them"):
        idw_weights(IN_A_ROW, square, grid=make_grid(square, 1000.0), cell=500.0)


def test_options_out_of_range_are_refused_together() -> None:
    """Power, max_gauges and radius out of range are one error with three lines; so is a cell of no length."""
    square = basins_of(KM, square=SQUARE)
    with pytest.raises(JobError, match="idw power: found 0; expected a number above 0") as caught:
        idw_weights(IN_A_ROW, square, power=0.0, max_gauges=0, radius=-5.0)
    assert [p.item for p in caught.value.problems] == ["idw power", "idw max_gauges", "idw radius"]
    with pytest.raises(JobError, match="idw cell: found nan; expected a length above 0"):
        idw_weights(IN_A_ROW, square, cell=float("nan"))


def test_planes_must_agree() -> None:
    """Gauges and basins in two systems are refused."""
    with pytest.raises(DataError, match="found 'local' for the gauges and 'EPSG:3035' for the basins"):
        choose_grid(IN_A_ROW, replace(basins_of(KM, square=SQUARE), crs="EPSG:3035"))


def test_many_powers_do_not_overflow() -> None:
    """With power 200 the nearest gauge takes a cell, and nothing overflows."""
    weights = idw_weights(IN_A_ROW, basins_of(KM, square=SQUARE), cell=500.0, power=200.0).weights
    np.testing.assert_allclose(weights, [[0.5, 0.425, 0.075]], atol=0.02)

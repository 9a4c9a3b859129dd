"""What gauges lend to the cells of a tile: the table, the polynomials that stand for far gauges, and their limits."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import KM, basins_of, gauges_at

from basinrain.averaging import idw_tiles, make_grid
from basinrain.averaging.idw_tiles import Lent, Tile, tiles_of

Floats = npt.NDArray[np.float64]
SQUARE = shapely.box(0, 0, 10, 10)


def many_tiles(power: float = 2.0, *, n_gauges: int = 300, cell: float = 400.0) -> list[Tile]:
    """Return the one tile of a square of 10 km in the middle of gauges scattered over 140 km."""
    gauges = np.random.default_rng(5).uniform(-65.0, 75.0, (n_gauges, 2)) * KM
    tiles = tiles_of(make_grid(basins_of(KM, square=SQUARE), cell), gauges, power=power, n_basins=1)
    assert tiles is not None
    return tiles


def by_plain_sums(tile: Tile, reporting: npt.NDArray[np.bool_]) -> Floats:
    """Return weights (n_sets, n_gauges) as the definition has them, cell by cell in double precision."""
    distance = np.hypot(*(tile.centres[:, None, :] - tile.gauges[None, :, :]).transpose(2, 0, 1))
    lent = distance**-tile.power * reporting[:, None, :]
    sums: Floats = np.einsum("c,scg->sg", tile.held, lent / lent.sum(axis=2, keepdims=True))
    return sums


@pytest.mark.parametrize("power", [0.5, 1.0, 2.0, 3.0, 4.5])
def test_weights_are_those_of_the_definition(power: float) -> None:
    """With 300 gauges, the nearest, the near ones, nearly all or all but one silent: every weight is right to 1e-5."""
    (tile,) = many_tiles(power)
    assert tile.kept is not None
    assert tile.kept.spread is not None
    rng = np.random.default_rng(8)
    order = np.argsort(np.hypot(*(tile.gauges - 5 * KM).T))
    reporting = np.ones((8, 300), dtype=bool)
    reporting[1, order[0]] = False
    reporting[2, order[:40]] = False
    reporting[3] = rng.random(300) < 0.5
    reporting[4] = rng.random(300) < 0.02
    reporting[5:] = False
    reporting[5, order[[0, 299]]] = True
    reporting[6, order[150]] = True
    reporting[7, order[200:203]] = True
    found = tile.weights(reporting.astype(np.float32))
    expected = by_plain_sums(tile, reporting)
    np.testing.assert_allclose(found[reporting], expected[reporting], rtol=1e-5)


def test_polynomials_save_work_and_are_left_where_they_do_not() -> None:
    """Of 300 gauges 45 terms and the near ones do; for 40 gauges, or for 25 cells, the plain table is less work."""
    (tile,) = many_tiles()
    assert tile.kept is not None
    assert tile.kept.spread is not None
    assert 45 < len(tile.kept.basis) < 100
    for other in (many_tiles(n_gauges=40), many_tiles(cell=2000.0)):
        assert other[0].kept is not None
        assert other[0].kept.spread is None


def test_a_gauge_that_no_polynomial_matches_is_near(monkeypatch: pytest.MonkeyPatch) -> None:
    """Held to a tolerance that nothing meets all gauges are near, so the table is taken; to any, none is."""
    monkeypatch.setattr(idw_tiles, "_POLYNOMIAL", 0.0)
    (tile,) = many_tiles()
    assert tile.kept is not None
    assert tile.kept.spread is None
    monkeypatch.setattr(idw_tiles, "_POLYNOMIAL", np.inf)
    (tile,) = many_tiles()
    assert tile.kept is not None
    assert tile.kept.basis.shape == (45, 625)


def test_what_is_kept_is_bounded_and_changes_no_more_than_rounding(monkeypatch: pytest.MonkeyPatch) -> None:
    """Without room the table is made whenever it is asked for, and gives the same weights to single precision."""
    (tile,) = many_tiles()
    monkeypatch.setattr(idw_tiles, "KEPT_BYTES", 1000)
    (bare,) = many_tiles()
    assert bare.kept is None
    reporting = (np.random.default_rng(2).random((5, 300)) < 0.8).astype(np.float32)
    np.testing.assert_allclose(bare.weights(reporting), tile.weights(reporting), rtol=1e-5)


def test_a_gauge_on_a_centre_has_it_while_it_reports() -> None:
    """One cell, A on its centre, B and C 100 and 200 m away: A has all; without it B and C have 4/5 and 1/5."""
    network = gauges_at((50, 50), (150, 50), (250, 50))
    gauges = np.column_stack((network.x, network.y))
    tiles = tiles_of(make_grid(basins_of(cell=shapely.box(0, 0, 100, 100)), 100.0), gauges, power=2.0, n_basins=1)
    assert tiles is not None
    weights = tiles[0].weights(np.array([[1, 1, 1], [0, 1, 1], [1, 0, 0]], dtype=np.float32))
    np.testing.assert_allclose(weights[0], [1.0, 0.0, 0.0], atol=1e-11)
    np.testing.assert_allclose(weights[1, 1:], [0.8, 0.2], rtol=1e-6)
    assert weights[2, 0] == 1.0


@pytest.mark.parametrize("power", [0.25, 2.0])
def test_gauges_in_one_place_share_a_centre(power: float) -> None:
    """Two gauges on one centre have half each, whatever the power; the one that reports has all; alone, all too."""
    gauges = np.array([[50.0, 50.0], [50.0, 50.0], [90.0, 50.0]])
    grid = make_grid(basins_of(cell=shapely.box(0, 0, 100, 100)), 100.0)
    tiles = tiles_of(grid, gauges, power=power, n_basins=1)
    assert tiles is not None
    weights = tiles[0].weights(np.array([[1, 1, 1], [1, 0, 1]], dtype=np.float32))
    np.testing.assert_allclose(weights[0], [0.5, 0.5, 0.0], atol=1e-11)
    np.testing.assert_allclose(weights[1, [0, 2]], [1.0, 0.0], atol=1e-11)
    alone = tiles_of(grid, gauges[:1], power=power, n_basins=1)
    assert alone is not None
    assert alone[0].weights(np.ones((1, 1), dtype=np.float32)).tolist() == [[1.0]]


def test_powers_out_of_the_range_of_single_precision_are_said_so() -> None:
    """Gauges 100 m and 300 km away lend by the power 16 as 4e55 to 1: there are no tiles."""
    gauges = np.array([[600.0, 500.0], [300.0 * KM, 0.0]])
    grid = make_grid(basins_of(KM, square=SQUARE), 1000.0)
    assert tiles_of(grid, gauges, power=16.0, n_basins=1) is None
    assert tiles_of(grid, gauges, power=6.0, n_basins=1) is not None


def test_a_large_basin_has_several_tiles() -> None:
    """10,000 cells are tiles of at most 2,048 cells, which hold the whole basin together."""
    tiles = tiles_of(make_grid(basins_of(KM, square=SQUARE), 100.0), np.zeros((1, 2)), power=2.0, n_basins=1)
    assert tiles is not None
    assert [len(tile.centres) for tile in tiles] == [2048] * 4 + [1808]
    assert sum(tile.held.sum() for tile in tiles) == pytest.approx(1.0, rel=1e-12)


def test_table_and_product_are_the_same_sums() -> None:
    """Written as a product of two, 3 gauges of which one is the sum of the others lend what the table says."""
    basis = np.array([[1.0, 2.0], [3.0, 4.0]], dtype=np.float32)
    spread = np.array([[1.0, 0.0], [0.0, 1.0], [1.0, 1.0]], dtype=np.float32)
    product, table = Lent(basis, spread), Lent(spread @ basis, None)
    reporting = np.array([[1.0, 1.0, 1.0], [0.0, 1.0, 1.0]], dtype=np.float32)
    assert product.sums(reporting).tolist() == table.sums(reporting).tolist() == [[8.0, 12.0], [7.0, 10.0]]
    cells = np.array([[1.0, 0.5]], dtype=np.float32)
    assert product.weigh(cells).tolist() == table.weigh(cells).tolist() == [[2.0, 5.0, 7.0]]

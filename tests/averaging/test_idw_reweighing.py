"""Inverse distance while gauges come and go: single precision beside double, blocks, the union, memory."""

from __future__ import annotations

import tracemalloc
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from benchmarks.networks import scattered_gauges, wiggled_basins
from drawn import KM, basins_of, gauges_at

from basinrain.averaging import choose_grid, idw_reweighing, idw_weights, make_grid
from basinrain.averaging.idw_reweighing import prepare_idw_reweigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.basins import Basins
from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork

Floats = npt.NDArray[np.float64]
NAN = np.nan
SQUARE = shapely.box(0, 0, 10, 10)
IN_A_ROW = gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM)


def means(network: GaugeNetwork, basins: Basins, depth: Floats, **options: Any) -> Floats:  # noqa: ANN401 - as the method
    return prepare_idw_reweigher(network, basins, **options)(depth, ReportingRuns.of(~np.isnan(depth)))


def by_tables(network: GaugeNetwork, basins: Basins, depth: Floats, **options: Any) -> Floats:  # noqa: ANN401 - the same
    """Return what weights made in double precision for every step give."""
    rows = [idw_weights(network, basins, ~np.isnan(row), **options).weights @ np.nan_to_num(row) for row in depth]
    return np.array(rows)


def broken_record(n_steps: int, n_gauges: int, *, silent: float = 0.2) -> Floats:
    rng = np.random.default_rng(n_steps)
    depth = rng.gamma(0.5, 8.0, (n_steps, n_gauges))
    depth[rng.random(depth.shape) < silent] = NAN
    return depth


def test_square_with_a_gauge_outside_and_gauges_that_fail() -> None:
    """All three 33.127 mm, as of the weights .44349, .38513, .17138; A and B mirror each other, 20; one alone; none."""
    depth = np.array([[10.0, 30.0, 100.0], [10.0, 30.0, NAN], [NAN, 30.0, NAN], [NAN] * 3, [10.0, NAN, NAN]])
    found = means(IN_A_ROW, basins_of(KM, square=SQUARE), depth, cell=50.0)[:, 0]
    assert found[0] == pytest.approx(33.127, abs=5e-4)
    np.testing.assert_allclose(found[1:], [20.0, 30.0, NAN, 10.0], rtol=1e-6)


def test_one_cell_by_hand() -> None:
    """Gauges 1, 2 and 4 km from the only centre: 16 : 4 : 1 by power 2; the silent ones leave 4 : 1, 16 : 1, 16 : 4."""
    cell = basins_of(KM, cell=shapely.box(0, 0, 1, 1))
    network = gauges_at((-0.5, 0.5), (2.5, 0.5), (0.5, 4.5), unit=KM)
    depth = np.array([[21.0, 42.0, 84.0], [NAN, 5.0, 10.0], [17.0, NAN, 34.0], [20.0, 40.0, NAN]])
    by_hand = [(16 * 21 + 4 * 42 + 84) / 21, (4 * 5 + 10) / 5, (16 * 17 + 34) / 17, (16 * 20 + 4 * 40) / 20]
    np.testing.assert_allclose(means(network, cell, depth, cell=KM)[:, 0], by_hand, rtol=1e-6)


@pytest.mark.parametrize("power", [1.0, 2.0, 3.5])
def test_single_precision_is_close_to_double(power: float) -> None:
    """120 gauges, 12 basins and their union, 40 sets of which some have few gauges: every mean is right to 1e-6."""
    network, basins = scattered_gauges(120, seed=4), wiggled_basins(4, 3, 200, seed=4).with_union()
    depth = broken_record(40, 120)
    depth[30:, 5:] = NAN
    options = {"power": power, "grid": make_grid(basins, 2500.0)}
    np.testing.assert_allclose(
        means(network, basins, depth, **options), by_tables(network, basins, depth, **options), rtol=1e-6
    )


def test_blocks_of_sets_and_groups_of_basins_do_not_matter(monkeypatch: pytest.MonkeyPatch) -> None:
    """Made 7 sets and 5 basins at a time, the means are those made all at once, to single precision."""
    network, basins = scattered_gauges(30, seed=6), wiggled_basins(4, 3, 200, seed=6).with_union()
    depth = broken_record(50, 30)
    grid = make_grid(basins, 4000.0)
    whole = means(network, basins, depth, grid=grid)
    monkeypatch.setattr(idw_reweighing, "_SETS", 7)
    monkeypatch.setattr(idw_reweighing, "_BLOCK_BYTES", 4 * 7 * 30 * 5)
    np.testing.assert_allclose(means(network, basins, depth, grid=grid), whole, rtol=1e-6)


def test_two_sets_are_weighed_in_double_precision() -> None:
    """A record with one or two sets of gauges, such as a completed one, is averaged by their tables to 1e-14."""
    depth = np.array([[10.0, 30.0, 100.0], [20.0, 3.0, 1.0], [10.0, 30.0, NAN], [NAN] * 3])
    basins = basins_of(KM, square=SQUARE)
    grid = choose_grid(IN_A_ROW, basins)
    expected = by_tables(IN_A_ROW, basins, depth, grid=grid)
    np.testing.assert_allclose(means(IN_A_ROW, basins, depth, grid=grid), expected, rtol=1e-14)


@pytest.mark.parametrize(
    "shapes",
    [
        {"west": shapely.box(0, 0, 4, 10), "east": shapely.box(4, 0, 10, 10)},
        {"west": shapely.box(0, 0, 6, 10), "east": shapely.box(4, 0, 10, 10)},
    ],
)
def test_the_union_is_that_of_its_own_weights(shapes: dict[str, shapely.Polygon]) -> None:
    """Where basins adjoin, the union's mean is the mean of theirs by area; else it is weighed by itself."""
    basins = basins_of(KM, **shapes).with_union()
    depth = np.array([[10.0, 30.0, 100.0], [10.0, 30.0, NAN], [NAN, 30.0, 9.0], [10.0, NAN, 5.0]])
    found = means(IN_A_ROW, basins, depth, cell=500.0)
    np.testing.assert_allclose(found, by_tables(IN_A_ROW, basins, depth, cell=500.0), rtol=1e-6)
    adds_up = np.isclose(found[:, :-1] @ basins.areas[:-1], found[:, -1] * basins.areas[:-1].sum(), rtol=1e-12)
    assert adds_up.all() == (basins.areas[0] == 40 * KM**2)


def test_a_power_too_great_for_single_precision_is_weighed_set_by_set() -> None:
    """By the power 30, with gauges 0.5 and 300 km away, means are still those of tables in double precision."""
    network = gauges_at((5.2, 5), (300, 5), (-40, 5), unit=KM)
    basins = basins_of(KM, square=SQUARE)
    depth = np.array([[1.0, 2.0, 3.0], [NAN, 2.0, 3.0], [1.0, 2.0, NAN], [NAN, 2.0, NAN]])
    options = {"cell": 1000.0, "power": 30.0}
    np.testing.assert_allclose(
        means(network, basins, depth, **options), by_tables(network, basins, depth, **options), rtol=1e-12
    )


def test_as_many_nearest_gauges_as_there_are_is_no_limit() -> None:
    """Taking the nearest 3 of 3, or of more than there are, gives the bytes of taking all."""
    depth = np.array([[10.0, 30.0, 100.0], [10.0, 30.0, NAN], [NAN, 30.0, 9.0], [10.0, NAN, 5.0]])
    basins = basins_of(KM, square=SQUARE)
    everyone = means(IN_A_ROW, basins, depth, cell=500.0)
    for count in (3, 9):
        assert means(IN_A_ROW, basins, depth, cell=500.0, max_gauges=count).tobytes() == everyone.tobytes()


def test_options_are_checked_as_by_the_weights() -> None:
    """A power of 0, and a cell beside a grid, are refused before any step is averaged."""
    basins = basins_of(KM, square=SQUARE)
    with pytest.raises(JobError, match=r"idw power: found 0; expected a number above 0"):
        prepare_idw_reweigher(IN_A_ROW, basins, power=0.0, cell=500.0)
    with pytest.raises(DataError, match=r"idw grid: found a grid and a cell; expected one of them"):
        prepare_idw_reweigher(IN_A_ROW, basins, cell=500.0, grid=make_grid(basins, 500.0))


def test_memory_does_not_grow_with_the_number_of_sets(monkeypatch: pytest.MonkeyPatch) -> None:
    """With 2 MiB of weights at a time, 600 sets of 200 gauges in 20 basins (9 MiB of weights) take under 6 MiB more."""
    monkeypatch.setattr(idw_reweighing, "_BLOCK_BYTES", 2 * 2**20)
    network, basins = scattered_gauges(200, seed=1), wiggled_basins(5, 4, 100, seed=1)
    depth = broken_record(600, 200)
    runs = ReportingRuns.of(~np.isnan(depth))
    reweigh = prepare_idw_reweigher(network, basins, grid=make_grid(basins, 4000.0))
    reweigh(depth[:9], ReportingRuns.of(~np.isnan(depth[:9])))
    tracemalloc.start()
    reweigh(depth, runs)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 6 * 2**20, peak / 2**20

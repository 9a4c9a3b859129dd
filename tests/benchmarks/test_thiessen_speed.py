"""Thiessen weights beside geopandas.overlay of the same cells and basins; ratios within one run.

Figures and how to run this again: docs/benchmarks.md.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import shapely
from benchmarks.networks import scattered_gauges, wiggled_basins

from basinrain.averaging import thiessen_cells, thiessen_pieces, thiessen_weights
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

pytestmark = pytest.mark.benchmark


def seconds(*works: Callable[[], Any], rounds: int = 3) -> list[float]:
    """Return the best time of each work over rounds in which they take turns."""
    best = [np.inf] * len(works)
    for _ in range(rounds):
        for k, work in enumerate(works):
            start = time.perf_counter()
            work()
            best[k] = min(best[k], time.perf_counter() - start)
    return best


def network_and_basins(gauges: int, columns: int, rows: int, vertices: int) -> tuple[GaugeNetwork, Basins]:
    network, basins = scattered_gauges(gauges, seed=1), wiggled_basins(columns, rows, vertices, seed=2)
    assert shapely.is_valid(basins.polygons).all()
    assert abs(shapely.get_num_coordinates(basins.polygons).mean() - vertices) < 0.01 * vertices
    return network, basins


def overlay_of(network: GaugeNetwork, basins: Basins) -> Callable[[], gpd.GeoDataFrame]:
    """Return the work of overlaying basins and cells that are both ready as frames."""
    cells = gpd.GeoDataFrame({"gauge": np.arange(len(network))}, geometry=thiessen_cells(network, around=basins.bounds))
    frame = gpd.GeoDataFrame({"basin": np.arange(len(basins))}, geometry=basins.polygons)
    return lambda: gpd.overlay(frame, cells, how="intersection", keep_geom_type=True)


def assert_equal_areas(network: GaugeNetwork, basins: Basins, overlay: gpd.GeoDataFrame) -> None:
    """Make sure that weights times areas are the overlay's areas, to 1e-9 of the basin."""
    theirs = np.zeros((len(basins), len(network)))
    np.add.at(theirs, (overlay["basin"].to_numpy(), overlay["gauge"].to_numpy()), overlay.geometry.area.to_numpy())
    weights = thiessen_weights(network, basins).weights
    np.testing.assert_allclose(weights, theirs / basins.areas[:, None], rtol=0, atol=1e-9)


def per_pair(network: GaugeNetwork, basins: Basins, *, rounds: int = 3) -> tuple[float, float, int]:
    """Return the seconds that weights cost per piece and per vertex of a piece, and the number of pieces."""
    pieces = thiessen_pieces(network, basins)
    took = seconds(lambda: thiessen_weights(network, basins), rounds=rounds)[0]
    vertices = int(shapely.get_num_coordinates(pieces.polygon).sum())
    return took / len(pieces.area), took / vertices, len(pieces.area)


def test_300_gauges_over_200_basins() -> None:
    """Weights of 300 gauges in 200 basins of about 900 vertices: at least 1.3 times as fast as overlay, areas equal."""
    network, basins = network_and_basins(300, 20, 10, 900)
    overlay = overlay_of(network, basins)
    assert_equal_areas(network, basins, overlay())
    theirs, mine = seconds(overlay, lambda: thiessen_weights(network, basins), rounds=5)
    print(f"300 x 200: overlay {theirs:.3f} s, weights {mine:.3f} s, ratio {theirs / mine:.2f}")  # noqa: T201
    assert theirs / mine >= 1.3


def test_cost_per_pair_does_not_grow() -> None:
    """5,000 gauges over 2,000 basins cost at most 1.5 times as much per piece as 300 over 200, and areas are equal."""
    small, _, n_small = per_pair(*network_and_basins(300, 20, 10, 900))
    network, basins = network_and_basins(5000, 50, 40, 900)
    large, _, n_large = per_pair(network, basins, rounds=2)
    assert_equal_areas(network, basins, overlay_of(network, basins)())
    print(f"{n_small} pieces {small * 1e6:.0f} us each, {n_large} pieces {large * 1e6:.0f} us each")  # noqa: T201
    assert large <= 1.5 * small


def test_basins_of_20000_vertices() -> None:
    """20 basins of 20,000 vertices: no dearer per vertex of a piece; small pieces at most 2.5 times as dear each."""
    small, small_vertex, _ = per_pair(*network_and_basins(300, 20, 10, 900))
    network, basins = network_and_basins(300, 5, 4, 20_000)
    overlay = overlay_of(network, basins)
    assert_equal_areas(network, basins, overlay())
    few, few_vertex, n_few = per_pair(network, basins)
    many, _, n_many = per_pair(scattered_gauges(5000, seed=1), basins, rounds=2)
    theirs, mine = seconds(overlay, lambda: thiessen_weights(network, basins))
    print(  # noqa: T201
        f"20,000 vertices: {n_few} pieces {few * 1e6:.0f} us each ({few_vertex / small_vertex:.2f} per vertex), "
        f"{n_many} pieces {many * 1e6:.0f} us each, against {small * 1e6:.0f}; ratio to overlay {theirs / mine:.1f}"
    )
    assert few_vertex <= small_vertex
    assert many <= 2.5 * small
    assert theirs / mine >= 1.3

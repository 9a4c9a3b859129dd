"""Run in a process of its own: series by inverse distance and by the arithmetic mean beside one plain product.

Prints one JSON object. ``speed`` measures what a test holds to a bound, ``figures`` the rest of the docs' times,
``memory FILE`` the growth of memory with the record in that file.
BLAS is to be held to one thread outside.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np
import numpy.typing as npt
from benchmarks.ratios import memory_growth, product_of, ratios, seconds
from benchmarks.series_records import network_and_basins, record_one, record_two
from scipy.spatial.distance import cdist

from basinrain.averaging import METHODS, Grid, choose_grid, idw_weights
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import reweigh_by_sets
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

CELL = 635.0
"""Side of a cell, m: 99,888 of them."""

SAMPLE = 5

Floats = npt.NDArray[np.float64]


def series(network: GaugeNetwork, basins: Basins, depth: Floats, method: str) -> Floats:
    """Return the whole series, nothing known before: grid, what gauges lend, runs, means."""
    options = {"cell": CELL} if method == "idw" else {}
    reweigh = METHODS[method].reweigher(network, basins, options)
    return reweigh(depth, ReportingRuns.of(~np.isnan(depth)))


def error(network: GaugeNetwork, basins: Basins, grid: Grid, depth: Floats, found: Floats) -> float:
    """Return how far, relatively, means of some wet steps are from those of weights made for each."""
    worst = 0.0
    wet = np.flatnonzero(np.nansum(depth, axis=1) > 0)
    for t in np.random.default_rng(3).choice(wet, SAMPLE):
        weights = idw_weights(network, basins, ~np.isnan(depth[t]), grid=grid).weights
        worst = max(worst, float(np.abs(found[t] / (weights @ np.nan_to_num(depth[t])) - 1).max()))
    return worst


def users_loop(network: GaugeNetwork, grid: Grid, present: npt.NDArray[np.bool_]) -> Floats:
    """Return the weights of one set of gauges as one writes them down: a matrix of distances, its rows, their means."""
    lent = cdist(grid.centres, np.column_stack((network.x, network.y))[present]) ** -2.0
    lent /= lent.sum(axis=1, keepdims=True)
    sums: Floats = (grid.shares @ lent) / grid.shares.sum(axis=1)[:, None]
    return sums


def by_record(network: GaugeNetwork, basins: Basins, grid: Grid, depth: Floats) -> dict[str, object]:
    """Return the figures of one record."""
    plain = product_of(depth, len(basins))
    runs = ReportingRuns.of(~np.isnan(depth))
    ready = METHODS["idw"].reweigher(network, basins, {"grid": grid})
    return {
        "sets": len(runs.sets),
        "error": error(network, basins, grid, depth, ready(depth, runs)),
        "idw": ratios(lambda: series(network, basins, depth, "idw"), plain, best_of=1).figures(),
        "idw, tiles at hand": ratios(lambda: ready(depth, runs), plain, best_of=1).figures(),
        "arithmetic": ratios(lambda: series(network, basins, depth, "arithmetic"), plain).figures(),
    }


def set_by_set(network: GaugeNetwork, basins: Basins, grid: Grid, depth: Floats) -> dict[str, object]:
    """Return what ways without anything prepared for sets cost: the package's own general way, and a user's loop."""
    plain = product_of(depth, len(basins))
    runs = ReportingRuns.of(~np.isnan(depth))
    sample = runs.sets[np.random.default_rng(4).choice(len(runs.sets), SAMPLE, replace=False)]
    expected = idw_weights(network, basins, sample[0], grid=grid).weights[:, sample[0]]
    np.testing.assert_allclose(users_loop(network, grid, sample[0]), expected, rtol=1e-9)
    even = METHODS["arithmetic"](network, basins)
    figures: dict[str, object] = {
        "a user's loop, s a set": min(seconds(lambda: users_loop(network, grid, sample[0])) for _ in range(SAMPLE)),
        "arithmetic": ratios(lambda: reweigh_by_sets(even, len(basins))(depth, runs), plain, best_of=1).figures(),
    }
    for method, options in (("idw", {"grid": grid, "max_gauges": 5}), ("thiessen", {})):
        weigh = METHODS[method](network, basins, options)
        figures[f"{method}, s a set"] = seconds(lambda: [weigh(present) for present in sample]) / SAMPLE  # noqa: B023 - called at once
    return figures


def speed() -> dict[str, object]:
    """Return the ratio that is held to a bound, and how far means are from those of weights made for each step."""
    network, basins = network_and_basins()
    grid = choose_grid(network, basins, cell=CELL)
    depth = record_one(network)
    means = series(network, basins, depth, "idw")
    timed = ratios(lambda: series(network, basins, depth, "idw"), product_of(depth, len(basins)))
    return {"cells": grid.n_cells, "error": error(network, basins, grid, depth, means), **timed.figures()}


def figures() -> dict[str, object]:
    """Return all other times; it takes a quarter of an hour."""
    network, basins = network_and_basins()
    grid = choose_grid(network, basins, cell=CELL)
    first, second = record_one(network), record_two(network)
    return {
        "cells": grid.n_cells,
        "R1": by_record(network, basins, grid, first),
        "R2": by_record(network, basins, grid, second),
        "set by set": set_by_set(network, basins, grid, first),
    }


def memory(file: Path) -> dict[str, object]:
    """Return the growth of memory over the record's size."""
    network, basins = network_and_basins()
    return {"growth": memory_growth(lambda: np.load(file), lambda depth: series(network, basins, depth, "idw"))}


if __name__ == "__main__":
    found = (
        memory(Path(sys.argv[2])) if sys.argv[1] == "memory" else {"speed": speed, "figures": figures}[sys.argv[1]]()
    )
    print(json.dumps(found))  # noqa: T201

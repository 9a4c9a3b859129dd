"""Run in a process of its own: series by inverse distance and by the arithmetic mean beside one plain product.

Prints one JSON object. ``speed`` measures the times, ``memory FILE`` the growth of memory with the record in that file. BLAS
is to be held to one thread outside.
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
    """Return how far, relatively, means of some wet steps are from those of weights made for each in double precision."""
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


def speed() -> dict[str, object]:
    network, basins = network_and_basins()
    grid = choose_grid(network, basins, cell=CELL)
    found: dict[str, object] = {"cells": grid.n_cells}
    for name, make, best_of in (("R1", record_one, 3), ("R2", record_two, 1)):
        depth = make(network)
        plain = product_of(depth, len(basins))
        runs = ReportingRuns.of(~np.isnan(depth))
        ready = METHODS["idw"].reweigher(network, basins, {"grid": grid})
        figures = {
            "sets": len(runs.sets),
            "error": error(network, basins, grid, depth, ready(depth, runs)),
            "idw": ratios(lambda: series(network, basins, depth, "idw"), plain, best_of=best_of).figures(),  # noqa: B023 - at once
            "idw, grid and tiles at hand": ratios(lambda: ready(depth, runs), plain, rounds=5, best_of=1).figures(),  # noqa: B023 - at once
            "arithmetic": ratios(lambda: series(network, basins, depth, "arithmetic"), plain).figures(),  # noqa: B023 - at once
        }
        found[name] = figures
        if name == "R1":
            sample = runs.sets[np.random.default_rng(4).choice(len(runs.sets), SAMPLE, replace=False)]
            theirs = min(seconds(lambda: users_loop(network, grid, sample[0])) for _ in range(SAMPLE))  # noqa: B023 - at once
            expected = idw_weights(network, basins, sample[0], grid=grid).weights[:, sample[0]]
            np.testing.assert_allclose(users_loop(network, grid, sample[0]), expected, rtol=1e-9)
            figures["a user's loop, s a set"] = theirs
            weigh = METHODS["arithmetic"](network, basins)
            figures["arithmetic set by set"] = ratios(
                lambda: reweigh_by_sets(weigh, len(basins))(depth, runs),
                plain,
                best_of=1,  # noqa: B023 - at once
            ).figures()
            for method, options in (("idw", {"grid": grid, "max_gauges": 5}), ("thiessen", {})):
                weigh_set = METHODS[method](network, basins, options)
                took = [seconds(lambda: weigh_set(present)) for present in sample]  # noqa: B023 - at once
                figures[f"{method} set by set, s a set"] = sum(took) / SAMPLE
    return found


def memory(file: Path) -> dict[str, float]:
    network, basins = network_and_basins()
    return {"growth": memory_growth(lambda: np.load(file), lambda depth: series(network, basins, depth, "idw"))}


if __name__ == "__main__":
    print(json.dumps(speed() if sys.argv[1] == "speed" else memory(Path(sys.argv[2]))))  # noqa: T201

"""Run in a process of its own: leave-one-out by every method beside one product of the record with a dense table.

Prints one JSON object: by method the ratios, and the seconds of the product. BLAS is to be held to one thread outside.
"""

from __future__ import annotations

import json
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt
from benchmarks.networks import scattered_gauges

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Estimator, candidates_of, leave_one_out_errors
from basinrain.infill.relations import relations_of

GAUGES, STEPS, ROUNDS, BEST_OF = 300, 10_000, 5, 3

Floats = npt.NDArray[np.float64]


def network_and_record(gauges: int, steps: int, *, seed: int) -> tuple[GaugeNetwork, Floats]:
    """Return gauges with normals, and depths that neighbours share, with outages of mean 240 steps over 4 % of time."""
    rng = np.random.default_rng(seed)
    bare = scattered_gauges(gauges, seed=seed)
    normals = rng.uniform(600, 1400, (gauges, 1))
    network = GaugeNetwork(ids=bare.ids, x=bare.x, y=bare.y, crs="local", normals=normals)
    near = np.exp(-network.distances() / 50_000)
    depth = rng.gamma(0.2, 8.0, (steps, gauges)) @ (near / near.sum(axis=0)) * (normals[:, 0] / 1000)
    for g in range(gauges):
        at = -int(rng.integers(0, 5760))
        while at < steps:
            at += 1 + int(rng.exponential(5760))
            stop = at + 1 + int(rng.exponential(240))
            depth[max(at, 0) : max(stop, 0), g] = np.nan
            at = stop
    return network, depth


def seconds(work: Callable[[], object]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def check(depth: Floats, network: GaugeNetwork, options: InfillOptions, **further: Any) -> None:  # noqa: ANN401 - as the estimator
    """Make sure that estimates of some steps are those of asking for weights one by one."""
    estimates = Estimator(network, options, **further).estimates(depth)
    for t in range(7, len(depth), len(depth) // 8):
        reporting = ~np.isnan(depth[t])
        for g in np.flatnonzero(reporting):
            others = reporting & (np.arange(len(network)) != g)
            weights = options.weights(network, int(g), others, **further)
            expected = weights[others] @ depth[t, others] if weights.any() else np.nan
            np.testing.assert_allclose(estimates[t, g], expected, rtol=1e-12, atol=1e-12)


def main() -> None:
    network, depth = network_and_record(GAUGES, STEPS, seed=1)
    filled = np.nan_to_num(depth)
    table = np.random.default_rng(2).random((GAUGES, GAUGES))
    out = np.empty((STEPS, GAUGES))
    relations = relations_of(depth, network)

    def plain() -> object:
        return np.matmul(filled, table, out=out)

    ratios: dict[str, list[float]] = {}
    products: list[float] = []
    for candidate in candidates_of(InfillOptions(nearest=5)):
        options = candidate.options
        further: dict[str, Any] = {"relations": relations} if options.chosen_method.needs_relations else {}
        check(depth, network, options, **further)

        def mine(options: InfillOptions = options, further: dict[str, Any] = further) -> object:
            return leave_one_out_errors(depth, network, options, **further)

        plain()
        for _ in range(ROUNDS):
            pairs = [(seconds(mine), seconds(plain)) for _ in range(BEST_OF)]
            best = [min(side) for side in zip(*pairs, strict=True)]
            ratios.setdefault(candidate.label, []).append(best[0] / best[1])
            products.append(best[1])
    print(json.dumps({"ratios": ratios, "product": min(products), "silent": float(np.isnan(depth).mean())}))  # noqa: T201


if __name__ == "__main__":
    main()

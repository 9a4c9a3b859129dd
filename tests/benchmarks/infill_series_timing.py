"""Run in a process of its own: a long record infilled and averaged with fixed weights, in stretches of a year.

``ratio SCALE NEAREST`` beside one dense product, ``memory FILE SCALE NEAREST`` of a record saved as an array, ``loop
NEAREST`` a plain loop for comparison. Prints one JSON object. BLAS is to be held to one thread outside.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any, Final, cast

import numpy as np
import numpy.typing as npt
from benchmarks.networks import scattered_gauges
from benchmarks.ratios import memory_growth, product_of, ratios, seconds
from benchmarks.series_records import GAUGES, record_one

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, RecordFiller
from basinrain.rainfall import RainRecord

BASINS: Final = 200
STRETCH: Final = 365 * 24

Floats = npt.NDArray[np.float64]


def network_and_options(scale: str, nearest: str) -> tuple[GaugeNetwork, InfillOptions]:
    given: Any = {"scale": scale, "nearest": nearest if nearest == "all" else int(nearest)}
    return scattered_gauges(GAUGES, seed=11), InfillOptions(**given)


def stretches(network: GaugeNetwork, depth: Floats) -> list[RainRecord]:
    """Return the record a year at a time: hours whose status follows from the depth, which is not copied."""
    records = []
    for first in range(0, len(depth), STRETCH):
        part = depth[first : first + STRETCH]
        ends = np.datetime64("2031-01-01T01", "s") + (first + np.arange(len(part))) * np.timedelta64(3600, "s")
        status = np.where(np.isnan(part), 3, np.where(part == 0, 1, 0)).astype(np.uint8)
        records.append(RainRecord(network.ids, ends - np.timedelta64(3600, "s"), ends, part, status, step="1h"))
    return records


def whole_job(network: GaugeNetwork, options: InfillOptions, records: list[RainRecord]) -> Floats:
    """Return means with every gap infilled, nothing at hand: no donor is known before."""
    filler = RecordFiller(network, options)
    table = np.random.default_rng(2).random((len(network), BASINS))
    means = np.empty((sum(len(record) for record in records), BASINS))
    at = 0
    for record in records:
        none = np.zeros(record.depth.shape, dtype=bool)
        np.matmul(filler.fill(record, none).depth, table, out=means[at : at + len(record)])
        at += len(record)
    return means


def check(network: GaugeNetwork, options: InfillOptions, record: RainRecord) -> float:
    """Return the greatest difference in mm from weights asked for one by one, for 300 missing steps or whole days."""
    depth = record.depth
    filled = RecordFiller(network, options).fill(record, np.zeros(depth.shape, dtype=bool)).depth
    shape = (-1, 24 if options.scale == "day" else 1, len(network))
    totals, found = depth.reshape(shape).sum(axis=1), filled.reshape(shape).sum(axis=1)
    missing = np.argwhere(np.isnan(depth.reshape(shape)).all(axis=1))
    worst = 0.0
    for row, g in missing[np.linspace(0, len(missing) - 1, 300).astype(int)].tolist():
        there = ~np.isnan(totals[row])
        expected = options.weights(network, g, there)[there] @ totals[row, there]
        worst = max(worst, abs(float(expected) - float(found[row, g])))
    return worst


def ratio(scale: str, nearest: str) -> dict[str, Any]:
    network, options = network_and_options(scale, nearest)
    depth = record_one(network)
    records = stretches(network, depth)
    means = whole_job(network, options, records)
    assert not np.isnan(means).any()
    found = ratios(lambda: whole_job(network, options, records), product_of(depth, BASINS)).figures()
    return {**found, "worst": check(network, options, records[3]), "silent": float(np.isnan(depth).mean())}


def asked_one_by_one(nearest: str) -> dict[str, float]:
    """Return what a plain loop takes that asks for the weights of every missing value, from 300 of them."""
    network, options = network_and_options("step", nearest)
    depth = record_one(network)
    missing = np.argwhere(np.isnan(depth))
    some = missing[np.linspace(0, len(missing) - 1, 300).astype(int)]
    distances = network.distances()

    def loop() -> None:
        for t, g in some.tolist():
            there = ~np.isnan(depth[t])
            weights = options.weights(network, g, there, distances=distances[g])
            float(weights[there] @ depth[t, there])

    return {"each": seconds(loop) / len(some), "missing": float(len(missing))}


def memory(file: str, scale: str, nearest: str) -> dict[str, float]:
    network, options = network_and_options(scale, nearest)

    def work(depth: Floats) -> Floats:
        return whole_job(network, options, stretches(network, depth))

    return {"growth": memory_growth(lambda: cast("Floats", np.load(Path(file))), work)}


def main() -> None:
    what, *rest = sys.argv[1:]
    found: Any = {"ratio": ratio, "memory": memory, "loop": asked_one_by_one}[what](*rest)  # type: ignore[operator]
    print(json.dumps(found))  # noqa: T201


if __name__ == "__main__":
    main()

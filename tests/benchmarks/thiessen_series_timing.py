"""Run in a process of its own: Thiessen means of a long record while gauges come and go.

``ratio one|two`` beside one dense product, ``memory FILE`` of a record saved as an array, ``slopes`` against size.
Prints one JSON object. BLAS is to be held to one thread outside.
"""

from __future__ import annotations

import json
import sys
from functools import partial
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
from benchmarks.networks import scattered_gauges, wiggled_basins
from benchmarks.ratios import memory_growth, product_of, ratios, seconds
from benchmarks.series_records import network_and_basins, rain_record, record_one, record_two

from basinrain.averaging import thiessen_cells
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.thiessen import prepare_thiessen
from basinrain.averaging.thiessen_reweighing import prepare_thiessen_reweigher
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

Floats = npt.NDArray[np.float64]

RECORDS = {"one": record_one, "two": record_two}


def whole_job(network: GaugeNetwork, basins: Basins, depth: Floats) -> Floats:
    """Return the means with nothing at hand: which gauges report when, the geometry, and the averaging."""
    runs = ReportingRuns.of(~np.isnan(depth))
    return prepare_thiessen_reweigher(network, basins)(depth, runs)


def check(network: GaugeNetwork, basins: Basins, depth: Floats) -> float:
    """Return the greatest difference in mm from weights made anew, at 40 steps spread over the record."""
    means, weigh = whole_job(network, basins, depth), prepare_thiessen(network, basins)
    worst = 0.0
    for t in np.linspace(0, len(depth) - 1, 41).astype(int):
        present = ~np.isnan(depth[t])
        expected = weigh(present).apply(np.where(present, depth[t], 0.0))
        worst = max(worst, float(np.abs(means[t] - expected).max()))
    return worst


def overlay_seconds(network: GaugeNetwork, basins: Basins, depth: Floats) -> tuple[float, int]:
    """Return what one overlay of basins and cells takes, the mean of five, and how many sets of gauges there are."""
    sets = ReportingRuns.of(~np.isnan(depth)).sets
    frame = gpd.GeoDataFrame({"basin": np.arange(len(basins))}, geometry=basins.polygons)

    def overlay(present: npt.NDArray[np.bool_]) -> gpd.GeoDataFrame:
        cells = thiessen_cells(network, present, around=basins.bounds)[present]
        cut = gpd.GeoDataFrame({"gauge": np.flatnonzero(present)}, geometry=cells)
        return gpd.overlay(frame, cut, how="intersection", keep_geom_type=True)

    overlay(sets[0])
    chosen = sets[np.linspace(0, len(sets) - 1, 5).astype(int)]
    return sum(seconds(partial(overlay, present)) for present in chosen) / 5, len(sets)


def ratio(which: str) -> dict[str, Any]:
    network, basins = network_and_basins()
    record = rain_record(network, RECORDS[which](network))
    worst = check(network, basins, record.depth)
    product = product_of(record.depth, len(basins))
    found = ratios(lambda: whole_job(network, basins, record.depth), product).figures()
    runs = ReportingRuns.of(~np.isnan(record.depth))
    at_hand = prepare_thiessen_reweigher(network, basins)
    again = ratios(lambda: at_hand(record.depth, runs), product, rounds=3).median
    overlay, n_sets = overlay_seconds(network, basins, record.depth)
    silent = float(np.isnan(record.depth).mean())
    return {**found, "worst": worst, "again": again, "overlay": overlay, "sets": n_sets, "silent": silent}


def memory(file: str) -> dict[str, float]:
    network, basins = network_and_basins()
    return {"growth": memory_growth(lambda: np.load(Path(file)), lambda depth: whole_job(network, basins, depth))}


def slopes() -> dict[str, list[tuple[int, float]]]:
    """Return seconds against the number of gauges, basins and steps, the others held (best of two)."""

    def best(gauges: int, columns: int, steps: int) -> float:
        network, basins = scattered_gauges(gauges, seed=11), wiggled_basins(columns, 10, 300, seed=2)
        depth = record_one(network, steps)
        return min(seconds(lambda: whole_job(network, basins, depth)) for _ in range(2))

    return {
        "gauges": [(n, best(n, 20, 20_000)) for n in (200, 400, 800, 1600)],
        "basins": [(10 * n, best(300, n, 20_000)) for n in (10, 20, 40, 80)],
        "steps": [(n, best(300, 20, n)) for n in (20_000, 40_000, 80_000, 160_000)],
    }


def main() -> None:
    what, *rest = sys.argv[1:]
    found: Any = ratio(*rest) if what == "ratio" else memory(*rest) if what == "memory" else slopes()
    print(json.dumps(found))  # noqa: T201


if __name__ == "__main__":
    main()

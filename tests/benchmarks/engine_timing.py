"""Run in a process of its own: whole series of a record, with observed shares and marks, beside one plain product.

Prints one JSON object. ``ratio RECORD GAPS`` measures the time, ``memory FILE GAPS`` the growth of memory.
BLAS is to be held to one thread outside.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np
import numpy.typing as npt
from benchmarks.ratios import memory_growth, product_of, ratios
from benchmarks.series_records import network_and_basins, rain_record, record_one, record_two

from basinrain.infill import InfillOptions
from basinrain.rainfall import RainRecord, Status
from basinrain.series import SeriesEngine, SeriesSetup

CHUNK = 4392
"""Steps of a chunk: half a year of hours, in whole days."""

WITH_STATUS = 9 / 8
"""Size of a record over that of its depths: a byte of status beside every depth."""

Floats = npt.NDArray[np.float64]


def setup_of(gaps: str) -> SeriesSetup:
    """Return the Thiessen series of the benchmark's network, gaps infilled step by step where they are."""
    network, basins = network_and_basins()
    return SeriesSetup(
        network=network,
        basins=basins,
        methods={"thiessen": {}},
        gaps=(gaps,),
        infill=InfillOptions(method="inverse-distance", scale="step"),
    )


def series(setup: SeriesSetup, record: RainRecord) -> Floats:
    """Return the depths of all steps, computed chunk by chunk by a new engine, with shares and marks beside them."""
    engine = SeriesEngine(setup)
    shape = (len(record), len(setup.basins))
    depth, share, flags = np.empty(shape), np.empty(shape, dtype=np.float32), np.empty(shape, dtype=np.uint8)
    for first in range(0, len(record), CHUNK):
        rows = slice(first, first + CHUNK)
        part = engine.compute(record.window(first, first + CHUNK))[setup.series[0]]
        depth[rows], share[rows], flags[rows] = part.depth, part.observed_share, part.flags
    return depth


def _record(setup: SeriesSetup, depth: Floats) -> RainRecord:
    """Return the record of these very depths, not of a copy."""
    ends = np.datetime64("2031-01-01", "s") + np.arange(1, len(depth) + 1) * np.timedelta64(3600, "s")
    status = np.full(depth.shape, Status.OBSERVED, dtype=np.uint8)
    status[np.isnan(depth)] = Status.MISSING
    return RainRecord(setup.network.ids, ends - np.timedelta64(3600, "s"), ends, depth, status, step="1h")


def main() -> None:
    """Measure what is asked for."""
    what, which, gaps = sys.argv[1:]
    setup = setup_of(gaps)
    if what == "memory":
        growth = memory_growth(lambda: np.load(Path(which)), lambda depth: series(setup, _record(setup, depth)))
        print(json.dumps({"growth": growth / WITH_STATUS}))  # noqa: T201
        return
    depth = (record_one if which == "one" else record_two)(setup.network)
    record = rain_record(setup.network, depth)
    found = ratios(lambda: series(setup, record), product_of(depth, len(setup.basins)))
    print(json.dumps(found.figures()))  # noqa: T201


if __name__ == "__main__":
    main()

"""A record of decades, computed in parts by the command line: time, and the memory of its process at its height.

    python tests/benchmarks/forty_years.py FOLDER [--years 40] [--gauges 2000] [--basins 1000]

Makes a seeded hourly record of an invented square country as NetCDF in FOLDER, if it is not there, runs
``basinrain series`` on it in a process of its own, and prints one line.
"""

from __future__ import annotations

import argparse
import json
import resource
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import shapely
from benchmarks.networks import scattered_gauges, wiggled_basins
from netCDF4 import Dataset

from basinrain.gauges import GaugeNetwork

YEAR_HOURS = 8766
BLOCK = YEAR_HOURS // 2
OUTAGE, APART = 240, 5760
"""Mean length of an outage and mean time between two, h: silent for 4 % of the time."""

JOB = """[job]
name = "Decades by the hour"

[gauges]
file = "gauges.csv"
crs = "local"

[rainfall]
file = "rain.nc"
unit = "mm"
interval = "1h"
timezone = "UTC"

[basins]
file = "basins.geojson"
id = "id"
crs = "local"

[averaging]
methods = ["thiessen"]

[series]
gaps = "reweight"
formats = ["netcdf"]
memory = {memory}
"""


def write_record(path: Path, network: GaugeNetwork, steps: int) -> None:
    """Write hourly depths that come in wet spells, with outages, some steps at a time."""
    rng = np.random.default_rng(11)
    silent = np.zeros((steps + 1, len(network)), dtype=np.int16)
    for g in range(len(network)):
        number = 2 * steps // APART + 10
        begin = np.cumsum(rng.exponential(APART, number) + rng.exponential(OUTAGE, number)).astype(np.int64)
        end = begin + 1 + rng.exponential(OUTAGE, number).astype(np.int64)
        np.add.at(silent[:, g], np.minimum(begin, steps), 1)
        np.add.at(silent[:, g], np.minimum(end, steps), -1)
    silent.cumsum(axis=0, out=silent)
    with Dataset(path, "w") as file:
        file.createDimension("time", steps)
        file.createDimension("gauge", len(network))
        times = file.createVariable("time", "f8", ("time",))
        times.units, times.standard_name = "hours since 1990-01-01 00:00:00", "time"
        times[:] = np.arange(1, steps + 1)
        ids = file.createVariable("gauge", str, ("gauge",))
        ids.cf_role = "timeseries_id"
        ids[:] = np.array(network.ids, dtype=object)
        depth = file.createVariable("depth", "f4", ("time", "gauge"), zlib=True, complevel=1, fill_value=-1.0)
        depth.units = "mm"
        for first in range(0, steps, BLOCK):
            stop = min(first + BLOCK, steps)
            wet = rng.random((stop - first, 1)) < 0.1
            values = np.round(rng.standard_exponential((stop - first, len(network)), dtype=np.float32) * wet, 1)
            values[silent[first:stop] > 0] = -1.0
            depth[first:stop] = values


def main() -> None:
    parser = argparse.ArgumentParser()
    parser.add_argument("folder", type=Path)
    for name, value in (("years", 40), ("gauges", 2000), ("basins", 1000)):
        parser.add_argument(f"--{name}", type=int, default=value)
    parser.add_argument("--memory", type=float, default=2.0)
    asked = parser.parse_args()
    folder = asked.folder
    folder.mkdir(parents=True, exist_ok=True)
    steps = asked.years * YEAR_HOURS
    network = scattered_gauges(asked.gauges, seed=1)
    if not (folder / "rain.nc").exists():
        rows = [f"{g},{x!r},{y!r}" for g, x, y in zip(network.ids, network.x.tolist(), network.y.tolist(), strict=True)]
        (folder / "gauges.csv").write_text("\n".join(["id,x,y", *rows]) + "\n")
        across = round(np.sqrt(asked.basins / 1.6))
        basins = wiggled_basins(across, asked.basins // across, 200, seed=2)
        features = [
            {"type": "Feature", "properties": {"id": name}, "geometry": json.loads(shapely.to_geojson(polygon))}
            for name, polygon in zip(basins.ids, basins.polygons, strict=True)
        ]
        (folder / "basins.geojson").write_text(json.dumps({"type": "FeatureCollection", "features": features}))
        write_record(folder / "rain.nc", network, steps)
    (folder / "job.toml").write_text(JOB.format(memory=asked.memory))
    start = time.perf_counter()
    command = Path(sys.executable).with_name("basinrain")
    subprocess.run([command, "series", str(folder / "job.toml"), "--quiet"], check=True)
    seconds = time.perf_counter() - start
    peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024
    print(  # noqa: T201
        f"{steps:,} steps x {asked.gauges:,} gauges x {asked.basins:,} basins: {seconds:.0f} s, "
        f"{peak:,.0f} MiB at most, of {asked.memory * 1024:,.0f} MiB that the job allows"
    )


if __name__ == "__main__":
    main()

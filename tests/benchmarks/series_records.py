"""Seeded long records for the benchmarks: gauges fall silent, open late and close for good in an invented country."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt
import shapely
from benchmarks.networks import scattered_gauges, wiggled_basins

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status

GAUGES: Final = 300
STEPS: Final = 87_600
OUTAGE: Final = 240.0
"""Mean length of an outage, steps."""
SILENT: Final = 0.04
"""Share of the time that a gauge is silent."""

Floats = npt.NDArray[np.float64]


def network_and_basins() -> tuple[GaugeNetwork, Basins]:
    """Return 300 gauges with annual normals, and 200 valid basins of about 900 vertices that fill the country."""
    bare, basins = scattered_gauges(GAUGES, seed=11), wiggled_basins(20, 10, 900, seed=2)
    assert shapely.is_valid(basins.polygons).all()
    normals = np.random.default_rng(12).uniform(600.0, 1400.0, (GAUGES, 1))
    return GaugeNetwork(ids=bare.ids, x=bare.x, y=bare.y, crs=bare.crs, normals=normals), basins


def record_one(network: GaugeNetwork, steps: int = STEPS) -> Floats:
    """Return depths in mm, shape (steps, n_gauges), NaN in outages of mean 240 steps over 4 % of the time.

    It rains in one step of ten. Depths are those that neighbours share, times the normal where there is one.
    """
    rng = np.random.default_rng(13)
    n = len(network)
    depth = np.zeros((steps, n))
    near = np.exp(-network.distances() / 50_000.0)
    shared = near / near.sum(axis=0)
    if network.normals is not None:
        shared *= network.normals[:, 0] / 1000.0
    wet = np.flatnonzero(rng.random(steps) < 0.1)
    depth[wet] = rng.gamma(0.2, 8.0, (len(wet), n)) @ shared
    between = OUTAGE / SILENT - OUTAGE
    for g in range(n):
        at = -int(rng.integers(0, int(between)))
        while at < steps:
            at += 1 + int(rng.exponential(between))
            stop = at + 1 + int(rng.exponential(OUTAGE))
            depth[max(at, 0) : max(stop, 0), g] = np.nan
            at = stop
    return depth


def record_two(network: GaugeNetwork, steps: int = STEPS) -> Floats:
    """Return the depths of :func:`record_one` with more of them missing.

    One gauge of five opens on the first day of the fourth of ten years, one of ten closes on the last day of the
    seventh, and 40 neighbours (a seventh of the gauges if these are fewer than 280) are silent for 240 steps from the
    middle of the record on. A record of another length has its borders at the same shares of it.
    """
    depth = record_one(network, steps)
    n = len(network)
    order = np.random.default_rng(14).permutation(n)
    depth[: steps * 3 // 10, order[: n // 5]] = np.nan
    depth[steps * 7 // 10 :, order[n // 5 : n // 5 + n // 10]] = np.nan
    middle = np.hypot(network.x - np.median(network.x), network.y - np.median(network.y))
    depth[steps // 2 : steps // 2 + 240, np.argsort(middle)[: max(1, min(40, n // 7))]] = np.nan
    return depth


def rain_record(network: GaugeNetwork, depth: Floats) -> RainRecord:
    """Return the hourly record of these depths.

    What is missing from the beginning, or to the end, for over 180 days was not in service; other NaN is missing.
    """
    ends = np.datetime64("2031-01-01T01", "s") + np.arange(len(depth)) * np.timedelta64(3600, "s")
    status = np.where(np.isnan(depth), Status.MISSING, np.where(depth == 0, Status.ZERO, Status.OBSERVED))
    status = status.astype(np.uint8)
    known = ~np.isnan(depth)
    first, last = known.argmax(axis=0), len(depth) - known[::-1].argmax(axis=0)
    for g in range(len(network)):
        if first[g] > 180 * 24:
            status[: first[g], g] = Status.NOT_INSTALLED
        if len(depth) - last[g] > 180 * 24:
            status[last[g] :, g] = Status.NOT_INSTALLED
    return RainRecord(network.ids, ends - np.timedelta64(3600, "s"), ends, depth, status, step="1h", zone="+00:00")

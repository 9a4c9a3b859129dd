"""Timing of design storms beside what a competent user would write with general libraries; prints JSON."""

from __future__ import annotations

import json
import sys
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import shapely
from benchmarks.networks import wiggled_basins
from benchmarks.ratios import ratios
from scipy import stats

from basinrain.designstorm.cell_weights import CellGrid, cell_weights
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.record_depths import record_depths

Floats = npt.NDArray[np.float64]
YEARS = [2.0, 5.0, 10.0, 20.0, 50.0, 80.0]
EULER = 0.5772156649015329


def record() -> dict[str, Any]:
    """1,000 resamples of 40 years, 12 durations, 10 areas; beside a loop over samples with scipy's L-moments."""
    rng = np.random.default_rng(5)
    minutes = np.array([60, 120, 180, 360, 540, 720, 1080, 1440, 2160, 2880, 4320, 5760], dtype=float)
    year = stats.gumbel_r.rvs(loc=30, scale=9, size=(40, 1, 10), random_state=rng)
    maxima = np.maximum(year * (minutes[:, None] / 1440) ** 0.3 * rng.uniform(0.95, 1.05, (40, 12, 10)), 0.1)
    areas = [f"area {k}" for k in range(10)]
    frequencies = [Frequency(years, "annual-maximum") for years in YEARS]
    variates = np.array([frequency.variate for frequency in frequencies])

    def ours() -> object:
        return record_depths(maxima, np.arange(1981, 2021), minutes, areas, frequencies=frequencies)

    def plain(samples: int) -> Floats:
        """Gumbel alone, one fit after the other; no goodness of fit, and durations may cross."""
        found = np.empty((samples, 12, 10, len(variates)))
        for s in range(samples):
            drawn = maxima[rng.integers(0, 40, 40)]
            for d in range(12):
                for a in range(10):
                    l1, l2 = stats.lmoment(drawn[:, d, a], order=[1, 2])
                    scale = l2 / np.log(2)
                    found[s, d, a] = l1 - EULER * scale + scale * variates
        return np.asarray(np.quantile(found, [0.05, 0.95], axis=0))

    part = 20
    found = ratios(ours, lambda: plain(part), rounds=3, best_of=1)
    return {"ours": found.work, "plain": found.beside * 1000 / part, "ratio": 1000 / part / found.median}


def rasters() -> dict[str, Any]:
    """Cells of a raster over 50 basins, beside geopandas.overlay of the same cells and basins."""
    basins = wiggled_basins(10, 5, 900, seed=3)
    polygons = basins.polygons
    west, south, east, north = basins.bounds
    n = 160
    size = max(east - west, north - south) / n
    grid = CellGrid(
        n_rows=n, n_columns=n, origin=(west, south + n * size), across=(size, 0.0), down=(0.0, -size), crs="local"
    )
    rows, columns = np.divmod(np.arange(n * n), n)
    x, top = west + columns * size, south + n * size - rows * size
    cells = gpd.GeoDataFrame({"cell": np.arange(n * n)}, geometry=shapely.box(x, top - size, x + size, top))
    frame = gpd.GeoDataFrame({"basin": np.arange(len(polygons))}, geometry=polygons)
    kept: dict[str, Any] = {}

    def ours() -> None:
        kept["ours"] = cell_weights(basins, grid)

    def overlay() -> None:
        kept["overlay"] = gpd.overlay(frame, cells, how="intersection")

    taken = ratios(ours, overlay, rounds=3, best_of=1)
    pieces = kept["overlay"]
    table = np.zeros((len(polygons), n * n))
    np.add.at(table, (pieces["basin"], pieces["cell"]), shapely.area(pieces.geometry.to_numpy()))
    table /= basins.areas[:, None]
    found = kept["ours"]
    at = found.rows * n + found.columns
    error = float(np.abs(found.table.weights - table[:, at]).max())
    return {"ours": taken.work, "overlay": taken.beside, "ratio": 1 / taken.median, "error": error, "cells": n * n}


if __name__ == "__main__":
    json.dump({"record": record, "rasters": rasters}[sys.argv[1]](), sys.stdout)

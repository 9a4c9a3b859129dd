"""Nine daily gauges of Oahu, 2010 to 2017 (NOAA GHCN-Daily; tests/data/oahu), completed."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pandas as pd
import pyproj
import pytest

from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, InfillOptions, complete
from basinrain.rainfall import RainRecord, Status

FOLDER = Path(__file__).parents[1] / "data" / "oahu"
UPPER_WAHIAWA = "USC00518838"


@pytest.fixture(scope="module")
def oahu() -> tuple[RainRecord, GaugeNetwork]:
    gauges = pd.read_csv(FOLDER / "gauges.csv", dtype={"id": str}).set_index("id")
    rain = pd.read_csv(FOLDER / "rain.csv", index_col="date", parse_dates=True)
    table = rain[list(gauges.index)]
    starts = np.array(table.index, dtype="datetime64[s]")
    ends = np.asarray(starts + np.timedelta64(86400, "s"), dtype="datetime64[s]")
    record = RainRecord.from_depths(tuple(gauges.index), starts, ends, table.to_numpy(), step="1d")
    network = GaugeNetwork(
        ids=tuple(gauges.index),
        x=gauges["lon"].to_numpy(),
        y=gauges["lat"].to_numpy(),
        crs="EPSG:4326",
        normals=table.groupby(pd.DatetimeIndex(table.index).month).mean().T.to_numpy() * 30,
    )
    return record, network


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("scale", ["step", "day"])
def test_every_gap_with_two_reporting_gauges_is_infilled(
    oahu: tuple[RainRecord, GaugeNetwork], method: str, scale: str
) -> None:
    """27.96 % of 2792 days by 9 gauges are missing; without a limit all are infilled where two gauges report.

    By the nearest gauge it takes one; by four quadrants the two must lie in different ones, by pyproj's azimuths.
    """
    record, network = oahu
    missing = np.isnan(record.depth)
    assert missing.sum() == round(0.2795686087233365 * 2792 * 9) == 7025
    options = InfillOptions(method=method, scale=scale, longest_gap=math.inf)  # type: ignore[arg-type]
    completed = complete(record, network, options)
    needed = 1 if method == "nearest-gauge" else 2
    possible = missing & ((~missing).sum(axis=1) >= needed)[:, None]
    if method == "four-quadrant":
        possible = missing & np.column_stack([quadrants_reporting(network, g, ~missing) >= 2 for g in range(9)])
    assert np.array_equal(completed.record.status == Status.INFILLED, possible)
    assert len(completed.estimates) == possible.sum() > 6000
    assert (completed.record.depth[possible] >= 0).all()
    assert completed.sources().sum(axis=1) == pytest.approx(np.nansum(completed.record.depth, axis=0), rel=1e-12)


def quadrants_reporting(network: GaugeNetwork, g: int, reporting: np.ndarray) -> np.ndarray:
    """Return in how many quadrants around gauge g another one reports, day by day."""
    n = len(network)
    azimuth = pyproj.Geod(ellps="WGS84").inv(np.full(n, network.x[g]), np.full(n, network.y[g]), network.x, network.y)[
        0
    ]
    quadrant = np.floor(np.mod(azimuth, 360) / 90)
    others = np.arange(n) != g
    held = np.column_stack([reporting[:, others & (quadrant == q)].any(axis=1) for q in range(4)])
    return np.asarray(held.sum(axis=1))


def test_gaps_over_31_days_are_left(oahu: tuple[RainRecord, GaugeNetwork]) -> None:
    """By the default limit; counted by another rule: runs of equal values found by pandas."""
    record, network = oahu
    completed = complete(record, network, InfillOptions(scale="step"))
    left = np.isnan(completed.record.depth)
    for g, gauge in enumerate(record.gauges):
        gap = pd.Series(np.isnan(record.depth[:, g]))
        length = gap.groupby((gap != gap.shift()).cumsum()).transform("size")
        assert left[:, g].sum() == (gap & (length > 31)).sum(), gauge
    # Upper Wahiawa is 88 % missing, three quarters of it in long gaps.
    wahiawa = record.gauges.index(UPPER_WAHIAWA)
    assert np.isnan(record.depth[:, wahiawa]).mean() == pytest.approx(0.88, abs=0.005)
    assert left[:, wahiawa].mean() == pytest.approx(0.66, abs=0.005)

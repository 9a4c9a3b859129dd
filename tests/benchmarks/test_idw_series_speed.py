"""Ten years by inverse distance while gauges come and go, beside one product of the record with a dense table.

Figures and how to run this again: docs/benchmarks.md.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from benchmarks.ratios import run_child
from benchmarks.series_records import network_and_basins, record_one

pytestmark = pytest.mark.benchmark

HELD_TO = 60.0


def test_100000_cells_300_gauges_200_basins_ten_years() -> None:
    """The whole series costs at most 60 products, and means are right to 1e-5."""
    found = run_child("idw_series_timing.py", "speed")
    print(  # noqa: T201
        f"\n{found['cells']:,} cells: {found['work']:.1f} s, {found['median']:.0f} x the product of "
        f"{found['beside']:.3f} s (at most {found['most']:.0f}); error {found['error']:.1e}"
    )
    assert found["error"] < 1e-5
    assert found["median"] <= HELD_TO


def test_memory_of_the_whole_series(tmp_path: Path) -> None:
    """The record, the series and all that is made on the way take at most 2.5 times the record."""
    np.save(tmp_path / "record.npy", record_one(network_and_basins()[0]))
    growth = run_child("idw_series_timing.py", "memory", str(tmp_path / "record.npy"))["growth"]
    print(f"\n{growth:.2f} x the record")  # noqa: T201
    assert growth <= 2.5

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
    """The whole series costs at most 60 products, and means are right to 1e-5; every figure of the docs is printed."""
    found = run_child("idw_series_timing.py", "speed")
    print("\ncells", found["cells"])  # noqa: T201
    for part in ("R1", "R2", "set by set"):
        for name, figure in found[part].items():
            print(part, name, figure)  # noqa: T201
    assert max(found["R1"]["error"], found["R2"]["error"]) < 1e-5
    assert found["R1"]["idw"]["median"] <= HELD_TO


def test_memory_of_the_whole_series(tmp_path: Path) -> None:
    """The record, the series and all that is made on the way take at most 2.5 times the record."""
    np.save(tmp_path / "record.npy", record_one(network_and_basins()[0]))
    growth = run_child("idw_series_timing.py", "memory", str(tmp_path / "record.npy"))["growth"]
    print(f"\n{growth:.2f} x the record")  # noqa: T201
    assert growth <= 2.5

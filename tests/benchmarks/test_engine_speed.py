"""Whole series by the engine, observed shares and marks included; ratios within one run, in child processes.

Figures and how to run this again: docs/benchmarks.md.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from benchmarks.ratios import run_child
from benchmarks.series_records import network_and_basins, record_one

pytestmark = pytest.mark.benchmark

SCRIPT = "engine_timing.py"


@pytest.mark.parametrize(
    ("record", "gaps", "held_to"), [("one", "reweight", 8.0), ("two", "reweight", 15.0), ("one", "infill", 8.0)]
)
def test_whole_series_beside_one_product(record: str, gaps: str, held_to: float) -> None:
    """Everything that is written of a Thiessen series costs at most 8 dense products, 15 where the network changes."""
    found = run_child(SCRIPT, "ratio", record, gaps)
    print(  # noqa: T201
        f"\nrecord {record}, {gaps}: {found['work']:.2f} s, {found['median']:.2f} x the product of "
        f"{found['beside']:.3f} s (at most {found['most']:.2f})"
    )
    assert found["median"] <= held_to


@pytest.mark.parametrize("gaps", ["reweight", "infill"])
def test_memory_beside_the_record(tmp_path: Path, gaps: str) -> None:
    """Record, statuses, series with shares and marks, and all that is at work: at most 2.5 times the record."""
    np.save(tmp_path / "depth.npy", record_one(network_and_basins()[0]))
    growth = run_child(SCRIPT, "memory", str(tmp_path / "depth.npy"), gaps)["growth"]
    print(f"\n{gaps}: {growth:.2f} x the record")  # noqa: T201
    assert growth <= 2.5

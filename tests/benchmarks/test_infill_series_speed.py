"""Ten years of hours infilled and averaged with fixed weights; ratios within one run, in child processes.

Figures and how to run this again: docs/benchmarks.md.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from benchmarks.networks import scattered_gauges
from benchmarks.ratios import run_child
from benchmarks.series_records import GAUGES, record_one

pytestmark = pytest.mark.benchmark

SCRIPT = "infill_series_timing.py"


@pytest.mark.parametrize(("scale", "held_to"), [("step", 5.0), ("day", 10.0)])
@pytest.mark.parametrize("nearest", ["5", "all"])
def test_infilled_and_averaged_beside_one_product(scale: str, held_to: float, nearest: str) -> None:
    """Inverse distance from 5 gauges or from all, then one product: at most 5 dense products, 10 day by day."""
    found = run_child(SCRIPT, "ratio", scale, nearest)
    loop = run_child(SCRIPT, "loop", nearest)
    whole = loop["each"] * loop["missing"]
    print(  # noqa: T201
        f"\n{scale}, nearest {nearest}, {found['silent']:.1%} silent: {found['work']:.2f} s, {found['median']:.2f} x "
        f"the product of {found['beside']:.3f} s (at most {found['most']:.2f}); worst difference "
        f"{found['worst']:.1e} mm; asking value by value {whole:.0f} s = {whole / found['work']:.0f} x"
    )
    assert found["worst"] <= 1e-11
    assert found["median"] <= held_to


@pytest.mark.parametrize(("scale", "nearest"), [("step", "5"), ("step", "all"), ("day", "5"), ("day", "all")])
def test_memory_beside_the_record(tmp_path: Path, scale: str, nearest: str) -> None:
    """At its peak the job holds at most 2.5 times the record, the record and the means (0.67 of it) included."""
    file = tmp_path / "depth.npy"
    np.save(file, record_one(scattered_gauges(GAUGES, seed=11)))
    growth = run_child(SCRIPT, "memory", str(file), scale, nearest)["growth"]
    print(f"\n{scale}, nearest {nearest}: {growth:.2f} x the record")  # noqa: T201
    assert growth <= 2.5

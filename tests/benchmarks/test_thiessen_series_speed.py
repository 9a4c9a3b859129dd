"""Thiessen means of ten years of hours while gauges come and go; ratios within one run, in child processes.

Figures and how to run this again: docs/benchmarks.md.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from benchmarks.ratios import run_child
from benchmarks.series_records import network_and_basins, record_one, record_two

pytestmark = pytest.mark.benchmark

SCRIPT = "thiessen_series_timing.py"


@pytest.mark.parametrize(("which", "held_to"), [("one", 8.0), ("two", 15.0)])
def test_whole_job_beside_one_product(which: str, held_to: float) -> None:
    """Runs, geometry and averaging together cost at most 8 dense products, 15 where the network changes."""
    found = run_child(SCRIPT, "ratio", which)
    overlays = found["overlay"] * found["sets"]
    print(  # noqa: T201
        f"\nrecord {which}, {found['silent']:.1%} silent: {found['work']:.2f} s, {found['median']:.2f} x the product "
        f"of {found['beside']:.3f} s (at most {found['most']:.2f}), {found['again']:.2f} x with geometry at hand; "
        f"worst difference {found['worst']:.1e} mm; {found['sets']} sets of gauges, "
        f"an overlay {found['overlay']:.3f} s, for all sets {overlays:.0f} s = {overlays / found['work']:.0f} x"
    )
    assert found["worst"] <= 1e-9
    assert found["median"] <= held_to


@pytest.mark.parametrize("which", ["one", "two"])
def test_memory_beside_the_record(tmp_path: Path, which: str) -> None:
    """At its peak the job holds at most 2.5 times the record, the record and the means (0.67 of it) included."""
    network, _ = network_and_basins()
    file = tmp_path / "depth.npy"
    np.save(file, (record_one if which == "one" else record_two)(network))
    growth = run_child(SCRIPT, "memory", str(file))["growth"]
    print(f"\nrecord {which}: {growth:.2f} x the record")  # noqa: T201
    assert growth <= 2.5


def test_growth_with_size() -> None:
    """Cost grows no faster than in proportion to gauges, basins and steps (a tenth is allowed for noise)."""
    for size, points in run_child(SCRIPT, "slopes").items():
        at, took = np.log(points).T
        slope = np.polyfit(at, took, 1)[0]
        print(f"\n{size}: slope {slope:.2f}, " + ", ".join(f"{n}: {s:.2f} s" for n, s in points))  # noqa: T201
        assert slope <= 1.1

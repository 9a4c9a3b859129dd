"""Leave-one-out beside one product of the same record with a dense table; ratios within one run, in a child process.

Figures and how to run this again: docs/benchmarks.md.
"""

from __future__ import annotations

import json
import os
import statistics
import subprocess
import sys
from pathlib import Path

import pytest

pytestmark = pytest.mark.benchmark

HERE = Path(__file__).parent
ONE_THREAD = dict.fromkeys(("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "OMP_NUM_THREADS"), "1")
HELD_TO = 5.0
HELD = ("station-average", "normal-ratio", "inverse-distance (power 1)", "inverse-distance (power 2)")


def test_300_gauges_over_10000_steps() -> None:
    """Station average, normal ratio and inverse distance cost at most 5 products each; every method is measured."""
    paths = os.pathsep.join([str(HERE.parents[1]), str(HERE.parent)])
    child = subprocess.run(
        [sys.executable, str(HERE / "leave_one_out_timing.py")],
        env={**os.environ, **ONE_THREAD, "PYTHONPATH": paths},
        capture_output=True,
        text=True,
        check=False,
    )
    assert child.returncode == 0, child.stderr
    found = json.loads(child.stdout)
    medians = {label: statistics.median(ratios) for label, ratios in found["ratios"].items()}
    print(f"\nproduct {found['product']:.3f} s, silent {found['silent']:.3f}")  # noqa: T201
    for label, ratio in medians.items():
        print(f"{label}: {ratio:.1f} x the product (at most {max(found['ratios'][label]):.1f})")  # noqa: T201
    assert all(medians[label] <= HELD_TO for label in HELD), medians

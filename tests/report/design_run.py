"""Small runs of design storms that can be reckoned by hand, and one with everything.

``make_design(folder, **changes)``: four squares of 25 km² (``QUARTERS``) with two depth points. The west one has 20,
40, 60 mm in 1, 6, 24 h at 2 years and 30, 60, 90 mm at 10, the east one 30, 60, 90 mm and 40, 80, 120 mm; the west
half (nw, sw) is the west point's, the east half the east's. Uplift 1.1, the areal reduction of Leclerc and Schaake,
Keers and Wescott beside it, two points of interest: ``ford`` above the west half, ``mouth`` above all; triangular and
uniform.
"""

from __future__ import annotations

from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, Final

import numpy as np
import pandas as pd
from design_jobs import write_design_job
from record_jobs import daily_record, write_record_job

from basinrain.design_job import run_design
from basinrain.results_design import DesignRun

POINTS: Final = [{"name": "ford", "basins": ["nw", "sw"]}, {"name": "mouth", "basins": ["nw", "ne", "sw", "se"]}]
UPLIFT: Final = {"factor": 1.1, "source": "Quill Climate Note (invented)", "horizon": "2070-2099"}
REDUCTION: Final = {"method": "leclerc-schaake", "compare": ["keers-wescott"]}

_WEST: Final = {2: (20, 40, 60), 10: (30, 60, 90)}
_EAST: Final = {2: (30, 60, 90), 10: (40, 80, 120)}


def two_points(names: tuple[str, str] = ("west point", "east point")) -> str:
    """Return the table of the two depth points."""
    rows = [
        f"{name},{x},5000,{hours}h,{years},{depth}"
        for name, x, depths in ((names[0], 2500, _WEST), (names[1], 7500, _EAST))
        for years, of in depths.items()
        for hours, depth in zip((1, 6, 24), of, strict=True)
    ]
    return "\n".join(["point,x,y,duration,return_period,depth", *rows]) + "\n"


def make_design(folder: Path, **changes: Any) -> DesignRun:  # noqa: ANN401 - values of a job
    """Return a run; changes as for :func:`design_jobs.write_design_job`."""
    given: dict[str, Any] = {
        "depths": two_points(),
        "unit": "km",
        "design__depths__crs": "local",
        "design__return_periods": [2, 10],
        "design__durations": ["1h", "6h", "24h"],
        "design__uplift": UPLIFT,
        "design__areal_reduction": REDUCTION,
        "design__point": POINTS,
        "design__pattern": [{"shape": "triangular", "peak": 0.5}, {"shape": "uniform"}],
    }
    return run_design(write_design_job(folder, **(given | changes)))


@cache
def two_halves() -> DesignRun:
    """Return the run as it is, each basin with its own depth."""
    with TemporaryDirectory() as folder:
        return make_design(Path(folder), design__sub_basins="own-depth")


@cache
def bare() -> DesignRun:
    """Return the least that a job may ask: one frequency, duration and pattern, one depth point, nothing else."""
    with TemporaryDirectory() as folder:
        return run_design(write_design_job(Path(folder)))


@cache
def from_record() -> DesignRun:
    """Return depths from fifteen years of days."""
    with TemporaryDirectory() as folder:
        return run_design(
            write_record_job(
                Path(folder),
                daily_record(),
                design__durations=["1d", "2d"],
                design__return_periods=[2, 10, 25],
                design__point=[{"name": "ford", "basins": ["west"]}, {"name": "mouth", "basins": ["west", "east"]}],
            )
        )


def make_storms(folder: Path, *storms: str, **changes: Any) -> DesignRun:  # noqa: ANN401 - values of a job
    """Return how rare storms were in which 8 mm fell in each of the first eight hours, at all gauges, and then nothing.

    The table has one point with 20, 40, 60 mm in 1, 6, 24 h at 2 years and 30, 60, 90 mm at 10. So 48 mm in 6 h are two
    fifths from the 2-year to the 10-year depth, and 8 mm in 1 h and 64 mm in 24 h are below and above the 2-year one.
    """
    hours = pd.date_range("2031-05-04T01:00", periods=24 * len(storms), freq="h")
    mm = np.where(np.arange(len(hours)) % 24 < 8, 8.0, 0.0)
    rain = pd.DataFrame({"Alder": mm, "Birch": mm, "Cairn": mm}, index=hours)
    table = {
        "from": "table",
        "file": "depths.csv",
        "unit": "mm",
        "probability": "return-period",
        "series": "annual-maximum",
        "source": "invented table",
        "date": "2031",
    }
    windows = [
        {"name": name, "start": f"2031-05-{4 + k:02d}T00:00", "end": f"2031-05-{5 + k:02d}T00:00"}
        for k, name in enumerate(storms)
    ]
    given: dict[str, Any] = {
        "interval": "1h",
        "storm": windows,
        "design__durations": ["6h"],
        "design__step": "1h",
        "design__depths": table,
        "design__rarity": {"storms": list(storms), "average": "thiessen"},
    }
    return run_design(write_record_job(folder, rain, **(given | changes)))


@cache
def two_storms() -> DesignRun:
    """Return the rarity of two storms alike."""
    with TemporaryDirectory() as folder:
        return make_storms(Path(folder), "Quill", "Sedge")

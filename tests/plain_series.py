"""Series of one basin for tests: steps of one length, whole tenths of mm, and a few that are missing."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import numpy.typing as npt
import pandas as pd
from hypothesis import strategies as st

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]

HOUR = np.timedelta64(3600, "s")
DAY = 24 * HOUR
START = np.datetime64("2031-05-04T00:00:00")
NYC = Path(__file__).parent / "data" / "nyc_hourly" / "ref_series.csv"


def steps(n: int, *, step: np.timedelta64 = HOUR, start: np.datetime64 = START) -> tuple[Times, Times]:
    """Return starts and ends of ``n`` steps."""
    starts = start + np.arange(n) * step
    return starts, starts + step


def hours(number: float) -> np.timedelta64:
    """Return so many hours."""
    return np.timedelta64(round(number * 3600), "s")


def depths(*, at_least: int = 1, at_most: int = 60, missing: bool = True) -> st.SearchStrategy[Floats]:
    """Draw a series that is mostly dry, with drizzle below 0.1 mm, rain, and steps that are missing."""
    values = [0.0, 0.0, 0.0, 0.0, 0.05, 0.1, 0.7, 3.0, 12.5, *([float("nan")] if missing else [])]
    return st.lists(st.sampled_from(values), min_size=at_least, max_size=at_most).map(np.array)


def nyc(column: str = "arithmetic_inside") -> tuple[Times, Times, Floats]:
    """Return hourly means over New York City in 2013 (CC0), computed independently of this package."""
    table = pd.read_csv(NYC)
    ends: Times = np.array([stamp.removesuffix("Z") for stamp in table["time_utc"]], dtype="datetime64[s]")
    return np.asarray(ends - HOUR), ends, table[column].to_numpy(dtype=float)

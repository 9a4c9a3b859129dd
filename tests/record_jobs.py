"""Drawn records of many years, and jobs of design storms that rest on them.

Two halves of a square of 10 km, ``west`` and ``east``. Gauges Alder and Birch lie at x = 2.5 and 9.5 km, so that the
line between their Thiessen polygons is x = 6: the west is Alder's, of the east Alder has a fifth, of both together
three fifths. Cairn lies at x = 5 and opened in the seventh year.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt
import pandas as pd
import shapely
from design_jobs import write_design_job

Floats = npt.NDArray[np.float64]

HALVES: Final = {"west": shapely.box(0, 0, 5, 10), "east": shapely.box(5, 0, 10, 10)}

GAUGES: Final = """id,x,y,from
Alder,2.5,5,
Birch,9.5,5,
Cairn,5,5,2008-01-01
"""

WEIGHTS: Final = {"union": (0.6, 0.4), "west": (1.0, 0.0), "east": (0.2, 0.8)}
"""Of Alder and Birch in every area, in the order of results."""

FROM_RECORD: Final = {"from": "record"}


def daily_record(years: int = 15, *, seed: int = 5) -> pd.DataFrame:
    """Return depths of calendar days from the first of October 2001, mm to a tenth, by the day's name."""
    days = pd.date_range("2001-10-01", f"{2001 + years}-09-30", freq="D")
    return _drawn(days, wet=0.25, scale=11.0, seed=seed).rename_axis("time")


def hourly_record(years: int = 15, *, seed: int = 6) -> pd.DataFrame:
    """Return hourly depths from the first of October 2001, mm to a tenth, by the end of the hour."""
    hours = pd.date_range("2001-10-01T01:00", f"{2001 + years}-10-01T00:00", freq="h")
    return _drawn(hours, wet=0.02, scale=6.0, seed=seed).rename_axis("time")


def _drawn(times: pd.DatetimeIndex, *, wet: float, scale: float, seed: int) -> pd.DataFrame:
    generator = np.random.default_rng(seed)
    common = generator.random(len(times)) < wet
    depths = generator.exponential(scale, (len(times), 3)) * common[:, None]
    table = pd.DataFrame(depths.round(1), index=times, columns=["Alder", "Birch", "Cairn"])
    # A gauge has no readings before it opened.
    table.loc[table.index < "2008-01-02", "Cairn"] = np.nan
    return table


def write_record_job(
    folder: Path,
    rain: pd.DataFrame,
    *,
    interval: str = "1d",
    gauges: str = GAUGES,
    **changes: Any,  # noqa: ANN401 - values of a job
) -> Path:
    """Write a job of design storms with gauges and their record; by default the depths are from the record.

    Parameters
    ----------
    folder
        Where the files go.
    rain
        Depths in mm by time and gauge; the names of days, or the ends of shorter steps.
    interval
        The record's step.
    gauges
        The text of ``gauges.csv``.
    changes
        As for :func:`design_jobs.write_design_job`.
    """
    stamps = rain.set_axis(pd.DatetimeIndex(rain.index).strftime("%Y-%m-%d" if interval == "1d" else "%Y-%m-%dT%H:%M"))
    given: dict[str, Any] = {
        "gauges": {"file": "gauges.csv", "crs": "local", "length_unit": "km", "columns": {"from": "from"}},
        "rainfall": [{"file": "rain.csv", "unit": "mm", "interval": interval}],
        "infill": {"method": "inverse-distance", "scale": "step", "min_donors": 1},
        "design__depths": FROM_RECORD,
        "design__durations": ["1d"],
        "design__step": interval,
    }
    files = {"gauges.csv": gauges, "rain.csv": stamps.to_csv(index_label="time")}
    return write_design_job(folder, squares=HALVES, unit="km", files=files, **(given | changes))


def area_means(rain: pd.DataFrame) -> pd.DataFrame:
    """Return the means of Alder and Birch over every area by the weights on the drawing, NaN where a part is."""
    return pd.DataFrame(
        {
            area: sum(w * rain[gauge] for gauge, w in zip(("Alder", "Birch"), weights, strict=True) if w)
            for area, weights in WEIGHTS.items()
        }
    )

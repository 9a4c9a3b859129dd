"""What one rainfall file holds, before the files of a source are joined."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems, ReadError

__all__ = [
    "DEPTH_NAMES",
    "FLAG_NAMES",
    "GAUGE_NAMES",
    "STEPS_NAMES",
    "STORM_NAMES",
    "TIME_NAMES",
    "Block",
    "problems_of",
]

TIME_NAMES: Final = (
    "time", "datetime", "date_time", "timestamp", "date", "day", "month", "time_utc", "datetime_utc", "time_local",
    "end", "interval_end", "valid_time",
)  # fmt: skip
"""Names under which a column of times is found, after a declared one; lower case, words joined by an underscore."""

GAUGE_NAMES: Final = ("gauge", "gauge_id", "gage", "gage_id", "station", "station_id", "site", "site_id", "id")
DEPTH_NAMES: Final = (
    "depth", "rain", "rainfall", "rain_mm", "rainfall_mm", "precipitation", "precip", "prcp", "amount", "value",
    "total",
)  # fmt: skip
FLAG_NAMES: Final = ("flag", "flags", "quality", "qualifier", "mark", "quality_flag")
STEPS_NAMES: Final = ("steps", "n_steps", "accumulated_steps")
STORM_NAMES: Final = ("storm", "event", "storm_name", "event_name")


@dataclass(frozen=True, eq=False)
class Block:
    """Depths of one file by interval end and gauge.

    Parameters
    ----------
    file
        The file.
    gauges
        The columns.
    ends : array of datetime64[s], shape (n_rows,)
        Interval ends in the source's clock, increasing.
    lines : array of int, shape (n_rows,)
        The line of the file that first has that time.
    depth, status : arrays, shape (n_rows, n_gauges)
        mm and :class:`~basinrain.rainfall.Status`; an accumulated total keeps its depth beside status ACCUMULATED.
    present : array of bool, shape (n_rows, n_gauges), or None
        Where the file has a cell, blank or not; None where it has all.
    spans
        Over how many steps the value of (gauge, row) accumulates, where the file says so.
    """

    file: str
    gauges: tuple[str, ...]
    ends: npt.NDArray[np.datetime64]
    lines: npt.NDArray[np.int64]
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    present: npt.NDArray[np.bool_] | None
    spans: dict[tuple[str, np.datetime64], int]


@contextmanager
def problems_of(file: str, problems: Problems) -> Iterator[Problems]:
    """Collect the problems of one file, those that stop its reading included, and hand them to ``problems``.

    Examples
    --------
    >>> problems = Problems()
    >>> with problems_of("rain.csv", problems) as here:
    ...     here.add(item="time", found="'noon'", line=2)
    >>> len(problems)
    1
    """
    here = Problems(file=file)
    try:
        yield here
        here.raise_as(ReadError)
    except ReadError as error:
        problems.extend(error)

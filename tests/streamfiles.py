"""The same rain in files of every format that can be read in parts, for tests."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import numpy.typing as npt
import pandas as pd
import pyarrow as pa
from pyarrow import parquet

from basinrain.gauges import GaugeNetwork

HOUR = {"unit": "mm", "interval": "1h"}
"""Options of an hourly source in mm."""


def hours(n: int, start: str = "2031-05-04T01:00:00", *, minutes: int = 60) -> npt.NDArray[np.datetime64]:
    """Return n interval ends, an hour apart."""
    return np.datetime64(start) + np.arange(n) * np.timedelta64(60 * minutes, "s")


def network_of(*ids: str, **options: Any) -> GaugeNetwork:  # noqa: ANN401 - any option of a network
    """Return gauges a kilometre apart in a line."""
    return GaugeNetwork(
        ids=ids, x=np.linspace(0.0, 9000.0, len(ids)), y=np.linspace(0.0, 1.0, len(ids)), crs="local", **options
    )


def wide_csv(
    path: Path, ends: npt.NDArray[np.datetime64], gauges: Sequence[str], depth: npt.NDArray[np.float64]
) -> Path:
    """Write a wide CSV; NaN is a blank cell."""
    frame = pd.DataFrame(depth, columns=list(gauges), index=pd.Index(np.datetime_as_string(ends, "s"), name="time"))
    frame.to_csv(path)
    return path


def long_csv(
    path: Path, ends: npt.NDArray[np.datetime64], gauges: Sequence[str], depth: npt.NDArray[np.float64]
) -> Path:
    """Write a long CSV in order of time; NaN is a blank cell."""
    _long(ends, gauges, depth).to_csv(path, index=False)
    return path


def wide_parquet(
    path: Path,
    ends: npt.NDArray[np.datetime64],
    gauges: Sequence[str],
    depth: npt.NDArray[np.float64],
    *,
    group: int = 3,
) -> Path:
    """Write a wide Parquet file in row groups of a few rows; NaN is null."""
    columns = [pa.array(ends), *(pa.array(column, from_pandas=True) for column in depth.T)]
    parquet.write_table(pa.table(columns, names=["time", *gauges]), path, row_group_size=group)
    return path


def long_parquet(
    path: Path,
    ends: npt.NDArray[np.datetime64],
    gauges: Sequence[str],
    depth: npt.NDArray[np.float64],
    *,
    group: int = 5,
) -> Path:
    """Write a long Parquet file in order of time, the gauges dictionary-encoded."""
    frame = _long(ends, gauges, depth)
    table = pa.table(
        {
            "gauge": pa.array(frame["gauge"].tolist()).dictionary_encode(),
            "time": pa.array(np.repeat(ends, len(gauges))),
            "depth": pa.array(depth.ravel(), from_pandas=True),
        }
    )
    parquet.write_table(table, path, row_group_size=group)
    return path


def netcdf(
    path: Path,
    ends: npt.NDArray[np.datetime64],
    gauges: Sequence[str],
    depth: npt.NDArray[np.float64],
    *,
    units: str = "seconds since 1970-01-01 00:00:00",
    edit: Callable[[Any], None] | None = None,
) -> Path:
    """Write a NetCDF file over (time, gauge); ``edit`` may change the open file."""
    with netCDF4.Dataset(path, "w") as file:
        file.createDimension("time", len(ends))
        file.createDimension("gauge", len(gauges))
        time = file.createVariable("time", "f8", ("time",))
        time.units, time.standard_name = units, "time"
        time[:] = ends.astype("datetime64[s]").astype(np.int64)
        file.createVariable("gauge", str, ("gauge",))[:] = np.array(list(gauges), dtype=object)
        rain = file.createVariable("rain", "f8", ("time", "gauge"))
        rain.units = "mm"
        rain[:] = depth
        if edit is not None:
            edit(file)
    return path


WRITERS: dict[str, tuple[str, str, Callable[..., Path]]] = {
    "wide text": ("rain.csv", "wide", wide_csv),
    "long text": ("rain.csv", "long", long_csv),
    "wide Parquet": ("rain.parquet", "wide", wide_parquet),
    "long Parquet": ("rain.pq", "long", long_parquet),
    "NetCDF": ("rain.nc", "wide", netcdf),
}
"""By format: the file's name, its layout, and what writes it."""


def write(
    folder: Path,
    form: str,
    ends: npt.NDArray[np.datetime64],
    gauges: Sequence[str],
    depth: npt.NDArray[np.float64],
    *,
    name: str = "",
) -> dict[str, Any]:
    """Write a file of a format of :data:`WRITERS`, and return the options of an hourly source of it.

    NetCDF times are UTC where nothing else is said, so that all have a time zone.
    """
    file, layout, writer = WRITERS[form]
    path = folder / (name + file)
    writer(path, ends, gauges, np.asarray(depth, dtype=float))
    return {"files": [path], "layout": layout, "timezone": "UTC", **HOUR}


def _long(ends: npt.NDArray[np.datetime64], gauges: Sequence[str], depth: npt.NDArray[np.float64]) -> pd.DataFrame:
    return pd.DataFrame(
        {
            "gauge": np.tile(np.array(list(gauges), dtype=object), len(ends)),
            "time": np.repeat(np.datetime_as_string(ends, "s"), len(gauges)),
            "depth": np.asarray(depth, dtype=float).ravel(),
        }
    )

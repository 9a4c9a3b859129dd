"""A small record of three gauges over two halves of a square, averaged while gauges come and go."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields, is_dataclass, replace
from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import numpy as np
import numpy.typing as npt
import shapely
from tiny import EAST, GAUGES, WEST, feature, geojson, write_tiny

from basinrain.basins import Basins
from basinrain.rainfall import RainRecord
from basinrain.results_series import SeriesRun
from basinrain.screening import Screening
from basinrain.series_job import run_series

N = np.nan
JOB = """[job]
name = "Two halves"
{more}
[gauges]
file = "gauges.csv"
crs = "local"
length_unit = "km"
[gauges.columns]
id = "id"
x = "x"
y = "y"
elevation = "elevation"
from = "from"
to = "to"

[[rainfall]]
file = "rain.csv"
unit = "mm"
interval = "{interval}"

[basins]
file = "basins.geojson"
id = "name"
crs = "local"
length_unit = "km"

[averaging]
methods = {methods}
idw = {{ cell = 500 }}

[infill]
method = "station-average"

[series]
gaps = {gaps}
{series}
"""
ALL = ("infill-then-reweight", "reweight", "infill")


def rain_text(first: str, step: str, depth: npt.ArrayLike) -> str:
    """Return a file of depths of A, B and C, a blank for NaN; times are ends, or days or months by themselves."""
    values = np.array(depth, dtype=float)
    if step == "1mo":
        months = np.datetime64(first, "M") + np.arange(len(values))
        times = [str(month) for month in months]
    elif step == "1d":
        times = [str(np.datetime64(first, "D") + k) for k in range(len(values))]
    else:
        times = [str(np.datetime64(first, "m") + np.timedelta64(60 * (k + 1), "m")) for k in range(len(values))]
    rows = [
        ",".join([time, *("" if np.isnan(value) else f"{value:.1f}" for value in row)])
        for time, row in zip(times, values, strict=True)
    ]
    return "\n".join(["time,A,B,C", *rows]) + "\n"


def years_of_rain(years: int = 4, seed: int = 3) -> npt.NDArray[np.float64]:
    """Return daily depths from 2027 on: rain on a third of the days, B silent for 20 and for 100 days, C for one."""
    rng = np.random.default_rng(seed)
    n = int((np.datetime64(f"{2027 + years}-01-01") - np.datetime64("2027-01-01")).astype(int))
    shared = np.where(rng.random(n) < 1 / 3, rng.gamma(0.8, 9.0, n), 0.0)
    depth = shared[:, None] * rng.uniform(0.7, 1.4, (n, 3)) * np.array([0.9, 1.0, 1.2])
    depth[60:80, 1] = N
    depth[400:500, 1] = N
    depth[900, 2] = N
    rounded: npt.NDArray[np.float64] = np.round(depth, 1)
    return rounded


def make_series_run(
    folder: Path,
    depth: npt.ArrayLike | None = None,
    *,
    first: str = "2027-01-01",
    step: str = "1d",
    gaps: Sequence[str] = ALL,
    methods: Sequence[str] = ("thiessen", "idw"),
    basins: int = 2,
    series: str = "",
    more: str = "",
    opened: str = "",
    settings: Sequence[str] = (),
    names: Sequence[str] = ("A", "B", "C"),
) -> SeriesRun:
    """Return a run over the record; C comes into service on the day ``opened``."""
    rows = GAUGES.splitlines()
    gauges = "\n".join([f"{rows[0]},from,to", f"{rows[1]},,", f"{rows[2]},,", f"{rows[3]},{opened},"]) + "\n"
    rain = rain_text(first, step, years_of_rain() if depth is None else depth)
    for old, new in zip("ABC", names, strict=True):
        gauges, rain = gauges.replace(f"\n{old},", f"\n{new},"), rain.replace(f",{old}", f",{new}", 1)
    halves = [feature(WEST, name="west"), feature(EAST, name="east")]
    job = JOB.format(interval=step, gaps=list(gaps), methods=list(methods), series=series, more=more)
    path = write_tiny(folder, job=job, gauges=gauges, rain=rain, basins=geojson(*halves[:basins]))
    return run_series(path, settings)


def read_by_chunks(run: SeriesRun) -> SeriesRun:
    """Return the run as if its record had been read chunk by chunk: not held, not screened, no gauge left out."""
    record = run.record
    empty = RainRecord(
        record.gauges,
        record.starts[:0],
        record.ends[:0],
        record.depth[:0],
        record.status[:0],
        step=record.step,
        zone=record.zone,
    )
    return replace(run, record=empty, screening=Screening(), left_out=())


class Wide:
    """A store whose every column is one of another's."""

    def __init__(self, store: Any, columns: npt.NDArray[np.int64]) -> None:  # noqa: ANN401 - a store
        self._store, self._columns = store, columns

    def __getattr__(self, name: str) -> Any:  # noqa: ANN401 - an array by policy and method
        def rows(gaps: str, method: str) -> _Columns:
            return _Columns(getattr(self._store, name)(gaps, method), self._columns)

        return rows


class _Columns:
    """Rows and columns by slices; never the whole of it."""

    def __init__(self, array: npt.NDArray[Any], columns: npt.NDArray[np.int64]) -> None:
        self._array, self._columns = array, columns

    def __getitem__(self, part: tuple[slice, slice]) -> npt.NDArray[Any]:
        steps, basins = part
        columns = self._columns[basins]
        assert len(columns) == 1
        return self._array[steps, columns[0] : columns[0] + 1]


def widened(run: SeriesRun, n: int) -> SeriesRun:
    """Return the run with ``n`` basins besides the union, squares whose numbers are those of its own in turn."""
    old = len(run.basins)
    columns = np.append(np.arange(n) % (old - 1), old - 1)
    side = int(np.ceil(np.sqrt(n)))
    squares = [shapely.box(k % side, k // side, k % side + 1, k // side + 1) for k in range(n)]
    basins = Basins(
        ids=tuple(f"B{k:04d}" for k in range(n)), polygons=np.array(squares, dtype=object), crs=run.basins.crs
    ).with_union()

    def wide(value: Any) -> Any:  # noqa: ANN401 - any part of a result
        if isinstance(value, np.ndarray) and value.ndim and value.shape[-1] == old:
            return value[..., columns]
        if is_dataclass(value) and not isinstance(value, type):
            return replace(value, **{field.name: wide(getattr(value, field.name)) for field in fields(value)})
        return value

    return replace(
        run,
        basins=basins,
        setup=replace(run.setup, basins=basins),
        summaries={series: wide(summary) for series, summary in run.summaries.items()},
        left_out=tuple(wide(found) for found in run.left_out),
        store=Wide(run.store, columns),  # type: ignore[arg-type]
    )


@cache
def four_years() -> SeriesRun:
    """Return four years of days, all policies, two methods; C comes into service on 2028-05-01."""
    with TemporaryDirectory() as folder:
        return make_series_run(Path(folder), opened="2028-05-01")


@cache
def four_days() -> SeriesRun:
    """Return four days that can be reckoned by hand: rain on the first and the third, when B is silent.

    By Thiessen the square is A's for .5, B's for .425, C's for .075; without B A's for .675 and C's for .325. B gets
    the mean of A and C, 30. So the depths are 15 and 25.75 by infill, 15 and 26.5 by reweighting.
    """
    depth = np.array([[10, 20, 20], [0, 0, 0], [20, N, 40], [0, 0, 0]])
    with TemporaryDirectory() as folder:
        return make_series_run(Path(folder), depth, gaps=["infill", "reweight"], methods=["thiessen"])

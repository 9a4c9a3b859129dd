"""A small run on a basin that can be drawn: two squares side by side, six gauges, every kind of status."""

from __future__ import annotations

from typing import Any

import numpy as np
import shapely

from basinrain.averaging import averaging_method
from basinrain.basin_depths import average_storm
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.ground import LOCAL, Plane
from basinrain.infill import Completed
from basinrain.infill.completed import Estimate
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.results import StormResult, StormRun
from basinrain.storms import Storm, hyetograph_shape

NAMES = ("A", "B", "C", "D", "E", "F")


def _depths() -> tuple[np.ndarray[Any, Any], np.ndarray[Any, Any]]:
    """Six hours: B is infilled in the third, C throughout from A and D, F has nothing, the others report."""
    nan = np.nan
    depth = np.array(
        [
            [0.0, 0.0, 0.5, 1.0, 0.0, nan],
            [2.0, 1.0, 2.5, 3.0, 1.0, nan],
            [6.0, 7.0, 7.0, 8.0, 4.0, nan],
            [3.0, 4.0, 4.0, 5.0, 6.0, nan],
            [1.0, 0.0, 1.0, 1.0, 2.0, nan],
            [0.0, 0.0, 0.0, 0.0, 0.0, nan],
        ]
    )
    status = np.where(np.isnan(depth), Status.MISSING, np.where(depth == 0, Status.ZERO, Status.OBSERVED)).astype(
        np.uint8
    )
    status[2, 1] = Status.INFILLED
    status[:, 2] = Status.INFILLED
    return depth, status


ESTIMATES = (
    Estimate(
        gauge="B", first=2, stop=3, scale="step", depth=7.0, method="station-average", donors={"A": 0.5, "D": 0.5}
    ),
    Estimate(
        gauge="C", first=0, stop=6, scale="storm", depth=15.0, method="station-average", donors={"A": 0.5, "D": 0.5}
    ),
)


def make_run(
    *,
    names: tuple[str, ...] = NAMES,
    basin_names: tuple[str, ...] = ("west", "east"),
    job: str = "Two squares",
    storms: tuple[str, ...] = ("Quill",),
    depth_unit: str = "mm",
    one_step: bool = False,
    plane: Plane | None = None,
    pattern: str = "mean",
    methods: tuple[str, ...] = ("arithmetic", "thiessen", "idw"),
    notes: tuple[Note, ...] = (),
    basins: Basins | None = None,
) -> StormRun:
    """Return the run; ``names`` replace the gauges' ids, the rest is as it says."""
    plane = plane or Plane(LOCAL, "Local plane", 0.0)
    rename = dict(zip(NAMES, names, strict=True))
    x, y = np.array([[3, 3], [7, 7], [13, 4], [17, 8], [24, 5], [15, 1]]).T * 1000.0
    network = GaugeNetwork(
        ids=names,
        x=x,
        y=y,
        crs=plane.crs,
        elevation=np.array([100.0, 200.0, 300.0, np.nan, 500.0, 600.0]),
        normals=np.array([[900.0], [1000.0], [1100.0], [1200.0], [1300.0], [1400.0]]),
        normal_period="1991-2020",
    )
    squares = [shapely.box(0, 0, 1e4, 1e4), shapely.box(1e4, 0, 2e4, 1e4)]
    basins = basins or Basins(ids=basin_names, polygons=squares[: len(basin_names)], crs=plane.crs).with_union()  # type: ignore[arg-type]
    depth, status = _depths()
    estimates = tuple(
        Estimate(
            gauge=rename[e.gauge],
            first=e.first,
            stop=e.stop,
            scale=e.scale,
            depth=e.depth,
            method=e.method,
            donors={rename[donor]: weight for donor, weight in e.donors.items()},
        )
        for e in ESTIMATES
    )
    ends = np.datetime64("2031-05-04T06", "s") + np.arange(1, 7) * np.timedelta64(3600, "s")
    record = RainRecord(names, ends - np.timedelta64(3600, "s"), ends, depth, status, step="1h", zone="+02:00")
    if one_step:
        nat = np.array(["NaT"], dtype="datetime64[s]")
        total = depth.sum(axis=0)[None, :]
        record = RainRecord(names, nat, nat, total, status[5:], step="storm", labels=storms[:1])
        record.status[:] = np.where(np.isnan(total), Status.MISSING, Status.OBSERVED)
        estimates = ()
    completed = Completed(record, estimates, ())
    weighers = {name: averaging_method(name)(network, basins, {}) for name in methods}
    depths = {name: average_storm(completed, weigher) for name, weigher in weighers.items()}
    results = []
    for name in storms:
        storm = Storm(name, 0, len(record), record.starts[0], record.ends[-1], pattern)
        shapes = tuple(hyetograph_shape(completed, storm, network, basins))
        results.append(StormResult(storm, completed, depths, shapes))
    return StormRun(
        name=job,
        settings={"job": {"name": job}, "infill": {"method": "station-average"}, "rainfall": [{"unit": "mm"}]},
        depth_unit=depth_unit,
        area_unit="km2",
        network=network,
        basins=basins,
        plane=plane,
        record=record,
        storms=tuple(results),
        notes=notes,
        inputs={"rain.csv": "0" * 64},
        versions={"basinrain": "0.1.0"},
        facts={"grid": "A grid of 1 km cells."},
    )

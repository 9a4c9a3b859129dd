"""The depths that a job's design rests on, and how much every point counts in every area."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import Literal, cast

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from basinrain import reading
from basinrain.averaging import averaging_method
from basinrain.basins import Basins
from basinrain.designstorm.depth_source import DepthSource
from basinrain.designstorm.equations import EquationDepths
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.interval_factors import interval_factor
from basinrain.designstorm.point_depths import PointDepths
from basinrain.errors import DataError, Problem, Problems
from basinrain.gauges import GaugeNetwork, colocated_groups
from basinrain.ground import LOCAL
from basinrain.jobfile import DesignJob, Job
from basinrain.jobfile.design_tables import EQUATION, RASTERS, DesignDepthsTable, DesignTable, RasterTable, minutes_of
from basinrain.reading.depth_rasters import RasterFile, read_depth_rasters
from basinrain.reading.design_depths import read_point_depths

__all__ = ["Sourced", "interval_factors", "mean_weights", "nearest_points", "sourced"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class Sourced:
    """Depths by duration and frequency, with the weight of every point in every area.

    Parameters
    ----------
    source
        The depths.
    weights : array of float, shape (n_areas, n_points)
        Rows sum to 1.
    method
        What made the weights, in words.
    """

    source: DepthSource
    weights: Floats
    method: str


def sourced(job: Job | DesignJob, design: DesignTable, areas: Basins) -> Sourced:
    """Read the depths that a job names, and weigh their points over the areas of the design.

    Parameters
    ----------
    job, design
        The job and its table; depths from the record are made elsewhere.
    areas
        In the working plane.

    Raises
    ------
    ReadError, DataError, JobError, MethodError
        A file or what it says cannot be; points are nowhere near the areas, or have no position where they need one.
    """
    table = design.depths
    if table.origin == EQUATION:
        return Sourced(source=_equation(table), weights=np.ones((len(areas), 1)), method="one point")
    if table.origin == RASTERS:
        depths, weights = read_depth_rasters(
            _rasters(job, table),
            areas,
            unit=table.unit or "",
            crs=table.crs,
            source=table.source,
            date=table.date,
        )
        return Sourced(source=depths, weights=weights.weights, method="share of the area in every cell")
    depths = read_point_depths(
        job.path(table.file or ""),
        unit=table.unit or "",
        series=table.series or "",
        probability=cast("Literal['aep', 'aep-percent', 'return-period']", table.probability),
        layout=cast("Literal['long', 'wide']", table.layout),
        columns=table.columns,
        duration_unit=table.duration_unit,
        crs=table.crs,
        source=table.source,
        date=table.date,
    )
    if len(depths.points) == 1:
        if not np.isnan(depths.positions).any():
            _near(depths, areas)
        return Sourced(source=depths, weights=np.ones((len(areas), 1)), method="one point")
    return Sourced(source=depths, weights=_weights(job, depths, areas, table.average), method=table.average)


def _equation(table: DesignDepthsTable) -> EquationDepths:
    first, last = table.valid or ("", "")
    return EquationDepths(
        point="equation",
        equation=table.equation or "",
        coefficients=table.coefficients,
        return_periods=np.array(table.return_periods),
        valid=(minutes_of(first), minutes_of(last)),
        unit=table.unit or "",
        duration_unit=table.duration_unit or "",
        series=table.series or "",
        source=table.source,
        date=table.date,
    )


def _rasters(job: Job | DesignJob, table: DesignDepthsTable) -> list[RasterFile]:
    return [
        RasterFile(job.path(raster.file), minutes_of(raster.duration), _frequency(raster, table.series or ""))
        for raster in table.raster
    ]


def _frequency(raster: RasterTable, series: str) -> Frequency:
    return Frequency.of_aep(raster.aep) if raster.aep is not None else Frequency(raster.return_period or 0.0, series)


def _network(depths: PointDepths) -> GaugeNetwork:
    return GaugeNetwork(ids=depths.points, x=depths.positions[:, 0], y=depths.positions[:, 1], crs=depths.crs)


def _near(depths: PointDepths, areas: Basins) -> GaugeNetwork:
    """Return the points of depths in the plane of the areas; refuse points that are nowhere near."""
    if (depths.crs == LOCAL) != (areas.crs == LOCAL):
        raise DataError(
            Problem(
                item="[design.depths] crs",
                found=f"'{depths.crs}' beside basins {'in' if areas.crs == LOCAL else 'that are not in'} 'local'",
                expected="both 'local', or both on the map",
                remedy="give both crs so that they can be brought together",
            )
        )
    network = _network(depths).to_crs(areas.crs)
    reading.check_near(network, areas, kind="depth point")
    return network


def _weights(job: Job | DesignJob, depths: PointDepths, areas: Basins, average: str) -> Floats:
    without = [point for point, position in zip(depths.points, depths.positions, strict=True) if np.isnan(position[0])]
    if without:
        raise DataError(
            Problem(
                item=f"[design.depths] file, point {point}",
                found="no position",
                expected="its coordinates, by which several points are averaged",
                remedy="add columns for them, or keep one point",
            )
            for point in without
        )
    network = _near(depths, areas)
    problems = Problems()
    for group in colocated_groups(network):
        problems.add(
            item=f"[design.depths] file, points {', '.join(group[:-1])} and {group[-1]}",
            found="one place for all of them",
            expected="places apart, by which several points are averaged",
            remedy="correct a position, or keep one of the points",
        )
    problems.raise_as(DataError)
    return mean_weights(job, network, areas, average, whose="points of the table")


def mean_weights(
    job: Job | DesignJob,
    network: GaugeNetwork,
    areas: Basins,
    average: str,
    *,
    whose: str,
) -> Floats:
    """Return the weights by which points or gauges have their mean over areas.

    Parameters
    ----------
    job
        Holds the options of averaging methods.
    network
        The points or gauges.
    areas
        The areas.
    average
        The averaging method.
    whose
        What the network is, for the message: ``"points of the table"``.

    Returns
    -------
    array of float, shape (n_areas, n_points)
        Every row sums to 1; no NaN.

    Raises
    ------
    DataError
        There are areas that the method has no mean of, such as the arithmetic one of an area without a gauge inside.
    """
    weigh = averaging_method(average).prepare(network, areas, **job.averaging.options(average))
    weights = weigh(np.ones(len(network), dtype=bool)).weights
    problems = Problems()
    for row in np.flatnonzero(np.isnan(weights).any(axis=1)).tolist():
        problems.add(
            item=f"[design.depths] average, {areas.ids[row]}",
            found=f"no weights by '{average}' from the {whose}",
            expected=f"{whose.split(maxsplit=1)[0]} that the method can use",
            remedy="choose 'thiessen', which takes the nearest",
        )
    problems.raise_as(DataError)
    return weights


def interval_factors(
    table: DesignDepthsTable, observed_every: float | None = None
) -> Callable[[Floats], Floats] | None:
    """Return what makes up for depths that were read at fixed intervals; None where the job asks for nothing.

    ``observed_every`` is the interval in minutes, of a record; else the job states it.
    """
    if table.interval_factor is None:
        return None
    every = minutes_of(table.observed_every or "") if observed_every is None else observed_every
    return partial(_factor, table.interval_factor, every)


def _factor(method: str, every: float, minutes: Floats) -> Floats:
    return interval_factor(method, minutes, every)


def nearest_points(source: DepthSource, network: GaugeNetwork) -> npt.NDArray[np.int64]:
    """Return which point of the depths is nearest to each gauge; the only one where there is one.

    Parameters
    ----------
    source
        The depths; several points have positions.
    network
        In the working plane.
    """
    if len(source.points) == 1 or not isinstance(source, PointDepths):
        return np.zeros(len(network), dtype=np.int64)
    points = _network(source).to_crs(network.crs)
    tree = KDTree(np.column_stack([points.x, points.y]))
    return np.asarray(tree.query(np.column_stack([network.x, network.y]))[1], dtype=np.int64)

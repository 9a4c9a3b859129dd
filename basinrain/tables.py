"""The tables of a storm run, as data frames in the job's units.

Columns and their order are those of the CSV files; ``docs/outputs.md`` describes each.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from basinrain.basin_depths import BasinDepths, spread_across_methods
from basinrain.rainfall import Status
from basinrain.storms import status_of_total
from basinrain.units import area_factor, depth_factor, volume_factor, volume_unit_for
from basinrain.weights import compare

if TYPE_CHECKING:
    import geopandas as gpd
    import pandas as pd

    from basinrain.basin_depths import BasinDepths
    from basinrain.infill import Completed
    from basinrain.results import StormResult, StormRun

__all__ = [
    "basin_means",
    "estimates",
    "gauge_depths",
    "gauge_totals",
    "hyetographs",
    "infilled",
    "peaks",
    "share_infilled",
    "spread",
    "storm_table",
    "thiessen",
    "time_text",
    "weights",
    "weights_compared",
]


def time_text(when: np.datetime64, zone: str) -> str:
    """Return a time in ISO 8601 with the record's offset; empty for NaT.

    Examples
    --------
    >>> time_text(np.datetime64("2031-05-04T06:00"), "+02:00"), time_text(np.datetime64("NaT"), "")
    ('2031-05-04T06:00+02:00', '')
    """
    if np.isnat(when):
        return ""
    seconds = when.astype("datetime64[s]")
    minutes = seconds.astype("datetime64[m]")
    return f"{minutes if minutes == seconds else seconds}{'Z' if zone == '+00:00' else zone}"


def _depths(run: StormRun) -> Iterator[tuple[StormResult, str, BasinDepths]]:
    for result in run.storms:
        for method, depths in result.depths.items():
            yield result, method, depths


def _frame(rows: list[tuple[Any, ...]], columns: str) -> pd.DataFrame:
    import pandas as pd

    return pd.DataFrame(rows, columns=columns.split())


def _quotient(part: npt.NDArray[np.float64], whole: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    quotient = np.full(np.broadcast(part, whole).shape, np.nan)
    np.divide(part, whole, out=quotient, where=whole > 0)
    return quotient


def basin_means(run: StormRun) -> pd.DataFrame:
    """Return ``basin_means``: one row per storm, basin and method.

    ``depth`` and ``volume`` are NaN where the method has no number for the basin, or at some step no gauge has a depth;
    ``share_infilled`` then is too. ``depth_reporting_only`` is NaN where at some step no gauge reports.
    """
    mm, m2 = depth_factor(run.depth_unit), area_factor(run.area_unit)
    volume_unit = volume_unit_for(run.depth_unit)
    m3 = volume_factor(volume_unit)
    rows = []
    for result, method, depths in _depths(run):
        total, table = depths.total, depths.table
        share = share_infilled(result, method)
        for b, basin in enumerate(run.basins.ids):
            area = run.basins.areas[b]
            rows.append(
                (
                    result.storm.name,
                    basin,
                    method,
                    total[b] / mm,
                    run.depth_unit,
                    area / m2,
                    run.area_unit,
                    total[b] / 1000 * area / m3,
                    volume_unit,
                    int(np.count_nonzero(np.nan_to_num(table.weights[b]))),
                    share[b],
                    table.covered[b],
                    depths.reporting_only[b] / mm,
                )
            )
    return _frame(
        rows,
        "storm basin method depth depth_unit area area_unit volume volume_unit gauges_used share_infilled "
        "covered_share depth_reporting_only",
    )


def share_infilled(result: StormResult, method: str) -> npt.NDArray[np.float64]:
    """Return the share of each basin's total that rests on infilled values; by weight where the basin stayed dry.

    Shape (n_basins,), 0 to 1; NaN where the total is missing. ``KeyError`` for a method that was not run.
    """
    depths = result.depths[method]
    by_weight = 1 - depths.observed_share.mean(axis=0)
    by_depth = _quotient(depths.infilled, depths.total)
    return np.where(depths.total == 0, by_weight, by_depth)


def storm_table(run: StormRun) -> pd.DataFrame:
    """Return ``storms``: windows, totals, and the peak of the mean over the weighted mean of the gauges' peaks.

    ``start`` and ``end`` are empty for storm totals without times. ``peak_ratio`` is NaN where a peak is not known or
    the gauges stayed dry.
    """
    mm = depth_factor(run.depth_unit)
    rows = []
    for result, method, depths in _depths(run):
        storm, zone = result.storm, run.record.zone
        peak_of_mean, mean_of_peaks = peaks(result, method)
        ratio = _quotient(peak_of_mean, mean_of_peaks)
        for b, basin in enumerate(run.basins.ids):
            rows.append(
                (
                    storm.name,
                    basin,
                    method,
                    time_text(storm.start, zone),
                    time_text(storm.end, zone),
                    depths.total[b] / mm,
                    run.depth_unit,
                    peak_of_mean[b] / mm,
                    mean_of_peaks[b] / mm,
                    ratio[b],
                )
            )
    return _frame(rows, "storm basin method start end depth depth_unit peak_of_mean mean_of_peaks peak_ratio")


def peaks(result: StormResult, method: str) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Return the peak of each basin's mean and the weighted mean of the gauges' own peaks, both in mm a step.

    Each has shape (n_basins,). The peak of a gauge that has no depth at some step is not known (NaN); nor is then a
    mean of peaks that needs it. ``KeyError`` for a method that was not run.
    """
    depths = result.depths[method]
    depth = result.completed.record.depth
    return depths.depth.max(axis=0), depths.table.apply(depth.max(axis=0))


def spread(run: StormRun) -> pd.DataFrame:
    """Return ``spread``: the least and greatest basin mean across methods, one row per storm and basin.

    Methods without a number are left out; ``spread`` and ``spread_percent`` are NaN where fewer than two have one.
    """
    mm = depth_factor(run.depth_unit)
    rows = []
    for result in run.storms:
        for b, basin in enumerate(run.basins.ids):
            least, most, apart, percent = spread_across_methods([d.total[b] for d in result.depths.values()])
            rows.append((result.storm.name, basin, least / mm, most / mm, apart / mm, run.depth_unit, percent))
    return _frame(rows, "storm basin least greatest spread depth_unit spread_percent")


def weights(run: StormRun) -> pd.DataFrame:
    """Return ``weights``: one row per storm, basin, method and gauge that has weight or contributes.

    No rows for a basin for which the method has no number. ``contribution`` and ``share`` are NaN where the basin's
    total is missing, ``share`` also where the basin stayed dry.
    """
    mm = depth_factor(run.depth_unit)
    rows: list[tuple[Any, ...]] = []
    for result, method, depths in _depths(run):
        share = _quotient(depths.contribution, depths.total[:, None])
        for b, basin in enumerate(run.basins.ids):
            weight = depths.table.weights[b]
            counts = np.flatnonzero((np.nan_to_num(weight) != 0) | (np.nan_to_num(depths.most[b]) != 0))
            rows += [
                (
                    result.storm.name,
                    basin,
                    method,
                    run.network.ids[g],
                    weight[g],
                    depths.least[b, g],
                    depths.most[b, g],
                    depths.contribution[b, g] / mm,
                    run.depth_unit,
                    share[b, g],
                )
                for g in counts
            ]
    return _frame(rows, "storm basin method gauge weight weight_min weight_max contribution depth_unit share")


def weights_compared(run: StormRun) -> pd.DataFrame:
    """Return ``weights_compared``: the methods side by side, the largest differences of weight first.

    Behind the weights and their difference every method has its contribution and share. A gauge without weight that
    contributes through infill is listed too, so that contributions sum to the mean.
    """
    import pandas as pd

    mm = depth_factor(run.depth_unit)
    frames = []
    for result in run.storms:
        tables = [depths.table for depths in result.depths.values()]
        contributes = np.any([np.nan_to_num(depths.most) != 0 for depths in result.depths.values()], axis=0)
        frame = compare(tables, also=contributes)
        frame.insert(0, "storm", result.storm.name)
        b = [run.basins.ids.index(basin) for basin in frame["basin"]]
        g = [run.network.position(gauge) for gauge in frame["gauge"]]
        for method, depths in result.depths.items():
            frame[f"contribution_{method}"] = depths.contribution[b, g] / mm
        frame["depth_unit"] = run.depth_unit
        for method, depths in result.depths.items():
            frame[f"share_{method}"] = _quotient(depths.contribution, depths.total[:, None])[b, g]
        frames.append(frame)
    return pd.concat(frames, ignore_index=True)


def gauge_totals(run: StormRun) -> pd.DataFrame:
    """Return ``gauge_totals``: one row per storm and gauge.

    ``depth`` is NaN where a step has none even after infill, or the gauge was not in service for the whole storm;
    ``status`` says which (:func:`~basinrain.storms.status_of_total`).
    """
    mm = depth_factor(run.depth_unit)
    rows = []
    for result in run.storms:
        record = result.completed.record
        total, observed = record.depth.sum(axis=0), record.reporting.sum(axis=0)
        rows += [
            (
                result.storm.name,
                gauge,
                total[g] / mm,
                run.depth_unit,
                status_of_total(record, g),
                int(observed[g]),
                len(record),
            )
            for g, gauge in enumerate(run.network.ids)
        ]
    return _frame(rows, "storm gauge depth depth_unit status steps_observed steps_total")


def gauge_depths(run: StormRun) -> pd.DataFrame:
    """Return ``gauge_depths``: one row per storm, gauge and step, with the status of every value.

    ``depth`` is NaN where the status says that nothing is known (:data:`~basinrain.rainfall.WITHOUT_DEPTH`); ``time``
    is the step's end, empty for storm totals without times.
    """
    import pandas as pd

    mm = depth_factor(run.depth_unit)
    labels = np.array([status.label for status in Status])
    frames = []
    for result in run.storms:
        record = result.completed.record
        times = [time_text(end, run.record.zone) for end in record.ends]
        frames += [
            pd.DataFrame(
                {
                    "storm": result.storm.name,
                    "gauge": gauge,
                    "time": times,
                    "depth": record.depth[:, g] / mm,
                    "depth_unit": run.depth_unit,
                    "status": labels[record.status[:, g]],
                }
            )
            for g, gauge in enumerate(run.network.ids)
        ]
    return pd.concat(frames, ignore_index=True)


def infilled(run: StormRun) -> pd.DataFrame:
    """Return ``infilled``: one row per storm and estimate."""
    import pandas as pd

    frames = []
    for result in run.storms:
        frame = estimates(result.completed, run.depth_unit).drop(columns="storm", errors="ignore")
        frame.insert(0, "storm", result.storm.name)
        frames.append(frame)
    return pd.concat(frames, ignore_index=True)


def estimates(completed: Completed, depth_unit: str) -> pd.DataFrame:
    """Return one row per estimate; the time is the end of the step or day, blank for a storm's total.

    In a record of storm totals the storm's name comes first.
    """
    mm = depth_factor(depth_unit)
    record = completed.record
    rows = []
    for estimate in completed.estimates:
        when = record.ends[estimate.stop - 1] if estimate.scale != "storm" else np.datetime64("NaT")
        rows.append(
            (
                estimate.gauge,
                time_text(when, record.zone),
                estimate.scale,
                estimate.depth / mm,
                depth_unit,
                estimate.method,
                " ".join(f"{donor}:{weight:.6g}" for donor, weight in sorted(estimate.donors.items())),
            )
        )
    frame = _frame(rows, "gauge time scale depth depth_unit method donors")
    if record.labels:
        frame.insert(0, "storm", [record.labels[estimate.first] for estimate in completed.estimates])
    return frame


def hyetographs(run: StormRun) -> pd.DataFrame:
    """Return ``hyetographs``: one row per storm, basin, method and step.

    ``depth`` and ``observed_share`` are NaN at a step without a number, ``cumulative`` from there on.
    """
    import pandas as pd

    mm = depth_factor(run.depth_unit)
    frames = []
    for result, method, depths in _depths(run):
        depth = result.hyetograph(method) / mm
        times = [time_text(end, run.record.zone) for end in result.completed.record.ends]
        frames += [
            pd.DataFrame(
                {
                    "storm": result.storm.name,
                    "basin": basin,
                    "method": method,
                    "time": times,
                    "depth": depth[:, b],
                    "cumulative": np.cumsum(depth[:, b]),
                    "depth_unit": run.depth_unit,
                    "observed_share": depths.observed_share[:, b],
                }
            )
            for b, basin in enumerate(run.basins.ids)
        ]
    return pd.concat(frames, ignore_index=True)


def thiessen(run: StormRun) -> gpd.GeoDataFrame:
    """Return ``thiessen``: polygons of basin and gauge, with area and weight, all gauges present.

    Longitude and latitude (EPSG:4326), or the metres of a local plane without a coordinate system. No row for a gauge
    whose polygon does not reach the basin; nothing is NaN.
    """
    import geopandas as gpd
    import shapely

    from basinrain.averaging import thiessen_pieces
    from basinrain.ground import LOCAL, LONLAT, project

    basin, gauge, polygons, areas = thiessen_pieces(run.network, run.basins)
    local = run.plane.crs == LOCAL
    shapes = polygons if local else project(polygons, run.plane.crs, LONLAT)
    # Outer rings counterclockwise, as RFC 7946 asks (section 3.1.6).
    shapes = shapely.orient_polygons(shapes)
    return gpd.GeoDataFrame(
        {
            "basin": [run.basins.ids[b] for b in basin],
            "gauge": [run.network.ids[g] for g in gauge],
            "area": areas / area_factor(run.area_unit),
            "area_unit": run.area_unit,
            "weight": areas / run.basins.areas[basin],
        },
        geometry=list(shapes),
        crs=None if local else LONLAT,
    )

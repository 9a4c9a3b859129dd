"""The tables of design storms; data frames in the job's units.

Columns and their order are those of the CSV files; ``docs/outputs.md`` describes each.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_words
from basinrain.tables import time_text
from basinrain.units import area_factor, depth_factor, volume_factor, volume_unit_for

if TYPE_CHECKING:
    import pandas as pd

    from basinrain.results_design import DesignRun

__all__ = [
    "annual_maxima",
    "design_depths",
    "design_hyetographs",
    "design_storms",
    "frequency_cells",
    "point_depths",
    "point_weights",
    "record_fits",
    "reductions_compared",
    "storm_rarity",
]

_HOW_OFTEN = "aep return_period return_period_in"
_DEPTHS = (
    f"point basin area area_unit {_HOW_OFTEN} duration point_depth interval_factor uplift reduction "
    "areal_depth depth_unit reduction_method from"
)
_STORMS = (
    f"point {_HOW_OFTEN} duration pattern basin area area_unit reduction depth depth_unit volume volume_unit "
    "peak_depth peak_intensity intensity_unit peak_ends_min step_min"
)
_HYETOGRAPHS = f"point {_HOW_OFTEN} duration pattern basin elapsed_min depth cumulative depth_unit"
_POINTS = f"depth_point {_HOW_OFTEN} duration depth depth_unit"
_WEIGHTS = "area_of depth_point weight method"
_COMPARED = f"point basin area area_unit {_HOW_OFTEN} duration method for_region standing factor reason"
_RARITY = (
    "storm kind place duration depth depth_unit window_end depth_aligned estimate_aep estimate_return_period "
    "at_least_return_period at_most_return_period return_period_in words remark"
)
_FITS = (
    f"area_of duration distribution taken years location scale shape {_HOW_OFTEN} fitted depth lower_90 upper_90 "
    "depth_unit plot_correlation p_value l_skewness l_skewness_error"
)
_MAXIMA = "area_of duration year season_share depth depth_unit"


def frequency_cells(frequency: Frequency | None) -> tuple[float, float, str]:
    """Return the cells of how often: the AEP only where return periods are those of an annual maximum series.

    Examples
    --------
    >>> frequency_cells(Frequency(100.0, "annual-maximum"))
    (0.01, 100.0, 'annual-maximum')
    >>> frequency_cells(Frequency(0.5, "partial-duration"))
    (nan, 0.5, 'partial-duration')
    """
    if frequency is None:
        return np.nan, np.nan, ""
    return frequency.written_aep, frequency.written_years, frequency.series


def _frame(rows: Iterable[Sequence[Any]], columns: str) -> pd.DataFrame:
    import pandas as pd

    return pd.DataFrame(rows, columns=columns.split())


def design_depths(run: DesignRun) -> pd.DataFrame:
    """Return ``design_depths``: one row per point of interest, frequency and duration; per basin where each is reduced.

    ``basin`` is blank where all basins above the point are one area.
    """
    mm, m2 = depth_factor(run.depth_unit), area_factor(run.area_unit)
    table = run.asked.design.areal_reduction
    method = "none" if table is None else table.method
    rows = []
    for area in run.reduced:
        for frequency in run.asked.frequencies:
            links = run.links[area.name, frequency]
            for d, minutes in enumerate(links.minutes.tolist()):
                rows.append(
                    (
                        area.point,
                        area.basin,
                        run.areas.basins.areas[area.reduced_as] / m2,
                        run.area_unit,
                        *frequency_cells(frequency),
                        duration_words(minutes),
                        links.point[d] / mm,
                        links.interval_factor[d],
                        links.uplift,
                        links.reduction[d],
                        links.areal[d] / mm,
                        run.depth_unit,
                        method,
                        run.sourced.source.source,
                    )
                )
    return _frame(rows, _DEPTHS)


def design_storms(run: DesignRun) -> pd.DataFrame:
    """Return ``design_storms``: one row per point of interest, frequency, duration, pattern and basin."""
    mm, m2 = depth_factor(run.depth_unit), area_factor(run.area_unit)
    volume_unit = volume_unit_for(run.depth_unit)
    rows = []
    for storm in run.storms:
        for b, basin in enumerate(storm.point.basins):
            area = run.areas.basins.areas[storm.point.rows[b]]
            peak = int(np.argmax(storm.depth[:, b]))
            most = storm.depth[peak, b]
            rows.append(
                (
                    storm.point.name,
                    *frequency_cells(storm.frequency),
                    duration_words(storm.minutes),
                    storm.choice.label,
                    basin,
                    area / m2,
                    run.area_unit,
                    storm.reduction[b],
                    storm.totals[b] / mm,
                    run.depth_unit,
                    storm.totals[b] / 1000 * area / volume_factor(volume_unit),
                    volume_unit,
                    most / mm,
                    most / mm * 60 / storm.step,
                    f"{run.depth_unit}/h",
                    (peak + 1) * storm.step,
                    storm.step,
                )
            )
    return _frame(rows, _STORMS)


def design_hyetographs(run: DesignRun) -> pd.DataFrame:
    """Return ``design_hyetographs``: one row per design storm, basin and step; time is that of the step's end."""
    import pandas as pd

    mm = depth_factor(run.depth_unit)
    frames = []
    for storm in run.storms:
        aep, years, series = frequency_cells(storm.frequency)
        elapsed = storm.step * np.arange(1, len(storm.depth) + 1)
        for b, basin in enumerate(storm.point.basins):
            depth = storm.depth[:, b] / mm
            columns = {
                "point": storm.point.name,
                "aep": aep,
                "return_period": years,
                "return_period_in": series,
                "duration": duration_words(storm.minutes),
                "pattern": storm.choice.label,
                "basin": basin,
                "elapsed_min": elapsed,
                "depth": depth,
                "cumulative": np.cumsum(depth),
                "depth_unit": run.depth_unit,
            }
            frames.append(pd.DataFrame(columns))
    return pd.concat(frames, ignore_index=True)[_HYETOGRAPHS.split()]


def point_depths(run: DesignRun) -> pd.DataFrame:
    """Return ``point_depths``: one row per depth point that counts, frequency and duration."""
    mm = depth_factor(run.depth_unit)
    minutes = np.array(run.asked.minutes, dtype=float)
    source = run.sourced.source
    counts = np.flatnonzero((run.sourced.weights > 0).any(axis=0))
    rows = []
    for frequency in run.asked.frequencies:
        depth = run.chain.at(minutes, frequency)
        rows += [
            (
                source.points[point],
                *frequency_cells(frequency),
                duration_words(each),
                depth[point, d] / mm,
                run.depth_unit,
            )
            for point in counts
            for d, each in enumerate(minutes)
        ]
    return _frame(rows, _POINTS)


def point_weights(run: DesignRun) -> pd.DataFrame:
    """Return ``point_weights``: one row per area and depth point that counts in it."""
    weights = run.sourced.weights
    return _frame(
        (
            (name, run.sourced.source.points[point], weights[area, point], run.sourced.method)
            for area, name in enumerate(run.areas.names)
            for point in np.flatnonzero(weights[area] > 0)
        ),
        _WEIGHTS,
    )


def reductions_compared(run: DesignRun) -> pd.DataFrame:
    """Return ``reductions_compared``: no row where the job asks for no comparison."""
    m2 = area_factor(run.area_unit)
    rows = []
    if run.compared:
        for area in run.reduced:
            size = run.areas.basins.areas[area.reduced_as] / m2
            for frequency in run.asked.frequencies:
                links = run.links[area.name, frequency]
                for d, minutes in enumerate(run.asked.minutes):
                    head = (
                        area.point,
                        area.basin,
                        size,
                        run.area_unit,
                        *frequency_cells(frequency),
                        duration_words(minutes),
                    )
                    table = run.asked.design.areal_reduction
                    own = "none" if table is None else table.method
                    rows.append((*head, own, "as the job says", "of the design", links.reduction[d], ""))
                    for other in run.compared:
                        key = (area.name, frequency, minutes)
                        rows.append(
                            (
                                *head,
                                other.method.name,
                                other.region,
                                "outside its region" if other.outside else "for comparison",
                                other.factors.get(key, np.nan),
                                other.reasons.get(key, ""),
                            )
                        )
    return _frame(rows, _COMPARED)


def storm_rarity(run: DesignRun) -> pd.DataFrame:
    """Return ``storm_rarity``: one row per storm, place and duration, areas before the wettest gauges."""
    mm, zone = depth_factor(run.depth_unit), run.zone
    rows = []
    for found in run.rarities:
        for row in (*found.rows, *found.gauge_rows):
            aep, years, _ = frequency_cells(row.found.estimate)
            commoner, rarer = row.found.commoner, row.found.rarer
            rows.append(
                (
                    found.storm,
                    row.kind,
                    row.place,
                    duration_words(row.minutes),
                    row.found.depth / mm,
                    run.depth_unit,
                    time_text(row.end, zone),
                    row.aligned / mm,
                    aep,
                    years,
                    np.nan if commoner is None else commoner.return_period,
                    np.nan if rarer is None else rarer.return_period,
                    found.frequencies[0].series,
                    row.found.words,
                    row.remark,
                )
            )
    return _frame(rows, _RARITY)


def record_fits(run: DesignRun) -> pd.DataFrame:
    """Return ``record_fits``: no row where the depths are not from the record."""
    if run.from_record is None:
        return _frame((), _FITS)
    mm, found = depth_factor(run.depth_unit), run.from_record.depths
    rows = []
    for area, name in enumerate(run.areas.names):
        for d, minutes in enumerate(run.from_record.minutes):
            for distribution, fit in found.fits.items():
                at = (area, d)
                rows += [
                    (
                        name,
                        duration_words(minutes),
                        distribution,
                        distribution == found.distribution,
                        int(found.n_years[at]),
                        fit.parameters.location[at] / mm,
                        fit.parameters.scale[at] / mm,
                        fit.parameters.shape[at],
                        *frequency_cells(frequency),
                        fit.quantiles[*at, f] / mm,
                        fit.depth[*at, f] / mm,
                        fit.lower[*at, f] / mm,
                        fit.upper[*at, f] / mm,
                        run.depth_unit,
                        fit.goodness.correlation[at],
                        fit.goodness.p_value[at],
                        found.moments.ratio[at],
                        fit.ratio_error[at],
                    )
                    for f, frequency in enumerate(found.depths.frequencies)
                ]
    return _frame(rows, _FITS)


def annual_maxima(run: DesignRun) -> pd.DataFrame:
    """Return ``annual_maxima``: no row where the depths are not from the record; blank where a year does not count."""
    record = run.from_record
    if record is None:
        return _frame((), _MAXIMA)
    mm = depth_factor(run.depth_unit)
    return _frame(
        (
            (
                name,
                duration_words(minutes),
                int(year),
                record.season_share[k, area],
                record.maxima[k, d, area] / mm,
                run.depth_unit,
            )
            for area, name in enumerate(run.areas.names)
            for d, minutes in enumerate(record.minutes)
            for k, year in enumerate(record.years)
        ),
        _MAXIMA,
    )

"""Section 1: the basin means, by storm, basin and method."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.report import limits
from basinrain.report.table import Row, Table, lines
from basinrain.report.words import (
    DASH,
    area_text,
    counted,
    depth_text,
    percent_text,
    unit_text,
    volume_text,
)
from basinrain.results import StormRun
from basinrain.units import area_factor, volume_unit_for

__all__ = ["details", "summary"]

_ROWS: Final = 240
_DETAILED: Final = 40


def summary(run: StormRun) -> Table:
    """Return the depths of all storms and basins, methods side by side, with their spread."""
    n = len(run.methods)
    unit = unit_text(run.depth_unit)
    spread = {(row.storm, row.basin): row for row in lines(run.spread)}
    means = {(row.storm, row.basin, row.method): row.depth for row in lines(run.basin_means)}
    short = len(run.storms) * len(run.basins) > _ROWS
    basins = limits.drawn_basins(run) if short else list(range(len(run.basins)))
    rows: list[Row] = []
    for result in run.storms:
        storm = result.storm.name
        for b in basins:
            basin = run.basins.ids[b]
            apart = spread[storm, basin]
            rows.append(
                (
                    storm,
                    basin,
                    area_text(run.basins.areas[b] / area_factor(run.area_unit)),
                    *(depth_text(means[storm, basin, method], run.depth_unit) for method in run.methods),
                    depth_text(apart.spread, run.depth_unit),
                    percent_text(apart.spread_percent / 100),
                )
            )
    notes = ["Spread: greatest less least of the methods, and that in per cent of their mean."]
    if any(DASH in row[3 : 3 + n] for row in rows):
        notes.append(f"{DASH}: the method has no number there.")
    if short:
        notes.append(
            f"The first {len(basins)} of {len(run.basins)} rows a storm are shown; all are in basin_means.csv."
        )
    return Table(
        caption="Basin mean depth by method",
        heads=("storm", "basin", f"area, {unit_text(run.area_unit)}", *run.methods, unit, "per cent"),
        over=(("", 3), (f"depth, {unit}", n), ("spread", 2)),
        align="tt" + "n" * (n + 3),
        rows=rows,
        notes=tuple(notes),
    )


def details(run: StormRun) -> list[Table]:
    """Return one table a storm: depth, volume and what they rest on, for every basin and method."""
    frame = run.basin_means
    basins = limits.drawn_basins(run) if len(run.basins) > _DETAILED else range(len(run.basins))
    kept = [run.basins.ids[b] for b in basins]
    partly = bool(((frame["covered_share"] < 1 - 1e-9) & frame["depth"].notna()).any())
    volume_unit = unit_text(volume_unit_for(run.depth_unit))
    unit = unit_text(run.depth_unit)
    heads = ["basin", "method", f"depth, {unit}", f"volume, {volume_unit}", "gauges used", "on infilled values"]
    heads.append(f"reporting gauges only, {unit}")
    if partly:
        heads.append("area covered")
    notes = [
        "On infilled values: the share of the depth that comes from estimates.",
        "Reporting gauges only: without any infill, weights rebuilt at every step from the gauges that report.",
    ]
    if len(kept) < len(run.basins):
        notes.append(f"{len(kept)} of {len(run.basins)} rows are shown; all are in basin_means.csv.")
    tables = []
    for result in run.storms[: limits.STORMS]:
        rows = []
        ours = frame[(frame["storm"] == result.storm.name) & frame["basin"].isin(kept)]
        # Methods of one basin together; the sort is stable, so that methods keep the job's order.
        place = ours["basin"].map(run.basins.ids.index)
        for row in lines(ours.loc[place.sort_values(kind="stable").index]):
            number = not np.isnan(row.depth)
            cells = [
                row.basin,
                row.method,
                depth_text(row.depth, run.depth_unit) if number else "no number",
                volume_text(row.volume),
                str(row.gauges_used) if number else DASH,
                percent_text(row.share_infilled if number else float("nan")),
                depth_text(row.depth_reporting_only, run.depth_unit),
            ]
            if partly:
                cells.append(percent_text(row.covered_share if number else float("nan")))
            rows.append(tuple(cells))
        tables.append(
            Table(
                caption=f"{result.storm.name}: depth, volume and what they rest on",
                heads=tuple(heads),
                align="tt" + "n" * (len(heads) - 2),
                rows=rows,
                notes=tuple(notes),
            )
        )
    if len(run.storms) > limits.STORMS:
        more = len(run.storms) - limits.STORMS
        last = tables[-1]
        tables[-1] = Table(
            caption=last.caption,
            heads=last.heads,
            align=last.align,
            rows=last.rows,
            notes=(*last.notes, f"{counted(more, 'more storm is', 'more storms are')} in basin_means.csv."),
        )
    return tables

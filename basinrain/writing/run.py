"""All files of a run."""

from __future__ import annotations

import json
from pathlib import Path
from typing import cast

from basinrain.basins import Basins
from basinrain.ground import LOCAL
from basinrain.report import render_comparison, render_design, render_report, render_screening, render_series
from basinrain.results import InfillRun, ScreenRun, StormRun
from basinrain.results_common import Run
from basinrain.results_design import DesignRun
from basinrain.results_series import SeriesRun
from basinrain.writing.design_content import DesignContent
from basinrain.writing.design_files import write_design_files
from basinrain.writing.folder import RECORD, whole_folder
from basinrain.writing.record import long_tables, record_text, run_tables
from basinrain.writing.series_content import SeriesContent
from basinrain.writing.series_files import write_series_files
from basinrain.writing.series_points import points_inside

__all__ = ["write_run"]


def write_run(run: Run, folder: str | Path) -> Path:
    """Write the run's tables, record and report, and a storm run's Thiessen polygons, into a folder.

    Parameters
    ----------
    run
        The run.
    folder
        Replaced as a whole; it appears only when every file is complete.

    Returns
    -------
    Path
        The folder.

    Raises
    ------
    WriteError
        The folder cannot be written.
    """
    place = Path(folder)
    with whole_folder(place) as built:
        for name, frame in {**run_tables(run), **long_tables(run)}.items():
            frame.to_csv(built / f"{name}.csv", index=False, encoding="utf-8", lineterminator="\n")
        if isinstance(run, StormRun):
            (built / "thiessen.geojson").write_text(thiessen_text(run), encoding="utf-8")
        if isinstance(run, SeriesRun):
            write_series_files(built, series_content(run), formats=run.formats)
        if isinstance(run, DesignRun):
            write_design_files(built, design_content(run), formats=run.formats)
        (built / "report.html").write_text(_report(run), encoding="utf-8")
        files = sorted(path.name for path in built.iterdir())
        (built / RECORD).write_text(record_text(run, files), encoding="utf-8")
    return place


def _report(run: Run) -> str:
    if isinstance(run, ScreenRun):
        return render_screening(run)
    if isinstance(run, SeriesRun):
        return render_series(run)
    if isinstance(run, DesignRun):
        return render_design(run)
    if isinstance(run, InfillRun):
        return render_comparison(run)
    return render_report(cast("StormRun", run))


def series_content(run: SeriesRun) -> SeriesContent:
    """Return a run's series at the step and in the clock asked for, with what files say beside the numbers."""
    grouping = run.grouping
    return SeriesContent(
        source=grouping.source(run.store),
        starts=grouping.starts,
        ends=grouping.ends,
        zone=grouping.zone,
        basins=run.basins.ids,
        areas=run.basins.areas,
        points=points_inside(run.basins),
        depth_unit=run.depth_unit,
        area_unit=run.area_unit,
        job=run.name,
        caution=run.caution,
        plane=run.plane.name,
        version=run.versions.get("basinrain", ""),
    )


def design_content(run: DesignRun) -> DesignContent:
    """Return a run's hyetographs, with what files say beside the numbers."""
    rows = {basin: row for point in run.areas.points for basin, row in zip(point.basins, point.rows, strict=True)}
    polygons = run.areas.basins.polygons[list(rows.values())]
    parts = Basins(ids=tuple(rows), polygons=polygons, crs=run.areas.basins.crs)
    return DesignContent(
        hyetographs=run.hyetographs,
        basins=parts.ids,
        areas=parts.areas,
        positions=points_inside(parts),
        start=run.start,
        depth_unit=run.depth_unit,
        area_unit=run.area_unit,
        source=f"{run.sourced.source.source} ({run.sourced.source.date})",
        job=run.name,
        caution=run.caution,
        version=run.versions.get("basinrain", ""),
    )


def thiessen_text(run: StormRun) -> str:
    """Return the Thiessen polygons as GeoJSON (RFC 7946).

    Positions are longitude and latitude (EPSG:4326). A job in local coordinates has no place on the map: its positions
    are metres of the local plane, which a member ``plane`` says, as section 4 of the standard allows by arrangement.
    """
    content = json.loads(run.thiessen.to_json(show_bbox=False, drop_id=True))
    content.pop("crs", None)
    if run.plane.crs == LOCAL:
        content["plane"] = "local, metres"
    return json.dumps(content, ensure_ascii=False) + "\n"

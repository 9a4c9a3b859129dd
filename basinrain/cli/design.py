"""``basinrain design``: depths, hyetographs in short, how rare storms were."""

from __future__ import annotations

from typing import Any

from rich.table import Table

from basinrain.cli.running import console, show_warnings
from basinrain.design_job import run_design
from basinrain.designstorm.measures import duration_text
from basinrain.jobfile import DesignJob, Job
from basinrain.report.words import area_text, depth_decimals, number_text, unit_text
from basinrain.results_design import DesignRun
from basinrain.units import area_factor, depth_factor
from basinrain.writing.design_files import check_design_formats

__all__ = ["compute", "show"]

_ROWS = 40
"""More rows of one table than this are not printed; the files have all."""


def compute(job: Job | DesignJob, **options: Any) -> DesignRun:  # noqa: ANN401 - as run_design takes them
    """Run the job, once it is known that its hyetographs can be written."""
    if job.design is not None:
        check_design_formats(job.design.formats)
    return run_design(job, **options)


def show(run: DesignRun) -> None:
    """Print the depths link by link, the peaks, how rare storms were, and the warnings."""
    page = console()
    page.print(f"Point depths: {run.sourced.source.source} ({run.sourced.source.date})", soft_wrap=True)
    page.print()
    _show_depths(run)
    _show_storms(run)
    for found in run.rarities:
        page.print(f"How rare {found.storm} was", soft_wrap=True)
        for sentence in found.sentences[:2]:
            page.print(f"  {sentence}", soft_wrap=True)
        page.print()
    show_warnings(page, run.warnings)
    page.print(run.caution, soft_wrap=True)


def _show_depths(run: DesignRun) -> None:
    page, digits, mm = console(), depth_decimals(run.depth_unit), depth_factor(run.depth_unit)
    table = Table(show_edge=False, pad_edge=False)
    whose = "basin" if any(area.basin for area in run.reduced) else "point of interest"
    for heading in (whose, "how often", "duration"):
        table.add_column(heading, no_wrap=True)
    areal = run.sourced.source.areal
    factors = ("depth of record", "uplift") if areal else ("point depth", "uplift", "reduction")
    for heading in (*factors, f"areal depth {run.depth_unit}"):
        table.add_column(heading, justify="right")
    rows = [
        (area, frequency, links, d)
        for area in run.reduced
        for frequency in run.asked.frequencies
        for links in [run.links[area.name, frequency]]
        for d in range(len(links.minutes))
    ]
    last = ""
    for area, frequency, links, d in rows[:_ROWS]:
        size = run.areas.basins.areas[area.reduced_as] / area_factor(run.area_unit)
        name = f"{area.name}, {area_text(size)} {unit_text(run.area_unit)}"
        table.add_row(
            "" if name == last else name,
            frequency.label,
            duration_text(links.minutes[d]),
            number_text(links.point[d] * links.interval_factor[d] / mm, digits),
            number_text(links.uplift, 2),
            *(() if areal else (number_text(links.reduction[d], 3),)),
            number_text(links.areal[d] / mm, digits),
        )
        last = name
    page.print(table)
    if len(rows) > _ROWS:
        page.print(f"{len(rows) - _ROWS} more rows stand in design_depths.csv")
    page.print()


def _show_storms(run: DesignRun) -> None:
    page, digits, mm = console(), depth_decimals(run.depth_unit), depth_factor(run.depth_unit)
    rarest = run.asked.frequencies[-1]
    storms = [storm for storm in run.storms if storm.frequency == rarest]
    page.print(f"Hyetographs, {rarest.label}, steps of {duration_text(run.asked.step)}")
    table = Table(show_edge=False, pad_edge=False)
    for heading in ("point of interest", "duration", "pattern"):
        table.add_column(heading, no_wrap=True)
    for heading in (f"depth of basins {run.depth_unit}", "largest step", f"{run.depth_unit}/h", "ends after"):
        table.add_column(heading, justify="right")
    for storm in storms[:_ROWS]:
        step, basin = divmod(int(storm.depth.argmax()), storm.depth.shape[1])
        peak = storm.depth[step, basin] / mm
        least, most = (number_text(value / mm, digits) for value in (storm.totals.min(), storm.totals.max()))
        table.add_row(
            storm.point.name,
            duration_text(storm.minutes),
            storm.choice.label,
            least if least == most else f"{least} to {most}",
            number_text(peak, digits),
            number_text(peak * 60 / storm.step, digits),
            duration_text((step + 1) * storm.step),
        )
    page.print(table)
    if len(storms) > _ROWS:
        page.print(f"{len(storms) - _ROWS} more storms stand in design_storms.csv")
    page.print()

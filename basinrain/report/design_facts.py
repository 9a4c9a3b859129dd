"""What a design was asked for, and which files stand beside its page."""

from __future__ import annotations

from typing import Final

from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.design_storms import OWN_DEPTH
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION
from basinrain.designstorm.measures import duration_text
from basinrain.jobfile.design_tables import EQUATION, NO_REDUCTION, RASTERS, RECORD, TABLE
from basinrain.report import design_shown, overview
from basinrain.report.provenance import ground_facts
from basinrain.report.table import Row, Table
from basinrain.report.words import area_text, unit_text, unit_word, when_text
from basinrain.results_design import DesignRun
from basinrain.units import area_factor

__all__ = ["asked_facts", "files_table", "plane_facts", "points_table", "sub_basins_words"]

_MOST_LISTED: Final = 12
_ORIGINS: Final = {
    TABLE: "a table",
    RASTERS: "rasters",
    EQUATION: "an intensity equation",
    RECORD: "the job's own record",
}
_SERIES: Final = {
    ANNUAL_MAXIMUM: "annual maximum series",
    PARTIAL_DURATION: "partial duration series",
}


def asked_facts(run: DesignRun) -> list[tuple[str, str]]:
    """Return the job in a few lines, each a name and a text."""
    design, source = run.asked.design, run.sourced.source
    often = [frequency.label for frequency in run.asked.frequencies]
    annual = source.series == ANNUAL_MAXIMUM
    lines = [
        (
            "Annual exceedance" if annual else "Return periods",
            design_shown.cut(often, _MOST_LISTED),
        ),
        ("Durations", design_shown.cut([duration_text(m) for m in run.asked.minutes], _MOST_LISTED)),
        ("Step", duration_text(run.asked.step)),
        ("Depths", f"from {_ORIGINS[design.depths.origin]}, {_SERIES[source.series]}"),
        ("Their source", f"{source.source}; dated {source.date}"),
        ("Jurisdiction", design.jurisdiction or "not stated"),
        ("Climate", _climate(run)),
        ("Areal reduction", _reduction(run)),
        ("Patterns", design_shown.cut(list(dict.fromkeys(p.label for p in design.pattern)), _MOST_LISTED)),
        ("Basins above a point", sub_basins_words(run)),
    ]
    if run.start is not None:
        lines.append(("Nominal start", f"{when_text(run.start)}, for models that want dates; nothing depends on it"))
    lines.append(("Units", overview.units_asked(run)))
    return lines


def _climate(run: DesignRun) -> str:
    uplift = run.asked.design.uplift
    if uplift is None:
        return "no uplift: climate change is not included"
    return f"depths × {uplift.factor:g} for {uplift.horizon}; {uplift.source}"


def _reduction(run: DesignRun) -> str:
    table = run.asked.design.areal_reduction
    if run.sourced.source.areal:
        return "none: the depths are areal already"
    if table is None or table.method == NO_REDUCTION:
        return "none"
    return REDUCTIONS[table.method].title


def sub_basins_words(run: DesignRun) -> str:
    """Return what depth every basin above a point of interest has."""
    design = run.asked.design
    if design.own_area:
        whose = "its own point depths" if design.sub_basins == OWN_DEPTH else "the point depths of all of them"
        return f"each has {whose}, reduced by its own area; not one storm over all of them"
    if design.sub_basins == OWN_DEPTH:
        return "each has its own depth in proportion to its point depths, the volume of all of them kept"
    return "all have the areal depth of all of them together"


def points_table(run: DesignRun) -> Table:
    """Return the points of interest with the basins above them and their area."""
    m2 = area_factor(run.area_unit)
    shown = run.areas.points[: design_shown.AREAS]
    rest = len(run.areas.points) - len(shown)
    return Table(
        caption="Points of interest",
        heads=("point of interest", "basins above it", f"area, {unit_text(run.area_unit)}"),
        align="ttn",
        rows=[
            (
                point.name,
                design_shown.cut(point.basins, _MOST_LISTED),
                area_text(float(run.areas.basins.areas[point.row]) / m2),
            )
            for point in shown
        ],
        notes=(
            "The area is that of all basins above the point as one: where they overlap, what they share counts once.",
            *((f"{rest} more are in design_depths.csv.",) if rest else ()),
        ),
    )


def plane_facts(run: DesignRun) -> list[tuple[str, str]]:
    """Return what is to be known of the plane and the areas; of gauges only where some were read."""
    gauged = bool(run.rarities) or run.from_record is not None
    return [(name, text) for name, text in ground_facts(run) if gauged or name != "Distances"]


def files_table(run: DesignRun) -> Table:
    """Return the files that stand beside the page, with what each holds."""
    step = f"{duration_text(run.asked.step)} steps"
    content = f"every hyetograph in {unit_word(run.depth_unit)}, {step}"
    rows: list[Row] = [
        (
            design_shown.FILES[word],
            f"{content}, one CSV file a basin, its design storms side by side"
            if word == "csv-per-basin"
            else f"{content}: point of interest, frequency, duration, pattern, basin",
        )
        for word in dict.fromkeys(run.formats)
    ]
    rows += [
        ("design_depths.csv", "from point depth to areal depth, link by link"),
        ("design_storms.csv", "depth, volume and peak of every basin in every design storm"),
        ("point_depths.csv", "the depths of every point at the durations and frequencies asked for"),
        ("point_weights.csv", "how much every point counts in every area"),
    ]
    if run.compared:
        rows.append(("reductions_compared.csv", "areal reductions side by side, with why one has no answer"))
    if run.rarities:
        rows.append(("storm_rarity.csv", "how rare observed storms were, by area, gauge and duration"))
    if run.from_record is not None:
        rows += [
            ("record_fits.csv", "both distributions of every area and duration, with their intervals"),
            ("annual_maxima.csv", "annual maxima of every area, with the share of each wet season that has a depth"),
        ]
    rows.append(("record.json", "the job as resolved, all warnings and remarks, and the tables above"))
    return Table(caption="Files beside this page", heads=("file", "what it holds"), align="tt", rows=rows)

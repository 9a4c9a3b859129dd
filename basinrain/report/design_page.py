"""The page of design storms: from point depths to hyetographs, and how rare storms were."""

from __future__ import annotations

from typing import Final

from basinrain.report import (
    design_chain_list,
    design_facts,
    design_formulas,
    design_pattern_list,
    design_point_list,
    design_rarity_list,
    design_record_list,
    design_reduction_list,
    design_shown,
    design_storm_list,
    overview,
    provenance,
)
from basinrain.report.design_hyetographs_figure import design_pictures
from basinrain.report.figures import Picture
from basinrain.report.frequency_figure import MOST_PANELS, frequency_picture
from basinrain.report.rendering import render_template
from basinrain.results_design import DesignRun

__all__ = ["render_design"]

_TITLES: Final = {
    "chain": "From point depth to areal depth",
    "reduction": "Areal reduction",
    "patterns": "Temporal patterns",
    "hyetographs": "Hyetographs",
    "points": "Point depths",
    "record": "Depths from the record",
    "rarity": "How rare observed storms were",
    "files": "Files, inputs and job",
}


def render_design(run: DesignRun) -> str:
    """Return the report of design storms as one HTML page.

    As :func:`basinrain.report.render_report`: no script, nothing fetched, the same text on every repeat. Sections on
    what the job does not ask are left out, and the others are numbered without a gap. Long lists are shortened, each
    with the file that holds the rest.

    Parameters
    ----------
    run
        A finished run.

    Returns
    -------
    str
        HTML, to be written as UTF-8.
    """
    areal = run.sourced.source.areal
    return render_template(
        "design.html",
        run=run,
        caution=run.caution,
        titles=_numbered(run),
        facts=design_facts.asked_facts(run),
        interest=design_facts.points_table(run),
        warnings=overview.note_groups(run.warnings),
        remarks=overview.note_groups(note for note in run.notes if note.level != "warning"),
        chain=design_chain_list.chain_sentences(run),
        chain_tables=design_chain_list.chain_tables(run),
        chain_pictures=design_chain_list.chain_pictures(run),
        chain_formulas=design_formulas.chain_formulas(run),
        reduction=design_reduction_list.reduction_facts(run),
        reduction_formula=[formula for formula in (design_formulas.used_reduction(run),) if formula is not None],
        compared=design_reduction_list.compared_tables(run),
        compared_formulas=[design_formulas.reduction_formula(other.method.name) for other in run.compared],
        patterns=design_pattern_list.pattern_facts(run),
        hyetograph_pictures=design_pictures(run.hyetographs, run.depth_unit),
        sub_basins=design_facts.sub_basins_words(run),
        depth_tables=design_storm_list.depth_tables(run),
        peak_tables=design_storm_list.peak_tables(run),
        hyetograph_tables=design_storm_list.hyetograph_tables(run),
        hyetograph_file=design_shown.hyetograph_file(run),
        points=[] if areal else design_point_list.point_sentences(run),
        point_tables=[]
        if areal
        else [table for table in (design_point_list.depths_table(run), design_point_list.weights_table(run)) if table],
        record=design_record_list.record_facts(run),
        record_pictures=_frequency_pictures(run),
        record_tables=[*design_record_list.depths_tables(run), *design_record_list.fit_tables(run)],
        record_formulas=design_formulas.record_formulas(run),
        maxima=design_record_list.maxima_table(run),
        rarity=design_rarity_list.rarity_facts(run),
        meaning=design_rarity_list.rarity_meaning(run),
        storms=design_rarity_list.rarity_shown(run),
        ground=design_facts.plane_facts(run),
        files=design_facts.files_table(run),
        inputs=provenance.inputs_table(run),
        versions=provenance.versions_table(run),
        settings=provenance.settings_text(run.settings),
    )


def _numbered(run: DesignRun) -> dict[str, str]:
    """Return the sections that apply, each with its number and title."""
    absent = {
        "reduction": not design_chain_list.reduces(run) and not run.compared,
        "points": run.sourced.source.areal,
        "record": run.from_record is None,
        "rarity": not run.rarities,
    }
    kept = [name for name in _TITLES if not absent.get(name, False)]
    return {name: f"{number} {_TITLES[name]}" for number, name in enumerate(kept, start=1)}


def _frequency_pictures(run: DesignRun) -> list[Picture]:
    if run.from_record is None:
        return []
    places = design_record_list.durations_drawn(run, MOST_PANELS)
    pictures = (
        frequency_picture(
            run.from_record, point.row, places, area=point.name, depth_unit=run.depth_unit, name=f"frequency-{number}"
        )
        for number, point in enumerate(design_shown.points(run), start=1)
    )
    return [picture for picture in pictures if picture is not None]

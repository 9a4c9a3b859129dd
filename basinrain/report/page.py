"""The report: one HTML file with everything in it, for a screen and for paper."""

from __future__ import annotations

from basinrain.report import effect_list, gauge_list, infill_list, limits, means, overview, provenance, shares, timing
from basinrain.report.comparison_list import choice_tables
from basinrain.report.fitness import fitness
from basinrain.report.map_figure import map_pictures
from basinrain.report.rendering import render_template
from basinrain.report.weights_figure import weights_pictures
from basinrain.results import StormRun

__all__ = ["render_report"]


def render_report(run: StormRun) -> str:
    """Return the report of a run as one HTML page.

    The page holds no script and asks for nothing: style and figures are inside it. The same run gives the same text,
    letter for letter. Depths are printed to 0.1 mm or 0.01 in, weights to 3 decimals; what is not known is a dash,
    never zero. Large runs are shortened, each time with the file that holds the rest.

    Parameters
    ----------
    run
        A finished run.

    Returns
    -------
    str
        HTML, to be written as UTF-8.
    """
    drawn = limits.drawn_storms(run)
    return render_template(
        "report.html",
        run=run,
        caution=run.caution,
        asked=overview.what_was_asked(run),
        storms_asked=overview.storms_asked(run),
        warnings=overview.note_groups(run.warnings),
        remarks=overview.note_groups(note for note in run.notes if note.level != "warning"),
        summary=means.summary(run),
        details=means.details(run),
        maps=map_pictures(run),
        weight_tables=[(result.storm.name, shares.weight_tables(run, result)) for result in drawn],
        weight_pictures=weights_pictures(run),
        weights_left_out=limits.left_out(run, "weights.csv"),
        listed_weight=limits.LISTED_WEIGHT,
        times=[timing.storm_times(run, result, k) for k, result in enumerate(drawn, start=1)],
        times_left_out=limits.left_out(run, "hyetographs.csv"),
        network=gauge_list.network_table(run),
        totals=gauge_list.totals_tables(run),
        estimates=infill_list.estimate_tables(run),
        infilled=infill_list.infilled_shares(run),
        fitness=fitness(run),
        effects=effect_list.storm_effects(run),
        choice=run.comparison.reason if run.comparison else "",
        choice_tables=choice_tables(run.comparison, depth_unit=run.depth_unit),
        ground=provenance.ground_facts(run),
        formulas=provenance.formulas(run),
        inputs=provenance.inputs_table(run),
        versions=provenance.versions_table(run),
        settings=provenance.settings_text(run.settings),
    )

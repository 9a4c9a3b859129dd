"""The page of a run over the whole record: what its series come to, and what they rest on."""

from __future__ import annotations

from basinrain.report import (
    found_list,
    greatest_list,
    long_term_list,
    network_list,
    overview,
    provenance,
    series_facts,
    series_names,
    years_list,
)
from basinrain.report.duration_figure import duration_pictures
from basinrain.report.fitness import fitness
from basinrain.report.found_figure import found_pictures
from basinrain.report.left_out_figure import left_out_picture
from basinrain.report.network_figure import network_picture
from basinrain.report.rendering import render_template
from basinrain.report.years_figure import years_picture
from basinrain.results_series import SeriesRun

__all__ = ["render_series"]


def render_series(run: SeriesRun) -> str:
    """Return the report of a run over the whole record as one HTML page.

    As :func:`basinrain.report.render_report`: no script, nothing fetched, the same text on every repeat. Figures and
    most tables are of the union, or of the only basin. Long lists are shortened, each with the file that holds the
    rest; of the series themselves only the storms that are shown are read.

    Parameters
    ----------
    run
        A finished run, its store open.

    Returns
    -------
    str
        HTML, to be written as UTF-8.
    """
    infilled = [run.setup.infill.method] if set(run.setup.gaps) != {"reweight"} else []
    return render_template(
        "series.html",
        run=run,
        caution=run.caution,
        facts=series_facts.record_facts(run),
        basin=run.basins.ids[series_names.lead_basin(run)],
        warnings=overview.note_groups(run.warnings),
        remarks=overview.note_groups(note for note in run.notes if note.level != "warning"),
        means=long_term_list.means_table(run),
        rests=long_term_list.rests_table(run),
        changes=network_list.changes_sentence(run),
        network=network_picture(run),
        changes_table=network_list.changes_table(run),
        left_out=long_term_list.left_out_sentence(run),
        left_out_picture=left_out_picture(run),
        left_out_table=long_term_list.left_out_table(run),
        years=years_list.years_sentence(run),
        years_picture=years_picture(run),
        period_tables=[table for table in (years_list.years_table(run), years_list.months_table(run)) if table],
        greatest=greatest_list.greatest_sentence(run),
        duration_pictures=duration_pictures(run),
        greatest_tables=greatest_list.greatest_tables(run),
        found=found_list.found_sentences(run),
        found_pictures=found_pictures(run),
        found_tables=found_list.found_tables(run),
        incomplete=found_list.incomplete_table(run),
        policies=series_facts.policy_facts(run),
        marks=series_facts.flag_facts(),
        ways=[*series_facts.ways_facts(run), *provenance.ground_facts(run)],
        formulas=[*provenance.mean_formulas(run.setup.methods), *provenance.infill_formulas(infilled)],
        fitness=fitness(run),
        files=series_facts.files_table(run),
        inputs=provenance.inputs_table(run),
        versions=provenance.versions_table(run),
        settings=provenance.settings_text(run.settings),
    )

"""The page of a comparison of infill methods, and of the record that was completed by the one that was taken."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.infill import Completed, InfillOptions
from basinrain.rainfall import Status
from basinrain.report import comparison_list, completed_list, effect_list, infill_list, overview, provenance
from basinrain.report.error_map_figure import error_map_picture
from basinrain.report.estimated_figure import estimated_picture
from basinrain.report.fitness import fitness
from basinrain.report.rendering import render_template
from basinrain.report.scores_figure import scores_picture
from basinrain.report.words import counted, percent_text
from basinrain.results import InfillRun

__all__ = ["render_comparison"]

_CAUTION: Final = (
    "Gauge sites are not the basin: the scores are those of estimating gauges from their neighbours. They show which "
    "method suits this network, not how well the rain over the basin is known."
)


def render_comparison(run: InfillRun) -> str:
    """Return a comparison of infill methods and what was infilled as one HTML page.

    As :func:`basinrain.report.render_report`: no script, nothing fetched, the same text on every repeat. Errors are
    printed with one decimal more than depths. Long lists are shortened, each with the file that holds the rest.

    Parameters
    ----------
    run
        A finished run.

    Returns
    -------
    str
        HTML, to be written as UTF-8.
    """
    comparison, unit = run.comparison, run.depth_unit
    pictures = (estimated_picture(comparison, depth_unit=unit), scores_picture(comparison, depth_unit=unit))
    told = {note.text for note in comparison.notes}
    labels = (*comparison.candidates, *comparison.skipped)
    methods = dict.fromkeys(label.split(" (")[0] for label in labels)
    return render_template(
        "comparison.html",
        run=run,
        caution=_CAUTION,
        reason=comparison.reason,
        facts=[*comparison_list.comparison_facts(comparison), ("Infilled by", _infilled_by(run))],
        warnings=overview.note_groups(run.warnings),
        remarks=overview.note_groups(note for note in run.notes if note.level != "warning" and note.text not in told),
        pictures=[picture for picture in pictures if picture],
        scores=comparison_list.choice_tables(comparison, depth_unit=unit),
        rules=list(dict.fromkeys(note.text for note in comparison.notes)),
        formulas=provenance.infill_formulas(methods),
        map=error_map_picture(comparison, run.network, run.basins, depth_unit=unit),
        by_gauge=comparison_list.gauge_table(comparison, depth_unit=unit),
        filled=_filled(run.completed),
        completed=[
            table
            for table in (
                completed_list.completed_table(run.completed, depth_unit=unit),
                completed_list.left_table(run.completed),
            )
            if table
        ],
        infilled=infill_list.infilled_shares(run),
        effects=effect_list.storm_effects(run),
        fitness=fitness(run),
        inputs=provenance.inputs_table(run),
        versions=provenance.versions_table(run),
        settings=provenance.settings_text(run.settings),
    )


def _infilled_by(run: InfillRun) -> str:
    settings = run.settings["infill"]
    return InfillOptions(method=settings["method"], power=settings.get("power")).label


def _filled(completed: Completed) -> str:
    record = completed.record
    filled = record.status == Status.INFILLED
    in_service = record.status != Status.NOT_INSTALLED
    if not filled.any():
        return "Nothing was infilled."
    methods = ", ".join(dict.fromkeys(estimate.method for estimate in completed.estimates))
    scales = " and ".join(dict.fromkeys(estimate.scale for estimate in completed.estimates))
    n = int(np.count_nonzero(filled))
    share = percent_text(n / int(np.count_nonzero(in_service)))
    return (
        f"{counted(n, 'value was', 'values were')} infilled ({share} of those in service) "
        f"by {methods} at the scale of the {scales}. A gauge not in service is not infilled, and no infilled "
        "value is a donor."
    )

"""The page of a screening: is the record fit to use."""

from __future__ import annotations

from typing import Final

from basinrain.report import check_list, consistency_list, findings_list, overview, provenance, screened_list
from basinrain.report.availability_figure import availability_picture
from basinrain.report.double_mass_figure import double_mass_pictures
from basinrain.report.edit_list import edit_table
from basinrain.report.rendering import render_template
from basinrain.report.words import zone_text
from basinrain.results import ScreenRun

__all__ = ["render_screening"]

_CAUTION: Final = (
    "A finding is a reason to look, not a proof, and a record without findings may still be wrong. A high value may be "
    "the storm: none is dropped unless the job says so. Whoever rejects or edits values answers for it with a reason."
)


def render_screening(run: ScreenRun) -> str:
    """Return what screening found as one HTML page.

    As :func:`basinrain.report.render_report`: no script, nothing fetched, the same text on every repeat. Long lists are
    shortened, each with the file that holds the rest; the edit log never is.

    Parameters
    ----------
    run
        A finished run.

    Returns
    -------
    str
        HTML, to be written as UTF-8.
    """
    screening, record = run.screening, run.raw
    return render_template(
        "screening.html",
        run=run,
        caution=_CAUTION,
        facts=screened_list.record_facts(record),
        counts=findings_list.count_table(screening.findings) if screening.findings else None,
        warnings=overview.note_groups(run.warnings),
        remarks=overview.note_groups(note for note in run.notes if note.level != "warning"),
        # With what was rejected shown as such.
        availability=availability_picture(run.record),
        completeness=screened_list.completeness_table(run.record),
        found=findings_list.finding_sections(screening.findings, depth_unit=run.depth_unit),
        settled=findings_list.settled_table(screening.findings),
        clock=zone_text(record.zone),
        edits=edit_table(run.edit_rows, depth_unit=run.depth_unit),
        curves=consistency_list.curve_sentence(screening.double_mass),
        curve_pictures=double_mass_pictures(screening.double_mass, depth_unit=run.depth_unit),
        curve_table=consistency_list.double_mass_table(screening.double_mass),
        homogeneity=consistency_list.homogeneity_table(screening.homogeneity),
        checks=check_list.check_tables(screening),
        inputs=provenance.inputs_table(run),
        versions=provenance.versions_table(run),
        settings=provenance.settings_text(run.settings),
    )

"""The page of a run over the whole record: one series per basin, method and policy, and what they rest on."""

from __future__ import annotations

from basinrain.report import overview, provenance
from basinrain.report.rendering import render_template
from basinrain.results import CAUTION
from basinrain.results_series import SeriesRun

__all__ = ["render_series"]


def render_series(run: SeriesRun) -> str:
    """Return the report of a run over the whole record as one HTML page."""
    return render_template(
        "series.html",
        run=run,
        caution=CAUTION,
        warnings=overview.note_groups(run.warnings),
        inputs=provenance.inputs_table(run),
        versions=provenance.versions_table(run),
        settings=provenance.settings_text(run.settings),
    )

"""The small run, and its report, made once."""

from __future__ import annotations

import pytest
from report.small_run import make_run

from basinrain.notes import Note
from basinrain.report import render_report
from basinrain.results import StormRun


@pytest.fixture(scope="session")
def run() -> StormRun:
    """Return the plain run of one storm."""
    note = Note(code="one-gauge-dominates", text="Gauge A has 62 % of the weight in basin west.", basin="west")
    return make_run(notes=(note,))


@pytest.fixture(scope="session")
def html(run: StormRun) -> str:
    """Return its report."""
    return render_report(run)

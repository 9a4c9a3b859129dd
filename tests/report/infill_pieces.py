"""A run of a comparison and a completed record: the comparison made up, the record that of the small run."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from report.comparison_pieces import make_comparison
from report.small_run import make_run

from basinrain.infill.leave_one_out import Comparison
from basinrain.notes import Note
from basinrain.results import InfillRun


def make_infill_run(
    comparison: Comparison | None = None,
    *,
    notes: tuple[Note, ...] = (),
    **changes: Any,  # noqa: ANN401 - handed on
) -> InfillRun:
    """Return the run; other fields are those of the small storm run, as :func:`make_run` makes it."""
    base = make_run(**changes)
    comparison = make_comparison(base.network.ids) if comparison is None else comparison
    completed = base.storms[0].completed
    left = Note(code="not-infilled", text="Gauge F stays without a depth at 6 steps: no donor.", gauge="F")
    return InfillRun(
        name=base.name,
        settings=base.settings,
        depth_unit=base.depth_unit,
        area_unit=base.area_unit,
        network=base.network,
        basins=base.basins,
        plane=base.plane,
        record=base.record,
        storms=base.storms[:1],
        comparison=comparison,
        completed=replace(completed, notes=(left,)),
        notes=notes,
        inputs=base.inputs,
        versions=base.versions,
    )

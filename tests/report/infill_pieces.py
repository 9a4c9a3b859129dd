"""A run of a comparison and a completed record: the comparison made up, the record that of the small run."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from report.comparison_pieces import make_comparison
from report.small_run import make_run

from basinrain import run_infill
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


def run_three_gauges(folder: Path, *, gap: bool) -> InfillRun:
    """Return the run of a job: A and B a kilometre apart in one basin, C east of it, 1.5 km from B.

    On days 1 to 5, A has 21, B 22 and C 23 mm; on day 6, A has 5, C 7 and B 6 mm, or with a gap nothing.
    """
    rows: Sequence[tuple[object, ...]] = [
        (2, 3, 4),
        (9, 7, 5),
        (0, 4, 8),
        (6, 6, 6),
        (4, 2, 0),
        (5, "" if gap else 6, 7),
    ]
    (folder / "gauges.csv").write_text("id,x,y\nA,0,0\nB,1,0\nC,2.5,0\n")
    (folder / "basins.geojson").write_text(
        '{"type": "Polygon", "coordinates": [[[-1, -1], [2, -1], [2, 1], [-1, 1], [-1, -1]]]}'
    )
    (folder / "rain.csv").write_text(
        "\n".join(["date,A,B,C", *(f"2031-05-{4 + day:02d},{a},{b},{c}" for day, (a, b, c) in enumerate(rows))])
    )
    job = folder / "job.toml"
    job.write_text(
        '[job]\nname = "Three in a row"\n[gauges]\nfile = "gauges.csv"\ncrs = "local"\nlength_unit = "km"\n'
        '[rainfall]\nfile = "rain.csv"\nunit = "mm"\ninterval = "1d"\n'
        '[basins]\nfile = "basins.geojson"\ncrs = "local"\nlength_unit = "km"\n'
        "[infill]\nmethod = 'station-average'\n"
    )
    return run_infill(job)

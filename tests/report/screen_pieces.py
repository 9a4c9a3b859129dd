"""A screened record whose numbers are seeded: thirty years of months, with a break, gaps and rejected values."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np
import shapely

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.ground import LOCAL, Plane
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.results import ScreenRun
from basinrain.screening import Finding, Screening, screen
from basinrain.screening.consistency import consistency
from basinrain.screening.edits import SUGGESTED, Edit

IDS = ("A", "B", "C", "D", "E", "F")

EDIT_ROWS: tuple[dict[str, Any], ...] = (
    {
        "gauge": "B",
        "from": "2004-01-01T00:00:00",
        "to": "2004-03-01T00:00:00",
        "action": "scale",
        "value": 0.1,
        "reason": "logger set to 0.1 mm",
        "by": "J. Marrow",
        "date": "2031-06-01",
        "steps_changed": 2,
        "depth_before": 254.0,
        "depth_after": 25.4,
    },
    {
        "gauge": "C",
        "from": "",
        "to": "",
        "action": "reject",
        "value": None,
        "reason": "ice",
        "by": "J. Marrow",
        "date": "",
        "steps_changed": 1,
        "depth_before": 12.0,
        "depth_after": None,
    },
    {
        "gauge": "D",
        "from": "2005-01-01T00:00:00",
        "to": "2005-02-01T00:00:00",
        "action": "set",
        "value": 50.8,
        "reason": "read off the chart",
        "by": "J. Marrow",
        "date": "2031-06-02",
        "steps_changed": 1,
        "depth_before": None,
        "depth_after": 50.8,
    },
)


def make_monthly(ids: Sequence[str] = IDS, *, years: int = 30, seed: int = 5) -> RainRecord:
    """Return monthly depths; the third gauge read a third too little in the first half, the second has gaps."""
    rng = np.random.default_rng(seed)
    months = np.arange("2001-01", f"{2001 + years}-02", dtype="datetime64[M]").astype("datetime64[s]")
    n = len(months) - 1
    depth = rng.gamma(8.0, 10.0, (n, 1)) * rng.normal(1, 0.06, (n, len(ids)))
    if len(ids) > 2:
        depth[: n // 2, 2] *= 0.67
        depth[n - 20 : n - 10, 1] = np.nan
    return RainRecord.from_depths(tuple(ids), months[:-1], months[1:], np.maximum(depth, 0), step="1mo", zone="+02:00")


def make_findings() -> tuple[Finding, ...]:
    """Return findings of every severity and state, one with an edit and one about the network."""
    may = [np.datetime64(f"2004-05-{day:02d}", "s") for day in range(1, 9)]
    slow = Edit(gauge="B", start=may[0], end=may[3], action="shift", value="1h", reason="Slow clock.", by=SUGGESTED)
    return (
        Finding(
            check="missing-code",
            gauge="A",
            start=may[0],
            end=may[1],
            severity="erroneous",
            evidence="999.0 mm in one step.",
            action="Reject it.",
        ),
        Finding(
            check="shifted-record",
            gauge="B",
            start=may[0],
            end=may[3],
            evidence="An hour behind A and C.",
            action="Shift it.",
            others=("A", "C", "D"),
            edit=slow,
        ),
        Finding(
            check="stuck-values",
            gauge="B",
            start=may[4],
            end=may[5],
            evidence="0.4 mm stands at 14 steps on end.",
            action="Reject the stretch.",
            state="rejected",
        ),
        Finding(
            check="spatial-outlier",
            gauge="C",
            start=may[6],
            end=may[7],
            evidence="120.0 mm where the neighbours had 30.0.",
            action="Look at it.",
            state="accepted",
        ),
        Finding(
            check="reading-hours",
            gauge="",
            severity="remark",
            evidence="Two sets of reading hours.",
            action="State them.",
        ),
    )


def make_screen_run(
    record: RainRecord | None = None,
    *,
    screening: Screening | None = None,
    edit_rows: tuple[dict[str, Any], ...] = EDIT_ROWS,
    depth_unit: str = "mm",
    name: str = "Two squares",
    notes: tuple[Note, ...] = (),
) -> ScreenRun:
    """Return a run with real double-mass curves and tests, and the made-up findings unless others are given."""
    raw = make_monthly() if record is None else record
    rng = np.random.default_rng(1)
    x, y = rng.uniform(0, 20e3, len(raw.gauges)), rng.uniform(0, 10e3, len(raw.gauges))
    network = GaugeNetwork(ids=raw.gauges, x=x, y=y, crs=LOCAL)
    if screening is None:
        years = consistency(raw, network)
        screening = replace(
            screen(raw, network),
            findings=make_findings(),
            double_mass=years.double_mass,
            homogeneity=years.homogeneity,
        )
    kept = raw
    if len(raw) > 12:
        depth, status = raw.depth.copy(), raw.status.copy()
        depth[10:12, 0], status[10:12, 0] = np.nan, Status.REJECTED
        kept = replace(raw, depth=depth, status=status)
    return ScreenRun(
        name=name,
        settings={"job": {"name": name}},
        depth_unit=depth_unit,
        area_unit="km2",
        network=network,
        basins=Basins(ids=("west",), polygons=np.array([shapely.box(0, 0, 2e4, 1e4)]), crs=LOCAL),
        plane=Plane(LOCAL, "Local plane", 0.0),
        record=kept,
        raw=raw,
        screening=screening,
        edit_rows=edit_rows,
        notes=notes,
        inputs={"rain.csv": "0" * 64},
        versions={"basinrain": "0.1.0"},
    )

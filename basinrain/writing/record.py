"""The record of a run as one JSON document: what was asked, read, warned of and found."""

from __future__ import annotations

import json
import math
from typing import TYPE_CHECKING, Any, Final

from basinrain.results import InfillRun, ScreenRun, StormRun
from basinrain.results_common import GaugedRun, Run
from basinrain.results_design import DesignRun
from basinrain.results_series import SeriesRun

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["long_tables", "record_text", "run_record", "run_tables", "told_tables"]


_MOST_ROWS: Final = 50_000


def run_tables(run: Run) -> dict[str, pd.DataFrame]:
    """Return the run's tables under the names of their files."""
    own: dict[str, pd.DataFrame] = {}
    if isinstance(run, StormRun):
        own = {
            "basin_means": run.basin_means,
            "storms": run.storm_table,
            "spread": run.spread,
            "weights": run.weights,
            "weights_compared": run.weights_compared,
            "gauge_totals": run.gauge_totals,
            "gauge_depths": run.gauge_depths,
            "infilled": run.infilled,
            "infill_effect": run.infill_effect,
            "series_check": run.series_check,
            "hyetographs": run.hyetographs,
        }
        if run.comparison is not None:
            own["infill_scores"] = run.infill_scores
            own["infill_differences"] = run.infill_differences
    elif isinstance(run, ScreenRun):
        own = {
            "completeness": run.completeness,
            "double_mass": run.double_mass,
            "homogeneity": run.homogeneity,
        }
    elif isinstance(run, InfillRun):
        own = {
            "infill_scores": run.infill_scores,
            "infill_differences": run.infill_differences,
            "infilled": run.infilled,
            "infill_effect": run.infill_effect,
            "series_check": run.series_check,
        }
    elif isinstance(run, SeriesRun):
        own = {
            "series_means": run.series_means,
            "left_out_means": run.left_out_means,
            "network_changes": run.network_changes,
            "greatest_depths": run.greatest_depths,
            "storms_found": run.storms_found,
        }
    elif isinstance(run, DesignRun):
        own = {
            "design_depths": run.design_depths,
            "design_storms": run.design_storms,
            "point_depths": run.point_depths,
            "point_weights": run.point_weights,
            **_asked_tables(run),
        }
    if isinstance(run, GaugedRun):
        own |= {"findings": run.findings, "edits": run.edit_table}
    return own


def _asked_tables(run: DesignRun) -> dict[str, pd.DataFrame]:
    """Return the tables that a design has where its job asks for what they hold."""
    tables = {}
    if run.compared:
        tables["reductions_compared"] = run.reductions_compared
    if run.rarities:
        tables["storm_rarity"] = run.storm_rarity
    if run.from_record is not None:
        tables |= {"record_fits": run.record_fits, "annual_maxima": run.annual_maxima}
    return tables


def told_tables(run: Run) -> dict[str, pd.DataFrame]:
    """Return the tables of the record that are written in formats of their own, not as plain tables.

    Design hyetographs of more rows than a reader of JSON would bear are in their files only.
    """
    if not isinstance(run, DesignRun) or sum(storm.depth.size for storm in run.storms) > _MOST_ROWS:
        return {}
    return {"design_hyetographs": run.design_hyetographs}


def long_tables(run: Run) -> dict[str, pd.DataFrame]:
    """Return the tables that go to files only: of a long record they would make the JSON too large to read."""
    if isinstance(run, SeriesRun):
        return {"period_totals": run.period_totals}
    if not isinstance(run, InfillRun):
        return {}
    return {
        "infill_cases": run.infill_cases,
        f"completed_{run.depth_unit}": run.completed_depths,
        "completed_status": run.completed_status,
    }


def run_record(run: Run, files: list[str]) -> dict[str, Any]:
    """Return the whole run as plain values; a number that is missing is null.

    Parameters
    ----------
    run
        The run.
    files
        Names of the files written beside the record; empty when nothing is written.
    """
    return {
        "name": run.name,
        "caution": run.caution,
        "versions": dict(run.versions),
        "job": dict(run.settings),
        "inputs": {name: {"sha256": digest} for name, digest in run.inputs.items()},
        "files": files,
        "plane": {"name": run.plane.name, "crs": run.plane.crs, "largest_distortion": run.plane.distortion},
        **(_of_record(run) if isinstance(run, GaugedRun) else {}),
        "facts": dict(run.facts),
        "warnings": [_note(note) for note in run.notes if note.level == "warning"],
        "remarks": [_note(note) for note in run.notes if note.level == "info"],
        "results": {name: _rows(frame) for name, frame in {**run_tables(run), **told_tables(run)}.items()},
    }


def _of_record(run: GaugedRun) -> dict[str, Any]:
    return {
        "clock": run.record.zone or "as in the files",
        "step": run.record.step,
        "checks": {"run": list(run.screening.checks_run), "skipped": dict(run.screening.checks_skipped)},
    }


def _note(note: Any) -> dict[str, str]:  # noqa: ANN401 - Note; only its text fields are read
    fields = ("code", "text", "storm", "basin", "gauge", "method")
    return {field: getattr(note, field) for field in fields if getattr(note, field)}


def _rows(frame: pd.DataFrame) -> list[dict[str, Any]]:
    columns = {name: [_plain(value) for value in frame[name].tolist()] for name in frame.columns}
    names = list(columns)
    return [dict(zip(names, row, strict=True)) for row in zip(*columns.values(), strict=True)]


def _plain(value: Any) -> Any:  # noqa: ANN401 - a cell
    import pandas as pd

    return None if value is pd.NA or (isinstance(value, float) and not math.isfinite(value)) else value


def record_text(run: Run, files: list[str]) -> str:
    """Return :func:`run_record` as JSON text."""
    return json.dumps(run_record(run, files), indent=1, ensure_ascii=False, allow_nan=False) + "\n"

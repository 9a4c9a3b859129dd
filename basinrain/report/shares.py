"""Section 3: the weights of the methods side by side, and what every gauge contributed."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.report import limits
from basinrain.report.table import Row, Table
from basinrain.report.words import (
    DASH,
    NARROW_SPACE,
    counted,
    depth_text,
    depth_texts,
    number_text,
    unit_text,
    weight_text,
)
from basinrain.results import StormResult, StormRun
from basinrain.units import depth_factor

__all__ = ["weight_tables"]


def weight_tables(run: StormRun, result: StormResult) -> list[Table]:
    """Return one table a basin: gauge by method, the largest differences first, with contribution and share.

    Parameters
    ----------
    run, result
        The run and one of its storms.
    """
    return [_table(run, result, b) for b in limits.drawn_basins(run)]


def _table(run: StormRun, result: StormResult, b: int) -> Table:
    methods = list(result.depths)
    n = len(methods)
    mm = depth_factor(run.depth_unit)
    weights = np.array([depths.table.weights[b] for depths in result.depths.values()])
    given = np.array([depths.contribution[b] for depths in result.depths.values()]) / mm
    totals = np.array([depths.total[b] for depths in result.depths.values()]) / mm
    answered = ~np.isnan(weights).any(axis=1)
    spread = np.ptp(weights[answered], axis=0) if answered.any() else np.zeros(len(run.network))
    share = np.divide(given, totals[:, None], out=np.zeros_like(given), where=totals[:, None] > 0)
    matters = np.maximum(np.abs(np.nan_to_num(weights)).max(axis=0), np.abs(np.nan_to_num(share)).max(axis=0))
    counts = np.flatnonzero((np.nan_to_num(weights) != 0).any(axis=0) | (np.nan_to_num(given) != 0).any(axis=0))
    listed = sorted(
        (g for g in counts if matters[g] >= limits.LISTED_WEIGHT),
        key=lambda g: (-round(float(spread[g]), 12), run.network.ids[g]),
    )
    others = [g for g in counts if matters[g] < limits.LISTED_WEIGHT]
    lines = [[g] for g in listed] + ([others] if others else [])
    names = [run.network.ids[g] for g in listed]
    if others:
        names.append(f"{counted(len(others), 'other')}, together")
    shown = [_contributions(given[m], totals[m], lines, run.depth_unit) for m in range(n)]
    rows: list[Row] = []
    for k, (name, line) in enumerate(zip(names, lines, strict=True)):
        alone = len(line) == 1
        rows.append(
            (
                name,
                *(weight_text(float(weights[m, line].sum())) for m in range(n)),
                weight_text(float(spread[line[0]])) if alone and answered.sum() > 1 else DASH,
                *(shown[m][k] for m in range(n)),
            )
        )
    foot = (
        "sum",
        *(weight_text(float(weights[m].sum())) for m in range(n)),
        "",
        *(_cell(depth_text(totals[m], run.depth_unit), 1.0 if totals[m] > 0 else float("nan")) for m in range(n)),
    )
    unit = unit_text(run.depth_unit)
    return Table(
        caption=f"{result.storm.name}, basin {run.basins.ids[b]}: weights and contributions",
        heads=("gauge", *methods, "largest difference", *methods),
        over=(("", 1), ("weight", n), ("", 1), (f"contribution, {unit}, and its share of the mean", n)),
        align="t" + "n" * (2 * n + 1),
        rows=rows,
        foot=[foot],
    )


def _contributions(
    given: npt.NDArray[np.float64], total: float, lines: list[list[np.intp]] | list[list[int]], unit: str
) -> list[str]:
    parts = np.array([given[line].sum() for line in lines])
    shares = parts / total if total > 0 else np.full(len(parts), np.nan)
    return [_cell(text, float(share)) for text, share in zip(depth_texts(parts, unit), shares, strict=True)]


def _cell(depth: str, share: float) -> str:
    if depth == DASH:
        return DASH
    return depth if np.isnan(share) else f"{depth} ({number_text(100 * share, 1)}{NARROW_SPACE}%)"

"""Section 6: what was infilled, from which donors, and how much of the basin means rests on it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from basinrain.infill.completed import Estimate
from basinrain.report import limits
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, depth_text, percent_text, unit_word, weight_text, when_text, zone_text
from basinrain.results import AveragedRun, InfillRun, StormResult, StormRun
from basinrain.tables import share_infilled
from basinrain.units import depth_factor

__all__ = ["estimate_tables", "infilled_shares"]


def estimate_tables(run: StormRun) -> list[Table]:
    """Return the estimates of every storm that has any, one by one or, where there are many, gauge by gauge."""
    tables = []
    for result in run.storms:
        estimates = result.completed.estimates
        if estimates:
            tables.append(_each(run, result) if len(estimates) <= limits.ESTIMATES else _by_gauge(run, result))
    return tables


def _donors(donors: Mapping[str, float]) -> str:
    return ", ".join(f"{gauge} {weight_text(w)}" for gauge, w in sorted(donors.items(), key=lambda d: (-d[1], d[0])))


def _each(run: StormRun, result: StormResult) -> Table:
    mm = depth_factor(run.depth_unit)
    record = result.completed.record
    rows: list[Row] = []
    for e in result.completed.estimates:
        when = DASH if e.scale == "storm" else when_text(record.ends[e.stop - 1])
        depth = depth_text(e.depth / mm, run.depth_unit)
        rows.append((e.gauge, e.scale, when, depth, e.method, _donors(e.donors)))
    return Table(
        caption=f"{result.storm.name}: estimates, {unit_word(run.depth_unit)}",
        heads=(
            "gauge",
            "scale",
            f"ending, {zone_text(run.record.zone)}",
            "depth",
            "method",
            "donors and their weights",
        ),
        align="tttntt",
        rows=rows,
        notes=(
            "An estimate is the weighted sum of the donors' depths over the same time.",
            "That of a day or storm is the whole total, what was observed of it included.",
        ),
    )


def _by_gauge(run: StormRun, result: StormResult) -> Table:
    groups: dict[tuple[str, str, str], list[Estimate]] = {}
    for e in result.completed.estimates:
        groups.setdefault((e.gauge, e.scale, e.method), []).append(e)
    mm = depth_factor(run.depth_unit)
    record = result.completed.record
    rows: list[Row] = []
    for (gauge, scale, method), estimates in list(groups.items())[: limits.GAUGES]:
        first, last = estimates[0], estimates[-1]
        rows.append(
            (
                gauge,
                scale,
                str(len(estimates)),
                when_text(record.ends[first.stop - 1]),
                when_text(record.ends[last.stop - 1]),
                depth_text(sum(e.depth for e in estimates) / mm, run.depth_unit),
                method,
                _donor_ranges(estimates),
            )
        )
    more = len(groups) - len(rows)
    return Table(
        caption=f"{result.storm.name}: estimates by gauge, {unit_word(run.depth_unit)}",
        heads=(
            "gauge",
            "scale",
            "estimates",
            f"first ending, {zone_text(run.record.zone)}",
            "last ending",
            "sum",
            "method",
            "donors, least to greatest weight",
        ),
        align="ttnttntt",
        rows=rows,
        notes=("Every single estimate is in infilled.csv." + (f" {more} more gauges are only there." if more else ""),),
    )


def _donor_ranges(estimates: Sequence[Estimate]) -> str:
    weights: dict[str, list[float]] = {}
    for e in estimates:
        for gauge, weight in e.donors.items():
            weights.setdefault(gauge, []).append(weight)
    texts = []
    for gauge, values in sorted(weights.items(), key=lambda d: (-len(d[1]), d[0]))[:8]:
        least, most = weight_text(min(values)), weight_text(max(values))
        texts.append(f"{gauge} {least}" if least == most else f"{gauge} {least} to {most}")
    if len(weights) > 8:
        texts.append(f"{len(weights) - 8} more")
    return ", ".join(texts)


def infilled_shares(run: AveragedRun) -> Table | None:
    """Return the share of the basin means that rests on estimates, where there is any; None where there is none.

    The whole record of a comparison is not named in its lines, since there is no other.
    """
    whole = isinstance(run, InfillRun)
    rows: list[Row] = []
    for result in run.storms:
        share = np.array([share_infilled(result, method) for method in result.depths])
        storm = () if whole else (result.storm.name,)
        rows += [
            (*storm, run.basins.ids[b], *(percent_text(float(s)) for s in share[:, b]))
            for b in limits.drawn_basins(run)
            if (np.nan_to_num(share[:, b]) > 0).any()
        ]
    if not rows:
        return None
    heads = ("basin",) if whole else ("storm", "basin")
    file = "infill_effect.csv" if whole else "basin_means.csv"
    return Table(
        caption="Share of the basin means that rests on infilled values",
        heads=(*heads, *run.methods),
        align="t" * len(heads) + "n" * len(run.methods),
        rows=rows,
        notes=(f"Basins without any are left out. All shares are in {file}.",),
    )

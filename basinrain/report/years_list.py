"""Totals of the water years and means of the months of a record."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.clocks import MONTHS
from basinrain.report import series_names
from basinrain.report.long_term_list import year_rule
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, depth_decimals, depth_text, number_text, percent_text, unit_word
from basinrain.results_series import SeriesRun
from basinrain.series.summary import SeriesSummary
from basinrain.units import depth_factor

__all__ = ["YEARS", "months_table", "years_sentence", "years_table"]

YEARS: Final = 60
"""Water years that are listed, the last."""


def years_sentence(run: SeriesRun) -> str:
    """Return the rule of completeness, and how many years and months of the lead basin fulfil it."""
    b = series_names.lead_basin(run)
    first = run.summaries[run.setup.series[0]]
    years, months = ((~np.isnan(totals.total[:, b])).sum() for totals in (first.water_years, first.months))
    text = (
        f"{year_rule(run)} The same holds for months. In basin {run.basins.ids[b]} {years} of "
        f"{len(first.water_years.names)} water years and {months} of {len(first.months.names)} months are complete "
        f"by {series_names.series_word(run.setup.series[0])}; period_totals.csv has them all, with calendar years."
    )
    straddling = max(first.water_years.straddling, first.months.straddling)
    if straddling:
        text += " A step that lies in two months belongs whole to the one that holds its middle."
    return text


def years_table(run: SeriesRun) -> Table | None:
    """Return the totals of the lead basin's water years by every listed series; None where none is complete."""
    b, mm, series = series_names.lead_basin(run), depth_factor(run.depth_unit), series_names.listed(run)
    found = [run.summaries[one] for one in series]
    totals = np.array([summary.water_years.total[:, b] for summary in found]) / mm
    if np.isnan(totals).all():
        return None
    share = np.min([summary.water_years.share[:, b] for summary in found], axis=0)
    names = found[0].water_years.names
    first = max(0, len(names) - YEARS)
    rows: list[Row] = [
        (names[y], *(depth_text(float(value), run.depth_unit) for value in totals[:, y]), percent_text(float(share[y])))
        for y in range(first, len(names))
    ]
    counts = (~np.isnan(totals)).sum(axis=1)
    foot: list[Row] = [
        ("mean", *(depth_text(_mean(row), run.depth_unit) for row in totals), ""),
        ("years", *(str(count) for count in counts), ""),
    ]
    heads, over = series_names.heads(run)
    notes = [f"{DASH}: not complete. Time with a number: the least of these series."]
    if first:
        notes.append(f"Shown: the last {YEARS} of {len(names)} years; mean and years are of all that are complete.")
    notes += series_names.left_out(run, "period_totals.csv")
    return Table(
        caption=f"Water years of basin {run.basins.ids[b]}: depth in {unit_word(run.depth_unit)}",
        heads=("water year", *heads, "time with a number"),
        over=(("", 1), *over, ("", 1)) if over else (),
        align="t" + "n" * (len(heads) + 1),
        rows=rows,
        foot=foot,
        notes=tuple(notes),
    )


def _mean(values: np.ndarray[tuple[int], np.dtype[np.float64]]) -> float:
    known = values[~np.isnan(values)]
    return float(known.mean()) if len(known) else float("nan")


def months_table(run: SeriesRun) -> Table | None:
    """Return the mean depths of the lead basin's calendar months, a line a series; None where none is complete."""
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    rows: list[Row] = []
    names = series_names.names(run)
    counts: list[list[int]] = []
    for series in series_names.listed(run):
        means, count = _month_means(run.summaries[series], b)
        counts.append(count)
        decimals = depth_decimals(run.depth_unit)
        rows.append((names[series], *(number_text(mean / mm, decimals) for mean in means)))
    if not any(map(any, counts)):
        return None
    least, most = np.min(counts, axis=0), np.max(counts, axis=0)
    foot = ("months", *(str(a) if a == z else f"{a}{DASH}{z}" for a, z in zip(least, most, strict=True)))
    return Table(
        caption=f"Means of the complete months of basin {run.basins.ids[b]}: depth in {unit_word(run.depth_unit)}",
        heads=("series", *(month[:3] for month in MONTHS)),
        align="t" + "n" * len(MONTHS),
        rows=rows,
        foot=[foot],
        notes=("Months: how many are complete.", *series_names.left_out(run, "period_totals.csv")),
    )


def _month_means(summary: SeriesSummary, b: int) -> tuple[list[float], list[int]]:
    which = summary.months.starts.astype("datetime64[M]").astype(np.int64) % len(MONTHS)
    total = summary.months.total[:, b]
    by_month = [total[(which == m) & ~np.isnan(total)] for m in range(len(MONTHS))]
    return [_mean(values) for values in by_month], [len(values) for values in by_month]

"""What the series of a record come to, by method and policy, and what of it hangs on single gauges."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.basins import UNION
from basinrain.clocks import MONTHS
from basinrain.report import limits, series_names
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, NARROW_SPACE, counted, depth_text, number_text, percent_text, unit_word
from basinrain.results_series import SeriesRun
from basinrain.series.long_term import LeftOut
from basinrain.units import depth_factor

__all__ = [
    "GAUGES",
    "has_years",
    "left_out_sentence",
    "left_out_table",
    "means_table",
    "most_moving",
    "rests_table",
    "year_rule",
]

GAUGES: Final = 20
"""Gauges left out in turn that are shown."""

_YEAR: Final = np.timedelta64(365, "D")

Floats = npt.NDArray[np.float64]


def has_years(run: SeriesRun) -> bool:
    """Return whether any basin has a complete water year by any series."""
    return any(bool((summary.annual.years > 0).any()) for summary in run.summaries.values())


def year_rule(run: SeriesRun) -> str:
    """Return the rule of completeness in a sentence."""
    settings = run.settings["series"]
    return (
        f"A water year begins with {MONTHS[settings['water_year'] - 1]} and has the name of the year in which it ends; "
        f"its total counts if {settings['complete'] * 100:g}{NARROW_SPACE}% of its time or more has a number, and is "
        "not scaled up for the rest."
    )


def means_table(run: SeriesRun) -> Table:
    """Return the long-term means of the basins, policies side by side, with their difference to the first policy.

    Of many basins those whose means differ most between policies, or rest least on observed values.
    """
    gaps, mm, annual = run.setup.gaps, depth_factor(run.depth_unit), has_years(run)
    basins = _listed_basins(run)
    n = len(gaps)
    rows: list[Row] = []
    for b in basins:
        for method in run.setup.methods:
            found = [run.summaries[policy, method] for policy in gaps]
            values = [s.annual.of_years[b] if annual else s.terms.total[b] for s in found]
            counts = [int(s.annual.years[b] if annual else s.terms.steps[b]) for s in found]
            rows.append(
                (
                    run.basins.ids[b],
                    method,
                    *(depth_text(float(value) / mm, run.depth_unit) for value in values),
                    _from_to(counts),
                    *(number_text(float(_percents(run, policy, method)[b]), 1) for policy in gaps[1:]),
                    percent_text(float(found[0].terms.observed_share[b])),
                )
            )
    unit = unit_word(run.depth_unit)
    what = f"mean annual depth, {unit}" if annual else f"depth of the record, {unit}"
    notes = [
        "Depths: means of the complete water years. Years: how many they are."
        if annual
        else "No water year is complete: depths are sums of the steps that have a number. Steps: how many they are.",
    ]
    if n > 1:
        notes.append(
            f"Difference: of the mean depth of all steps that have a number, in per cent of that by '{gaps[0]}'."
        )
    notes.append(
        "Observed share: with the weights of all gauges in service, the share that lay on gauges that report, mean of "
        f"the steps{f' by {gaps[0]!r}' if n > 1 else ''}."
    )
    if any(DASH in row[n + 2] for row in rows):
        notes.append(
            f"Where {'years' if annual else 'steps'} differ between policies, the depths are not of the same "
            f"{'years' if annual else 'steps'}."
        )
    others = len(run.basins) - len(basins)
    if others:
        by = "whose means differ most between policies" if n > 1 else "with the smallest observed shares"
        notes.append(
            f"Shown: the union and the {len(basins) - 1} basins {by}; the {others} others are in series_means.csv."
            if UNION in run.basins.ids
            else f"Shown: the {len(basins)} basins {by}; the {others} others are in series_means.csv."
        )
    over = (("", 2), (what, n), ("", 1), (f"difference to {gaps[0]}, %", n - 1), ("", 1)) if n > 1 else ()
    return Table(
        caption=f"{what[0].upper()}{what[1:]}, by averaging method and policy for gaps"
        if n > 1
        else f"{what[0].upper()}{what[1:]}, by averaging method",
        heads=(
            "basin",
            "method",
            *(gaps if n > 1 else (what,)),
            "years" if annual else "steps",
            *gaps[1:],
            "observed share",
        ),
        over=over,
        align="tt" + "n" * (2 * n + 1),
        rows=rows,
        notes=tuple(notes),
    )


def _from_to(counts: list[int]) -> str:
    least, most = (number_text(count, 0, grouped=True) for count in (min(counts), max(counts)))
    return least if least == most else f"{least}{DASH}{most}"


def _percents(run: SeriesRun, policy: str, method: str) -> Floats:
    """Return by how many per cent the mean depth of a step is above that by the first policy, shape (n_basins,)."""
    return run.summaries[policy, method].terms.percent_above(run.summaries[run.setup.gaps[0], method].terms)


def _listed_basins(run: SeriesRun) -> list[int]:
    """Return the rows of all of a few basins, else of those to look at first; the union last."""
    union = [b for b, basin in enumerate(run.basins.ids) if basin == UNION]
    basins = [b for b in range(len(run.basins)) if b not in union]
    if len(basins) > limits.BASINS:
        gaps = run.setup.gaps
        moves = [np.abs(_percents(run, policy, method)) for policy in gaps[1:] for method in run.setup.methods]
        most = np.nan_to_num(np.max(np.nan_to_num(moves), axis=0)) if moves else np.zeros(len(run.basins))
        share = np.min([np.nan_to_num(s.terms.observed_share) for s in run.summaries.values()], axis=0)
        order = sorted(basins, key=lambda b: (-round(float(most[b]), 9), round(float(share[b]), 9), b))
        basins = sorted(order[: limits.BASINS])
    return basins + union


def rests_table(run: SeriesRun) -> Table:
    """Return what the series of the union, or the only basin, rest on: one line a series."""
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    long = run.ends[-1] - run.starts[0] >= _YEAR
    rows: list[Row] = []
    for policy, method in series_names.listed(run):
        found = run.summaries[policy, method]
        terms = found.terms
        rows.append(
            (
                method,
                policy,
                *((depth_text(float(found.annual.of_steps[b]) / mm, run.depth_unit),) if long else ()),
                *(
                    number_text(int(count[b]), 0, grouped=True)
                    for count in (terms.steps, terms.missing, terms.infilled, terms.reweighted)
                ),
                percent_text(float(terms.observed_share[b])),
            )
        )
    notes = [
        "Missing: steps without a number, which are not zero.",
        "Infilled: steps whose value rests in part on infilled depths.",
        "Reweighted: steps at which a gauge in service that has weight had no depth, so that the others have more.",
    ]
    if long:
        notes.append(
            "Mean of all steps: scaled to a year of 365.2425 days; where gaps favour a season, no mean annual depth."
        )
    return Table(
        caption=f"What the series of basin {run.basins.ids[b]} rest on",
        heads=(
            "method",
            "policy",
            *((f"mean of all steps, {unit_word(run.depth_unit)} a year",) if long else ()),
            "steps with a number",
            "missing",
            "infilled",
            "reweighted",
            "observed share",
        ),
        align="tt" + "n" * (6 if long else 5),
        rows=rows,
        notes=(*notes, *series_names.left_out(run, "series_means.csv")),
    )


def most_moving(run: SeriesRun) -> dict[str, dict[series_names.Series, LeftOut]]:
    """Return the gauges that were left out, by listed series; those that move the lead basin's mean most first."""
    b, shown = series_names.lead_basin(run), set(series_names.listed(run))
    by_gauge: dict[str, dict[series_names.Series, LeftOut]] = {}
    for found in run.left_out:
        if (found.gaps, found.method) in shown:
            by_gauge.setdefault(found.gauge, {})[found.gaps, found.method] = found

    def moves(gauge: str) -> tuple[float, float, str]:
        parts = by_gauge[gauge].values()
        lead = max(float(np.nan_to_num(np.abs(found.percent[b]))) for found in parts)
        anywhere = max(float(np.nan_to_num(np.abs(found.percent)).max()) for found in parts)
        return -round(lead, 9), -round(anywhere, 9), gauge

    return {gauge: by_gauge[gauge] for gauge in sorted(by_gauge, key=moves)[:GAUGES]}


def left_out_sentence(run: SeriesRun) -> str:
    """Return what was tried, or why nothing was."""
    if run.left_out:
        n = len({found.gauge for found in run.left_out})
        return (
            f"{counted(n, 'gauge was', 'gauges were')} left out, one at a time, as if it had never been there, and the "
            "whole record was averaged anew. What is compared is the mean of the steps that have a number either way."
        )
    if run.settings["series"].get("leave_out") is None and not len(run.record):
        return (
            "No gauge was left out in turn: the record was read chunk by chunk. Those named under [series] leave_out "
            "would be."
        )
    return "No gauge was left out in turn: the job names none."


def left_out_table(run: SeriesRun) -> Table | None:
    """Return by how much the mean changes without each gauge, in the lead basin and where it changes most."""
    gauges = most_moving(run)
    if not gauges:
        return None
    b, series = series_names.lead_basin(run), series_names.listed(run)
    several = len(run.basins) > 1
    rows: list[Row] = []
    for gauge, found in gauges.items():
        cells = [number_text(float(found[one].percent[b]), 1) if one in found else DASH for one in series]
        rows.append((gauge, *cells, *(_worst(run, found) if several else ())))
    names, over = series_names.heads(run)
    n = len({one.gauge for one in run.left_out})
    notes = [f"{DASH}: without the gauge there is no number to compare."] if _blank(rows, len(series)) else []
    if len(rows) < n:
        notes.append(f"Shown: the {len(rows)} of {n} gauges that move this basin's mean most.")
    if several:
        notes.append("On the right the basin whose mean changes most, by any of these series.")
    notes.append("All basins are in left_out_means.csv.")
    basin = run.basins.ids[b]
    methods = over or ((f"basin {basin}", len(names)),)
    return Table(
        caption=f"Change of the mean of basin {basin} without each gauge, %",
        heads=("gauge", *names, *(("largest", "in basin") if several else ())),
        over=(("", 1), *methods, *((("any basin", 2),) if several else ())),
        align="t" + "n" * len(names) + ("nt" if several else ""),
        rows=rows,
        notes=tuple(notes),
    )


def _blank(rows: list[Row], n: int) -> bool:
    return any(cell == DASH for row in rows for cell in row[1 : n + 1])


def _worst(run: SeriesRun, found: dict[series_names.Series, LeftOut]) -> Row:
    percents = np.array([one.percent for one in found.values()])
    if np.isnan(percents).all():
        return DASH, DASH
    k, b = np.unravel_index(int(np.nanargmax(np.abs(percents))), percents.shape)
    if not round(float(abs(percents[k, b])), 1):
        return number_text(0.0, 1), DASH
    return number_text(float(percents[k, b]), 1), run.basins.ids[b]

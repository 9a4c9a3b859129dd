"""Areal reduction: the method with where it holds, and others beside it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

from basinrain.design_reduction import stated_options
from basinrain.designstorm.areal_reduction import REDUCTIONS, Limits
from basinrain.designstorm.areal_reduction.limits import area_words, between_words
from basinrain.designstorm.measures import duration_text
from basinrain.report import design_shown
from basinrain.report.design_chain_list import reduces
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, area_text, number_text, unit_text
from basinrain.results_design import ComparedReduction, DesignRun
from basinrain.units import area_factor

__all__ = ["compared_tables", "reduction_facts"]

_DECIMALS: Final = 4


def reduction_facts(run: DesignRun) -> list[tuple[str, str]]:
    """Return what is to be known of the areal reduction of the design, each a name and a text."""
    table = run.asked.design.areal_reduction
    if table is None or not reduces(run):
        return []
    method = REDUCTIONS[table.method]
    where = f"{method.region_words}; the design is for {run.asked.design.jurisdiction or 'a place not stated'}"
    lines = [("Method", method.title), ("For", where)]
    if table.region is not None:
        lines.append(("Region", table.region))
    own = not method.jurisdiction
    seen = "the job's own values, not checked" if own else "the source, or a copy of it, was seen"
    lines += [
        ("Source", table.source if own else method.source),
        ("Evidence", method.evidence or seen),
        ("Range", _range(run)),
        ("Area that decides", _area(run)),
        (
            "Outside the range",
            "taken at its nearest end, with a warning" if table.outside == "clamp" else "refused",
        ),
    ]
    clamped = dict.fromkeys(text for links in run.links.values() for text in links.clamped)
    lines.append(("Taken at an end", " ".join(clamped) or "nothing was outside the range"))
    return lines


def _range(run: DesignRun) -> str:
    table = run.asked.design.areal_reduction
    if table is None:
        return DASH
    method = REDUCTIONS[table.method]
    if table.method == "table":
        return f"the durations and areas of {table.file}"
    return range_words(method.limits(**stated_options(table.method, table)))


def range_words(limits: Limits) -> str:
    """Return where a method holds.

    Examples
    --------
    >>> range_words(Limits(minutes=(30, 1440), smallest_area=1e7, largest_areas=((0, 1e9),)))
    'durations 30 min to 24 h; areas 10 to 1000 km²'
    >>> range_words(Limits(minutes=(1, 10080), largest_areas=((0, 1e9), (1440, 3e10)), aep=(0.0005, 0.5)))
    'durations 1 min to 7 days; areas up to 1000 km² below 24 h, else up to 30000 km²; AEP 0.0005 to 0.5'
    >>> range_words(Limits())
    'durations: none is stated; areas: none is stated'
    """
    low, high = limits.minutes
    if low == 0 and math.isinf(high):
        words = ["durations: none is stated"]
    elif math.isinf(high):
        words = [f"durations from {duration_text(low)}"]
    else:
        words = [f"durations {between_words(duration_text(low), duration_text(high))}"]
    largest = [area for _, area in limits.largest_areas]
    parts = []
    for k, area in enumerate(largest):
        last = k == len(largest) - 1 and k > 0
        most = area_words(area, limits.area_unit)
        lead = f"{area_words(limits.smallest_area, 'km2').removesuffix(' km²')} to" if limits.smallest_area else "up to"
        parts.append(f"{'else ' if last else ''}{lead} {most}{limits.below_words(area)}")
    if math.isinf(largest[-1]):
        least = f" from {area_words(limits.smallest_area)}" if limits.smallest_area else ": none is stated"
        words.append(f"areas{least}")
    else:
        words.append(f"areas {', '.join(parts)}")
    if limits.aep is not None:
        words.append(f"AEP {limits.aep[0]:g} to {limits.aep[1]:g}")
    return "; ".join(words)


def _area(run: DesignRun) -> str:
    if run.asked.design.own_area:
        return "that of each basin by itself, since the job says so"
    m2 = area_factor(run.area_unit)
    points = [
        f"{point.name} {area_text(run.links[point.name, run.asked.frequencies[0]].reduced_area / m2)} "
        f"{unit_text(run.area_unit)}"
        for point in run.areas.points
    ]
    return f"that of all basins above the point of interest as one: {design_shown.cut(points, design_shown.AREAS)}"


def compared_tables(run: DesignRun) -> list[tuple[str, Table]]:
    """Return other areal reductions beside that of the design, each table with the heading that it must have."""
    groups = (
        ("Outside their region, for comparison only", [other for other in run.compared if other.outside]),
        ("Others for the region, for comparison", [other for other in run.compared if not other.outside]),
    )
    return [(heading, _compared(run, others)) for heading, others in groups if others]


def _compared(run: DesignRun, others: Sequence[ComparedReduction]) -> Table:
    table = run.asked.design.areal_reduction
    own = table.method if table is not None and reduces(run) else "no reduction"
    often = design_shown.frequencies(run) if _varies(run, others) else [run.asked.frequencies[-1]]
    rows: list[Row] = []
    reasons: dict[str, None] = {}
    for area in design_shown.reduced(run):
        for frequency in often:
            links = run.links[area.name, frequency]
            for minutes in design_shown.durations(run):
                key = (area.name, frequency, minutes)
                factor = float(links.reduction[run.asked.minutes.index(minutes)])
                cells = [number_text(other.factors.get(key, math.nan), _DECIMALS) for other in others]
                reasons.update(
                    (f"{other.method.name}, {area.name}, {duration_text(minutes)}: {other.reasons[key]}.", None)
                    for other in others
                    if key in other.reasons
                )
                name = area.name if len(often) == 1 else f"{area.name}, {frequency.label}"
                rows.append((name, duration_text(minutes), number_text(factor, _DECIMALS), *cells))
    whose = "basin" if any(area.basin for area in run.reduced) else "point of interest"
    told = list(reasons)
    notes = [
        *(f"{other.method.name}: {other.method.title}, for {other.region}." for other in others),
        *([f"{DASH}: no answer. {' '.join(told[:4])}"] if told else []),
        *(["Other reasons are in reductions_compared.csv."] if told[4:] else []),
        *design_shown.left_out(run, "reductions_compared.csv", areas=True),
    ]
    if len(often) == 1 and len(run.asked.frequencies) > 1:
        notes.insert(0, "The factors are the same at every frequency.")
    return Table(
        caption="Areal reduction factors by other methods",
        heads=(whose, "duration", f"{own}, of the design", *(other.method.name for other in others)),
        align="tnn" + "n" * len(others),
        rows=rows,
        notes=tuple(notes),
    )


def _varies(run: DesignRun, others: Sequence[ComparedReduction]) -> bool:
    """Return whether a factor, or whether there is one, depends on the frequency."""
    for area in run.reduced:
        for d, minutes in enumerate(run.asked.minutes):
            found = {
                (
                    float(run.links[area.name, frequency].reduction[d]),
                    *(other.factors.get((area.name, frequency, minutes)) for other in others),
                )
                for frequency in run.asked.frequencies
            }
            if len(found) > 1:
                return True
    return False

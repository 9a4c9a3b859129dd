"""The storms found in a record: how they were separated, ranked, and what fell before them."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.report import series_names
from basinrain.report.table import Row, Table
from basinrain.report.words import (
    DASH,
    counted,
    depth_text,
    number_text,
    percent_text,
    step_text,
    unbroken,
    unit_text,
    unit_word,
    when_text,
    zone_text,
)
from basinrain.results_series import SeriesRun
from basinrain.series.dry_gap import DryGap
from basinrain.series.events import TOTAL, RankedEvent
from basinrain.units import depth_factor

__all__ = ["LISTED", "found_sentences", "found_tables", "incomplete_table"]

LISTED: Final = 20
"""Storms of a table."""

_INCOMPLETE: Final = 10


def found_sentences(run: SeriesRun) -> list[str]:
    """Return what separates storms, in which series they were sought, how they are ranked, and how many there are."""
    found = run.storms
    if np.isnat(found.dry_gap) or any(note.code == "storms-not-sought" for note in found.notes):
        return ["No storms were sought: the record's steps are not of one length that divides a day."]
    wet = f"{found.wet_depth / depth_factor(run.depth_unit):.3g}"
    gap = series_names.length_text(found.dry_gap)
    series = series_names.series_word((found.gaps, found.method))
    sentences = [
        f"Storms were sought in the series of basin {found.basin} by {series}. "
        f"A step is wet from {wet} {unit_text(run.depth_unit)} on; storms are separated by a dry time of {gap} or more"
        + ("." if found.test is None else ", which was found by a test.")
    ]
    step = run.ends[0] - run.starts[0]
    if found.test is not None:
        sentences.append(_test(found.test))
    elif found.dry_gap < step:
        sentences.append(
            f"The record's step of {series_names.length_text(step)} is longer than that: any dry step separates, and "
            "shorter dry times are not seen."
        )
    number = len(found.ranking.complete) + len(found.ranking.incomplete)
    if not number:
        sentences.append("No step of the series is wet: there is no storm.")
        return sentences
    by = (
        "all that fell in them" if found.ranking.by == TOTAL else f"the greatest depth in {step_text(found.ranking.by)}"
    )
    sentences.append(
        f"{counted(number, 'storm was', 'storms were')} found; ranked by {by}. "
        + (
            f"{counted(len(found.ranking.incomplete), 'storm is', 'storms are')} not complete: a step without a number "
            "lies in or near them, and they have no rank."
            if found.ranking.incomplete
            else "All are complete."
        )
    )
    return sentences


def _test(test: DryGap) -> str:
    k = int(np.flatnonzero(test.candidates == test.gap)[0])
    spells = number_text(int(test.spells[k]), 0, grouped=True)
    text = (
        "It is the shortest for which the dry times between storms may be exponential (Restrepo-Posada and Eagleson "
        f"1982): the coefficient of variation of the {spells} dry spells of at least "
        f"{series_names.length_text(test.gap)} is {number_text(float(test.cv[k]), 2)}"
    )
    if k:
        shorter = series_names.length_text(test.candidates[k - 1])
        text += f", of those of at least {shorter} {number_text(float(test.cv[k - 1]), 2)}"
    text += f"; {counted(test.left_out, 'spell is', 'spells are')} left out since their length is not known."
    if test.at_step:
        text += " That is the record's step already: the gap may be shorter than the steps can show."
    return text


def found_tables(run: SeriesRun) -> list[Table]:
    """Return the largest storms with what fell before them, and their depths by every series; nothing where none is."""
    if not run.storms.taken:
        return []
    tables = [_ranked(run)]
    if len(run.setup.series) > 1:
        tables.append(_by_series(run))
    return tables


def _ranked(run: SeriesRun) -> Table:
    found, mm, unit = run.storms, depth_factor(run.depth_unit), run.depth_unit
    taken = found.taken[:LISTED]
    by_total = found.ranking.by == TOTAL
    b = run.basins.ids.index(found.basin)
    share = run.store.observed_share(found.gaps, found.method)
    index = found.index
    rows: list[Row] = []
    young = False
    for k, ranked in enumerate(taken):
        event = ranked.event
        before = [float("nan")] * 3 if found.before is None else (found.before.depth[k] / mm).tolist()
        text = DASH
        if index is not None:
            spun = int(index.days[k]) >= index.days_needed
            young |= not spun
            value = depth_text(float(index.from_zero[k]) / mm, unit)
            text = value if spun else f"≥ {value}"
        rows.append(
            (
                str(ranked.rank),
                unbroken(when_text(event.start)),
                unbroken(when_text(event.end)),
                f"{event.duration / np.timedelta64(1, 'h'):g}",
                *(() if by_total else (depth_text(ranked.depth / mm, unit),)),
                depth_text(event.total / mm, unit) + ("*" if event.cut else ""),
                depth_text(event.peak / mm, unit),
                percent_text(_mean_share(share[event.first : event.stop, b : b + 1])),
                *(depth_text(value, unit) for value in before),
                text,
            )
        )
    notes = [
        f"Times are in {zone_text(run.record.zone)}.",
        "Observed: mean share of the weight on gauges that report.",
        (
            "Before the storm: depth in the 5, 10 and 30 days that end with its start; "
            f"{DASH} where a step in them has no number or lies before the record."
        ),
    ]
    if index is not None:
        notes.append(
            f"Index: antecedent precipitation index, day by day {index.recession:g} of what it was and what fell, up "
            "to the storm's start (Kohler and Linsley 1951)."
        )
    if young and index is not None:
        notes.append(
            f"≥: the record has fewer than the {index.days_needed} days without a gap before the storm that the index "
            "takes until its beginning no longer matters; it is reckoned from zero and is no less."
        )
    if any(one.event.cut for one in taken):
        notes.append("*: the record begins or ends within the dry gap of the storm, which may be longer.")
    if len(taken) < len(found.taken):
        notes.append(f"Shown: {len(taken)} of {len(found.taken)}. All are in storms_found.csv.")
    ranked_head = () if by_total else (f"in {step_text(found.ranking.by)}",)
    return Table(
        caption=f"Largest storms of basin {found.basin} by {series_names.series_word((found.gaps, found.method))}, "
        f"{unit_word(unit)}",
        heads=(
            "rank",
            "start",
            "end",
            "hours",
            *ranked_head,
            "depth",
            "greatest step",
            "observed",
            "5 d",
            "10 d",
            "30 d",
            "index",
        ),
        over=(("", 7 + len(ranked_head)), ("before the storm", 4)),
        align="tttn" + "n" * (7 + len(ranked_head)),
        rows=rows,
        notes=tuple(notes),
    )


def _mean_share(share: npt.NDArray[np.float32]) -> float:
    known = share[~np.isnan(share)]
    return float(known.mean(dtype=float)) if known.size else float("nan")


def _by_series(run: SeriesRun) -> Table:
    found, mm = run.storms, depth_factor(run.depth_unit)
    b = run.basins.ids.index(found.basin)
    series = series_names.listed(run)
    depths = [run.store.depth(*one) for one in series]
    rows: list[Row] = []
    for ranked in found.taken[:LISTED]:
        steps = slice(ranked.event.first, ranked.event.stop)
        rows.append(
            (
                f"{ranked.rank}: {when_text(ranked.event.start)[:10]}",
                *(depth_text(float(depth[steps, b : b + 1].sum()) / mm, run.depth_unit) for depth in depths),
            )
        )
    heads, over = series_names.heads(run)
    return Table(
        caption=f"Depths of basin {found.basin} in the same storms by every series, {unit_word(run.depth_unit)}",
        heads=("storm", *heads),
        over=(("", 1), *over) if over else (),
        align="t" + "n" * len(heads),
        rows=rows,
        notes=(f"From the start to the end of the storm as above; {DASH} where a step has no number.",),
    )


def incomplete_table(run: SeriesRun) -> Table | None:
    """Return the storms whose depth is not known, by what is there of them; None where there is none."""
    found, mm, unit = run.storms, depth_factor(run.depth_unit), run.depth_unit
    shown = found.ranking.incomplete[:_INCOMPLETE]
    if not shown:
        return None
    complete = np.array([ranked.depth for ranked in found.ranking.complete])
    notes = [
        "Would rank: by what is there. More may have fallen, and with missing steps inside it may have been several."
    ]
    if len(shown) < len(found.ranking.incomplete):
        notes.append(f"Shown: {len(shown)} of {len(found.ranking.incomplete)}. All are in storms_found.csv.")
    return Table(
        caption=f"Storms of basin {found.basin} that are not complete, {unit_word(unit)}",
        heads=("start", "end", "what is there", "greatest step", "missing inside", "missing near", "would rank"),
        align="ttnnnnn",
        rows=[_incomplete(ranked, complete, mm, unit) for ranked in shown],
        notes=tuple(notes),
    )


def _incomplete(ranked: RankedEvent, complete: npt.NDArray[np.float64], mm: float, unit: str) -> Row:
    event = ranked.event
    return (
        unbroken(when_text(event.start)),
        unbroken(when_text(event.end)),
        depth_text(ranked.present / mm, unit),
        depth_text(event.peak / mm, unit),
        str(event.missing_inside),
        str(event.missing_beside),
        str(1 + int((complete > ranked.present).sum())),
    )

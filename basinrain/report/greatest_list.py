"""Greatest depths by duration: sliding windows beside those tied to the clock."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.basins import UNION
from basinrain.report import limits, series_names
from basinrain.report.table import Row, Table
from basinrain.report.words import (
    counted,
    depth_text,
    number_text,
    unbroken,
    unit_word,
    when_text,
    zone_text,
)
from basinrain.results_series import SeriesRun
from basinrain.series.greatest_depths import GreatestDepths
from basinrain.units import depth_factor

__all__ = ["duration_words", "greatest_sentence", "greatest_tables"]

_COLUMNS: Final = 9


def greatest_sentence(run: SeriesRun) -> str:
    """Return how the windows lie, and that nothing was added for it; or why there are none."""
    if _first(run) is None:
        return "No greatest depths were sought: the record's steps are not of one length."
    return (
        "Sliding windows begin at any step; those tied to the clock begin at whole multiples of the duration from the "
        "start of the record's first day, as depths read at fixed hours do, and their greatest is never the greater. "
        "Both are as they were found: none is multiplied to make up for the clock, or for the record's step. Windows "
        "in which a step has no number do not count."
    )


def greatest_tables(run: SeriesRun) -> list[Table]:
    """Return the tables: the lead basin's by the first series, by every series, and of the first basins."""
    found = _first(run)
    if found is None:
        return []
    tables = [_by_kind(run, found)]
    if len(run.setup.series) > 1:
        tables.append(_by_series(run, found))
    if len(run.basins) > 1:
        tables.append(_by_basin(run, found))
    return tables


def _first(run: SeriesRun) -> GreatestDepths | None:
    return run.summaries[run.setup.series[0]].greatest


def duration_words(found: GreatestDepths) -> list[str]:
    """Return the durations as they are printed."""
    return [series_names.length_text(duration) for duration in found.durations]


def _by_kind(run: SeriesRun, found: GreatestDepths) -> Table:
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    kinds = (found.sliding, found.aligned)
    rows: list[Row] = []
    for d, words in enumerate(duration_words(found)):
        cells: list[str] = []
        for kind in kinds:
            cells += [
                depth_text(float(kind.depth[d, b]) / mm, run.depth_unit),
                unbroken(when_text(kind.ends[d, b])),
                number_text(int(kind.windows[d]), 0, grouped=True),
                number_text(int(kind.left_out[d, b]), 0, grouped=True),
            ]
        rows.append((words, *cells))
    unit, four = unit_word(run.depth_unit), ("ending", "windows", "left out")
    return Table(
        caption=f"Greatest depths of basin {run.basins.ids[b]} by {series_names.series_word(run.setup.series[0])}",
        heads=("duration", f"depth, {unit}", *four, f"depth, {unit}", *four),
        over=(("", 1), ("sliding", 4), ("tied to the clock", 4)),
        align="t" + "ntnn" * 2,
        rows=rows,
        notes=(
            f"Times are in {zone_text(run.record.zone)}; of equal depths the first.",
            "Left out: windows in which a step has no number.",
        ),
    )


def _by_series(run: SeriesRun, found: GreatestDepths) -> Table:
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    heads, over = series_names.heads(run)
    greatest = [run.summaries[series].greatest for series in series_names.listed(run)]
    rows: list[Row] = [
        (
            words,
            *(depth_text(float(one.sliding.depth[d, b]) / mm, run.depth_unit) for one in greatest if one is not None),
        )
        for d, words in enumerate(duration_words(found))
    ]
    return Table(
        caption=f"Greatest depths of basin {run.basins.ids[b]} in sliding windows, {unit_word(run.depth_unit)}",
        heads=("duration", *heads),
        over=(("", 1), *over) if over else (),
        align="t" + "n" * len(heads),
        rows=rows,
        notes=("With their times, and those tied to the clock, in greatest_depths.csv.",),
    )


def _by_basin(run: SeriesRun, found: GreatestDepths) -> Table:
    mm, words = depth_factor(run.depth_unit), duration_words(found)
    # Spread over all durations where there are too many for the width of a page.
    places = np.unique(np.linspace(0, len(words) - 1, min(len(words), _COLUMNS)).round().astype(int))
    union = [b for b, basin in enumerate(run.basins.ids) if basin == UNION]
    others = [b for b in range(len(run.basins)) if b not in union]
    if len(others) > limits.BASINS:
        depth = np.nan_to_num(found.sliding.depth[:, others], nan=-1.0)
        most = depth[int(places[len(places) // 2])]
        others = sorted(np.array(others)[np.argsort(-most, kind="stable")[: limits.BASINS]].tolist())
    basins = others + union
    left = len(run.basins) - len(basins)
    notes = []
    if len(places) < len(words):
        notes.append(f"Shown: {len(places)} of {len(words)} durations.")
    if left:
        notes.append(
            f"The {counted(len(others), 'basin')} with the greatest depths in {words[int(places[len(places) // 2])]}; "
            f"{left} more are in greatest_depths.csv."
        )
    return Table(
        caption=f"Greatest depths of the basins in sliding windows by "
        f"{series_names.series_word(run.setup.series[0])}, {unit_word(run.depth_unit)}",
        heads=("basin", *(words[d] for d in places)),
        align="t" + "n" * len(places),
        rows=[
            (
                run.basins.ids[b],
                *(depth_text(float(found.sliding.depth[d, b]) / mm, run.depth_unit) for d in places),
            )
            for b in basins
        ],
        notes=tuple(notes),
    )

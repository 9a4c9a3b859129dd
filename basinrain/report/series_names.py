"""Which series, basins and policies the page of a whole record shows, and what it calls them."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.basins import UNION
from basinrain.report.table import Row
from basinrain.report.words import step_text
from basinrain.results_series import SeriesRun
from basinrain.series.steps import in_words

__all__ = ["MOST_SERIES", "Series", "heads", "lead_basin", "left_out", "length_text", "listed", "names", "series_word"]

MOST_SERIES: Final = 9
"""Series that stand side by side in a table."""

Series = tuple[str, str]
"""Policy and method."""


def lead_basin(run: SeriesRun) -> int:
    """Return the row of the union, or that of the only basin."""
    return run.basins.ids.index(UNION) if UNION in run.basins.ids else 0


def listed(run: SeriesRun) -> list[Series]:
    """Return the series that tables show, those of a method together; whole methods, of many the first."""
    gaps = run.setup.gaps
    methods = list(run.setup.methods)[: max(1, MOST_SERIES // len(gaps))]
    return [(policy, method) for method in methods for policy in gaps]


def left_out(run: SeriesRun, file: str) -> tuple[str, ...]:
    """Return the sentence that names the methods whose series are not shown; nothing when all are."""
    shown = {method for _, method in listed(run)}
    others = [method for method in run.setup.methods if method not in shown]
    return (f"The series by {', '.join(others)} are in {file}.",) if others else ()


def heads(run: SeriesRun) -> tuple[Row, tuple[tuple[str, int], ...]]:
    """Return a head for each listed series, and the line above them: methods over policies where there are several."""
    series, several = listed(run), len(run.setup.gaps)
    if several == 1:
        return tuple(method for _, method in series), ()
    methods = list(dict.fromkeys(method for _, method in series))
    return tuple(policy for policy, _ in series), tuple((method, several) for method in methods)


def names(run: SeriesRun) -> dict[Series, str]:
    """Return what tells each listed series from the others: its policy, its method, or both."""
    series = listed(run)
    policies, methods = ({one[k] for one in series} for k in (0, 1))
    if len(methods) == 1 and len(policies) > 1:
        return {one: one[0] for one in series}
    return {one: one[1] if len(policies) == 1 else f"{one[1]}, {one[0]}" for one in series}


def length_text(length: np.timedelta64) -> str:
    """Return a length of time in words.

    Examples
    --------
    >>> length_text(np.timedelta64(90, "m")), length_text(np.timedelta64(1, "D")), length_text(np.timedelta64(48, "h"))
    ('90 min', '1 day', '2 days')
    """
    text = step_text(in_words(int(length / np.timedelta64(1, "s"))))
    return f"{text}s" if text.endswith(" day") and text != "1 day" else text


def series_word(series: Series) -> str:
    """Return a series as it is called in a sentence.

    Examples
    --------
    >>> series_word(("reweight", "thiessen"))
    "thiessen ('reweight')"
    """
    return f"{series[1]} ('{series[0]}')"

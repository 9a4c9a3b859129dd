"""What the page of design storms shows of many points of interest, frequencies, durations and areas."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, TypeVar

import numpy as np

from basinrain.design_areas import ReducedArea
from basinrain.designstorm.design_storms import PointOfInterest
from basinrain.designstorm.exceedance import Frequency
from basinrain.results_design import DesignRun

__all__ = [
    "AREAS",
    "DURATIONS",
    "FILES",
    "FREQUENCIES",
    "POINTS",
    "cut",
    "durations",
    "frequencies",
    "hyetograph_file",
    "infill_words",
    "left_out",
    "points",
    "reduced",
    "spread",
]

POINTS: Final = 4
"""Points of interest that have tables and figures."""

FREQUENCIES: Final = 6
"""Frequencies in a table."""

DURATIONS: Final = 6
"""Durations in a table."""

AREAS: Final = 12
"""Basins, and depth points, in a table."""

FILES: Final = {
    "csv": "design_hyetographs.csv",
    "csv-per-basin": "hyetographs/",
    "parquet": "design_hyetographs.parquet",
    "netcdf": "design_hyetographs.nc",
}

T = TypeVar("T")


def spread(items: Sequence[T], most: int) -> list[T]:
    """Return at most so many items, the first and the last among them; of one only the last.

    Examples
    --------
    >>> spread("abcdefg", 3), spread("abcdefg", 1), spread("ab", 3)
    (['a', 'd', 'g'], ['g'], ['a', 'b'])
    """
    if len(items) <= most:
        return list(items)
    if most == 1:
        return [items[-1]]
    return [items[at] for at in np.linspace(0, len(items) - 1, most).round().astype(int).tolist()]


def points(run: DesignRun) -> tuple[PointOfInterest, ...]:
    """Return the points of interest that are shown: the first few."""
    return run.areas.points[:POINTS]


def reduced(run: DesignRun) -> tuple[ReducedArea, ...]:
    """Return the areas whose chain of depths is shown: the first few."""
    return run.reduced[:POINTS]


def frequencies(run: DesignRun) -> list[Frequency]:
    """Return the frequencies that are shown, the most frequent and the rarest among them."""
    return spread(run.asked.frequencies, FREQUENCIES)


def durations(run: DesignRun) -> list[int]:
    """Return the durations that are shown, in minutes, the shortest and the longest among them."""
    return spread(run.asked.minutes, DURATIONS)


def left_out(run: DesignRun, file: str, *, areas: bool = False) -> tuple[str, ...]:
    """Return the sentence that says what is not shown; nothing when all is.

    Of points of interest, frequencies and durations; with ``areas`` of the areas that are reduced as one.
    """
    parts = [
        f"{'the first ' if noun == 'point' else ''}{shown} of {total} {words}"
        for noun, shown, total, words in (
            ("point", len(reduced(run)), len(run.reduced), "areas")
            if areas and len(run.reduced) != len(run.areas.points)
            else ("point", len(points(run)), len(run.areas.points), "points of interest"),
            ("frequency", len(frequencies(run)), len(run.asked.frequencies), "frequencies"),
            ("duration", len(durations(run)), len(run.asked.minutes), "durations"),
        )
        if shown < total
    ]
    if not parts:
        return ()
    return (f"Shown here: {', '.join(parts[:-1])}{' and ' if parts[1:] else ''}{parts[-1]}; the others are in {file}.",)


def cut(names: Sequence[str], most: int) -> str:
    """Return names in a row, of many the first ones and how many more there are.

    Examples
    --------
    >>> cut(["A", "B", "C"], 2), cut(["A"], 2)
    ('A, B and 1 more', 'A')
    """
    more = len(names) - most
    return ", ".join(names) if more <= 0 else f"{', '.join(names[:most])} and {more} more"


def infill_words(run: DesignRun) -> str:
    """Return how gaps of the record were infilled."""
    infill = run.settings["infill"]
    scale = infill.get("scale")
    return str(infill["method"]) + (f" at the scale of the {scale}" if scale else "")


def hyetograph_file(run: DesignRun) -> str:
    """Return the file that holds every hyetograph, by the job's first format."""
    return FILES[run.formats[0]]

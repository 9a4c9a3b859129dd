"""Design hyetographs as one tidy CSV file."""

from __future__ import annotations

from pathlib import Path
from typing import Final

import numpy as np

from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.writing.design_content import DesignContent
from basinrain.writing.series_content import writing
from basinrain.writing.series_csv import csv_row, depth_texts

__all__ = ["COLUMNS", "NAME", "number_text", "write_csv"]

NAME: Final = "design_hyetographs.csv"
"""The file's name."""

COLUMNS: Final = (
    "point",
    "aep",
    "return_period",
    "return_period_in",
    "duration",
    "pattern",
    "basin",
    "elapsed_min",
    "time",
    "depth",
    "cumulative",
    "depth_unit",
)
"""The tidy columns; ``time`` only where the storm has a nominal start."""


def write_csv(folder: Path, content: DesignContent) -> None:
    """Write the hyetographs as one row per hyetograph, basin and step.

    Parameters
    ----------
    folder
        Where ``design_hyetographs.csv`` is made.
    content
        What to write. The text of one hyetograph is held at a time. Every number reads back to the last digit, so the
        depths of a basin sum to the depth of its storm.

    Raises
    ------
    WriteError
        The file cannot be written.
    """
    columns = [name for name in COLUMNS if name != "time" or content.start is not None]
    with writing(NAME), (folder / NAME).open("w", encoding="utf-8", newline="") as file:
        file.write(",".join(columns) + "\n")
        for one in content.hyetographs:
            file.write("".join(_rows(content, one)))


def _rows(content: DesignContent, one: DesignHyetograph) -> list[str]:
    depth = content.depth(one)
    depths, sums = depth_texts(depth), depth_texts(np.cumsum(depth, axis=1))
    ends = [str(minutes) for minutes in one.elapsed.tolist()]
    if content.start is not None:
        ends = [f"{end},{time}" for end, time in zip(ends, content.time_texts(one.elapsed), strict=True)]
    facts = [
        one.point,
        number_text(one.frequency.written_aep),
        number_text(one.frequency.written_years),
        one.frequency.series,
        one.duration,
        one.pattern,
    ]
    heads = [csv_row([*facts, basin]) for basin in one.basins for _ in ends]
    unit = content.depth_unit
    cells = zip(heads, ends * len(one.basins), depths, sums, strict=True)
    return [f"{head},{end},{d},{s},{unit}\n" for head, end, d, s in cells]


def number_text(value: float) -> str:
    """Return a number as text that reads back to the same number, whole ones without a point, blank for NaN.

    Examples
    --------
    >>> number_text(100.0), number_text(0.01), number_text(14.2857142857), number_text(float("nan"))
    ('100', '0.01', '14.2857142857', '')
    """
    if np.isnan(value):
        return ""
    return str(int(value)) if value.is_integer() else repr(value)

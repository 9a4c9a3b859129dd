"""Basin-mean series as one tidy CSV file."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.writing.series_content import SeriesContent, words_by_code, writing

__all__ = ["NAME", "csv_row", "depth_texts", "share_texts", "write_csv"]

NAME: Final = "series.csv"
"""The file's name."""

_HELD: Final = 1 << 17
"""Values that are turned into text together; about 40 MiB."""


def write_csv(folder: Path, content: SeriesContent) -> None:
    """Write the series as one row per series, step and basin.

    Parameters
    ----------
    folder
        Where ``series.csv`` is made.
    content
        What to write. No more than about 130 thousand values (or the basins of one step) are held at a time.

    Raises
    ------
    WriteError
        The file cannot be written.
    """
    words = words_by_code()
    unit = content.depth_unit
    with writing(NAME), (folder / NAME).open("w", encoding="utf-8", newline="") as file:
        file.write("basin,method,gaps,time,depth,depth_unit,observed_share,flags\n")
        for gaps, method in content.source.series:
            heads = [csv_row([basin, method, gaps]) for basin in content.basins]
            for steps in content.blocks(_HELD):
                block = content.block(gaps, method, steps)
                times = [time for time in content.time_texts(steps) for _ in heads]
                rows = zip(
                    heads * (len(times) // max(1, len(heads))),
                    times,
                    depth_texts(block.depth),
                    share_texts(block.observed_share),
                    block.flags.ravel().tolist(),
                    strict=True,
                )
                file.write("".join([f"{h},{t},{d},{unit},{s},{words[f]}\n" for h, t, d, s, f in rows]))


def csv_row(cells: Sequence[str]) -> str:
    r"""Return cells as a row of a CSV file, quoted where they must be, without the end of the line.

    Examples
    --------
    >>> csv_row(["Upper, west", 'the "old" one', "idw"])
    '"Upper, west","the ""old"" one",idw'
    """
    text = io.StringIO()
    csv.writer(text, lineterminator="").writerow(cells)
    return text.getvalue()


def depth_texts(depth: npt.NDArray[np.float64]) -> list[str]:
    """Return depths as text that reads back to the same number, blank where there is none, in the order of memory.

    Examples
    --------
    >>> depth_texts(np.array([[0.1, 0.0], [np.nan, 1 / 3]]))
    ['0.1', '0.0', '', '0.3333333333333333']
    """
    return [repr(value) if value == value else "" for value in depth.ravel().tolist()]  # noqa: PLR0124 - NaN


def share_texts(share: npt.NDArray[np.float32]) -> list[str]:
    """Return shares as the shortest text that reads back to the same single-precision number, blank where NaN.

    Examples
    --------
    >>> share_texts(np.array([1.0, 0.7, np.nan], dtype=np.float32))
    ['1.0', '0.7', '']
    """
    # Few gauges come and go, so few shares differ.
    values, which = np.unique(share.ravel(), return_inverse=True)
    texts = ["" if np.isnan(value) else str(value) for value in values]
    return [texts[at] for at in which.tolist()]

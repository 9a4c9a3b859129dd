"""A temporal pattern of the user's own: the cumulative share of the depth by the share of the duration."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.patterns.ordinates import Ordinates
from basinrain.errors import JobError, Problems, ReadError
from basinrain.reading.columns import numbers
from basinrain.reading.delimited import read_delimited
from basinrain.reading.long import required_columns

__all__ = ["read_pattern_table"]

_NAMES: Final = {
    "time": ("time", "time_share", "time_fraction", "t"),
    "share": ("share", "depth_share", "depth_fraction", "fraction", "cumulative", "cumulative_share"),
}


def read_pattern_table(path: Path, *, percent: bool = False, columns: Mapping[str, str] | None = None) -> Ordinates:
    r"""Read the ordinates of a cumulative temporal pattern.

    Parameters
    ----------
    path
        Delimited text with a column of times and one of shares of the depth that have fallen by then.
    percent
        Whether both columns run from 0 to 100 in place of 0 to 1; never guessed.
    columns
        Which column holds ``time`` and which ``share``; those not named are found by the names common in the trade.

    Returns
    -------
    Ordinates
        From 0 to 1, whichever the file has.

    Raises
    ------
    JobError
        ``columns`` names something else.
    ReadError
        A column is missing; with their lines: cells that are no numbers, columns that start or end elsewhere, times
        that do not rise, shares that fall. All problems of the file together.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "early.csv"
    >>> _ = path.write_text("time,share\n0,0\n25,60\n100,100\n")
    >>> curve = read_pattern_table(path, percent=True)
    >>> curve.time.tolist(), curve.share.tolist()
    ([0.0, 0.25, 1.0], [0.0, 0.6, 1.0])
    """
    problems = Problems(file=str(path))
    for key in columns or {}:
        problems.check_known("columns", key, _NAMES)
    problems.raise_as(JobError)
    table = read_delimited(path)
    found = required_columns(table, _NAMES, columns or {}, problems)
    problems.raise_as(ReadError)
    assert found is not None  # noqa: S101 - a missing one has been raised
    whole = 100.0 if percent else 1.0
    read = {}
    for key, column in found.items():
        values, _ = numbers(table, column)
        read[key] = values / whole
        for row in np.flatnonzero(np.isnan(values)):
            cell = table.frame[column].iloc[row]
            problems.add(
                item="the pattern",
                found=f"'{cell}'" if cell else "nothing",
                expected=f"a number from 0 to {whole:g}",
                line=int(table.lines[row]),
                column=column,
            )
        _check_run(values, table.lines, whole, column, problems)
        # Where a number is missing, a step over it says nothing.
        step = np.diff(values)
        for row in np.flatnonzero(step <= 0 if key == "time" else step < 0) + 1:
            problems.add(
                item="the pattern",
                found=f"that it {'stands still' if step[row - 1] == 0 else 'falls'}, from {values[row - 1]:g} to "
                f"{values[row]:g}",
                expected="a later time in every row" if key == "time" else "cumulative shares, none less than before",
                line=int(table.lines[row]),
                column=column,
            )
    problems.raise_as(ReadError)
    return Ordinates(time=read["time"], share=read["share"])


def _check_run(
    values: npt.NDArray[np.float64], lines: npt.NDArray[np.int64], whole: float, column: str, problems: Problems
) -> None:
    for row, verb, end in ((0, "starts", 0.0), (-1, "ends", whole)):
        if not np.isnan(values[row]) and values[row] != end:
            remedy = f"give the whole curve, from 0 to {whole:g}"
            if (verb, whole, values[row]) == ("ends", 1.0, 100.0):
                remedy = "declare percent = true"
            elif (verb, whole, values[row]) == ("ends", 100.0, 1.0):
                remedy = "remove percent = true"
            problems.add(
                item="the pattern",
                found=f"that it {verb} at {values[row]:g}",
                expected=f"{end:g}",
                remedy=remedy,
                line=int(lines[row]),
                column=column,
            )

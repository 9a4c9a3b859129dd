"""Rows of a gauge table, with their place in the file for messages."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.reading.columns import numbers
from basinrain.reading.delimited import DelimitedTable

__all__ = ["GaugeRows"]


@dataclass(frozen=True, eq=False)
class GaugeRows:
    """The rows of a gauge table that are read, and where they stand in the file.

    Parameters
    ----------
    table : DelimitedTable
        Their cells.
    vector : bool
        Whether they are features of a vector file; messages number these instead of naming a line.
    ids : tuple of str
        The gauge of every row, ``""`` where it has no id.
    problems : Problems
        Takes what is wrong with them.

    Examples
    --------
    >>> import pandas as pd
    >>> table = DelimitedTable(
    ...     "g.csv", ("id", "z"), pd.DataFrame({"id": ["A", "B"], "z": ["12", "x"]}), np.arange(2, 4), "."
    ... )
    >>> rows = GaugeRows(table, vector=False, ids=("A", "B"), problems=Problems(file="g.csv"))
    >>> rows.numbers("z")
    array([12., nan])
    >>> len(rows.problems)
    1
    """

    table: DelimitedTable
    vector: bool
    ids: tuple[str, ...]
    problems: Problems

    def add(self, row: int, *, column: str, found: str, expected: str, remedy: str = "") -> None:
        """Record a problem of a row; the fields are those of :class:`~basinrain.errors.Problem`."""
        gauge, number = self.ids[row], int(self.table.lines[row])
        self.problems.add(
            item=(f"feature {number}: " if self.vector else "") + (f"gauge {gauge}" if gauge else "a gauge"),
            found=found,
            expected=expected,
            remedy=remedy,
            line=None if self.vector else number,
            column=column,
            gauge=gauge,
        )

    def numbers(self, column: str, *, blank: bool = True) -> npt.NDArray[np.float64]:
        """Return a column's numbers, NaN where there is none; a cell that is no number is a problem."""
        values, bad = numbers(self.table, column)
        wrong = bad if blank else np.isnan(values)
        for row in np.flatnonzero(wrong):
            cell = self.table.frame[column].iloc[row]
            self.add(
                int(row),
                column=column,
                found=f"'{cell}'" if cell else "nothing",
                expected="a number",
                remedy="correct the cell",
            )
        return values

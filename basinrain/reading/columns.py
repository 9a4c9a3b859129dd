"""Columns of a table of text: which one holds a quantity, and its numbers."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problems, nearest_name
from basinrain.reading.delimited import DelimitedTable

__all__ = ["find_column", "numbers"]

_NUMBER: Final = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")


def find_column(
    columns: Sequence[str], trade_names: Sequence[str], *, mapped: str | None, key: str, problems: Problems
) -> str | None:
    """Return the column that holds a quantity.

    Parameters
    ----------
    columns
        Names of the file's columns.
    trade_names
        Names under which the quantity is known, the first found wins; capitals do not matter, and a space, a hyphen and
        a full stop count as an underscore.
    mapped
        The column that the user named; it is used or it is a problem, whatever the trade names say.
    key
        The quantity's name in the job's ``columns``, for the problem.
    problems
        Takes the problem of a mapped column that is not there, with the nearest name.

    Returns
    -------
    str or None
        The column's name in the file; None where there is none.

    Examples
    --------
    >>> from basinrain.errors import ReadError
    >>> problems = Problems(file="gauges.csv")
    >>> find_column(["Station ID", "Lon"], ["id", "station_id"], mapped=None, key="id", problems=problems)
    'Station ID'
    >>> find_column(["Station ID", "Lon"], ["lat"], mapped="Lo", key="lon", problems=problems)
    >>> problems.raise_as(ReadError)
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: gauges.csv: columns.lon: found no column 'Lo'; expected a column of the file; did you \
mean 'Lon'?
    """
    if mapped is not None:
        for column in columns:
            if column == mapped:
                return column
        for column in columns:
            if column.lower() == mapped.strip().lower():
                return column
        problems.add(
            item=f"columns.{key}",
            found=f"no column '{mapped}'",
            expected="a column of the file",
            remedy=nearest_name(mapped, columns),
        )
        return None
    plain = {re.sub(r"[\s.\-]+", "_", column.strip().lower()): column for column in reversed(columns)}
    return next((plain[name] for name in trade_names if name in plain), None)


def numbers(table: DelimitedTable, column: str) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.bool_]]:
    """Return a column's numbers, and which cells are not numbers.

    Parameters
    ----------
    table
    column
        Name of a column of ``table``.

    Returns
    -------
    values : array of float, shape (n_rows,)
        NaN where the cell is blank or no number.
    bad : array of bool, shape (n_rows,)
        True where a cell has text that is not a finite decimal number: words, ``"nan"``, ``"inf"``, a thousands mark. A
        blank cell is not bad.

    Examples
    --------
    >>> frame = pd.DataFrame({"depth": ["1.5", "", "1e2", "nan", "1,5"]})
    >>> table = DelimitedTable("depths.csv", ("depth",), frame, np.arange(2, 7), ".")
    >>> numbers(table, "depth")
    (array([  1.5,   nan, 100. ,   nan,   nan]), array([False, False, False,  True,  True]))
    """
    # Depths repeat: every different text is read once.
    codes, texts = pd.factorize(table.frame[column])
    values = np.full(len(texts), np.nan)
    bad = np.zeros(len(texts), dtype=bool)
    for place, text in enumerate(texts):
        if not text:
            continue
        number = text
        if table.decimal == ",":
            number = "?" if "." in text else text.replace(",", ".")
        if _NUMBER.fullmatch(number) and np.isfinite(value := float(number)):
            values[place] = value
        else:
            bad[place] = True
    return values[codes], bad[codes]

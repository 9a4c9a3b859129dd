"""Normals of a gauge table: of the twelve months, or of the year."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.reading.columns import find_column
from basinrain.reading.gauge_rows import GaugeRows

__all__ = ["MONTHS", "normal_columns", "read_normals"]

# fmt: off
MONTHS: Final = ("january", "february", "march", "april", "may", "june",
                  "july", "august", "september", "october", "november", "december")
# fmt: on
_NORMALS: Final = (
    tuple(month[:3] for month in MONTHS),
    MONTHS,
    *(tuple(f"{stem}{month:02d}" for month in range(1, 13)) for stem in ("normal_", "p")),
    *(tuple(f"{stem}{month}" for month in range(1, 13)) for stem in ("normal_", "p")),
    tuple(f"normal_{month[:3]}" for month in MONTHS),
)
_MOST_MONTHS: Final = 6
"""So many columns of one scheme of months are meant as normals, and a missing one is a slip."""


def normal_columns(
    columns: Sequence[str], mapped: Mapping[str, str | tuple[str, ...]], annual: str | None, problems: Problems
) -> tuple[str, ...]:
    """Return the 12 monthly columns where there are such, else the annual one, else none.

    Parameters
    ----------
    columns
        Names of the file's columns.
    mapped
        The columns that the user named, by key; ``normals`` and ``normal`` count here.
    annual
        The column of the year's normal.
    problems
        Takes months that are missing among the others.

    Examples
    --------
    >>> months = ["JAN", "FEB", "MAR", "APR", "MAY", "JUN", "JUL", "AUG", "SEP", "OCT", "NOV", "DEC"]
    >>> normal_columns(["id", "normal", *months], {}, "normal", Problems())[:2]
    ('JAN', 'FEB')
    >>> normal_columns(["id", "normal"], {}, "normal", Problems())
    ('normal',)
    """
    if "normals" in mapped:
        named = [find_column(columns, (), mapped=name, key="normals", problems=problems) for name in mapped["normals"]]
        return tuple(name for name in named if name is not None)
    if "normal" not in mapped:
        for scheme in _NORMALS:
            months = [find_column(columns, (name,), mapped=None, key="normals", problems=problems) for name in scheme]
            present = tuple(name for name in months if name is not None)
            if len(present) == len(MONTHS):
                return present
            if len(present) >= _MOST_MONTHS:
                absent = [name for name, month in zip(scheme, months, strict=True) if month is None]
                problems.add(
                    item="monthly normals",
                    found="no column " + " nor ".join(f"'{name}'" for name in absent),
                    expected="all twelve months",
                    remedy="add it, or name the columns with columns = { normals = [...] }",
                )
                return ()
    return (annual,) if annual else ()


def read_normals(rows: GaugeRows, columns: Sequence[str], factor: float) -> npt.NDArray[np.float64] | None:
    """Return the normals in mm, shape (n_gauges, n_columns); NaN where blank, None without columns.

    Parameters
    ----------
    rows
        Takes negative normals and cells that are no numbers.
    columns
        One column, or twelve.
    factor
        mm in one unit of the cells.
    """
    if not columns:
        return None
    normals = np.empty((len(rows.ids), len(columns)))
    for place, column in enumerate(columns):
        normals[:, place] = rows.numbers(column)
        for row in np.flatnonzero(normals[:, place] < 0):
            rows.add(
                int(row),
                column=column,
                found=f"a normal of {normals[row, place]:g}",
                expected="0 or more, or a blank cell where it is not known",
            )
    return normals * factor

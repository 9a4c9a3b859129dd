"""An areal reduction table of the user's own: factors by area and duration."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Final

import numpy as np
import pandas as pd

from basinrain.designstorm.areal_reduction.table import ReductionTable
from basinrain.designstorm.measures import duration_text, parse_duration
from basinrain.errors import JobError, Problems, ReadError
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import DelimitedTable, read_delimited
from basinrain.reading.options import option_problems
from basinrain.units import area_factor

__all__ = ["read_reduction_table"]

_SLACK: Final = 1e-9
_PERCENT: Final = 2.0
"""What is no factor and at least this is taken to be in percent, in the advice that an error gives."""


@dataclass(frozen=True)
class _Entry:
    """One factor, with its area in the table's unit."""

    area: float
    minutes: float
    factor: float
    line: int
    column: str


def read_reduction_table(path: Path, *, area_unit: str, source: str) -> ReductionTable:
    r"""Read a table of areal reduction factors.

    Parameters
    ----------
    path
        Delimited text, long (columns ``area``, ``duration`` and ``factor``) or wide (a column ``duration``, and a
        column for every area, which is its heading). Durations have their unit: ``30min``, ``6h``, ``1d``.
    area_unit
        Unit of the areas, one of :data:`basinrain.units.AREA_UNITS`; never guessed.
    source
        Where the factors are from.

    Returns
    -------
    ReductionTable
        Areas in m² and durations in minutes, rising, whatever the order in the file; a factor for each of both.

    Raises
    ------
    JobError
        The unit is not known, or there is no source.
    ReadError
        All problems of the file together, with their lines: columns that are missing, cells that are no area, duration
        or factor above 0 and at most 1, factors that are repeated or missing, or that rise with area.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "factors.csv"
    >>> _ = path.write_text("duration,10,100\n1h,0.9,0.75\n6h,0.96,0.9\n")
    >>> table = read_reduction_table(path, area_unit="km2", source="invented")
    >>> table.areas.tolist(), table.minutes.tolist(), table.factor.tolist()
    ([10000000.0, 100000000.0], [60.0, 360.0], [[0.9, 0.96], [0.75, 0.9]])
    """
    problems = Problems(file=str(path))
    with option_problems(problems, file=str(path), item="[design.areal_reduction] area_unit"):
        square_metres = area_factor(area_unit)
    if not source.strip():
        problems.add(
            item="[design.areal_reduction] source", found="nothing", expected="where the factors of the file are from"
        )
    problems.raise_as(JobError)
    entries = _entries(read_delimited(path), area_unit, problems)
    problems.raise_as(ReadError)
    areas = sorted({entry.area for entry in entries})
    minutes = sorted({entry.minutes for entry in entries})
    factor = np.full((len(areas), len(minutes)), np.nan)

    def words(a: int, d: int) -> str:
        return f"{areas[a]:g} {area_unit}, {duration_text(minutes[d])}"

    for entry in entries:
        a, d = areas.index(entry.area), minutes.index(entry.minutes)
        if not np.isnan(factor[a, d]):
            problems.add(
                item=words(a, d),
                found=f"a factor of {entry.factor:g} after one of {factor[a, d]:g}",
                expected="one",
                remedy="remove one",
                line=entry.line,
                column=entry.column,
            )
        factor[a, d] = entry.factor
    for a, d in np.argwhere(np.isnan(factor)).tolist():
        problems.add(item=words(a, d), found="no factor", expected="one for every area and duration", remedy="add it")
    for a, d in np.argwhere(np.diff(factor, axis=0) > _SLACK).tolist():
        problems.add(
            item=words(a + 1, d),
            found=f"a factor of {factor[a + 1, d]:g}, above {factor[a, d]:g} of {areas[a]:g} {area_unit}",
            expected="a factor that does not rise with area",
            remedy="correct one of them",
        )
    problems.raise_as(ReadError)
    return ReductionTable(
        areas=np.array(areas) * square_metres, minutes=np.array(minutes), factor=factor, source=source
    )


def _entries(table: DelimitedTable, area_unit: str, problems: Problems) -> list[_Entry]:
    """Return the factors of either layout; what cannot be read is reported."""

    def column_of(*names: str) -> str | None:
        return find_column(table.columns, names, mapped=None, key=names[0], problems=problems)

    duration, area, factor = column_of("duration"), column_of("area", f"area_{area_unit}"), column_of("factor")
    if duration is None or (area is None) != (factor is None) or len(table.columns) < 2:
        problems.add(
            item="the header",
            found=", ".join(table.columns),
            expected="columns area, duration and factor, or duration and a column for every area",
        )
        return []
    minutes = [
        _minutes(str(cell), int(line), duration, problems)
        for cell, line in zip(table.frame[duration], table.lines, strict=True)
    ]
    if area is not None and factor is not None:
        areas, bad = numbers(table, area)
        for row in np.flatnonzero(bad | ~(areas >= 0)):
            _report(table, area, int(row), problems, expected="an area, 0 or more", remedy="correct the cell")
        factors = {factor: areas}
    else:
        headings = [name for name in table.columns if name != duration]
        cells = pd.DataFrame({"area": headings})
        areas, bad = numbers(replace(table, columns=("area",), frame=cells), "area")
        for place in np.flatnonzero(bad | ~(areas >= 0)):
            problems.add(
                item="the header",
                found=f"'{headings[place]}'",
                expected="columns area, duration and factor, or an area over every column but the duration's",
            )
        factors = {name: np.full(len(minutes), of) for name, of in zip(headings, areas, strict=True)}
    entries = []
    for column, of in factors.items():
        values, _ = numbers(table, column)
        for row in np.flatnonzero(~((values > 0) & (values <= 1))):
            remedy = "write percent as fractions" if _PERCENT <= values[row] <= 100 else "correct the cell"
            _report(table, column, int(row), problems, expected="a factor above 0 and at most 1", remedy=remedy)
        entries += [
            _Entry(float(a), m, float(f), int(line), column)
            for a, m, f, line in zip(of, minutes, values, table.lines, strict=True)
        ]
    return entries


def _minutes(text: str, line: int, column: str, problems: Problems) -> float:
    try:
        return parse_duration(text)
    except JobError as error:
        problem = error.problems[0]
        problems.add(
            item="a duration",
            found=problem.found,
            expected=problem.expected,
            remedy="write the unit" if problem.remedy else "correct the cell",
            line=line,
            column=column,
        )
        return np.nan


def _report(table: DelimitedTable, column: str, row: int, problems: Problems, *, expected: str, remedy: str) -> None:
    cell = table.frame[column].iloc[row]
    problems.add(
        item="a row",
        found=f"'{cell}'" if cell else "nothing",
        expected=expected,
        remedy=remedy,
        line=int(table.lines[row]),
        column=column,
    )

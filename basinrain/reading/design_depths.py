"""Tables of depths by duration and frequency: long, or wide for one point."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from types import MappingProxyType
from typing import Final, Literal

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain import ground
from basinrain.designstorm.exceedance import PARTIAL_DURATION, SERIES, Frequency
from basinrain.designstorm.measures import DURATION_UNITS, INTENSITY_UNITS, duration_text, in_mm, parse_duration
from basinrain.designstorm.point_depths import PointDepths, report_faults
from basinrain.errors import JobError, Problem, Problems, ReadError
from basinrain.reading.columns import numbers
from basinrain.reading.delimited import DelimitedTable, read_delimited
from basinrain.reading.design_cells import AEP, PERCENT, PROBABILITIES, YEARS, DesignCells, long_cells, wide_cells
from basinrain.reading.options import option_problems
from basinrain.reading.point_positions import POSITION_NAMES, each_of, read_positions
from basinrain.units import DEPTH_UNITS

__all__ = ["read_point_depths"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_LAYOUTS: Final = ("long", "wide")

_MARKS: Final = MappingProxyType({AEP: "", PERCENT: r"\s*%", YEARS: r"[\s\-]*(?:years|year|yrs|yr|y)"})
"""What may stand behind the number of a probability, as a regular expression."""

_EXPECTED: Final = MappingProxyType(
    {
        AEP: "a fraction between 0 and 1",
        PERCENT: "a percentage between 0 and 100",
        YEARS: "a number of years",
    }
)
_NOT_A_FRACTION: Final = (
    f"declare probability = '{PERCENT}' where it is percent, '{YEARS}' where it is years, or correct it"
)
_LARGE: Final = 1_000_000
_MOST_EMPTY: Final = 4
"""A table of over so many entries, and so many for every value, comes from columns that hold something else."""

_Value = float | Problem
_Parser = Callable[[list[str], DelimitedTable, "_Rules"], list[_Value]]


@dataclass(frozen=True, kw_only=True)
class _Rules:
    """How to understand the cells."""

    unit: str
    series: str
    probability: str
    duration_unit: str | None
    columns: Mapping[str, str]
    crs: str | None


@dataclass(frozen=True, eq=False, kw_only=True)
class _Entries:
    """The values, each with its place on the three axes; NaN where a cell cannot be read."""

    points: tuple[str, ...]
    point: Ints
    minutes: Floats
    years: Floats
    value: Floats
    line: Ints


def read_point_depths(
    path: str | Path,
    *,
    unit: str,
    series: str,
    probability: Literal["aep", "aep-percent", "return-period"],
    source: str,
    date: str,
    layout: Literal["long", "wide"] = "long",
    columns: Mapping[str, str] | None = None,
    duration_unit: str | None = None,
    crs: str | None = None,
) -> PointDepths:
    r"""Read a table of depths by duration and frequency.

    Parameters
    ----------
    path
        Delimited text.
    unit
        Of the values, one of :data:`~basinrain.designstorm.measures.UNITS`; per hour means intensity. Never guessed.
    series
        What the frequencies are counted in, one of :data:`~basinrain.designstorm.exceedance.SERIES`.
    probability
        ``"aep"``: annual exceedance probabilities as fractions; ``"aep-percent"``: as percent; ``"return-period"``:
        years. A partial duration series has return periods.
    source, date
        Where the depths come from, and of when they are.
    layout
        ``"long"``: a row for every value, with the columns duration, probability, depth, and where there are such,
        point and lon and lat, or x and y. ``"wide"``: one point, named after the file; a column of durations, which is
        the first one unless it is named, and a column for every frequency, which is its heading.
    columns
        Which column holds what, by ``point``, ``duration``, ``probability``, ``depth``, ``lon``, ``lat``, ``x``, ``y``;
        those not named are found by the names common in the trade. Only ``duration`` with layout ``"wide"``.
    duration_unit
        The unit of durations that are numbers alone, one of
        :data:`~basinrain.designstorm.measures.DURATION_UNITS`; 15min, 1h and 2d need none.
    crs
        The positions' coordinate system; needed for x and y.

    Returns
    -------
    PointDepths
        Points in the file's order, durations and return periods rising; without a point column one point, named after
        the file. Rows and columns may stand in any order.

    Raises
    ------
    JobError
        All of: options that are not known; source or date not stated; a partial duration series with probabilities.
    ReadError
        With all problems of the file, by line: no such columns; cells that are no numbers; probabilities that cannot be
        or are percent where a fraction is declared; durations without a unit; entries that are repeated or missing;
        points with two positions; depths not above 0 or falling with duration or rarity; intensities rising with
        duration.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "quill.csv"
    >>> _ = path.write_text("duration,0.1,0.5\n1h,45,30\n30min,32,20\n")
    >>> table = read_point_depths(
    ...     path,
    ...     unit="mm",
    ...     series="annual-maximum",
    ...     probability="aep",
    ...     layout="wide",
    ...     source="invented",
    ...     date="2031",
    ... )
    >>> table.points, table.durations.tolist(), table.return_periods.tolist(), table.depth[0].tolist()
    (('quill',), [30.0, 60.0], [2.0, 10.0], [[20.0, 32.0], [30.0, 45.0]])
    """
    path = Path(path)
    rules = _Rules(
        unit=unit,
        series=series,
        probability=probability,
        duration_unit=duration_unit,
        columns=dict(columns or {}),
        crs=crs,
    )
    _check_options(rules, layout, {"source": source, "date": date}, str(path))
    table = read_delimited(path)
    problems = Problems(file=table.file)
    if layout == "wide":
        cells = wide_cells(table, columns=rules.columns, problems=problems)
    else:
        cells = long_cells(
            table,
            unit=unit,
            probability=probability,
            duration_unit=duration_unit,
            columns=rules.columns,
            problems=problems,
        )
    if cells is None:
        problems.raise_as(ReadError)
    assert cells is not None  # noqa: S101 - the problems above have been raised
    entries = _entries(cells, rules, path.stem, problems)
    positions, used_crs = read_positions(
        table, entries.point, entries.points, columns=rules.columns, crs=crs, problems=problems
    )
    durations, frequencies, depth = _tabulated(entries, rules, problems)
    problems.raise_as(ReadError)
    return PointDepths(
        points=entries.points,
        durations=durations,
        return_periods=np.array([frequency.return_period for frequency in frequencies]),
        depth=depth,
        series=series,
        source=source,
        date=date,
        positions=positions,
        crs=used_crs,
    )


def _check_options(rules: _Rules, layout: str, stated: Mapping[str, str], file: str) -> None:
    problems = Problems(file=file)
    known = ("duration",) if layout == "wide" else ("point", "duration", "probability", "depth", *POSITION_NAMES)
    for key, given, accepted in (
        # A depth is never taken for an intensity that is spelled alike.
        ("unit", rules.unit, INTENSITY_UNITS if "/" in rules.unit else tuple(DEPTH_UNITS)),
        ("series", rules.series, SERIES),
        ("probability", rules.probability, PROBABILITIES),
        ("layout", layout, _LAYOUTS),
        ("duration_unit", rules.duration_unit, tuple(DURATION_UNITS)),
        *(("columns", key, known) for key in rules.columns),
    ):
        if given is not None:
            problems.check_known(f"[design.depths] {key}", given, accepted)
    for key, text in stated.items():
        if not text.strip():
            problems.add(item=f"[design.depths] {key}", found="nothing", expected=f"the {key} of the depths")
    if rules.series == PARTIAL_DURATION and rules.probability in {AEP, PERCENT}:
        problems.add(
            item="[design.depths] probability",
            found=f"'{rules.probability}' of a partial duration series",
            expected=f"'{YEARS}', in which such a series is counted",
            remedy="give return periods, or declare the series that the probabilities are of",
        )
    with option_problems(problems, file=file, item="[design.depths] crs"):
        _ = None if rules.crs is None else ground.parse_crs(rules.crs)
    problems.raise_as(JobError)


def _entries(cells: DesignCells, rules: _Rules, name: str, problems: Problems) -> _Entries:
    table = cells.table
    codes, names = np.zeros(len(table.lines), dtype=np.int64), [name]
    if cells.point is not None:
        found, texts = pd.factorize(table.frame[cells.point])
        codes, names = np.asarray(found, dtype=np.int64), [str(text) for text in texts]
    minutes = _axis(cells, cells.duration, _durations_of, rules, problems)
    years = _axis(cells, cells.probability, _years_of, rules, problems)
    value, bad = numbers(table, cells.depth)
    for row in each_of(np.flatnonzero(np.isnan(value)), problems):
        duration, frequency, cell = (
            str(table.frame[column].iloc[row]) for column in (cells.duration, cells.probability, cells.depth)
        )
        problems.add(
            item=f"point {names[codes[row]] or '?'}, duration {duration}, {rules.probability} {frequency}",
            found=f"'{cell}'" if bad[row] else "nothing",
            expected="a number",
            remedy="correct the cell",
            line=int(table.lines[row]),
            column=frequency if cells.wide else cells.depth,
        )
    return _Entries(points=tuple(names), point=codes, minutes=minutes, years=years, value=value, line=table.lines)


def _axis(cells: DesignCells, column: str, values_of: _Parser, rules: _Rules, problems: Problems) -> Floats:
    """Return the values of an axis' column; every text that is none is reported once, where it first stands."""
    codes, found = pd.factorize(cells.table.frame[column])
    texts = [str(text) for text in found]
    # A row of a wide table has a value for every frequency.
    each = len(codes) // max(len(np.unique(cells.table.lines)), 1)
    first, count = np.unique(codes, return_index=True)[1], np.bincount(codes) // max(each, 1)
    heading = cells.wide and column == cells.probability
    values = np.full(len(texts), np.nan)
    for place, value in enumerate(values_of(texts, cells.table, rules)):
        if isinstance(value, float):
            values[place] = value
            continue
        more = "" if heading or count[place] == 1 else f" in this row and {count[place] - 1} more"
        problems.add(
            item=f"column {texts[place] if heading else column}",
            found=value.found + more,
            expected=value.expected,
            remedy=value.remedy,
            line=None if heading else int(cells.table.lines[first[place]]),
        )
    return values[codes]


def _durations_of(texts: list[str], table: DelimitedTable, rules: _Rules) -> list[_Value]:
    plain = [text.replace(",", ".") if table.decimal == "," else text for text in texts]
    values: list[_Value] = []
    for text in plain:
        try:
            # Whatever the unit, one duration is one number.
            values.append(round(parse_duration(text, unit=rules.duration_unit), 6))
        except JobError as error:
            values.append(error.problems[0])
    return values


def _years_of(texts: list[str], table: DelimitedTable, rules: _Rules) -> list[_Value]:
    bare = [re.sub(_MARKS[rules.probability] + "$", "", text, flags=re.IGNORECASE) for text in texts]
    frame = pd.DataFrame({"text": bare}, dtype=object)
    found, _ = numbers(DelimitedTable(table.file, ("text",), frame, np.arange(len(bare)), table.decimal), "text")
    return [_year_value(text, number, rules) for text, number in zip(texts, found.tolist(), strict=True)]


def _year_value(text: str, number: float, rules: _Rules) -> _Value:
    expected = _EXPECTED[rules.probability]
    if np.isnan(number):
        return Problem(item="", found=f"'{text}'" if text else "nothing", expected=expected)
    if rules.probability == YEARS:
        try:
            return Frequency(number, rules.series).return_period
        except JobError as error:
            return error.problems[0]
    fraction = number if rules.probability == AEP else number / 100
    if 0 < fraction < 1:
        return Frequency.of_aep(fraction).return_period
    remedy = _NOT_A_FRACTION if rules.probability == AEP and number >= 1 else "correct it"
    return Problem(item="", found=f"'{text}'", expected=expected, remedy=remedy)


def _tabulated(entries: _Entries, rules: _Rules, problems: Problems) -> tuple[Floats, list[Frequency], Floats]:
    """Return durations, frequencies and depths in mm, shape (n_points, n_durations, n_frequencies); report faults."""
    named = np.array([bool(point) for point in entries.points])[entries.point]
    sound = named & ~(np.isnan(entries.minutes) | np.isnan(entries.years))
    durations, years = np.unique(entries.minutes[sound]), np.unique(entries.years[sound])
    frequencies = [Frequency(float(period), rules.series) for period in years]
    shape = (len(entries.points), len(durations), len(years))
    size, given = int(np.prod(shape)), int(sound.sum())
    if size > max(_LARGE, _MOST_EMPTY * given):
        problems.add(
            item="the table of depths",
            found=f"{shape[0]} points, {shape[1]} durations and {shape[2]} frequencies in {given} values",
            expected="a value for every duration and frequency of a point",
            remedy="name the columns that hold them with columns = { ... }",
        )
        problems.raise_as(ReadError)
    point, line = entries.point[sound], entries.line[sound]
    place = (point, np.searchsorted(durations, entries.minutes[sound]), np.searchsorted(years, entries.years[sound]))
    again = pd.Series(np.ravel_multi_index(place, shape)).duplicated().to_numpy()
    once = tuple(axis[~again] for axis in place)
    lines = np.zeros(shape, dtype=np.int64)
    lines[once] = line[~again]
    depth = np.full(shape, np.nan)
    depth[once] = in_mm(entries.value[sound], entries.minutes[sound], rules.unit)[~again]
    for row in each_of(np.flatnonzero(again), problems):
        p, d, t = (int(axis[row]) for axis in place)
        problems.add(
            item=f"point {entries.points[p]}, {duration_text(durations[d])}, {frequencies[t].label}",
            found=f"a depth again, first on line {lines[p, d, t]}",
            expected="each once",
            remedy="remove one of them",
            line=int(line[row]),
        )
    # What cells that cannot be read were meant for is not known.
    report_faults(
        entries.points, durations, frequencies, depth, problems, unit=rules.unit, lines=lines, gaps=bool(sound.all())
    )
    return durations, frequencies, depth

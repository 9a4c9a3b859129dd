"""A region's greatest depths by duration, as the user gives them for screening."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path
from typing import Final

from basinrain.errors import JobError, Problems, ReadError, unknown
from basinrain.intervals import DAY, parse_interval
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import read_delimited
from basinrain.units import DEPTH_UNITS, depth_factor

__all__ = ["read_envelope"]

_MONTH: Final = 31
"""Days of a month in the envelope: a longest one, so that no month is measured against too low a limit."""


def read_envelope(path: Path) -> tuple[tuple[float, float], ...]:
    r"""Read a table of greatest depths.

    Parameters
    ----------
    path
        A file with the columns ``duration`` (``"15min"``, ``"1h"``, ``"1d"``, ``"1mo"``), ``depth`` and ``unit``.

    Returns
    -------
    tuple of (hours, mm)
        By duration, increasing.

    Raises
    ------
    ReadError
        A column is missing, a cell is no duration, depth above 0 or unit, a duration stands twice, or a longer one has
        less depth; all problems together.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "greatest.csv"
    >>> _ = path.write_text("duration,depth,unit\n1d,300,mm\n1h,3.5,in\n")
    >>> read_envelope(path)
    ((1.0, 88.9), (24.0, 300.0))
    """
    problems = Problems(file=str(path))
    table = read_delimited(path)
    columns = {}
    for key in ("duration", "depth", "unit"):
        column = find_column(table.columns, (key,), mapped=None, key=key, problems=problems)
        if column is None:
            problems.add(item="the header", found=f"no column '{key}'", expected="columns duration, depth and unit")
        else:
            columns[key] = column
    problems.raise_as(ReadError)
    depths, _ = numbers(table, columns["depth"])
    limits: dict[float, float] = {}
    for row, (duration, unit) in enumerate(
        zip(table.frame[columns["duration"]], table.frame[columns["unit"]], strict=True)
    ):
        line = int(table.lines[row])
        hours = _hours(str(duration), line, problems)
        if unit not in DEPTH_UNITS:
            problems.include(unknown("unit", unit, DEPTH_UNITS, line=line))
        elif not depths[row] > 0:
            cell = table.frame[columns["depth"]].iloc[row]
            problems.add(item="depth", found=f"'{cell}'", expected="a number above 0", line=line)
        elif hours in limits:
            problems.add(item="duration", found=f"'{duration}' twice", expected="each duration once", line=line)
        elif hours:
            # Twelve digits: a product of factors is no better known.
            limits[hours] = float(f"{depths[row] * depth_factor(str(unit)):.12g}")
    ordered = sorted(limits.items())
    for (shorter, more), (longer, less) in pairwise(ordered):
        if less < more:
            problems.add(
                item="depth",
                found=f"{less:g} mm in {longer:g} h, below {more:g} mm in {shorter:g} h",
                expected="at least as much in a longer duration",
            )
    problems.raise_as(ReadError)
    return tuple(ordered)


def _hours(text: str, line: int, problems: Problems) -> float:
    try:
        seconds = parse_interval(text, item="duration").seconds
    except JobError as error:
        found = error.problems[0]
        problems.add(item="duration", found=found.found, expected=found.expected, line=line)
        return 0.0
    return (_MONTH * DAY if seconds is None else seconds) / 3600

"""One pass over a rainfall file: its times, its gauges, and where its rows stand."""

from __future__ import annotations

import csv
from collections.abc import Collection, Sequence
from pathlib import Path

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems, ReadError
from basinrain.layouts import file_format
from basinrain.reading.blocks import TIME_NAMES
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable, Header, has_spaces_at_cell_ends, report_uneven, table_of_rows
from basinrain.reading.netcdf import open_netcdf
from basinrain.reading.parquet import open_parquet
from basinrain.reading.source_rules import SourceRules
from basinrain.reading.stamps import StampRules
from basinrain.reading.stream_files import NetcdfFile, Rows, StreamFile, WideFile
from basinrain.reading.stream_long import LongPass
from basinrain.reading.stream_text import scan_text
from basinrain.reading.stream_times import TimeColumn

__all__ = ["survey"]


def survey(
    path: Path,
    rules: SourceRules,
    stamps: StampRules,
    *,
    zone: str | None,
    exclude: Collection[str],
    problems: Problems,
) -> tuple[StreamFile | None, str | None]:
    """Go through a file once.

    Parameters
    ----------
    path
        The file, of layout wide or long.
    rules, stamps
        How to understand it.
    zone
        The clock settled by earlier files; None when this is the first.
    exclude
        Gauges that are left out.
    problems
        Takes what is wrong with the times, and with the rows of text as far as they have too many cells or too few;
        cells are read later.

    Returns
    -------
    file, zone
        None where the file cannot be used at all.

    Raises
    ------
    ReadError
        What keeps the file from being read.
    """
    kind = file_format(path.name)
    if kind == "netcdf":
        opened, zone = open_netcdf(path, rules.depths, stamps, columns=rules.columns, zone=zone, problems=problems)
        return None if opened is None else NetcdfFile.of(opened, rules.depths, exclude), zone
    if rules.layout == "long":
        return _long(path, rules, stamps, zone=zone, exclude=exclude, problems=problems)
    return _wide(path, rules, stamps, zone=zone, exclude=exclude, problems=problems)


def _wide(
    path: Path,
    rules: SourceRules,
    stamps: StampRules,
    *,
    zone: str | None,
    exclude: Collection[str],
    problems: Problems,
) -> tuple[StreamFile | None, str | None]:
    before = len(problems)
    rows: Rows
    if file_format(path.name) == "parquet":
        rows = parquet = open_parquet(path, layout="wide", columns=rules.columns)
        time = _time_column(path, parquet.columns, rules)
        times = TimeColumn(time, stamps, zone, problems)
        for _, table in parquet.tables(0, parquet.n_rows, only=[time]):
            times.add(table.frame[time].tolist(), table.lines)
    else:
        found: list[TimeColumn] = []
        names: list[str] = []

        def visit(lines: list[str], numbers: npt.NDArray[np.int64], header: Header) -> None:
            if not found:
                names.append(_time_column(path, [name for name in header.names if name], rules))
                found.append(TimeColumn(names[0], stamps, zone, problems))
            cut = report_uneven(lines, numbers, len(header.names), header.separator, problems)
            place = header.names.index(names[0])
            found[0].add([_cell(str(row), place, header.separator) for row in cut], numbers)

        rows = scan_text(path, visit)
        times, time = found[0], names[0]
    gauges = tuple(name for name in rows.columns if name != time)
    if not gauges:
        problems.add(item="the header", found=f"only the column '{time}'", expected="a column for every gauge")
    ends, lines, zone = times.finish()
    if len(problems) > before:
        return None, zone
    used = tuple(gauge for gauge in gauges if gauge not in exclude)
    return WideFile(str(path), used, ends, lines, rows, time, rules.depths), zone


def _time_column(path: Path, columns: Sequence[str], rules: SourceRules) -> str:
    problems = Problems(file=str(path))
    found = find_column(columns, TIME_NAMES, mapped=rules.columns.get("time"), key="time", problems=problems)
    problems.raise_as(ReadError)
    return columns[0] if found is None else found


def _cell(row: str, place: int, separator: str) -> str:
    if '"' in row:
        cells = next(csv.reader([row], delimiter=separator, skipinitialspace=True))
    else:
        cells = row.split(separator, place + 1)
    return cells[place].strip() if place < len(cells) else ""


def _long(
    path: Path,
    rules: SourceRules,
    stamps: StampRules,
    *,
    zone: str | None,
    exclude: Collection[str],
    problems: Problems,
) -> tuple[StreamFile | None, str | None]:
    going = LongPass(str(path), rules, stamps, zone, problems)
    rows: Rows
    if file_format(path.name) == "parquet":
        rows = parquet = open_parquet(path, layout="long", columns=rules.columns)
        only = going.columns_in(parquet.columns)
        for _, table in parquet.tables(0, parquet.n_rows, only=only):
            going.add(table)
    else:

        def visit(lines: list[str], numbers: npt.NDArray[np.int64], header: Header) -> None:
            going.columns_in([name for name in header.names if name])
            going.add(_table(path, lines, numbers, header))

        rows = scan_text(path, visit)
    return going.finish(rows, exclude)


def _table(path: Path, lines: list[str], numbers: npt.NDArray[np.int64], header: Header) -> DelimitedTable:
    spaced = has_spaces_at_cell_ends("\n".join(lines), header.separator)
    return table_of_rows(lines, numbers, header, str(path), decimal=".", spaced=spaced)

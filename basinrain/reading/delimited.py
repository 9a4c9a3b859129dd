"""Delimited text (CSV, TSV) as spreadsheets and agencies write it, every row with its line in the file.

Nothing is guessed about a cell: a table holds text. What the text of a number is, is settled for the whole file, so
that a comma is never a decimal sign in one column and a thousands mark in the next.
"""

from __future__ import annotations

import csv
import io
import re
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problem, Problems, ReadError
from basinrain.reading.decimal_signs import decimal_signs
from basinrain.reading.files import read_bytes
from basinrain.reading.interrupts import interrupts_seen

__all__ = [
    "DelimitedTable",
    "Header",
    "decode_text",
    "has_spaces_at_cell_ends",
    "header_of",
    "read_delimited",
    "report_uneven",
    "table_of_rows",
]

_SEPARATORS: Final = ("\t", ";", ",")


@dataclass(frozen=True, eq=False)
class DelimitedTable:
    """The cells of a delimited text file.

    Parameters
    ----------
    file : str
        The file, as the user is shown it.
    columns : tuple of str
        Names of the columns, all different.
    frame : pandas.DataFrame
        The cells as text without surrounding spaces; an empty cell is ``""``, never NaN. Rows and columns without any
        content are left out.
    lines : array of int, shape (n_rows,)
        The line of the file, from 1, on which every row starts.
    decimal : str
        The decimal sign of the file's numbers, ``"."`` or ``","``.
    """

    file: str
    columns: tuple[str, ...]
    frame: pd.DataFrame
    lines: npt.NDArray[np.int64]
    decimal: str


class Header(NamedTuple):
    """The names of a file's columns (``""`` where there is none), what separates its cells, and the header's line."""

    names: tuple[str, ...]
    separator: str
    line: int


def read_delimited(path: Path) -> DelimitedTable:
    r"""Read a delimited text file with one header line.

    UTF-8 with or without byte-order mark; any line ends; cells separated by comma, semicolon or tab, whichever the
    header has most of; cells may be quoted. Where the separator is not a comma, numbers may have a decimal comma.

    Parameters
    ----------
    path
        The file.

    Returns
    -------
    DelimitedTable

    Raises
    ------
    ReadError
        The file is missing, a folder, unreadable, empty, binary, not UTF-8 or only a header; columns are unnamed or
        named twice; rows have more cells than the header, or fewer (all such rows together). A row of empty cells is
        passed over, however many it has; so are empty cells behind the header's last name.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "depths.csv"
    >>> _ = path.write_bytes(b"time;W01 ;W02\r\n\r\n2031-05-01; 1,5;\r\n")
    >>> table = read_delimited(path)
    >>> table.columns, table.decimal, table.lines.tolist(), table.frame.to_numpy().tolist()
    (('time', 'W01', 'W02'), ',', [3], [['2031-05-01', '1,5', '']])
    """
    file = str(path)
    text = decode_text(read_bytes(path), file)
    lines = text.split("\n")
    kept = [number for number, line in enumerate(lines) if line and not line.isspace()]
    if not kept:
        raise ReadError(Problem(item="the file", found="nothing in it", expected="a header and rows", file=file))
    header = header_of(lines[kept[0]], kept[0] + 1)
    cells: Sequence[str] | Sequence[list[str]]
    if '"' in text and any(line.count('"') % 2 for line in lines):
        names, cells, numbers_of_lines = _records(text, header.separator, file)
        header = header._replace(names=_names(names))
    else:
        cells = [lines[number] for number in kept[1:]]
        numbers_of_lines = np.asarray(kept[1:], dtype=np.int64) + 1
    decimal = "," if decimal_signs(text, header.separator) == {","} else "."
    table = table_of_rows(
        cells, numbers_of_lines, header, file, decimal=decimal, spaced=has_spaces_at_cell_ends(text, header.separator)
    )
    if not len(table.lines):
        raise ReadError(Problem(item="the file", found="a header and nothing below it", expected="rows", file=file))
    return table


def decode_text(content: bytes, file: str, *, first_line: int = 1) -> str:
    r"""Return the text of a file, or of whole lines from its line ``first_line`` on, its line ends all ``\n``.

    Raises
    ------
    ReadError
        It is binary, or not UTF-8.

    Examples
    --------
    >>> decode_text(b"time,A\r\n", "rain.csv")
    'time,A\n'
    """
    if b"\0" in content:
        raise ReadError(
            Problem(
                item="the file",
                found="binary content",
                expected="delimited text in UTF-8",
                remedy="export it as CSV in UTF-8",
                file=file,
            )
        )
    try:
        text = content.decode("utf-8-sig" if first_line == 1 else "utf-8")
    except UnicodeDecodeError as error:
        # With a byte-order mark, the position counts from behind it.
        raise ReadError(
            Problem(
                item="the file",
                found=f"byte 0x{error.object[error.start]:02x}, which is not UTF-8",
                expected="text in UTF-8",
                remedy="save it as UTF-8",
                file=file,
                line=error.object.count(b"\n", 0, error.start) + first_line,
            )
        ) from None
    return text.replace("\r\n", "\n").replace("\r", "\n") if "\r" in text else text


def header_of(text: str, line: int) -> Header:
    """Return what the header line of a file says.

    Examples
    --------
    >>> header_of("time;W01 ;W02;", 1)
    Header(names=('time', 'W01', 'W02'), separator=';', line=1)
    """
    separator = _separator(text)
    return Header(_names(next(csv.reader([text], delimiter=separator, skipinitialspace=True))), separator, line)


def _names(cells: Sequence[str]) -> tuple[str, ...]:
    names = [name.strip() for name in cells]
    while names and not names[-1]:
        names.pop()
    return tuple(names)


def table_of_rows(
    rows: Sequence[str] | Sequence[list[str]],
    lines: npt.NDArray[np.int64],
    header: Header,
    file: str,
    *,
    decimal: str,
    spaced: bool,
) -> DelimitedTable:
    """Return the table of some rows of a file; rows of empty cells are left out.

    Parameters
    ----------
    rows
        Lines, or lists of cells.
    lines
        The line of the file on which each begins.
    header, file, decimal
        As for the whole file.
    spaced
        Whether cells may have spaces around them.

    Raises
    ------
    ReadError
        Columns are unnamed or named twice; rows have more cells than the header, or fewer.

    Examples
    --------
    >>> header = header_of("time,W01", 1)
    >>> table_of_rows(["2031-05-04,1.5"], np.array([7]), header, "rain.csv", decimal=".", spaced=False).frame["W01"][0]
    '1.5'
    """
    problems = Problems(file=file)
    frame = _frame(rows, lines, len(header.names), header.separator, problems)
    _check_names(header.names, frame, problems, line=header.line)
    problems.raise_as(ReadError)
    if spaced:
        frame = frame.apply(lambda column: column.str.strip())
    full = (frame != "").to_numpy().any(axis=1)
    if not full.all():
        frame, lines = frame.iloc[np.flatnonzero(full)], lines[full]
    named = [place for place, name in enumerate(header.names) if name]
    frame = frame.iloc[:, named]
    frame.columns = pd.Index([header.names[place] for place in named])
    return DelimitedTable(file, tuple(frame.columns), frame.reset_index(drop=True), lines, decimal)


def _separator(header: str) -> str:
    bare = re.sub(r'"[^"]*"', "", header)
    return max(_SEPARATORS, key=lambda separator: (bare.count(separator), separator == ","))


def has_spaces_at_cell_ends(text: str, separator: str) -> bool:
    """Return whether cells may need stripping; it is slow on a million rows, and times have spaces inside."""
    marks = (f" {separator}", f"{separator} ", " \n", "\n ", '" ', ' "')
    return (
        any(mark in text for mark in marks)
        or text.endswith(" ")
        or not text.isascii()
        or (separator != "\t" and "\t" in text)
    )


def _records(text: str, separator: str, file: str) -> tuple[list[str], list[list[str]], npt.NDArray[np.int64]]:
    """Cells of a text whose quoted cells may run over line ends."""
    reader = csv.reader(io.StringIO(text), delimiter=separator, skipinitialspace=True, strict=True)
    records, starts = [], []
    start = 1
    try:
        for record in reader:
            if any(cell.strip() for cell in record):
                records.append(record)
                starts.append(start)
            start = reader.line_num + 1
    except csv.Error:
        raise ReadError(
            Problem(
                item="a quoted cell",
                found="a quotation mark out of place",
                expected="cells quoted from end to end, a mark inside them doubled",
                remedy="correct the row that starts here",
                file=file,
                line=start,
            )
        ) from None
    return records[0], records[1:], np.asarray(starts[1:], dtype=np.int64)


def report_uneven(
    rows: Sequence[str] | Sequence[list[str]],
    lines: npt.NDArray[np.int64],
    n_columns: int,
    separator: str,
    problems: Problems,
) -> list[str | list[str]]:
    """Return rows without empty cells behind the last column; rows with more cells than columns or fewer are problems.

    Examples
    --------
    >>> problems = Problems(file="rain.csv")
    >>> report_uneven(["8:00,1,,", "9:00"], np.array([2, 3]), 2, ",", problems)
    ['8:00,1', '9:00']
    >>> problems.raise_as(ReadError)
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: rain.csv:3: a row: found 1 cell; expected 2, as the header has; give every cell, an \
empty one where there is no value
    """
    cut: list[str | list[str]] = list(rows)
    for place, cells in _uneven(rows, n_columns, separator):
        # Cells after the last named column, and those of a row that has none filled, are a spreadsheet's leavings.
        if any(cell.strip() for cell in (cells[n_columns:] if len(cells) > n_columns else cells)):
            problems.add(
                item="a row",
                found=f"{len(cells)} cell" + ("s" if len(cells) > 1 else ""),
                expected=f"{n_columns}, as the header has",
                remedy=_uneven_remedy(separator, n_columns, more=len(cells) > n_columns),
                line=int(lines[place]),
            )
        cut[place] = _joined(cells[:n_columns], separator) if isinstance(rows[0], str) else cells[:n_columns]
    return cut


def _frame(
    rows: Sequence[str] | Sequence[list[str]],
    lines: npt.NDArray[np.int64],
    n_columns: int,
    separator: str,
    problems: Problems,
) -> pd.DataFrame:
    """Cells of the rows, n_columns across; rows with more cells or fewer are problems."""
    cut = report_uneven(rows, lines, n_columns, separator, problems)
    if not rows or not isinstance(rows[0], str):
        padded = [[*row, *[""] * (n_columns - len(row))] for row in cut]
        return pd.DataFrame(padded, columns=range(n_columns), dtype=object)
    with interrupts_seen():
        return pd.read_csv(
            io.StringIO("\n".join(str(row) for row in cut)),
            sep=separator,
            header=None,
            names=list(range(n_columns)),
            index_col=False,
            dtype=object,  # plain strings: three times as fast as strings of Arrow
            na_filter=False,
            skip_blank_lines=False,
            skipinitialspace=True,
            engine="c",
            low_memory=False,
        )


def _uneven(
    rows: Sequence[str] | Sequence[list[str]], n_columns: int, separator: str
) -> Iterator[tuple[int, list[str]]]:
    """Yield place and cells of the rows that have not n_columns cells."""
    # Between quotation marks a separator separates nothing.
    doubtful = [
        place
        for place, row in enumerate(rows)
        if not isinstance(row, str) or row.count(separator) != n_columns - 1 or '"' in row
    ]
    for place in doubtful:
        row = rows[place]
        cells = next(csv.reader([row], delimiter=separator, skipinitialspace=True)) if isinstance(row, str) else row
        if len(cells) != n_columns:
            yield place, cells


def _uneven_remedy(separator: str, n_columns: int, *, more: bool) -> str:
    if not more:
        return "give every cell, an empty one where there is no value"
    if n_columns == 1:
        return "begin the file with its header: remove titles above it"
    if separator == ",":
        return "separate cells by semicolons where the decimal sign is a comma, or quote cells with a comma"
    return ""


def _joined(cells: Sequence[str], separator: str) -> str:
    line = io.StringIO()
    csv.writer(line, delimiter=separator, lineterminator="").writerow(cells)
    return line.getvalue()


def _check_names(columns: Sequence[str], frame: pd.DataFrame, problems: Problems, *, line: int) -> None:
    for name, count in Counter(columns).items():
        if name and count > 1:
            problems.add(
                item="the header",
                found=f"{count} columns named '{name}'",
                expected="every column once",
                remedy="rename or remove them",
                line=line,
                column=name,
            )
    for place, name in enumerate(columns):
        if not name and frame.iloc[:, place].str.strip().ne("").any():
            problems.add(
                item="the header",
                found=f"no name over column {place + 1}, which has cells",
                expected="a name for every column",
                line=line,
            )

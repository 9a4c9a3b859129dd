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
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problem, Problems, ReadError
from basinrain.reading.files import read_bytes

__all__ = ["DelimitedTable", "read_delimited"]

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
    text = _text(path, file)
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    lines = text.split("\n")
    kept = [number for number, line in enumerate(lines) if line and not line.isspace()]
    if not kept:
        raise ReadError(Problem(item="the file", found="nothing in it", expected="a header and rows", file=file))
    separator = _separator(lines[kept[0]])
    cells: Sequence[str] | Sequence[list[str]]
    if '"' in text and any(line.count('"') % 2 for line in lines):
        header, cells, numbers_of_lines = _records(text, separator, file)
    else:
        header = next(csv.reader([lines[kept[0]]], delimiter=separator, skipinitialspace=True))
        cells = [lines[number] for number in kept[1:]]
        numbers_of_lines = np.asarray(kept[1:], dtype=np.int64) + 1
    columns = [name.strip() for name in header]
    while columns and not columns[-1]:
        columns.pop()
    problems = Problems(file=file)
    frame = _frame(cells, numbers_of_lines, len(columns), separator, problems)
    _check_names(columns, frame, problems, line=kept[0] + 1)
    problems.raise_as(ReadError)

    if _has_spaces_at_cell_ends(text, separator):
        frame = frame.apply(lambda column: column.str.strip())
    filled = (frame != "").to_numpy()
    rows = filled.any(axis=1)
    if not rows.any():
        raise ReadError(Problem(item="the file", found="a header and nothing below it", expected="rows", file=file))
    if not rows.all():
        frame, numbers_of_lines = frame.iloc[np.flatnonzero(rows)], numbers_of_lines[rows]
    named = [place for place, name in enumerate(columns) if name]
    frame = frame.iloc[:, named]
    frame.columns = pd.Index([columns[place] for place in named])
    return DelimitedTable(
        file=file,
        columns=tuple(frame.columns),
        frame=frame.reset_index(drop=True),
        lines=numbers_of_lines,
        decimal=_decimal(text, separator),
    )


def _text(path: Path, file: str) -> str:
    content = read_bytes(path)
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
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        # With a byte-order mark, the position counts from behind it.
        raise ReadError(
            Problem(
                item="the file",
                found=f"byte 0x{error.object[error.start]:02x}, which is not UTF-8",
                expected="text in UTF-8",
                remedy="save it as UTF-8",
                file=file,
                line=error.object.count(b"\n", 0, error.start) + 1,
            )
        ) from None


def _separator(header: str) -> str:
    bare = re.sub(r'"[^"]*"', "", header)
    return max(_SEPARATORS, key=lambda separator: (bare.count(separator), separator == ","))


def _has_spaces_at_cell_ends(text: str, separator: str) -> bool:
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


def _frame(
    rows: Sequence[str] | Sequence[list[str]],
    lines: npt.NDArray[np.int64],
    n_columns: int,
    separator: str,
    problems: Problems,
) -> pd.DataFrame:
    """Cells of the rows, n_columns across; rows with more cells or fewer are problems."""
    cut: list[str | list[str]] = list(rows)
    whole_lines = bool(rows) and isinstance(rows[0], str)
    for place, cells in _uneven(rows, n_columns, separator):
        # Cells after the last named column, and those of a row that has none filled, are a spreadsheet's leavings.
        if any(cell.strip() for cell in (cells[n_columns:] if len(cells) > n_columns else cells)):
            problems.add(
                item="a row",
                found=f"{len(cells)} cell" + ("s" if len(cells) > 1 else ""),
                expected=f"{n_columns}, as the header has",
                remedy=_uneven_remedy(separator, more=len(cells) > n_columns),
                line=int(lines[place]),
            )
        cut[place] = _joined(cells[:n_columns], separator) if whole_lines else cells[:n_columns]
    if not whole_lines:
        padded = [[*row, *[""] * (n_columns - len(row))] for row in cut]
        return pd.DataFrame(padded, columns=range(n_columns), dtype=str)
    return pd.read_csv(
        io.StringIO("\n".join(str(row) for row in cut)),
        sep=separator,
        header=None,
        names=list(range(n_columns)),
        index_col=False,
        dtype=str,
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


def _uneven_remedy(separator: str, *, more: bool) -> str:
    if not more:
        return "give every cell, an empty one where there is no value"
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


def _decimal(text: str, separator: str) -> str:
    """Return a comma where whole cells are numbers with a comma and none is a number with a point."""
    if separator == ",":
        return "."

    def has(sign: str) -> bool:
        cell = rf'(?:^|{separator})[ "]*[+-]?[0-9]*{sign}[0-9]+(?:[eE][+-]?[0-9]+)?[ "]*(?:{separator}|$)'
        return re.search(cell, text, re.MULTILINE) is not None

    return "," if has(",") and not has(r"\.") else "."

"""Delimited text (CSV, TSV) as spreadsheets and agencies write it, every row with its line in the file.

Nothing is guessed about a cell: a table holds text. What the text of a number is, is settled for the whole file, so
that a comma is never a decimal sign in one column and a thousands mark in the next.
"""

from __future__ import annotations

import csv
import io
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problem, Problems, ReadError, nearest_name

__all__ = ["DelimitedTable", "find_column", "numbers", "read_bytes", "read_delimited"]

_SEPARATORS: Final = ("\t", ";", ",")
_NUMBER: Final = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")


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
        named twice; rows have more cells than the header (all such rows together).

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
        header = next(csv.reader([lines[kept[0]]], delimiter=separator))
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


def read_bytes(path: Path, *, size: int = -1, expected: str = "a header and rows") -> bytes:
    """Return a file's content.

    Parameters
    ----------
    path
    size
        Return no more than so many bytes from its start; -1 for all.
    expected
        What a file with nothing in it should hold.

    Raises
    ------
    ReadError
        The file is missing, a folder, unreadable or empty.

    Examples
    --------
    >>> read_bytes(Path("no_such_file.csv"))
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: no_such_file.csv: the file: found nothing of that name; expected a file; correct the \
path
    """
    file = str(path)
    try:
        with path.open("rb") as stream:
            content = stream.read(size)
    except FileNotFoundError:
        problem = Problem(
            item="the file", found="nothing of that name", expected="a file", remedy="correct the path", file=file
        )
    except OSError as error:
        if path.is_dir():
            problem = Problem(item="the file", found="a folder", expected="a file", remedy="name a file", file=file)
        else:
            problem = Problem(
                item="the file",
                found=f"that it cannot be read ({error.strerror})",
                remedy="allow reading it, or copy it to where it can be read",
                file=file,
            )
    else:
        if content:
            return content
        problem = Problem(item="the file", found="nothing in it", expected=expected, file=file)
    raise ReadError(problem)


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
    reader = csv.reader(io.StringIO(text), delimiter=separator, strict=True)
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
    """Cells of the rows, n_columns across; rows with more than that are problems."""
    cut: list[str | list[str]] = list(rows)
    whole_lines = bool(rows) and isinstance(rows[0], str)
    for place, row in enumerate(cut):
        if isinstance(row, str):
            if row.count(separator) < n_columns:
                continue
            cells = next(csv.reader([row], delimiter=separator))
        else:
            cells = row
        if len(cells) <= n_columns:
            continue
        if any(cell.strip() for cell in cells[n_columns:]):
            problems.add(
                item="a row",
                found=f"{len(cells)} cells",
                expected=f"at most {n_columns}, as the header has",
                remedy="separate cells by semicolons where the decimal sign is a comma, or quote cells with a comma"
                if separator == ","
                else "",
                line=int(lines[place]),
            )
        cut[place] = _joined(cells[:n_columns], separator) if isinstance(row, str) else cells[:n_columns]
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

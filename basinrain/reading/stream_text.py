"""Delimited text that is read in parts: where its rows stand, and the tables of some of them."""

from __future__ import annotations

import csv
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problem, ReadError
from basinrain.reading.decimal_signs import decimal_signs
from basinrain.reading.delimited import (
    DelimitedTable,
    Header,
    decode_text,
    has_spaces_at_cell_ends,
    header_of,
    table_of_rows,
)
from basinrain.reading.stream_mark import FileMark

__all__ = ["TextRows", "scan_text"]

_BLOCK: Final = 1 << 22
"""Bytes of text in hand at a time; a longer row is taken whole."""


@dataclass(frozen=True, eq=False)
class TextRows:
    """Where the rows of a delimited file stand; it holds no open file.

    Parameters
    ----------
    mark
        The file as it was.
    header
        Its header.
    decimal
        Its decimal sign.
    first_rows, offsets, lines : arrays of int, shape (n_blocks + 1,)
        The row, the byte and the line at which every block begins, and their ends. Rows count from 0 below the header,
        those without content left out.
    """

    mark: FileMark
    header: Header
    decimal: str
    first_rows: npt.NDArray[np.int64]
    offsets: npt.NDArray[np.int64]
    lines: npt.NDArray[np.int64]

    @property
    def n_rows(self) -> int:
        """How many rows the file has."""
        return int(self.first_rows[-1])

    @property
    def columns(self) -> tuple[str, ...]:
        """The names of its columns."""
        return tuple(name for name in self.header.names if name)

    def tables(
        self,
        first: int,
        stop: int,
        *,
        only: Sequence[str] | None = None,  # noqa: ARG002 - a row of text is one piece
    ) -> Iterator[tuple[int, DelimitedTable]]:
        """Yield the rows ``first`` to ``stop`` (exclusive) in pieces of a bounded size, each with its first row.

        Raises
        ------
        ReadError
            The file is gone or has changed; its rows cannot be read.
        """
        self.mark.check()
        begin = max(int(np.searchsorted(self.first_rows, first, "right")) - 1, 0)
        end = int(np.searchsorted(self.first_rows, stop, "left"))
        file = str(self.mark.path)
        with self.mark.path.open("rb") as stream:
            for block in range(begin, end):
                stream.seek(int(self.offsets[block]))
                content = stream.read(int(self.offsets[block + 1] - self.offsets[block]))
                line = int(self.lines[block])
                text = decode_text(content, file, first_line=line)
                rows, numbers = _filled(text, line, self.header)
                if len(rows) != self.first_rows[block + 1] - self.first_rows[block]:
                    raise self.mark.changed()
                low = max(first - int(self.first_rows[block]), 0)
                high = min(stop - int(self.first_rows[block]), len(rows))
                if low < high:
                    yield (
                        int(self.first_rows[block]) + low,
                        table_of_rows(
                            rows[low:high],
                            numbers[low:high],
                            self.header,
                            file,
                            decimal=self.decimal,
                            spaced=has_spaces_at_cell_ends(text, self.header.separator),
                        ),
                    )


def scan_text(path: Path, visit: Callable[[list[str], npt.NDArray[np.int64], Header], None]) -> TextRows:
    r"""Go through a file once, and return where its rows stand.

    Parameters
    ----------
    path
        The file.
    visit
        Called with the rows of every block in turn, their lines in the file, and the header; for the first block also
        where it has no row.

    Raises
    ------
    ReadError
        What keeps a delimited file from being read; a quoted cell that runs over a line end.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "rain.csv"
    >>> _ = path.write_text("time,A\n\n2031-05-04,1.5\n,\n2031-05-05,0\n")
    >>> rows = scan_text(path, lambda rows, lines, header: print(rows, lines, header.names))
    ['2031-05-04,1.5', '2031-05-05,0'] [3 5] ('time', 'A')
    >>> [(first, table.frame["A"].tolist()) for first, table in rows.tables(1, 2)]
    [(1, ['0'])]
    """
    mark, file = FileMark.of(path), str(path)
    header: Header | None = None
    n_rows, offset, line = 0, 0, 1
    index: list[tuple[int, int, int]] = []
    signs: frozenset[str] = frozenset()
    for content in _blocks(path):
        text = decode_text(content, file, first_line=line)
        n_lines = text.count("\n") + (not text.endswith("\n"))
        if header is None:
            found = _first_line(text)
            if found is None:
                offset, line = offset + len(content), line + n_lines
                continue
            header = header_of(found[1], line + found[0])
            # Names that cannot be are told before anything is read below them.
            table_of_rows([], np.empty(0, dtype=np.int64), header, file, decimal=".", spaced=False)
        if '"' in text:
            _check_quotes(text, line, file)
        if "." not in signs:
            signs |= decimal_signs(text, header.separator)
        rows, numbers = _filled(text, line, header)
        visit(rows, numbers, header)
        index.append((n_rows, offset, line))
        n_rows, offset, line = n_rows + len(rows), offset + len(content), line + n_lines
    if header is None:
        raise ReadError(Problem(item="the file", found="nothing in it", expected="a header and rows", file=file))
    if not n_rows:
        raise ReadError(Problem(item="the file", found="a header and nothing below it", expected="rows", file=file))
    index.append((n_rows, offset, line))
    firsts, offsets, lines = np.array(index, dtype=np.int64).T
    return TextRows(mark, header, "," if signs == {","} else ".", firsts, offsets, lines)


def _blocks(path: Path) -> Iterator[bytes]:
    """Yield the file in blocks of whole lines."""
    held = b""
    with path.open("rb") as stream:
        while part := stream.read(_BLOCK):
            held += part
            # A carriage return at the very end may belong to a line feed that follows.
            cut = max(held.rfind(b"\n"), held.rfind(b"\r", 0, len(held) - 1)) + 1
            if cut:
                yield held[:cut]
                held = held[cut:]
    if held:
        yield held


def _first_line(text: str) -> tuple[int, str] | None:
    """Return the first line with content, and how many lines there are before it."""
    lines = enumerate(text.split("\n"))
    return next(((number, line) for number, line in lines if line and not line.isspace()), None)


def _check_quotes(text: str, first_line: int, file: str) -> None:
    for number, line in enumerate(text.split("\n")):
        if line.count('"') % 2:
            raise ReadError(
                Problem(
                    item="a quoted cell",
                    found="a line end in it, or a quotation mark out of place",
                    expected="cells that end on their line, where a file is read in parts",
                    remedy="correct the row that starts here",
                    file=file,
                    line=first_line + number,
                )
            )


def _filled(text: str, first_line: int, header: Header) -> tuple[list[str], npt.NDArray[np.int64]]:
    """Return the rows below the header that have content, and their lines."""
    blank = f'{header.separator}" \t'
    rows, numbers = [], []
    for number, row in enumerate(text.split("\n"), first_line):
        if number <= header.line or not row or row.isspace():
            continue
        if row[0] in blank and not _has_content(row, header.separator):
            continue
        rows.append(row)
        numbers.append(number)
    return rows, np.asarray(numbers, dtype=np.int64)


def _has_content(row: str, separator: str) -> bool:
    if '"' in row:
        return any(cell.strip() for cell in next(csv.reader([row], delimiter=separator, skipinitialspace=True)))
    return bool(row.replace(separator, "").strip())

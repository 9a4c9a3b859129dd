"""Delimited text: every way in which spreadsheets write the same table, and every file that is none."""

import re
from pathlib import Path

import numpy as np
import pytest

from basinrain.errors import ReadError
from basinrain.reading.columns import numbers
from basinrain.reading.delimited import DelimitedTable, read_delimited


def written(folder: Path, content: str | bytes, name: str = "table.csv") -> Path:
    """Return a file with this content."""
    path = folder / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def cells(table: DelimitedTable) -> list[list[str]]:
    """Return the cells row by row."""
    return table.frame.to_numpy().tolist()


def refusal(path: Path) -> str:
    """Return the text of the error that reading the file raises."""
    with pytest.raises(ReadError, match=re.escape(path.name)) as caught:
        read_delimited(path)
    return str(caught.value).replace(f"{path.parent}/", "")


@pytest.mark.parametrize("bom", ["", "\ufeff"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_one_table_in_every_dress(tmp_path: Path, separator: str, end: str, bom: str) -> None:
    """Separator, line ends and byte-order mark do not change the cells."""
    rows = ["id,Höhe,W 1", "A,1.5,x y", "B,,z"]
    table = read_delimited(written(tmp_path, bom + end.join(row.replace(",", separator) for row in rows) + end))
    assert table.columns == ("id", "Höhe", "W 1")
    assert cells(table) == [["A", "1.5", "x y"], ["B", "", "z"]]
    assert table.lines.tolist() == [2, 3]
    assert table.decimal == "."


def test_rows_know_their_line_in_the_file(tmp_path: Path) -> None:
    """Blank lines, and rows of nothing but separators, are passed over without shifting the line numbers."""
    table = read_delimited(written(tmp_path, "\n\nid,x\n\nA,1\n,\n   \nB,2"))
    assert cells(table) == [["A", "1"], ["B", "2"]]
    assert table.lines.tolist() == [5, 8]


def test_rows_know_their_line_behind_a_cell_of_two_lines(tmp_path: Path) -> None:
    """A quoted cell may run over a line end, and the rows behind it keep their line."""
    table = read_delimited(written(tmp_path, 'id,note\nA,"first\n\nsecond"\n\nB,plain\nC,\n'))
    assert cells(table) == [["A", "first\n\nsecond"], ["B", "plain"], ["C", ""]]
    assert table.lines.tolist() == [2, 6, 7]


@pytest.mark.parametrize(
    ("content", "lines"),
    [
        # Without the refusal, 1.0 of gauge D would be read as that of C.
        ("t,A,B,C,D\n1,.1,.2,.3,.4\n2,.1,.2,1.0\n3,,,,\n4\n", [(3, 4), (5, 1)]),
        ("t,A,B,C,D\n1,.1,.2,.3\n", [(2, 4)]),
        ("t;A;B;C;D\r\n1;0,1;0,2;0,3;0,4\r\n\r\n2;0,1;0,2;0,3\r\n", [(4, 4)]),
        # A comma inside quotation marks separates nothing, with a space before them or without.
        ('t,A,B,C,D\n1,"a,b",2,3\n2, "a,b",2,3\n3, "a,b",2,3,4\n', [(2, 4), (3, 4)]),
        ('t,A,B,C,D\n1,"a\nb",2,3,4\n2,1,2,3\n3,"a\nb",2,3\n', [(4, 4), (5, 4)]),
        # Names in the header count, not its trailing separators.
        ("t,A,B,C,D,,\n1,2,3,4,5,,\n2,3,4,5,6\n3,4,5,6\n", [(4, 4)]),
    ],
)
def test_short_rows_are_refused(tmp_path: Path, content: str, lines: list[tuple[int, int]]) -> None:
    """A row that lost a cell is never filled up: nothing says which gauge's value it lacks."""
    assert refusal(written(tmp_path, content)).splitlines() == [
        f"table.csv:{line}: a row: found {n} cell{'' if n == 1 else 's'}; expected 5, as the header has; give every "
        "cell, an empty one where there is no value"
        for line, n in lines
    ]


def test_empty_cells_at_the_end_of_a_row_are_cells(tmp_path: Path) -> None:
    """Nothing after the last separators is an empty cell; a row of empty cells only is none, however many it has."""
    table = read_delimited(written(tmp_path, "id,x,y\nA,,\n,\nB,1,\n,,,\n"))
    assert cells(table) == [["A", "", ""], ["B", "1", ""]]
    assert table.lines.tolist() == [2, 4]


def test_a_file_of_short_rows_is_counted_not_listed(tmp_path: Path) -> None:
    """Fifty rows are listed, the rest is a number."""
    path = written(tmp_path, "id,x,y\n" + "A,1\n" * 70)
    with pytest.raises(ReadError, match=r"\n20 more problems: found but not listed$") as caught:
        read_delimited(path)
    assert [problem.line for problem in caught.value.problems] == list(range(2, 52))


def test_surrounding_spaces_are_not_content(tmp_path: Path) -> None:
    """Spaces around cells and names go, spaces inside stay, quoted or not."""
    table = read_delimited(written(tmp_path, ' id , name\n A ,"  Long Hill "\nB\u00a0, b c \n'))
    assert table.columns == ("id", "name")
    assert cells(table) == [["A", "Long Hill"], ["B", "b c"]]


def test_quoted_cells_hold_separators(tmp_path: Path) -> None:
    """A separator or a doubled quotation mark inside quotation marks is text."""
    table = read_delimited(written(tmp_path, 'id,name\nA,"Hill, upper ""old"""\n"B",b\n'))
    assert cells(table) == [["A", 'Hill, upper "old"'], ["B", "b"]]


def test_empty_columns_at_the_end_are_dropped(tmp_path: Path) -> None:
    """The trailing separators of a spreadsheet are no columns and no surplus cells."""
    table = read_delimited(written(tmp_path, "id,x,,\nA,1,,\nB,2,,,,\n"))
    assert table.columns == ("id", "x")
    assert cells(table) == [["A", "1"], ["B", "2"]]


def test_text_that_looks_like_missing_stays_text(tmp_path: Path) -> None:
    """NA, nan and null are text like any other, and a leading zero stays."""
    table = read_delimited(written(tmp_path, "id,x\n050109,NA\nnull,nan\n"))
    assert cells(table) == [["050109", "NA"], ["null", "nan"]]


@pytest.mark.parametrize(
    ("content", "decimal", "values"),
    [
        ("id;x\nA;1,5\nB;-,25\n", ",", [1.5, -0.25]),
        ("id\tx\nA\t1,5\nB\t2\n", ",", [1.5, 2.0]),
        ("id;x\nA;1.5\nB;2\n", ".", [1.5, 2.0]),
        ('id;x\nA;"1,5"\nB;2,0e1\n', ",", [1.5, 20.0]),
        # Both signs in one file: the comma could be a thousands mark, and is refused cell by cell.
        ("id;x\nA;1.5\nB;1,234\n", ".", [1.5, np.nan]),
        ('id,x\nA,1.5\nB,"1,234"\n', ".", [1.5, np.nan]),
        ("id;x\nA;1,5\nB;1.234,5\n", ",", [1.5, np.nan]),
    ],
)
def test_the_decimal_sign_is_one_for_the_file(tmp_path: Path, content: str, decimal: str, values: list[float]) -> None:
    """A comma is the decimal sign where it separates no cells and no number of the file has a point."""
    table = read_delimited(written(tmp_path, content))
    assert table.decimal == decimal
    got, bad = numbers(table, "x")
    np.testing.assert_array_equal(got, values)
    assert bad.tolist() == np.isnan(values).tolist()


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "table.csv: the file: found nothing in it; expected a header and rows"),
        (b"\xef\xbb\xbf \r\n\n", "table.csv: the file: found nothing in it; expected a header and rows"),
        (b"id,x\n", "table.csv: the file: found a header and nothing below it; expected rows"),
        (b"id,x\n,\n", "table.csv: the file: found a header and nothing below it; expected rows"),
        (
            b"id,x\nA,\x00\n",
            "table.csv: the file: found binary content; expected delimited text in UTF-8; export it as CSV in UTF-8",
        ),
        (
            "id,x\nA,Höhe\n".encode("latin-1"),
            "table.csv:2: the file: found byte 0xf6, which is not UTF-8; expected text in UTF-8; save it as UTF-8",
        ),
        (
            b"id,x,x\nA,1,2\n",
            (
                "table.csv:1: column x: the header: found 2 columns named 'x'; expected every column once; "
                "rename or remove them"
            ),
        ),
        (
            b"id,,x\nA,1,2\n",
            "table.csv:1: the header: found no name over column 2, which has cells; expected a name for every column",
        ),
        (
            b"id;x\nA;1;2\nB\nC;1;;3\n",
            (
                "table.csv:2: a row: found 3 cells; expected 2, as the header has\n"
                "table.csv:3: a row: found 1 cell; expected 2, as the header has; give every cell, an empty one where "
                "there is no value\n"
                "table.csv:4: a row: found 4 cells; expected 2, as the header has"
            ),
        ),
        (
            b"Depths of Quill, 2031\n;2;10\n1h;20;30\n",
            (
                "table.csv:2: a row: found 1 cell; expected 2, as the header has; give every cell, an empty one where "
                "there is no value\n"
                "table.csv:3: a row: found 1 cell; expected 2, as the header has; give every cell, an empty one where "
                "there is no value"
            ),
        ),
        (
            b"Depths of Quill\nduration;2;10\n1h;20,5;30,5\n",
            (
                "table.csv:3: a row: found 3 cells; expected 1, as the header has; begin the file with its header: "
                "remove titles above it"
            ),
        ),
        (
            b"id,x\nA,1,5\n",
            (
                "table.csv:2: a row: found 3 cells; expected 2, as the header has; "
                "separate cells by semicolons where the decimal sign is a comma, or quote cells with a comma"
            ),
        ),
        (
            b'id,x\nA,1\nB,"2\nC,3\n',
            (
                "table.csv:3: a quoted cell: found a quotation mark out of place; "
                "expected cells quoted from end to end, a mark inside them doubled; correct the row that starts here"
            ),
        ),
    ],
)
def test_what_is_no_table_is_refused_in_words(tmp_path: Path, content: bytes, message: str) -> None:
    """Each fault of a file is one line: where, what was found, what was expected, what to do."""
    assert refusal(written(tmp_path, content)) == message


def test_a_missing_file_and_a_folder_are_told_apart(tmp_path: Path) -> None:
    """The message says whether nothing is there, or a folder."""
    assert refusal(tmp_path / "gone.csv") == (
        "gone.csv: the file: found nothing of that name; expected a file; correct the path"
    )
    (tmp_path / "folder.csv").mkdir()
    assert refusal(tmp_path / "folder.csv") == "folder.csv: the file: found a folder; expected a file; name a file"


def test_a_file_that_may_not_be_read_is_said_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The system's own reason is passed on."""

    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied")

    path = written(tmp_path, "id,x\nA,1\n")
    monkeypatch.setattr(Path, "open", refuse)
    assert refusal(path) == (
        "table.csv: the file: found that it cannot be read (Permission denied); "
        "allow reading it, or copy it to where it can be read"
    )


def test_reading_leaves_the_file_alone(tmp_path: Path) -> None:
    """No input is ever touched."""
    path = written(tmp_path, b"\xef\xbb\xbfid;x\r\nA;1,5\r\n")
    before = path.stat().st_mtime_ns, path.read_bytes()
    read_delimited(path)
    assert (path.stat().st_mtime_ns, path.read_bytes()) == before


def test_a_long_record_keeps_rows_and_lines_together(tmp_path: Path) -> None:
    """Row by row, the fast reader agrees with splitting the lines."""
    rng = np.random.default_rng(3)
    rows = [f"{i},{v:.1f},{'' if v < 1 else f'{v:.2f}'}" for i, v in enumerate(rng.gamma(0.5, 4.0, 20_000))]
    for place in range(0, len(rows), 997):
        rows[place] += "\n"
    table = read_delimited(written(tmp_path, "n,a,b\n" + "\n".join(rows)))
    assert cells(table) == [row.strip().split(",") for row in rows]
    lines = ("n,a,b\n" + "\n".join(rows)).split("\n")
    assert [lines[line - 1].split(",")[0] for line in table.lines] == table.frame["n"].tolist()

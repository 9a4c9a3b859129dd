"""Delimited text: every way in which spreadsheets write the same table, and every file that is none."""

import re
from pathlib import Path

import hypothesis.strategies as st
import numpy as np
import pandas as pd
import pytest
from hypothesis import given

from basinrain.errors import Problems, ReadError
from basinrain.reading.delimited import DelimitedTable, find_column, numbers, read_bytes, read_delimited


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
    table = read_delimited(written(tmp_path, 'id,note\nA,"first\n\nsecond"\n\nB,plain\nC\n'))
    assert cells(table) == [["A", "first\n\nsecond"], ["B", "plain"], ["C", ""]]
    assert table.lines.tolist() == [2, 6, 7]


def test_cells_missing_at_the_end_of_a_row_are_empty(tmp_path: Path) -> None:
    """A short row has nothing in the columns it does not reach, be it the first or a later one."""
    table = read_delimited(written(tmp_path, "id,x,y\nA\nB,1,2\nC,3\n"))
    assert cells(table) == [["A", "", ""], ["B", "1", "2"], ["C", "3", ""]]


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
            b"id;x\nA;1;2\nB;1\nC;1;;3\n",
            (
                "table.csv:2: a row: found 3 cells; expected at most 2, as the header has\n"
                "table.csv:4: a row: found 4 cells; expected at most 2, as the header has"
            ),
        ),
        (
            b"id,x\nA,1,5\n",
            (
                "table.csv:2: a row: found 3 cells; expected at most 2, as the header has; "
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


def test_read_bytes_reads_no_more_than_asked(tmp_path: Path) -> None:
    """A size bounds what is read; -1 is all."""
    path = written(tmp_path, "abcdef")
    assert (read_bytes(path, size=2), read_bytes(path)) == (b"ab", b"abcdef")


@given(st.lists(st.floats(allow_nan=False, allow_infinity=False), min_size=1))
def test_numbers_are_read_to_the_last_bit(values: list[float]) -> None:
    """A number's shortest text gives that number back."""
    frame = pd.DataFrame({"x": [repr(value) for value in values]}, dtype=str)
    got, bad = numbers(DelimitedTable("t.csv", ("x",), frame, np.arange(len(values)), "."), "x")
    np.testing.assert_array_equal(got, values)
    assert not bad.any()


@pytest.mark.parametrize(
    "text", ["inf", "-Infinity", "nan", "NaN", "1_000", "0x10", "1,000", "1e999", "T", "1 2", "٣", "--1"]
)
def test_odd_texts_are_no_numbers(text: str) -> None:
    """What another reader might take for a number is reported, not read."""
    got, bad = numbers(DelimitedTable("t.csv", ("x",), pd.DataFrame({"x": [text, ""]}), np.arange(2), "."), "x")
    assert np.isnan(got).all()
    assert bad.tolist() == [True, False]


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


@pytest.mark.parametrize(
    ("columns", "mapped", "column"),
    [
        (["Gauge ID", "x"], None, "Gauge ID"),
        (["station", "gauge.id"], None, "gauge.id"),
        (["STATION", "x"], None, "STATION"),
        (["Id", "gauge_id"], "Id", "Id"),
        (["Id", "gauge_id"], "ID", "Id"),
        (["id", "ID"], "ID", "ID"),
        (["name"], None, None),
    ],
)
def test_columns_are_found_by_trade_name_or_mapping(columns: list[str], mapped: str | None, column: str | None) -> None:
    """The mapped column wins, then the first trade name in their order; capitals and word breaks do not matter."""
    problems = Problems()
    assert find_column(columns, ["gauge_id", "station"], mapped=mapped, key="id", problems=problems) == column
    assert len(problems) == 0


def test_a_mapped_column_that_is_not_there_is_never_replaced() -> None:
    """A slip in the mapping is a problem, though a trade name would fit."""
    problems = Problems(file="gauges.csv")
    assert find_column(["id", "gauge"], ["id"], mapped="gage", key="id", problems=problems) is None
    with pytest.raises(
        ReadError,
        match=r"^gauges.csv: columns.id: found no column 'gage'; expected a column of the file; did you mean 'gauge'\?",
    ):
        problems.raise_as(ReadError)

"""GHCN-Daily files by station as CSV."""

from __future__ import annotations

from pathlib import Path

import pytest
from ghcnfiles import ONE, TWO, block_of, days, faults_of

from basinrain.errors import Problems
from basinrain.reading.ghcn_csv import csv_cells


def row(date: str = "20310504", value: str = "15", *, station: str = ONE, flags: str = ",,X", hour: str = "") -> str:
    """Return a row of PRCP."""
    return f"{station},{date},PRCP,{value},{flags},{hour}"


def test_rows_in_any_order(tmp_path: Path) -> None:
    """Rows may stand in any order; days without one are missing."""
    block = block_of(
        tmp_path, row("20310507", "0"), row("20310504"), row("20310505", "2", hour="0700"), layout="ghcn-csv"
    )
    assert days(block) == {4: (1.5, "observed"), 5: (0.2, "observed"), 6: (None, "missing"), 7: (0.0, "zero")}
    assert block.lines.tolist() == [2, 3, 0, 1]


def test_a_header(tmp_path: Path) -> None:
    """A header that begins with ID is left out, and lines count with it."""
    header = "ID,DATE,ELEMENT,DATA_VALUE,M_FLAG,Q_FLAG,S_FLAG,OBS_TIME"
    block = block_of(tmp_path, header, row(), layout="ghcn-csv")
    assert (days(block), block.lines.tolist()) == ({4: (1.5, "observed")}, [2])


def test_no_rows() -> None:
    """A file without precipitation gives no cells."""
    cells = csv_cells(b"ORX00000001,20310504,TMAX,15,,,X,\r\n\r\n", Problems())
    assert (cells.gauges, len(cells.value)) == ((), 0)


def test_blanks_for_no_flag(tmp_path: Path) -> None:
    """A flag that is written as a blank is none."""
    assert days(block_of(tmp_path, row(flags=" , ,X"), layout="ghcn-csv")) == {4: (1.5, "observed")}


def test_a_value_twice(tmp_path: Path) -> None:
    """A second row for a station, day and element is told with both lines."""
    [fault] = faults_of(tmp_path, row(), row(station=TWO), row("20310505"), row(value="16"), layout="ghcn-csv")
    assert fault == (
        f"4: gauge {ONE}: found PRCP of 2031-05-04, as in line 1; expected each day once for a station and element; "
        "remove one of the rows"
    )


def test_a_file_of_another_kind(tmp_path: Path) -> None:
    """Where hardly any row is of the format, it is said once."""
    [fault] = faults_of(tmp_path, *(["time,A,B", "2031-05-04,1,2"] * 4), layout="ghcn-csv")
    assert fault.startswith("1: a row: found 3 cells, and 7 more lines like it; expected 8: station, date, ")


@pytest.mark.parametrize(
    ("line", "message"),
    [
        (row()[:-1], "a row: found 7 cells; expected 8: station, date, element"),
        (row() + ",", "a row: found 9 cells; expected 8: station, date, element"),
        ("STATION", "a row: found 1 cell; expected 8: station, date, element"),
        (row().replace(",", ";"), "a row: found 1 cell; expected 8: station, date, element"),
        (row().replace("PRCP", "PRC"), "a row: found element 'PRC'; expected four capital letters or figures"),
        (row(station="ORX1"), "the station: found 'ORX1'; expected an id of 11 characters"),
        (row(station="ORX00 00001"), "the station: found 'ORX00 00001'; expected an id of 11 characters"),
        (row("20310631"), "the date: found '20310631'; expected a date as YYYYMMDD, of 1700 to 2199"),
        (row("2031-05-04"), "the date: found '2031-05-04'; expected a date as YYYYMMDD, of 1700 to 2199"),
        (row("13310504"), "the date: found '13310504'; expected a date as YYYYMMDD, of 1700 to 2199"),
        (row(value="1.5"), "the value: found '1.5'; expected a whole number"),
        (row(value=""), "the value: found ''; expected a whole number"),
        (row(value="1e3"), "the value: found '1e3'; expected a whole number"),
        (row(flags="TT,,X"), "the mflag: found 'TT'; expected one character or none"),
        (row(flags=",XX,X"), "the qflag: found 'XX'; expected one character or none"),
        (row(value='"15"'), "the value: found '\"15\"'; expected a whole number"),
    ],
)
def test_rows_that_cannot_be(tmp_path: Path, line: str, message: str) -> None:
    """A row with a cell too many or too few, or with one that cannot be read, is told with its line."""
    [fault] = faults_of(tmp_path, row("20310501"), line, layout="ghcn-csv")
    assert fault.startswith(f"2: {message}")


def test_problems_together(tmp_path: Path) -> None:
    """The faults of a file are all listed, the unknown flags among them."""
    faults = faults_of(tmp_path, row(value="x"), row("20310505", flags="Y,,X"), row("2031050"), "x", layout="ghcn-csv")
    assert sorted(int(fault.split(":")[0]) for fault in faults) == [1, 2, 3, 4]

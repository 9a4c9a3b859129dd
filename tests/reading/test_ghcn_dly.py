"""GHCN-Daily station files of fixed width."""

from __future__ import annotations

import io
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from ghcnfiles import ONE, TWO, block_of, days, faults_of, month

from basinrain.errors import Problems
from basinrain.reading.ghcn_dly import dly_cells

NO_LINE = (
    "expected station in columns 1-11, year in 12-15, month in 16-17, element in 18-21; check that the file is a .dly "
    "file, and correct the line"
)


def test_every_number_as_a_fixed_width_reader_finds_it() -> None:
    """The values of two stations and two years are those that pandas.read_fwf finds in the published columns."""
    rng = np.random.default_rng(8)
    lines = [
        month(
            "PRCP",
            {
                d: f"{v}{'T' if v == 0 and d % 3 == 0 else ''}"
                for d, v in enumerate(rng.integers(-1, 4000, 31), 1)
                if v >= 0
            },
            station=station,
            when=f"{year}{m:02d}",
        )
        for station in (TWO, ONE)
        for year in (2031, 2032)
        for m in range(1, 13)
    ]
    widths = [11, 4, 2, 4] + [5, 1, 1, 1] * 31
    names = ["id", "year", "month", "element", *(f"{name}{d}" for d in range(1, 32) for name in "vmqs")]
    frame = pd.read_fwf(io.StringIO("\n".join(lines)), widths=widths, names=names, header=None, dtype=str)
    expected = {}
    for row in frame.to_dict("records"):
        for d in range(1, pd.Period(f"{row['year']}-{row['month']}").days_in_month + 1):
            expected[row["id"], f"{row['year']}-{row['month']}-{d:02d}"] = (int(row[f"v{d}"]), row[f"m{d}"] == "T")
    # The lines above hold values for 31 days in every month; those that the month has not are cut off.
    text = "\n".join(line[: 21 + 8 * pd.Period(f"{line[11:15]}-{line[15:17]}").days_in_month] for line in lines)
    problems = Problems()
    cells = dly_cells(text.encode(), problems)
    found = {
        (cells.gauges[g], str(np.datetime64(int(day), "D"))): (int(v), chr(m) == "T")
        for g, day, v, m in zip(cells.gauge, cells.day, cells.value, cells.mflag, strict=True)
    }
    assert len(problems) == 0
    assert len(found) == 2 * (365 + 366)
    assert found == expected


@pytest.mark.parametrize("ending", ["\n", "\r\n"])
def test_line_ends_and_blank_lines(tmp_path: Path, ending: str) -> None:
    """Line ends of either kind, empty lines and a byte-order mark change nothing."""
    text = "\ufeff" + month("PRCP", {4: "15"}) + ending * 2 + month("TMAX", {4: "15"}) + ending
    assert days(block_of(tmp_path, text)) == {4: (1.5, "observed")}


def test_blanks_missing_at_the_end(tmp_path: Path) -> None:
    """A line may have lost blanks, down to the value of the month's last day."""
    full = month("PRCP", {30: "15"}, when="203106")
    assert len(full) == 269
    for length in (269, 266, 261, 21 + 29 * 8 + 5):
        assert days(block_of(tmp_path, full[:length]))[30] == (1.5, "observed")
    assert days(block_of(tmp_path, full + "   "))[30] == (1.5, "observed")
    assert faults_of(tmp_path, full[: 21 + 29 * 8 + 4]) == [
        "1: a line: found 257 characters; expected 269; restore the line; only blanks at its end may be missing"
    ]


@pytest.mark.parametrize(
    ("line", "length"), [(month("PRCP", {})[:98], 98), (month("PRCP", {31: "15  X"})[:268] + " X", 270)]
)
def test_lines_of_another_length(tmp_path: Path, line: str, length: int) -> None:
    """A line that is cut off or too long is told with its length, among good lines of any element."""
    assert faults_of(tmp_path, month("PRCP", {}), line.replace("PRCP", "TMAX")) == [
        f"2: a line: found {length} characters; expected 269; restore the line; only blanks at its end may be missing"
    ]


@pytest.mark.parametrize(
    "head",
    ["ORX00000001203113PRCP", "ORX00000001203100PRCP", "ORX000000012O3105PRCP", "ORX00000001103105PRCP",
     "ORX00000001203105PRC ", "ORX0000001 203105PRCP", "ORX00000001,20310504,", "STATION"],
)  # fmt: skip
def test_lines_of_another_kind(tmp_path: Path, head: str) -> None:
    """A line that does not begin as the format says is refused, with its beginning."""
    line = head + month("PRCP", {})[21:] if len(head) == 21 else head
    assert faults_of(tmp_path, line) == [f"1: a line: found '{head}'; {NO_LINE}"]


def test_a_file_of_another_kind(tmp_path: Path) -> None:
    """Where hardly any line is of the format, it is said once."""
    [fault] = faults_of(tmp_path, month("PRCP", {}), *(["time,A,B", "2031-05-04,1,2"] * 4))
    assert fault == f"2: a line: found 'time,A,B', and 7 more lines like it; {NO_LINE}"


def test_a_lost_character_is_noticed(tmp_path: Path) -> None:
    """Wherever one character of a line is lost, the line is refused; the source flag at its end is not read."""
    line = month("PRCP", {d: f"{d * 7}  X" for d in range(1, 32)})
    for lost in range(len(line) - 1):
        assert faults_of(tmp_path, line[:lost] + line[lost + 1 :]), f"character {lost + 1}"


def test_a_month_twice(tmp_path: Path) -> None:
    """A second line for a station, month and element is told with both lines."""
    lines = [month("PRCP", {4: "15"}), month("PRCP", {4: "15"}, station=TWO), month("PRCP", {5: "15"})]
    assert faults_of(tmp_path, *lines) == [
        (
            f"3: gauge {ONE}: found PRCP of 2031-05, as in line 1; expected each month once for a station and element; "
            "remove one of the lines"
        )
    ]


def test_days_that_the_month_has_not(tmp_path: Path) -> None:
    """A value on 29 February of a common year, or on 31 June, is refused; on a leap year's 29 February it is read."""
    assert days(block_of(tmp_path, month("PRCP", {29: "15"}, when="203202"))) == {29: (1.5, "observed")}
    lines = [month("PRCP", {29: "15"}, when="203102"), month("MDPR", {31: "0"}, when="203106")]
    expected = "expected -9999, as the month has not so many days; correct the month or the value"
    assert faults_of(tmp_path, *lines) == [
        f"1: gauge {ONE}: PRCP of day 29: found '15'; {expected}",
        f"2: gauge {ONE}: MDPR of day 31: found '0'; {expected}",
    ]


@pytest.mark.parametrize("slot", ["1.5  ", " 1 5 ", "15   ", "     ", "    -", "--15 ", "  1-5", "  +15", "  O15"])
def test_bad_numbers(tmp_path: Path, slot: str) -> None:
    """A value that is no whole number at the right of its five columns is refused with its place."""
    line = month("PRCP", {})
    at = 21 + 3 * 8
    assert faults_of(tmp_path, line[:at] + slot + line[at + 5 :]) == [
        (
            f"1: gauge {ONE}: PRCP of day 4: found '{slot.strip()}'; expected a whole number, at the right of columns "
            "of 5; -9999 where missing; correct the value"
        )
    ]

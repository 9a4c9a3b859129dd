"""The time axis of one source."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from rainfiles import labels, read, times, written

from basinrain.errors import Problems, ReadError
from basinrain.intervals import parse_interval
from basinrain.rainfall import RainRecord
from basinrain.reading.axis import check_length
from basinrain.reading.rainfall import read_rainfall


def wide(gauges: str, hours: list[int], depth: str = "1") -> str:
    """Return hourly rows of 4 May 2031 for single-letter gauges."""
    rows = [f"2031-05-04 {hour:02d}:00" + f",{depth}" * len(gauges) for hour in hours]
    return "\n".join([",".join(["time", *gauges]), *rows, ""])


def read_all(folder: Path, *texts: str, **options: Any) -> RainRecord:  # noqa: ANN401 - any option of the reader
    files = [written(folder, text, f"part{k}.csv") for k, text in enumerate(texts, 1)]
    return read_rainfall(files, **({"layout": "wide", "unit": "mm", "interval": "1h"} | options))


def test_files_follow_each_other(tmp_path: Path) -> None:
    """Files in any order make one axis, and files with other gauges more columns."""
    record = read_all(tmp_path, wide("AB", [3, 4], "2"), wide("AB", [1, 2]), wide("C", [2, 3], "5"))
    assert record.gauges == ("A", "B", "C")
    np.testing.assert_array_equal(record.depth, [[1, 1, np.nan], [1, 1, 5], [2, 2, 5], [2, 2, np.nan]])
    assert [end for _, end in times(record)] == [f"2031-05-04T0{hour}:00" for hour in (1, 2, 3, 4)]


def test_overlapping_files(tmp_path: Path) -> None:
    """A gauge and time in two files is refused, both files named."""
    with pytest.raises(ReadError) as caught:
        read_all(tmp_path, wide("A", [1, 2]), wide("A", [2, 3]))
    assert str(caught.value) == (
        f"{tmp_path / 'part2.csv'}:2: gauge A: found the 1h that ends at 2031-05-04T02:00:00, which "
        f"{tmp_path / 'part1.csv'} has too; expected a gauge and time in one file only; remove it from one of the files"
    )


def test_files_that_overlap_at_length(tmp_path: Path) -> None:
    """Many values in two files are one line, with the first of them and their number; so is a file given twice."""
    with pytest.raises(ReadError) as caught:
        read_all(tmp_path, wide("AB", [1, 2, 3]), wide("BA", [2, 3, 4]))
    assert str(caught.value) == (
        f"{tmp_path / 'part2.csv'}:2: gauge B: found the 1h that ends at 2031-05-04T02:00:00, which "
        f"{tmp_path / 'part1.csv'} has too, and 3 more values like it; expected a gauge and time in one file only; "
        "remove it from one of the files"
    )
    with pytest.raises(
        ReadError, match=r"^\S*part2\.csv: the file: found the same content as in \S*part1\.csv; [^\n]*$"
    ):
        read_all(tmp_path, wide("AB", [1, 2, 3]), wide("AB", [1, 2, 3]))


def test_undeclared_gap(tmp_path: Path) -> None:
    """Absent times are refused, the first few named, with the line behind the gap."""
    with pytest.raises(ReadError) as caught:
        read_all(tmp_path, wide("A", [1, 2, 7, 9]))
    assert str(caught.value) == (
        f"{tmp_path / 'part1.csv'}:4: time axis: found no rows for 5 of the 1h steps, ending at 2031-05-04T03:00:00, "
        "2031-05-04T04:00:00, 2031-05-04T05:00:00, ...; expected every step once; complete the file, or declare gaps = "
        "'missing'"
    )


def test_declared_gap(tmp_path: Path) -> None:
    """Declared gaps are missing values, never zero."""
    record = read_all(tmp_path, wide("A", [1, 2, 5]), gaps="missing")
    assert labels(record) == [["observed"], ["observed"], ["missing"], ["missing"], ["observed"]]
    np.testing.assert_array_equal(record.depth[:, 0], [1, 1, np.nan, np.nan, 1])


def test_gap_between_files(tmp_path: Path) -> None:
    """A gap between the files of a gauge is one; between files that share no gauge it is not."""
    with pytest.raises(
        ReadError, match=r"^time axis: found no row for 1 of the 1h steps, ending at 2031-05-04T03:00:00; "
    ):
        read_all(tmp_path, wide("A", [1, 2]), wide("A", [4]))
    record = read_all(tmp_path, wide("A", [1, 2]), wide("B", [4]))
    assert [row[0] for row in labels(record)] == ["observed", "observed", "missing", "missing"]


def test_gap_of_months(tmp_path: Path) -> None:
    """Months follow each other whatever their length, and a month left out is a gap."""
    months = "month,A\n2031-01,1\n2031-02,2\n2031-03,3\n"
    record = read(tmp_path, months, interval="1mo")
    assert times(record)[1] == ("2031-02-01T00:00", "2031-03-01T00:00")
    with pytest.raises(
        ReadError, match=r":3: time axis: found no row for 1 of the 1mo steps, ending at 2031-03-01T00:00:00"
    ):
        read(tmp_path, months.replace("2031-02,2\n", ""), interval="1mo")


def test_stamp_off_the_axis(tmp_path: Path) -> None:
    """A stamp that is not a whole number of steps from the others is refused, with its line."""
    text = wide("A", [1, 2, 3]).replace("02:00", "02:10")
    with pytest.raises(ReadError) as caught:
        read_all(tmp_path, text)
    assert str(caught.value) == (
        f"{tmp_path / 'part1.csv'}:3: time: found an interval that ends at 2031-05-04T02:10:00; expected a whole "
        "number of steps of 1h from 2031-05-04T01:00:00; correct the stamp, or the interval"
    )


def test_a_mistyped_year_makes_no_endless_axis(tmp_path: Path) -> None:
    """An axis of more steps than any record has is refused before it is laid out."""
    text = "time,A\n2031-05-04 01:00,1\n9031-05-04 02:00,1\n"
    with pytest.raises(
        ReadError, match=r"^time axis: found 61\d{6} steps of 1h from 2031-05-04T01:00:00 to 9031-05-04T02"
    ):
        read_all(tmp_path, text, gaps="missing")


def test_accumulated_mark(tmp_path: Path) -> None:
    """A marked value is the total of its step and of the missing ones directly before it."""
    days = ["2,0", ",", ",", "45A,0A", "3,"]
    record = read(
        tmp_path,
        "date,A,B\n" + "".join(f"2031-05-0{k},{cells}\n" for k, cells in enumerate(days, 1)),
        interval="1d",
        accumulated="A",
    )
    assert [row[0] for row in labels(record)] == ["observed", "accumulated", "accumulated", "accumulated", "observed"]
    assert [(t.gauge, str(t.start)[:10], str(t.end)[:10], t.depth) for t in record.totals] == [
        ("A", "2031-05-02", "2031-05-05", 45.0),
        ("B", "2031-05-02", "2031-05-05", 0.0),
    ]


def test_accumulated_over_its_own_step(tmp_path: Path) -> None:
    """A marked value with a known one before it is a value like any other."""
    record = read(tmp_path, "date,A,B\n2031-05-01,2,2\n2031-05-02,3A,0A\n", interval="1d", accumulated="A")
    assert (labels(record)[1], record.totals) == (["observed", "zero"], ())


def test_accumulation_without_a_beginning(tmp_path: Path) -> None:
    """When nothing tells where an accumulation began, it is refused."""
    with pytest.raises(ReadError) as caught:
        read(tmp_path, "date,A\n2031-05-01,\n2031-05-02,3A\n", interval="1d", accumulated="A")
    assert str(caught.value) == (
        f"{tmp_path / 'rain.csv'}: gauge A: accumulated value of the step that ends at 2031-05-03T00:00:00: found no "
        "value before the missing steps it accumulates; expected missing steps directly before it, back to a known "
        "value; give the number of steps in a steps column, or correct the cells"
    )


def test_accumulation_over_known_values(tmp_path: Path) -> None:
    """A value over 3 steps, of which one has a value of its own, is refused."""
    text = "gauge,date,depth,steps\nA,2031-05-01,1,\nA,2031-05-02,1,\nA,2031-05-03,9,3\n"
    with pytest.raises(
        ReadError, match=r"found a value of their own in the 3 steps it accumulates; expected missing steps"
    ):
        read(tmp_path, text, layout="long", interval="1d")


def test_rejected_accumulation(tmp_path: Path) -> None:
    """Nothing is known of the steps of an accumulation that was rejected."""
    text = "gauge,date,depth,steps,flag\nA,2031-05-01,1,,\nA,2031-05-03,9,2,R\n"
    record = read(tmp_path, text, layout="long", interval="1d", flags={"rejected": ["R"]})
    assert (labels(record), record.totals) == ([["observed"], ["missing"], ["rejected"]], ())


def test_length_of_an_axis() -> None:
    """Steps are counted from end to end, months by the calendar; more than 20 million are taken for a wrong time."""
    problems = Problems()
    assert check_length(0, 11, parse_interval("1mo"), problems) == 12
    assert check_length(0, 60 * 19_999_999, parse_interval("1min"), problems) == 20_000_000
    assert len(problems) == 0
    check_length(0, 60 * 20_000_000, parse_interval("1min"), problems)
    with pytest.raises(
        ReadError, match=r"time axis: found 20000001 steps of 1min from 1970-01-01T00:00:00 to 2008-01-10"
    ):
        problems.raise_as(ReadError)

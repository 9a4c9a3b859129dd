"""Long files."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from rainfiles import labels, read, times, written

from basinrain.errors import ReadError
from basinrain.reading.rainfall import read_rainfall


def test_rows_in_any_order(tmp_path: Path) -> None:
    """Rows of all gauges are sorted into one table, gauges in the order of their first rows."""
    text = (
        "station,date,precip,flag\nB,2031-05-05,2.5,E\nA,2031-05-04,1.5,\nA,2031-05-05,T,\n"
        "B,2031-05-04,-99,\nB,2031-05-06,9,R\n"
    )
    record = read(
        tmp_path, text, layout="long", interval="1d", missing=["-99"], flags={"estimated": ["E"], "rejected": ["R"]}
    )
    assert record.gauges == ("B", "A")
    np.testing.assert_array_equal(record.depth, [[np.nan, 1.5], [2.5, 0.0], [np.nan, np.nan]])
    assert labels(record) == [["missing", "observed"], ["estimated", "trace"], ["rejected", "missing"]]
    assert times(record)[0] == ("2031-05-04T00:00", "2031-05-05T00:00")


def test_two_writings_of_a_time(tmp_path: Path) -> None:
    """08:00 and 08:00:00 are one time."""
    text = "gauge,time,depth\nA,2031-05-04 08:00,1\nB,2031-05-04T08:00:00,2\n"
    assert read(tmp_path, text, layout="long").depth.tolist() == [[1.0, 2.0]]


def test_mapped_columns(tmp_path: Path) -> None:
    """The user's names for the columns win."""
    text = "pluvio,quand,hauteur,depth\nA,2031-05-04 08:00,1.25,9\n"
    columns = {"gauge": "pluvio", "time": "quand", "depth": "hauteur"}
    assert read(tmp_path, text, layout="long", columns=columns).depth.tolist() == [[1.25]]


def test_steps_column(tmp_path: Path) -> None:
    """A value over 3 steps is a known total over them; the two steps before it need no rows."""
    text = "gauge,date,depth,steps\nA,2031-05-03,5,\nA,2031-05-06,45,3\nB,2031-05-06,1,1\n"
    record = read(tmp_path, text, layout="long", interval="1d")
    assert [row[0] for row in labels(record)] == ["observed", "accumulated", "accumulated", "accumulated"]
    [total] = record.totals
    assert (total.gauge, str(total.start), str(total.end), total.depth) == (
        "A",
        "2031-05-04T00:00:00",
        "2031-05-07T00:00:00",
        45.0,
    )


def test_steps_of_months(tmp_path: Path) -> None:
    """Months accumulate month by month."""
    record = read(tmp_path, "gauge,month,depth,steps\nA,2031-03,300,3\n", layout="long", interval="1mo")
    assert times(record) == [
        ("2031-01-01T00:00", "2031-02-01T00:00"),
        ("2031-02-01T00:00", "2031-03-01T00:00"),
        ("2031-03-01T00:00", "2031-04-01T00:00"),
    ]
    assert [total.depth for total in record.totals] == [300.0]


def test_problems_together(tmp_path: Path) -> None:
    """Blank gauges, faulty times, depths, marks and steps are all listed."""
    path = written(
        tmp_path,
        "gauge,time,depth,flag,steps\n,2031-05-04 01:00,1,,\nA,noon,1,,\nB,noon,1,,\nA,2031-05-04 01:00,x,,\n"
        "A,2031-05-04 02:00,1,Z,\nA,2031-05-04 03:00,1,,0\nA,2031-05-04 04:00,1,,1.5\n",
    )
    with pytest.raises(ReadError) as caught:
        read_rainfall([path], layout="long", unit="mm", interval="1h")
    assert str(caught.value).splitlines() == [
        (
            f"{path}:3: column time: found 'noon'; expected a time such as 2031-05-04 08:00, "
            "2031-05-04T08:00:00+02:00, 2031-05-04 or 2031-05; correct the stamp, or "
            "declare its form in time_format"
        ),
        f"{path}:2: column gauge: found a blank cell; expected the gauge",
        (
            f"{path}:5: column depth: gauge A: found 'x'; expected a depth of 0 or more; correct the cell, or declare "
            "it in missing"
        ),
        (
            f"{path}:6: column depth: gauge A: found mark 'Z'; expected a declared mark (T); declare what it means in "
            "flags"
        ),
        f"{path}:7: column steps: found '0'; expected a whole number of steps, 1 to 366",
        f"{path}:8: column steps: found '1.5'; expected a whole number of steps, 1 to 366",
    ]


def test_a_time_twice(tmp_path: Path) -> None:
    """A gauge's time that comes again is refused, with both lines."""
    path = written(tmp_path, "gauge,time,depth\nA,2031-05-04 01:00,1\nB,2031-05-04 01:00,1\nA,2031-05-04T01:00,1\n")
    with pytest.raises(ReadError) as caught:
        read_rainfall([path], layout="long", unit="mm", interval="1h")
    assert str(caught.value) == (
        f"{path}:4: gauge A: found '2031-05-04T01:00', as in line 2; expected each time once for a gauge; remove "
        "one of the rows"
    )


def test_columns_that_are_not_there(tmp_path: Path) -> None:
    """Columns that are needed and not found are listed with the names under which they are looked for."""
    with pytest.raises(ReadError) as caught:
        read(tmp_path, "who,time,mm\nA,2031-05-04 01:00,1\n", layout="long")
    lines = str(caught.value).splitlines()
    assert [line.split(": ", 1)[1].split(";")[0] for line in lines] == [
        "the header: found no column for the gauge among: who, time, mm",
        "the header: found no column for the depth among: who, time, mm",
    ]
    assert lines[0].endswith("; name it in columns.gauge")


def test_gap_of_one_gauge(tmp_path: Path) -> None:
    """A time that one gauge lacks between its first and last is a gap; before and after them it is missing."""
    text = "gauge,time,depth\n" + "".join(
        f"{gauge},2031-05-04 0{hour}:00,1\n"
        for gauge, hours in (("A", "12345"), ("B", "2 4"))
        for hour in hours.split()
        for hour in hour
    )
    with pytest.raises(ReadError) as caught:
        read(tmp_path, text, layout="long")
    assert str(caught.value) == (
        f"{tmp_path / 'rain.csv'}: gauge B: found no row for 1 of the 1h steps, ending at 2031-05-04T03:00:00; "
        "expected every step once between its first and last; complete the file, or declare gaps = 'missing'"
    )
    record = read(tmp_path, text, layout="long", gaps="missing")
    assert [row[1] for row in labels(record)] == ["missing", "observed", "missing", "observed", "missing"]

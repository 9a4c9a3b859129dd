"""Wide files."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from rainfiles import labels, read, times, written

from basinrain.errors import ReadError
from basinrain.reading.rainfall import read_rainfall


@pytest.mark.parametrize(
    "content",
    [
        b"time,W01,W02\n2031-05-04 01:00,1.5,\n2031-05-04 02:00,0,2.25\n",
        b"time,W01,W02\r\n2031-05-04 01:00,1.5,\r\n2031-05-04 02:00,0,2.25\r\n",
        b"\xef\xbb\xbftime;W01;W02\r\n2031-05-04 01:00;1,5;\r\n2031-05-04 02:00;0;2,25\r\n",
        b"W01\tW02\tDate Time\n1.5\t\t2031-05-04 01:00\n0\t2.25\t2031-05-04 02:00\n",
        b'when,"W01", W02\n2031-05-04 01:00,"1.5",\n\n2031-05-04 02:00, 0 ,2.25\n,,\n',
    ],
)
def test_the_same_table_in_other_writings(tmp_path: Path, content: bytes) -> None:
    """Line ends, byte-order marks, separators, decimal commas, quotes and the time column's place do not matter."""
    record = read(tmp_path, content)
    assert record.gauges == ("W01", "W02")
    assert times(record) == [("2031-05-04T00:00", "2031-05-04T01:00"), ("2031-05-04T01:00", "2031-05-04T02:00")]
    np.testing.assert_array_equal(record.depth, [[1.5, np.nan], [0.0, 2.25]])
    assert labels(record) == [["observed", "missing"], ["zero", "observed"]]


def test_ids_and_paths_beyond_ascii(tmp_path: Path) -> None:
    """Gauge ids and paths may have any letters and spaces."""
    path = written(tmp_path, "time,Überlauf 1,雨量\n2031-05-04 01:00,1,2\n", name="ein Ordner/Regen größer.csv")
    record = read_rainfall([path], layout="wide", unit="mm", interval="1h")
    assert (record.gauges, record.depth.tolist()) == (("Überlauf 1", "雨量"), [[1.0, 2.0]])


def test_named_time_column(tmp_path: Path) -> None:
    """The column that the user names holds the times, whatever the others are called."""
    text = "time,end of hour\n1.5,2031-05-04 01:00\n"
    assert read(tmp_path, text, columns={"time": "end of hour"}).gauges == ("time",)


def test_problems_of_a_file_together(tmp_path: Path) -> None:
    """Every faulty cell and stamp is one line: file, line, column, gauge, found, expected, what to do."""
    path = written(
        tmp_path, "time,W01,W02\n2031-05-04 01:00,wet,-1\n2031-05-04 02:00,-999,inf\nnoon,1,1\n2031-05-04 03:00,1,1\n"
    )
    with pytest.raises(ReadError) as caught:
        read_rainfall([path], layout="wide", unit="mm", interval="1h")
    assert str(caught.value).splitlines() == [
        (
            f"{path}:4: column time: found 'noon'; expected a time such as 2031-05-04 08:00, "
            "2031-05-04T08:00:00+02:00, 2031-05-04 or 2031-05; correct the stamp, or "
            "declare its form in time_format"
        ),
        (
            f"{path}:2: column W01: gauge W01: found 'wet'; expected a depth of 0 or more; correct the cell, or "
            "declare it in missing"
        ),
        (
            f"{path}:3: column W01: gauge W01: found '-999'; expected a depth of 0 or more; it looks like a missing "
            "code; if it is one, add '-999' to missing"
        ),
        (
            f"{path}:2: column W02: gauge W02: found '-1'; expected a depth of 0 or more; correct the cell, or declare "
            "it in missing"
        ),
        (
            f"{path}:3: column W02: gauge W02: found 'inf'; expected a depth of 0 or more; correct the cell, or "
            "declare it in missing"
        ),
    ]
    assert [(p.gauge, p.time) for p in caught.value.problems[1:3]] == [
        ("W01", "2031-05-04 01:00"),
        ("W01", "2031-05-04 02:00"),
    ]


def test_times_twice_or_out_of_order(tmp_path: Path) -> None:
    """A time that comes again, and a time after a later one, are refused with their lines."""
    hours = ["01", "02", "04", "03", "02", "05"]
    path = written(tmp_path, "time,W01\n" + "".join(f"2031-05-04 {hour}:00,1\n" for hour in hours))
    with pytest.raises(ReadError) as caught:
        read_rainfall([path], layout="wide", unit="mm", interval="1h", gaps="missing")
    assert str(caught.value).splitlines() == [
        (
            f"{path}:5: column time: found '2031-05-04 03:00' after a later time; expected times in order; sort "
            "the rows by time"
        ),
        (
            f"{path}:6: column time: found '2031-05-04 02:00', as in line 3; expected each time once; remove one "
            "of the rows"
        ),
    ]


def test_no_gauges(tmp_path: Path) -> None:
    """A file with times only is refused."""
    with pytest.raises(
        ReadError, match=r"rain.csv: the header: found only the column 'time'; expected a column for every"
    ):
        read(tmp_path, "time\n2031-05-04 01:00\n")


def test_time_column_that_is_not_there(tmp_path: Path) -> None:
    """A named column that the file lacks is refused, the nearest named."""
    with pytest.raises(ReadError, match=r"columns.time: found no column 'tim'; .*; did you mean 'time'\?"):
        read(tmp_path, "time,W01\n2031-05-04 01:00,1\n", columns={"time": "tim"})

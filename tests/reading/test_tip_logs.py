"""Rows of logs: their order, their doubles, their columns."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from rainfiles import read, written

from basinrain.errors import ReadError
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.tip_logs import moment

TIPS: dict[str, Any] = {"layout": "tips", "interval": "5min"}


def test_a_moment_in_words() -> None:
    """Seconds since 1970 are told as ISO 8601."""
    assert moment(int(np.datetime64("2031-05-04T10:05:01", "s").astype(int))) == "2031-05-04T10:05:01"


def test_tips_out_of_order(tmp_path: Path) -> None:
    """Rows of a gauge that go back in time are one line with file and line; other gauges' rows may lie between."""
    rows = ["A,10:00", "B,09:00", "A,10:10", "B,09:30", "A,10:05", "A,10:07", "B,09:20"]
    text = "gauge,time\n" + "".join(f"{row[:2]}2031-05-04 {row[2:]}\n" for row in rows)
    path = tmp_path / "rain.csv"
    with pytest.raises(ReadError) as caught:
        read(tmp_path, text, **TIPS, tip=0.2)
    end = "expected tips in order of time; sort the rows by time; rows of the same time are tips of their own, and stay"
    assert str(caught.value).splitlines() == [
        f"{path}:6: gauge A: found '2031-05-04 10:05' after a later time, and 1 more like it; {end}",
        f"{path}:8: gauge B: found '2031-05-04 09:20' after a later time; {end}",
    ]


def test_a_second_may_have_several_tips(tmp_path: Path) -> None:
    """Stamps of whole seconds may repeat in a downpour."""
    text = "time\n" + "".join(f"2031-05-04 10:00:0{second}\n" for second in (1, 1, 2, 2, 3))
    assert read(tmp_path, text, **TIPS, tip=0.1).depth.tolist() == [[0.5]]


def test_rows_that_stand_twice(tmp_path: Path) -> None:
    """Every row doubled, or the whole log pasted behind itself, is no rain of twice the depth."""
    rows = [f"2031-05-04 10:{minute}:00\n" for minute in (10, 20, 30)]
    with pytest.raises(
        ReadError, match=r"rain\.csv:3: gauge rain: found every time at least twice; expected a row for"
    ):
        read(tmp_path, "time\n" + "".join(row * 2 for row in rows), **TIPS, tip=0.1)
    with pytest.raises(
        ReadError, match=r"rain\.csv:5: gauge rain: found '2031-05-04 10:10:00' after a later time, and 1"
    ):
        read(tmp_path, "time\n" + "".join(rows * 2), **TIPS, tip=0.1)


def test_files_that_overlap(tmp_path: Path) -> None:
    """A log that was read out again with what the log before has, is refused in one line."""
    files = [
        written(tmp_path, "gauge,time\nA,2031-05-04 10:00\nA,2031-05-04 11:00\n", "may.csv"),
        written(tmp_path, "gauge,time\nA,2031-05-04 11:00\nA,2031-05-04 12:00\n", "june.csv"),
    ]
    with pytest.raises(ReadError) as caught:
        read_rainfall(files, unit="mm", tip=0.2, **TIPS)
    assert str(caught.value) == (
        f"{files[1]}:2: gauge A: found rows from 2031-05-04T11:00:00, and in {files[0]} until 2031-05-04T11:00:00; "
        "expected files of a gauge that follow on each other; remove what both files have from one of them"
    )


@pytest.mark.parametrize(
    ("text", "options", "message"),
    [
        (
            "time,depth\n2031-05-04 10:00,0.2\n",
            {"tip": 0.2},
            r"tip: found it beside the depth column 'depth'; expected one",
        ),
        (
            "time\n2031-05-04 10:00\n",
            {},
            r"the header: found no column for the depth among: time; expected tip, the depth",
        ),
        (
            "gauge,when\nA,2031-05-04 10:00\n",
            {"tip": 1},
            r"the header: found no column for the time among: gauge, when",
        ),
        ("time\n2031-05-04 10:00\n", {"columns": {"depth": "d"}}, r"columns\.depth: found no column 'd'"),
        ("gauge,time\n,2031-05-04 10:00\n", {"tip": 1}, r"rain\.csv:2: column gauge: found a blank cell"),
        ("time,depth\n2031-05-04 10:00,T\n", {}, r"rain\.csv:2: column depth: gauge rain: found 'T'"),
        ("time,depth\n2031-05-04 10:00,-1\n", {}, r"rain\.csv:2: column depth: gauge rain: found '-1'"),
        (
            "time\n2031-05-04\n",
            {"tip": 1},
            r"rain\.csv:2: column time: found '2031-05-04'; expected a date with a time of day; give the time of every",
        ),
        ("time\n2031-05-04 10:00:00.x\n", {"tip": 1}, r"rain\.csv:2: column time: found '2031-05-04 10:00:00\.x'"),
    ],
)
def test_files_that_cannot_be(tmp_path: Path, text: str, options: dict[str, Any], message: str) -> None:
    """Each faulty file says where, what was found and what is expected."""
    with pytest.raises(ReadError, match=message):
        read(tmp_path, text, **TIPS, **options)


def test_local_times_shown_twice(tmp_path: Path) -> None:
    """A tip in the hour that clocks show twice has no one step."""
    with pytest.raises(
        ReadError, match=r"found '2031-10-26 02:30:00\.5', which the clocks of Europe/Vienna show twice"
    ):
        read(tmp_path, "time\n2031-10-26 02:30:00.5\n", **TIPS, tip=0.2, timezone="Europe/Vienna")

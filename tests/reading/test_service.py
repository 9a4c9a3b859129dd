"""Times of service."""

from pathlib import Path

import pytest
from rainfiles import written

from basinrain.errors import ReadError
from basinrain.reading.gauges import read_gauges


@pytest.mark.parametrize(
    ("text", "opened", "closed"),
    [
        ("2031-06-30", "2031-06-30T00:00:00", "2031-07-01T00:00:00"),
        ("2031-02", "2031-02-01T00:00:00", "2031-03-01T00:00:00"),
        ("2031", "2031-01-01T00:00:00", "2032-01-01T00:00:00"),
        ("2031-06-30T08:00", "2031-06-30T08:00:00", "2031-06-30T08:00:00"),
        ("2031-06-30 08:00:05", "2031-06-30T08:00:05", "2031-06-30T08:00:05"),
    ],
)
def test_a_bare_date_names_its_day(tmp_path: Path, text: str, opened: str, closed: str) -> None:
    """Service begins with the start, and ends with the end, of what the text names."""
    network = read_gauges(written(tmp_path, f"id,lon,lat,from,to\nA,1,2,{text},\nB,2,2,,{text}\n"))
    assert (str(network.opened[0]), str(network.closed[1])) == (opened, closed)


@pytest.mark.parametrize(
    ("cells", "message"),
    [
        (",2031-02-30", r"column to: gauge A: found '2031-02-30'; expected a date such as 2031-06-30"),
        ("May 2031,", r"column from: gauge A: found 'May 2031'; expected a date such as"),
        (
            "2031-06-30T08:00,2031-06-30T08:00",
            r"column to: gauge A: found in service to 2031-06-30T08:00:00, from 2031-06-30T08:00:00; expected an end",
        ),
    ],
)
def test_times_that_cannot_be(tmp_path: Path, cells: str, message: str) -> None:
    """What is no date, and an end that is not after its start, is refused with line, column and gauge."""
    with pytest.raises(ReadError, match=rf"rain\.csv:2: {message}"):
        read_gauges(written(tmp_path, f"id,lon,lat,from,to\nA,1,2,{cells}\n"))


def test_one_day_of_service(tmp_path: Path) -> None:
    """From and to on one date are that day."""
    network = read_gauges(written(tmp_path, "id,lon,lat,from,to\nA,1,2,2031-06-30,2031-06-30\n"))
    assert (network.closed - network.opened).astype(int).tolist() == [86400]

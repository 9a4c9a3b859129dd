"""Times of a job in the clock of its record: dates, months, offsets, and the day that a date names."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import JobError
from basinrain.jobfile.tables import EditTable, RainfallTable, StormTable
from basinrain.jobfile.times import edit_window_times, rainfall_day_start, storm_window_times

MIDNIGHT = np.timedelta64(0, "s")


def source(**fields: str | int) -> RainfallTable:
    return RainfallTable.model_validate({"file": "r.csv", "unit": "mm", "interval": "1d", **fields})


def window(
    start: str | None, end: str | None, zone: str = "", day_start: np.timedelta64 = MIDNIGHT
) -> tuple[str | None, str | None]:
    first, last = storm_window_times(StormTable(name="Quill", start=start, end=end), zone, day_start=day_start)
    return None if first is None else str(first), None if last is None else str(last)


@pytest.mark.parametrize(
    ("sources", "hours"),
    [
        ([source(read_hour="07:00", date_means="ends")], -17),
        ([source(read_hour="07:00", date_means="starts")], 7),
        ([source(read_hour="06:30", date_means="starts")], 6.5),
        ([source(read_hour=9, date_means="starts")], 9),
        ([source(read_hour="07:00", date_means="calendar-day")], 0),
        ([source(read_hour="07:00")], 0),
        ([source()], 0),
        ([source(read_hour="07:00", date_means="ends"), source(read_hour="07:00", date_means="ends")], -17),
        ([source(read_hour="07:00", date_means="ends"), source(read_hour="08:00", date_means="ends")], 0),
        ([source(read_hour="07:00", date_means="ends"), source(interval="1h")], 0),
        ([source(interval="1h")], 0),
        ([], 0),
    ],
)
def test_the_day_of_a_date(sources: list[RainfallTable], hours: float) -> None:
    """The files' own day where all are read daily at one hour, else from midnight: hours after midnight of the date."""
    assert rainfall_day_start(sources) == np.timedelta64(int(hours * 3600), "s")


def test_a_bare_date_is_its_whole_day() -> None:
    """From the midnight at which it begins to the one at which it ends, over the end of a leap year's February too."""
    assert window("2031-05-04", "2031-05-04") == ("2031-05-04T00:00:00", "2031-05-05T00:00:00")
    assert window("2032-02-28", "2032-02-29") == ("2032-02-28T00:00:00", "2032-03-01T00:00:00")


def test_a_bare_date_is_the_files_day() -> None:
    """Read at 07:00 and dated by its end, 9 March lasts from the 8th at 07:00 to the 9th at 07:00."""
    day = rainfall_day_start([source(read_hour="07:00", date_means="ends")])
    assert window("2031-03-09", "2031-03-09", day_start=day) == ("2031-03-08T07:00:00", "2031-03-09T07:00:00")


def test_a_bare_month_is_its_whole_month() -> None:
    """From the start of its first day to the end of its last, in a leap year and over the end of a year."""
    assert window("2032-02", "2032-02") == ("2032-02-01T00:00:00", "2032-03-01T00:00:00")
    assert window("2031-11", "2031-12") == ("2031-11-01T00:00:00", "2032-01-01T00:00:00")
    day = np.timedelta64(7 * 3600, "s")
    assert window("2031-04", "2031-04", day_start=day) == ("2031-04-01T07:00:00", "2031-05-01T07:00:00")


def test_a_time_is_taken_as_it_is() -> None:
    """A time without an offset is in the record's clock, whichever that is, and the day of a date does not move it."""
    expected = ("2031-05-04T06:00:00", "2031-05-04T18:30:00")
    for zone in ("", "+02:00", "-05:30"):
        assert window("2031-05-04T06:00", "2031-05-04 18:30", zone, np.timedelta64(25200, "s")) == expected


@pytest.mark.parametrize(
    ("text", "zone", "expected"),
    [
        ("2031-05-04T06:00Z", "+02:00", "2031-05-04T08:00:00"),
        ("2031-05-04T06:00+02:00", "+02:00", "2031-05-04T06:00:00"),
        ("2031-05-04T06:00+02:00", "+00:00", "2031-05-04T04:00:00"),
        ("2031-05-04T01:00+05:30", "-03:30", "2031-05-03T16:00:00"),
        ("2031-12-31T23:30:15-01:00", "+00:00", "2032-01-01T00:30:15"),
    ],
)
def test_an_offset_is_brought_to_the_records_clock(text: str, zone: str, expected: str) -> None:
    """The same moment, read off the record's clock, at either end of the window."""
    assert window(text, text, zone) == (expected, expected)


def test_an_offset_needs_a_clock_to_go_to() -> None:
    """Files that state no zone cannot be met by a time with an offset: the storm and the time are named."""
    with pytest.raises(
        JobError,
        match=r"storm Quill: found the time '2031-05-04T06:00Z' with an offset; expected times without one, .* zone",
    ):
        window("2031-05-04T06:00Z", None)


def test_what_is_not_given_is_none() -> None:
    """Start and end are each taken by themselves."""
    assert window(None, None) == (None, None)
    assert window("2031-05-04", None) == ("2031-05-04T00:00:00", None)
    assert window(None, "2031-05", "+02:00") == (None, "2031-06-01T00:00:00")


@pytest.mark.parametrize(
    ("stated", "expected"),
    [
        ({}, ("NaT", "NaT")),
        ({"from": "2031-05-04"}, ("2031-05-04T00:00:00", "NaT")),
        ({"to": "2031-05"}, ("NaT", "2031-06-01T00:00:00")),
        ({"from": "2031-05-04T06:00", "to": "2031-05-04"}, ("2031-05-04T06:00:00", "2031-05-05T00:00:00")),
    ],
)
def test_an_edit_may_be_open(stated: dict[str, str], expected: tuple[str, str]) -> None:
    """A side of an edit that is not given is open, both are the whole record."""
    said = {"gauge": "W01", "action": "reject", "reason": "moved", "by": "site log", "date": "2031-06-01"}
    edit = EditTable.model_validate(said | stated)
    assert tuple(str(time) for time in edit_window_times(edit, 1, "", day_start=MIDNIGHT)) == expected

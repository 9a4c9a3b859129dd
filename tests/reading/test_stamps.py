"""Time stamps."""

from __future__ import annotations

import datetime as dt
import zoneinfo
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from basinrain.clocks import clock_seconds
from basinrain.errors import JobError
from basinrain.intervals import parse_interval
from basinrain.reading.stamps import StampRules, Stamps, read_stamps


def stamps(texts: list[str], interval: str = "1h", *, zone: str | None = None, **options: Any) -> Stamps:  # noqa: ANN401
    return read_stamps(texts, StampRules(interval=parse_interval(interval), **options), zone=zone)


def ends(texts: list[str], interval: str = "1h", **options: Any) -> list[str]:  # noqa: ANN401 - any rule
    result = stamps(texts, interval, **options)
    assert result.faults == []
    return [str(end)[:16] for end in result.ends]


@pytest.mark.parametrize(
    ("interval", "stamp", "options", "end"),
    [
        ("1h", "2031-05-04 08:00", {}, "2031-05-04T08:00"),
        ("1h", "2031-05-04T08:00:00", {}, "2031-05-04T08:00"),
        ("1h", "2031-05-04T08:00:00.000", {}, "2031-05-04T08:00"),
        ("1h", "2031-05-04 08:00", {"stamp": "start"}, "2031-05-04T09:00"),
        ("1h", "2031-05-04 24:00", {}, "2031-05-05T00:00"),
        ("1h", "2031-12-31T24:00:00", {}, "2032-01-01T00:00"),
        ("1d", "2031-05-05T00:00", {}, "2031-05-05T00:00"),
        ("1d", "2031-05-04", {}, "2031-05-05T00:00"),
        ("1d", "2031-05-04", {"stamp": "start"}, "2031-05-05T00:00"),
        ("1d", "2031-05-04", {"read_hour": 28800, "date_means": "ends"}, "2031-05-04T08:00"),
        ("1d", "2031-05-04", {"read_hour": 28800, "date_means": "starts"}, "2031-05-05T08:00"),
        ("1d", "2031-05-04 08:00", {"read_hour": 28800, "date_means": "ends"}, "2031-05-04T08:00"),
        ("5d", "2031-05-05", {}, "2031-05-06T00:00"),
        ("5d", "2031-05-01", {"stamp": "start"}, "2031-05-06T00:00"),
        ("1mo", "2031-05", {}, "2031-06-01T00:00"),
        ("1mo", "2031-05", {"stamp": "start"}, "2031-06-01T00:00"),
        ("1mo", "2031-05-01", {}, "2031-06-01T00:00"),
        ("1mo", "2031-05-31", {}, "2031-06-01T00:00"),
        ("1mo", "2031-06-01T00:00", {}, "2031-06-01T00:00"),
        ("1mo", "2031-05-01T00:00", {"stamp": "start"}, "2031-06-01T00:00"),
        ("1mo", "2031-12", {}, "2032-01-01T00:00"),
        ("1h", "04/05/2031 08:00", {"time_format": "%d/%m/%Y %H:%M"}, "2031-05-04T08:00"),
        ("1d", "04.05.2031", {"time_format": "%d.%m.%Y"}, "2031-05-05T00:00"),
        ("1mo", "05/2031", {"time_format": "%m/%Y"}, "2031-06-01T00:00"),
    ],
)
def test_interval_ends(interval: str, stamp: str, options: dict[str, Any], end: str) -> None:
    """A stamp ends its interval unless it starts it; a bare date or month names that one, never the one before."""
    assert ends([stamp], interval, **options) == [end]


@pytest.mark.parametrize(
    ("texts", "options", "clock", "expected"),
    [
        (["2031-05-04 08:00"], {}, "", ["2031-05-04T08:00"]),
        (["2031-05-04 08:00"], {"timezone": "UTC"}, "+00:00", ["2031-05-04T08:00"]),
        (["2031-05-04 08:00"], {"timezone": "-09:30"}, "-09:30", ["2031-05-04T08:00"]),
        (["2031-05-04T08:00Z"], {}, "+00:00", ["2031-05-04T08:00"]),
        (["2031-05-04T08:00+02:00", "2031-05-04T07:00Z"], {}, "+02:00", ["2031-05-04T08:00", "2031-05-04T09:00"]),
        (["2031-05-04T08:00+0200"], {"timezone": "UTC"}, "+00:00", ["2031-05-04T06:00"]),
        (
            ["2031-01-04 08:00", "2031-07-04 08:00"],
            {"timezone": "Europe/Vienna"},
            "+01:00",
            ["2031-01-04T08:00", "2031-07-04T07:00"],
        ),
        (["2031-01-04 08:00"], {"timezone": "Australia/Sydney"}, "+10:00", ["2031-01-04T07:00"]),
        (
            ["04/05/2031 08:00 +0200", "04/05/2031 07:00 +0000"],
            {"time_format": "%d/%m/%Y %H:%M %z"},
            "+02:00",
            ["2031-05-04T08:00", "2031-05-04T09:00"],
        ),
    ],
)
def test_clock(texts: list[str], options: dict[str, Any], clock: str, expected: list[str]) -> None:
    """The clock is a fixed offset: the declared one, an IANA zone's standard time, or the first stamp's own."""
    assert ends(texts, **options) == expected
    assert stamps(texts, **options).zone == clock


def test_bare_dates_are_in_standard_time() -> None:
    """Days of an IANA zone are days of its standard time, all of 24 hours."""
    assert ends(["2031-07-04"], "1d", timezone="Europe/Vienna") == ["2031-07-05T00:00"]


def test_later_files_keep_the_clock() -> None:
    """The clock that the first file settled holds for the next."""
    result = stamps(["2031-07-04T08:00+02:00"], zone="+01:00")
    assert (str(result.ends[0]), result.zone) == ("2031-07-04T07:00:00", "+01:00")


def test_local_times_that_do_not_exist_once() -> None:
    """Skipped and repeated local times are listed together, each with the way out."""
    result = stamps(["2031-03-30 02:30", "2031-06-01 00:00", "2031-10-26 02:30"], timezone="Europe/Vienna")
    assert [tuple(fault)[:2] for fault in result.faults] == [
        (0, "'2031-03-30 02:30', which the clocks of Europe/Vienna skip"),
        (2, "'2031-10-26 02:30', which the clocks of Europe/Vienna show twice"),
    ]
    assert {fault.remedy for fault in result.faults} == {"give the stamps in standard time, with timezone = '+01:00'"}
    assert np.isnat(result.ends).tolist() == [True, False, True]


@pytest.mark.parametrize(
    ("texts", "interval", "options", "rows", "expected"),
    [
        (["noon", "2031-02-30 00:00", ""], "1h", {}, [0, 1, 2], "a time such as 2031-05-04 08:00"),
        (["2031-05-04 25:00", "2031-05-04 24:30"], "1h", {}, [0, 1], "a time such as"),
        (["2031-05-04T08:00+99:00"], "1h", {}, [0], "a time such as"),
        (["2031-05-04"], "1h", {"time_format": "%d/%m/%Y %H:%M"}, [0], "a time such as %d/%m/%Y %H:%M"),
        (["2031-05-04"], "1h", {}, [0], "a date with a time of day, as the interval is 1h"),
        (["2031-05"], "1d", {}, [0], "a date, as the interval is 1d"),
        (["2031-05-15T00:00"], "1mo", {}, [0], "the first moment of a month, or a bare month"),
        (["2031-05-04", "2031-05-05", "2031-05-07T00:00"], "1d", {}, [2], "a bare date, as the other stamps are"),
        (["2031-05-04T08:00", "2031-05-04T09:00", "2031-05-04T10:00Z"], "1h", {}, [2], "no offset, as the other"),
        (["2031-05-04T08:00Z", "2031-05-04T09:00"], "1h", {}, [1], "an offset from UTC, as the other stamps have"),
        (["2031-05-04T00:00"], "1d", {"read_hour": 28800, "date_means": "ends"}, [0], "a bare date, or the reading"),
    ],
)
def test_faulty_stamps(
    texts: list[str], interval: str, options: dict[str, Any], rows: list[int], expected: str
) -> None:
    """Stamps that cannot be, or are not of the kind of the others or of the step, are faults and have no end."""
    result = stamps(texts, interval, **options)
    assert [fault.row for fault in result.faults] == rows
    assert all(fault.expected.startswith(expected) for fault in result.faults)
    assert np.flatnonzero(np.isnat(result.ends)).tolist() == rows


@pytest.mark.parametrize(
    ("zone", "text", "expected"),
    [("", "2031-05-04T08:00Z", "no offset"), ("+02:00", "2031-05-04T08:00", "an offset from UTC")],
)
def test_files_with_and_without_offsets_do_not_mix(zone: str, text: str, expected: str) -> None:
    """A second file whose stamps have an offset where the first's had none, or the reverse, is at fault."""
    assert [fault.expected for fault in stamps([text], zone=zone).faults] == [f"{expected}, as the other stamps have"]


def test_unknown_format() -> None:
    """A format that is none is refused."""
    with pytest.raises(JobError, match=r"^time_format: found '%Q'; expected a strptime format"):
        stamps(["2031"], time_format="%Q")


@pytest.mark.parametrize(
    ("texts", "interval", "options", "found", "expected"),
    [
        ([f"2031-05-0{k}" for k in range(1, 7)], "1h", {}, "'2031-05-01', and 5 more", "a date with a time of day, as"),
        ([f"2031-0{k}" for k in range(1, 7)], "1d", {}, "'2031-01', and 5 more", "a date, as the interval is 1d"),
        (
            [f"2031-05-04 0{k}:00" for k in range(1, 9)],
            "1d",
            {"read_hour": 28800, "date_means": "ends"},
            "'2031-05-04 01:00', and 6 more",
            "a bare date, or the reading hour",
        ),
        ([f"2031-05-0{k}" for k in range(1, 7)], "1mo", {}, "'2031-05-02', and 4 more", "one date for a month, as"),
        ([f"2031-05-04 0{k}:00" for k in range(1, 7)], "1mo", {}, "'2031-05-04 01:00', and 5 more", "the first moment"),
    ],
)
def test_stamps_of_another_interval_are_told_once(
    texts: list[str], interval: str, options: dict[str, Any], found: str, expected: str
) -> None:
    """Where nearly all stamps are of the wrong kind, the interval is wrong: one line, and no row is used."""
    result = stamps(texts, interval, **options)
    assert [fault.found for fault in result.faults] == [f"{found} stamps like it"]
    assert result.faults[0].expected.startswith(expected)
    assert "interval" in result.faults[0].remedy
    assert np.isnat(result.ends).sum() >= len(texts) - 1


def test_stamps_of_another_interval_among_others_are_listed() -> None:
    """Up to four fifths of the stamps may be wrong one by one."""
    texts = [f"2031-05-0{k}T0{8 if k > 4 else 7}:00" for k in range(1, 6)]
    result = stamps(texts, "1d", read_hour=28800, date_means="ends")
    assert [fault.found for fault in result.faults] == [f"'{text}'" for text in texts[:4]]


def test_first_and_last_day_both_name_a_month() -> None:
    """A month written by its first day in one row and by its last in another is one month."""
    dates = [f"2031-0{k}-{day}" for k in (1, 3, 5) for day in ("01", "31")]
    assert ends(dates, "1mo") == [f"2031-0{k}-01T00:00" for k in (2, 2, 4, 4, 6, 6)]


@settings(deadline=None)
@given(
    st.datetimes(dt.datetime(1990, 1, 1), dt.datetime(2030, 1, 1)).map(lambda t: t.replace(second=0, microsecond=0)),
    st.sampled_from(["Europe/Vienna", "America/New_York", "Australia/Sydney", "Asia/Kolkata"]),
)
def test_legal_time_agrees_with_the_standard_library(time: dt.datetime, name: str) -> None:
    """Local stamps are the instants that Python's own zoneinfo makes of them, or are refused."""
    zone = zoneinfo.ZoneInfo(name)
    result = stamps([f"{time:%Y-%m-%d %H:%M}"], timezone=name)
    early, late = (time.replace(tzinfo=zone, fold=fold).astimezone(dt.UTC) for fold in (0, 1))
    if early != late:
        assert len(result.faults) == 1
        return
    instant = early.replace(tzinfo=None) + dt.timedelta(seconds=clock_seconds(result.zone))
    assert result.ends[0].astype("datetime64[s]").item() == instant


def test_a_wrong_format_is_one_line() -> None:
    """When most stamps are not as the format says, the format is wrong: one fault with an example and their number."""
    cells = [f"2031-05-{day:02d} 08:00" for day in range(1, 11)]
    result = stamps(cells, time_format="%d.%m.%Y %H:%M")
    assert [tuple(fault)[:3] for fault in result.faults] == [
        (0, "'2031-05-01 08:00', and 9 more stamps like it", "a time such as %d.%m.%Y %H:%M")
    ]
    assert np.isnat(result.ends).all()
    some = stamps([*cells[:6], "a", "b", "c", "d"])
    assert [fault.row for fault in some.faults] == [6, 7, 8, 9]
    assert np.isnat(some.ends).tolist() == [False] * 6 + [True] * 4

"""Clocks and zones."""

from __future__ import annotations

import zoneinfo

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from basinrain.clocks import clock_name, clock_seconds, parse_zone, standard_offset
from basinrain.errors import JobError


def test_unknown_zone() -> None:
    """A zone that does not exist is refused, the nearest named."""
    with pytest.raises(JobError, match=r"^timezone: found 'Europe/Viena'; .*; did you mean 'Europe/Vienna'\?$"):
        parse_zone("Europe/Viena")
    with pytest.raises(
        JobError, match=r"^timezone: found '\?\?'; expected 'UTC', an offset such as '\+02:00', or an IANA"
    ):
        parse_zone("??")


def test_unknown_clock() -> None:
    """A clock that is no offset is refused."""
    with pytest.raises(JobError, match=r"^clock: found 'noon'; expected an offset"):
        clock_seconds("noon")


@pytest.mark.parametrize(
    ("zone", "times", "seconds"),
    [
        ("Europe/Vienna", ["2031-07-01"], 3600),
        # Summer in the south.
        ("Australia/Sydney", ["2031-01-01", "2031-07-01"], 36000),
        ("Asia/Kolkata", [], 19800),
        # Samoa changed sides of the date line at the end of 2011 (IANA time zone database).
        ("Pacific/Apia", ["NaT", "2010-07-01", "2013-07-01"], -39600),
        ("Pacific/Apia", ["2013-07-01"], 46800),
    ],
)
def test_standard_offset(zone: str, times: list[str], seconds: int) -> None:
    """Standard time is that of the year in which the record begins, never summer time."""
    assert standard_offset(zoneinfo.ZoneInfo(zone), np.array(times, dtype="datetime64[s]")) == seconds


@settings(deadline=None)
@given(st.integers(-14 * 60, 14 * 60))
def test_clock_names_round_trip(minutes: int) -> None:
    """A clock's name says its offset."""
    assert clock_seconds(clock_name(minutes * 60)) == minutes * 60

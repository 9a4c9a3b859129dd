"""Durations and depths in words and units."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.measures import UNITS, depth_words, duration_text, duration_words, in_mm, parse_duration
from basinrain.errors import JobError


@pytest.mark.parametrize(
    ("text", "minutes"),
    [
        *[("15min", 15), ("1h", 60), ("24 h", 1440), ("2d", 2880), ("1.5H", 90), (" .5h ", 30), ("7.5 min", 7.5)],
        *[("1 hr", 60), ("24 hours", 1440), ("24-hour", 1440), ("15 mins.", 15), ("3 days", 4320), ("1 minute", 1)],
    ],
)
def test_durations(text: str, minutes: float) -> None:
    """A number with its unit, in capitals or not, with a space or not."""
    assert parse_duration(text) == minutes
    assert parse_duration(text, unit="d") == minutes


@pytest.mark.parametrize(("unit", "minutes"), [("min", 3), ("h", 180), ("d", 4320)])
def test_numbers_alone(unit: str, minutes: float) -> None:
    """A number alone is in the declared unit."""
    assert parse_duration("3", unit=unit) == minutes


@pytest.mark.parametrize("text", ["", "h", "0h", "-1h", "1mo", "1 week", "1e2min", "nan", "1h30"])
def test_other_texts(text: str) -> None:
    """Anything else is refused, with the forms that are accepted."""
    with pytest.raises(
        JobError, match=rf"^duration: found '{text}'; expected a number with min, h or d: 15min, 1h, 2d$"
    ):
        parse_duration(text)


def test_numbers_without_a_unit() -> None:
    """A number alone, with no unit declared, is never guessed."""
    with pytest.raises(
        JobError, match=r"^duration: found '60' without a unit; expected .*; write the unit, or declare duration_unit$"
    ):
        parse_duration("60")


@given(st.integers(1, 10_000))
def test_words_are_read_back(minutes: int) -> None:
    """What a duration is called is read as that duration."""
    assert parse_duration(duration_words(minutes)) == minutes


def test_words_of_durations() -> None:
    """Hours up to three days, days beyond; minutes, with their fraction, for what is no whole number of hours."""
    minutes = (0.5, 7.5, 60.0, 90.0, 2880.0, 4320.0, 4380.0, 5760.0)
    words = ["0.5min", "7.5min", "1h", "90min", "48h", "72h", "73h", "4d"]
    assert [duration_words(length) for length in minutes] == words
    texts = ["0.5 min", "7.5 min", "1 h", "90 min", "48 h", "72 h", "73 h", "4 days"]
    assert [duration_text(length) for length in minutes] == texts


def test_words_of_what_is_no_duration() -> None:
    """Messages name a length of zero, a negative one and NaN in minutes."""
    assert [duration_text(length) for length in (0.0, -5.0, float("nan"))] == ["0 min", "-5 min", "nan min"]


@pytest.mark.parametrize("unit", UNITS)
def test_units(unit: str) -> None:
    """Of one duration, an hour, a depth and its intensity are one number, and words bring it back."""
    mm = in_mm(np.array([2.0]), np.array([60.0]), unit)[0]
    depth_unit = unit.removesuffix("/h")
    assert depth_words(mm, 60.0, unit) == f"2 {depth_unit} (2 {depth_unit}/h)"


def test_intensities() -> None:
    """1 in/h over 90 min is 1.5 in, 38.1 mm; a gap stays one."""
    np.testing.assert_allclose(in_mm(np.array([1.0, np.nan]), np.array([90.0, 90.0]), "in/h"), [38.1, np.nan])

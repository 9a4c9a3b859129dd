"""Depths and times in words."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.screening.wording import depth_text, exact_text, steps_text

START = np.datetime64("2031-05-04T00:00:00")


@pytest.mark.parametrize(
    ("depth", "unit", "text"), [(31.24, "mm", "31.2 mm"), (31.24, "in", "1.23 in"), (0.0, "in", "0.00 in")]
)
def test_depths_are_said_to_a_tenth_of_a_mm_or_a_hundredth_of_an_inch(depth: float, unit: str, text: str) -> None:
    """The precision that gauges have."""
    assert depth_text(depth, unit) == text  # type: ignore[arg-type]


def test_a_depth_that_is_told_by_its_digits_keeps_them() -> None:
    """3276.7 mm and an inch of 0.254 mm are not rounded."""
    assert exact_text(3276.7, "mm") == "3276.7 mm"
    assert exact_text(25.4 * 99.99, "in") == "99.99 in"


@pytest.mark.parametrize(
    ("seconds", "n", "text"),
    [
        (86400, 1, "the day 2031-05-04"),
        (86400, 2, "the 2 days 2031-05-04 to 2031-05-05"),
        (3600, 1, "the hour that ends 2031-05-04 01:00"),
        (3600, 2, "the 2 hours that end 2031-05-04 01:00 to 2031-05-04 02:00"),
        (600, 3, "the 3 steps that end 2031-05-04 00:10 to 2031-05-04 00:30"),
    ],
)
def test_steps_are_named_by_their_ends(seconds: int, n: int, text: str) -> None:
    """Days from midnight by their dates, all else by the times at which it ends."""
    starts = START + np.arange(n) * np.timedelta64(seconds, "s")
    assert steps_text(starts, starts + seconds) == text


def test_months_are_named_and_totals_without_times_counted() -> None:
    """Months differ in length; storms have no times."""
    months = np.array(["2031-01", "2031-02", "2031-03"], dtype="datetime64[M]").astype("datetime64[s]")
    assert steps_text(months[:1], months[1:2]) == "the month 2031-01"
    assert steps_text(months[:2], months[1:]) == "the 2 months 2031-01 to 2031-02"
    never = np.full(2, np.datetime64("NaT", "s"))
    assert steps_text(never, never) == "the 2 steps"

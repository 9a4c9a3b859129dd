"""A time axis in the record's own clock, with digits only."""

from __future__ import annotations

from datetime import UTC
from typing import Any

from matplotlib.dates import HOURLY, MINUTELY, MONTHLY, SECONDLY, AutoDateLocator, ConciseDateFormatter

__all__ = ["date_axis"]


def date_axis(axis: Any, *, most: int = 6) -> None:  # noqa: ANN401 - matplotlib's axis
    """Give an axis dates as digits, at most ``most`` of them; values are those of :func:`matplotlib.dates.date2num`."""
    # In the record's own clock, never the machine's.
    locator = AutoDateLocator(tz=UTC, minticks=3, maxticks=most)  # type: ignore[no-untyped-call]
    # Without these nearly three years, days, hours or minutes have no interval that is long enough, and it warns.
    for unit, longest in ((MONTHLY, 12), (HOURLY, 24), (MINUTELY, 60), (SECONDLY, 60)):
        locator.intervald[unit] = [*locator.intervald[unit], longest]
    axis.set_major_locator(locator)
    # Digits only: the names of months would follow the machine's language.
    formatter = ConciseDateFormatter(  # type: ignore[no-untyped-call]
        locator,
        tz=UTC,
        formats=["%Y", "%Y-%m", "%m-%d", "%H:%M", "%H:%M", "%H:%M:%S"],
        zero_formats=["", "%Y", "%Y-%m", "%m-%d", "%H:%M", "%H:%M"],
        offset_formats=["", "%Y", "%Y", "%Y-%m-%d", "%Y-%m-%d", "%Y-%m-%d %H:%M"],
    )
    axis.set_major_formatter(formatter)

"""Times of service of a gauge table."""

from __future__ import annotations

import re
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.reading.gauge_rows import GaugeRows

__all__ = ["service_times"]

_TIME: Final = re.compile(r"[0-9]{4}(-[0-9]{2}(-[0-9]{2}([T ][0-9]{2}:[0-9]{2}(:[0-9]{2})?)?)?)?")


def service_times(
    rows: GaugeRows, from_column: str | None, to_column: str | None
) -> tuple[npt.NDArray[np.datetime64], npt.NDArray[np.datetime64]]:
    """Return from when to when each gauge is in service, NaT where there is no limit.

    Parameters
    ----------
    rows
        Takes cells that are no dates, and ends that are not after their start.
    from_column, to_column
        Columns of dates or times; None where there is none. The day, month or year named in the second is in service to
        its end.
    """
    opened = _times(rows, from_column, at_end=False)
    closed = _times(rows, to_column, at_end=True)
    for row in np.flatnonzero(closed <= opened):
        rows.add(
            int(row),
            column=to_column or "",
            found=f"in service to {closed[row]}, from {opened[row]}",
            expected="an end after the start",
        )
    return opened, closed


def _times(rows: GaugeRows, column: str | None, *, at_end: bool) -> npt.NDArray[np.datetime64]:
    """Return the start, or the end, of the day, month or year that each cell names; NaT where it is blank."""
    times = np.full(len(rows.ids), "NaT", dtype="datetime64[s]")
    if column is None:
        return times
    for row, text in enumerate(rows.table.frame[column]):
        if not text:
            continue
        named = _named_time(text)
        if named is None:
            rows.add(
                row,
                column=column,
                found=f"'{text}'",
                expected="a date such as 2031-06-30, or a date and time such as 2031-06-30T08:00",
            )
        else:
            times[row] = named + 1 if at_end and len(text) <= len("2031-06-30") else named
    return times


def _named_time(text: str) -> np.datetime64 | None:
    """Return the year, month, day, minute or second that a text names, in that unit."""
    if not _TIME.fullmatch(text):
        return None
    try:
        return np.datetime64(text)
    except ValueError:
        return None

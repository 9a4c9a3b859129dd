"""The order of a file's rows in time."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import Problems, ReadError
from basinrain.reading.order import check_order


def _check(*days: int) -> Problems:
    problems = Problems(file="rain.csv")
    ends = np.array([np.datetime64("2031-05-01", "s") + np.timedelta64(day, "D") if day else "NaT" for day in days])
    shown = [f"day {day}" for day in days]
    lines = np.arange(2, 2 + len(days))
    check_order(ends.astype("datetime64[s]"), shown.__getitem__, lines, item="column day", problems=problems)
    return problems


@pytest.mark.parametrize("days", [(), (4,), (1, 2, 9), (3, 0, 4)])
def test_in_order(days: tuple[int, ...]) -> None:
    """Times that rise are in order; one that could not be read is passed over."""
    assert len(_check(*days)) == 0


def test_twice_and_back() -> None:
    """A time that comes again is told with the line of its first; one before a later time is out of order."""
    with pytest.raises(ReadError) as caught:
        _check(3, 5, 4, 5, 6).raise_as(ReadError)
    assert str(caught.value).splitlines() == [
        "rain.csv:4: column day: found 'day 4' after a later time; expected times in order; sort the rows by time",
        "rain.csv:5: column day: found 'day 5', as in line 3; expected each time once; remove one of the rows",
    ]

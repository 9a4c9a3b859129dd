"""Readings of one counter, with the moments at which it is set to 0."""

from __future__ import annotations

import numpy as np

from basinrain.rainfall import RainRecord
from basinrain.reading.counter_column import counter_column

NAN = np.nan


def readings(column: list[float], start: str = "2031-05-03T22:00") -> RainRecord:
    """Return readings of gauge A every 6 h."""
    ends = np.datetime64(start, "s") + np.arange(len(column)) * np.timedelta64(6, "h")
    return RainRecord.from_depths(("A",), ends - np.timedelta64(6, "h"), ends, np.array([column]).T, step="6h")


def test_the_moments_at_which_it_is_set_to_0() -> None:
    """Right after the reading of that time, there or not; of several without a reading between them, the last."""
    column = counter_column(readings([NAN, 3, 4, 5, NAN, NAN, NAN, NAN, NAN, 2, 3, NAN, NAN]), 0, 22 * 3600)
    assert column.rows.tolist() == [0, 1, 2, 3, 8, 9, 10]
    assert column.anew.tolist() == [True, False, False, False, True, False, False]
    assert column.values.tolist() == [0, 3, 4, 5, 0, 2, 3]
    assert (column.n_read, column.segments().tolist()) == (5, [0, 4, 7])
    assert column.hours(np.array([5])).tolist() == [6.0]


def test_without_a_declared_time() -> None:
    """There is one segment, of the readings alone."""
    column = counter_column(readings([1, NAN, 4]), 0, None)
    assert (column.rows.tolist(), column.segments().tolist(), int(column.anew.sum())) == ([0, 2], [0, 2], 0)
    assert column.said(1) == "from 1 mm to 4 mm at 2031-05-04T10:00:00"
    assert column.without(np.array([True, False])).rows.tolist() == [2]

"""The readings of one counter, in order of time, with the moments at which it is declared to be set to 0."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.intervals import DAY
from basinrain.rainfall import RainRecord

__all__ = ["CounterColumn", "counter_column"]


@dataclass(frozen=True, eq=False)
class CounterColumn:
    """Readings of one gauge; arrays have shape (n_readings,).

    Parameters
    ----------
    record
        Readings of all gauges in place of depths.
    place
        The gauge's column.
    rows
        The record's step that each reading ends.
    values
        mm.
    anew
        Where nothing was read, but the counter was set to 0, right after the reading of that row if there is one.
    """

    record: RainRecord
    place: int
    rows: npt.NDArray[np.int64]
    values: npt.NDArray[np.float64]
    anew: npt.NDArray[np.bool_]

    @property
    def gauge(self) -> str:
        """The gauge's id."""
        return self.record.gauges[self.place]

    @property
    def n_read(self) -> int:
        """How many readings there are."""
        return int((~self.anew).sum())

    def hours(self, readings: npt.NDArray[np.int64]) -> npt.NDArray[np.float64]:
        """Return the hours from the reading before to each of these readings."""
        ends = self.record.ends[self.rows].astype(np.int64)
        return np.asarray((ends[readings] - ends[readings - 1]) / 3600.0)

    def time(self, reading: int) -> np.datetime64:
        """Return the time of a reading."""
        return np.datetime64(self.record.ends[self.rows[reading]])

    def segments(self) -> npt.NDArray[np.int64]:
        """Return where the counter begins: at its first reading, and where it was set to 0; and the end of all."""
        return np.unique(np.r_[0, np.flatnonzero(self.anew), len(self.values)])

    def without(self, faulty: npt.NDArray[np.bool_]) -> CounterColumn:
        """Return the column without some readings."""
        return replace(self, rows=self.rows[~faulty], values=self.values[~faulty], anew=self.anew[~faulty])

    def said(self, reading: int) -> str:
        """Return in words how a reading follows on the one before: ``"from 8 mm to 0 mm at 2031-05-04T00:00:00"``."""
        before, after = self.values[reading - 1 : reading + 1]
        return f"from {before:g} mm to {after:g} mm at {self.time(reading)}"

    def report(self, problems: Problems, reading: int, *, found: str, expected: str, remedy: str) -> None:
        """Record what is wrong with the gauge, at a reading."""
        problems.add(
            item=f"gauge {self.gauge}",
            found=found,
            expected=expected,
            remedy=remedy,
            gauge=self.gauge,
            time=str(self.time(reading)),
        )


def counter_column(record: RainRecord, place: int, reset: int | None) -> CounterColumn:
    """Return the readings of one gauge.

    Parameters
    ----------
    record
        Readings in mm in place of depths; what is not known has no depth.
    place
        The gauge's column.
    reset
        Seconds after midnight at which the counter is set to 0, right after its reading then; None: not declared.

    Examples
    --------
    The reading of midnight is missing; from then on the counter counts from 0 all the same:

    >>> ends = np.datetime64("2031-05-03T22:00:00") + np.arange(5) * np.timedelta64(3600, "s")
    >>> cells = [[1.0], [2.0], [np.nan], [0.5], [0.7]]
    >>> record = RainRecord.from_depths(("R07",), ends - np.timedelta64(3600, "s"), ends, cells, step="1h")
    >>> column = counter_column(record, 0, 0)
    >>> column.rows, column.values
    (array([0, 1, 2, 3, 4]), array([1. , 2. , 0. , 0.5, 0.7]))
    >>> column.anew
    array([False, False,  True, False, False])
    """
    rows = np.flatnonzero(~np.isnan(record.depth[:, place]))
    values = np.asarray(record.depth[rows, place])
    anew = np.zeros(len(rows), dtype=bool)
    if reset is None:
        return CounterColumn(record, place, rows, values, anew)
    at = np.flatnonzero(record.ends.astype(np.int64) % DAY == reset)
    # Of several resets in a row without a reading between them the last one counts.
    following = np.searchsorted(rows, at, side="right")
    at = at[(following < len(rows)) & (np.diff(following, append=-1) != 0)]
    order = np.argsort(np.r_[2 * rows, 2 * at + 1], kind="stable")
    return CounterColumn(
        record,
        place,
        np.r_[rows, at][order],
        np.r_[values, np.zeros(len(at))][order],
        np.r_[anew, np.ones(len(at), dtype=bool)][order],
    )

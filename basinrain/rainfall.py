"""The rain record: depths per interval and gauge, and where every value came from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from enum import IntEnum
from typing import Final, cast

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problems
from basinrain.notes import Note

__all__ = ["MEASURED", "REPORTING", "WITHOUT_DEPTH", "KnownTotal", "RainRecord", "Status"]


class Status(IntEnum):
    """Where a value of the record came from. It travels to every output, by its ``label``.

    Examples
    --------
    >>> Status.PRESUMED_ZERO.label, Status(3) is Status.MISSING
    ('presumed zero', True)
    """

    OBSERVED = 0
    ZERO = 1
    TRACE = 2
    MISSING = 3
    PRESUMED_ZERO = 4
    ACCUMULATED = 5
    SPREAD = 6
    ESTIMATED = 7
    ADJUSTED = 8
    REJECTED = 9
    NOT_INSTALLED = 10
    INFILLED = 11

    @property
    def label(self) -> str:
        """The status in words: ``"not installed"``."""
        return self.name.lower().replace("_", " ")


MEASURED: Final = frozenset(
    {
        Status.OBSERVED,
        Status.ZERO,
        Status.TRACE,
        Status.PRESUMED_ZERO,
        Status.ESTIMATED,
        Status.ADJUSTED,
    }
)
"""Statuses whose value was measured at the record's own step; only such values are donors step by step."""

REPORTING: Final = MEASURED | {Status.SPREAD}
"""Statuses whose value is the gauge's own: measured at the step, or measured over a longer interval and spread."""

WITHOUT_DEPTH: Final = frozenset({Status.MISSING, Status.REJECTED, Status.NOT_INSTALLED, Status.ACCUMULATED})
"""Statuses that have no depth at the step; the depth is NaN there, never zero."""


@dataclass(frozen=True)
class KnownTotal:
    """A depth that is known over several steps only: an accumulation, a daily reading, a storm total.

    Parameters
    ----------
    gauge
        The gauge's id.
    start, end
        The interval ``(start, end]`` over which it fell, datetime64[s] in the record's clock.
    depth
        mm.
    """

    gauge: str
    start: np.datetime64
    end: np.datetime64
    depth: float


@dataclass(frozen=True, eq=False)
class RainRecord:
    """Depths of rain by interval and gauge.

    Parameters
    ----------
    gauges : tuple of str
        Gauge ids, the columns.
    starts, ends : array of datetime64[s], shape (n_steps,)
        Every interval is ``(start, end]``, in the record's clock. Ends increase and intervals do not overlap. A record
        of storm totals without times has NaT in both.
    depth : array of float, shape (n_steps, n_gauges)
        mm; NaN where the status is one of :data:`WITHOUT_DEPTH`, and nowhere else.
    status : array of uint8, shape (n_steps, n_gauges)
        A :class:`Status` for every value.
    step : str
        The step in words: ``"1h"``, ``"1d"``, ``"1mo"``, ``"storm"`` for storm totals.
    zone : str
        The clock, a fixed offset from UTC such as ``"+02:00"``; empty where the files do not say.
    totals : tuple of KnownTotal
        Depths known only over several steps. Before spreading, their steps have status ACCUMULATED and no depth.
    day_phase : int
        Seconds after midnight at which the record's rainfall day begins.
    labels : tuple of str
        The storms' names, one a step, in a record of storm totals; else empty.
    recorders : frozenset of str
        Gauges that record at the record's own step or finer, whose values can give a pattern in time; all when not
        given.
    notes : tuple of Note
        What the reading of a source had to remark. They are the source's: records that are made from several do not
        carry them on.

    Raises
    ------
    DataError
        Shapes disagree, times do not increase, a depth is negative or infinite, or depth and status contradict each
        other.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(
    ...     ("A", "B"), ends - np.timedelta64(3600, "s"), ends, [[1.0, 0.0], [2.5, np.nan]], step="1h"
    ... )
    >>> record.status
    array([[0, 1],
           [0, 3]], dtype=uint8)
    >>> record.reporting
    array([[ True,  True],
           [ True, False]])
    >>> RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [-2.0]], step="1h")
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauge A: found -2.0 mm; expected a depth of 0 or more
    """

    gauges: tuple[str, ...]
    starts: npt.NDArray[np.datetime64]
    ends: npt.NDArray[np.datetime64]
    depth: npt.NDArray[np.float64]
    status: npt.NDArray[np.uint8]
    step: str = field(kw_only=True)
    zone: str = field(default="", kw_only=True)
    totals: tuple[KnownTotal, ...] = field(default=(), kw_only=True)
    day_phase: int = field(default=0, kw_only=True)
    labels: tuple[str, ...] = field(default=(), kw_only=True)
    recorders: frozenset[str] = field(default=cast("frozenset[str]", None), kw_only=True)
    notes: tuple[Note, ...] = field(default=(), kw_only=True)

    def __post_init__(self) -> None:
        given = cast("frozenset[str] | None", self.recorders)
        object.__setattr__(self, "recorders", frozenset(self.gauges) if given is None else given)
        problems = Problems()
        shape = (len(self.ends), len(self.gauges))
        for name in ("depth", "status"):
            if getattr(self, name).shape != shape:
                problems.add(item=name, found=f"an array of shape {getattr(self, name).shape}", expected=f"{shape}")
        if self.labels and len(self.labels) != len(self.ends):
            problems.add(item="labels", found=f"{len(self.labels)} names", expected=f"{len(self.ends)}, one a step")
        problems.raise_as(DataError)
        if not np.isnat(self.ends).any() and (np.diff(self.ends) <= np.timedelta64(0, "s")).any():
            problems.add(item="times", found="ends that do not increase", expected="each interval once, in order")
        bad = (self.depth < 0) | np.isinf(self.depth)
        for t, g in np.argwhere(bad):
            problems.add(
                item=f"gauge {self.gauges[g]}",
                found=f"{self.depth[t, g]} mm",
                expected="a depth of 0 or more",
                gauge=self.gauges[g],
                time=str(self.ends[t]),
            )
        empty = np.isin(self.status, [int(s) for s in WITHOUT_DEPTH])
        for t, g in np.argwhere(empty != np.isnan(self.depth)):
            problems.add(
                item=f"gauge {self.gauges[g]}",
                found=f"depth {self.depth[t, g]} with status '{Status(self.status[t, g]).label}'",
                expected="no depth where nothing is known, and only there",
                gauge=self.gauges[g],
                time=str(self.ends[t]),
            )
        problems.raise_as(DataError)

    @classmethod
    def from_depths(
        cls,
        gauges: tuple[str, ...],
        starts: npt.NDArray[np.datetime64],
        ends: npt.NDArray[np.datetime64],
        depth: npt.ArrayLike,
        *,
        step: str,
        zone: str = "",
    ) -> RainRecord:
        """Return a record whose statuses follow from the depths: NaN is missing, 0 is zero, the rest is observed.

        Parameters
        ----------
        gauges : tuple of str
            Gauge ids, the columns.
        starts, ends : array of datetime64, shape (n_steps,)
            Every interval is ``(start, end]``.
        depth : array-like of float, shape (n_steps, n_gauges)
            mm; NaN where nothing is known. It is copied.
        step, zone : str
            As for :class:`RainRecord`.

        Returns
        -------
        RainRecord

        Raises
        ------
        DataError
            Shapes disagree, ends do not increase, or a depth is negative or infinite.

        Examples
        --------
        >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
        >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[0.0], [np.nan]], step="1h")
        >>> [Status(code).label for code in record.status[:, 0]]
        ['zero', 'missing']
        >>> RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[0.0], [1.0]], step="1h")
        Traceback (most recent call last):
            ...
        basinrain.errors.DataError: depth: found an array of shape (2, 1); expected (2, 2)
        status: found an array of shape (2, 1); expected (2, 2)
        """
        values = np.array(depth, dtype=float)
        status = np.where(np.isnan(values), Status.MISSING, np.where(values == 0, Status.ZERO, Status.OBSERVED)).astype(
            np.uint8
        )
        return cls(
            gauges,
            np.asarray(starts, dtype="datetime64[s]"),
            np.asarray(ends, dtype="datetime64[s]"),
            values,
            status,
            step=step,
            zone=zone,
        )

    def __len__(self) -> int:
        return len(self.ends)

    @property
    def measured(self) -> npt.NDArray[np.bool_]:
        """Where a value was measured at the record's own step, shape (n_steps, n_gauges)."""
        return np.isin(self.status, [int(s) for s in MEASURED])

    @property
    def reporting(self) -> npt.NDArray[np.bool_]:
        """Where a value is the gauge's own, measured at the step or spread, shape (n_steps, n_gauges)."""
        return np.isin(self.status, [int(s) for s in REPORTING])

    def steps_of(self, totals: Sequence[KnownTotal]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
        """Return the whole steps that lie in each total's interval, as far as the record has them.

        Parameters
        ----------
        totals : sequence of KnownTotal
            Their gauges do not matter here.

        Returns
        -------
        first, stop : array of int, shape (n_totals,)
            Positions of steps, ``stop`` not included; equal where no whole step lies in the interval.

        Examples
        --------
        >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03"], dtype="datetime64[s]")
        >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, np.ones((3, 1)), step="1h")
        >>> late = KnownTotal("A", np.datetime64("2031-05-04T01"), np.datetime64("2031-05-04T09"), 5.0)
        >>> short = KnownTotal("A", np.datetime64("2031-05-04T01:10"), np.datetime64("2031-05-04T01:40"), 5.0)
        >>> record.steps_of([late, short])
        (array([1, 2]), array([3, 2]))
        """
        first = np.searchsorted(self.starts, np.array([total.start for total in totals], dtype="datetime64[s]"))
        stop = np.searchsorted(self.ends, np.array([total.end for total in totals], dtype="datetime64[s]"), "right")
        return first, np.maximum(first, stop)

    def window(self, first: int, stop: int) -> RainRecord:
        """Return the record of the steps ``first`` to ``stop`` (exclusive); ``totals`` are kept whole.

        Parameters
        ----------
        first, stop : int
            Positions of steps, as in a slice: what lies beyond the record is not there, and ``first`` equal to ``stop``
            gives a record without steps.

        Returns
        -------
        RainRecord
            Its arrays are views of this record's.

        Examples
        --------
        >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03"], dtype="datetime64[s]")
        >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [np.nan], [4.0]], step="1h")
        >>> record.window(1, 9).depth.ravel(), len(record.window(2, 2))
        (array([nan,  4.]), 0)
        """
        return replace(
            self,
            starts=self.starts[first:stop],
            ends=self.ends[first:stop],
            depth=self.depth[first:stop],
            status=self.status[first:stop],
            labels=self.labels[first:stop],
        )

    def ordered(self, gauges: tuple[str, ...]) -> RainRecord:
        """Return the record with its columns in the order of ``gauges``.

        Parameters
        ----------
        gauges : tuple of str
            Ids of columns. A column that is not named is left out of the arrays; ``totals`` and ``recorders`` stay.

        Returns
        -------
        RainRecord

        Raises
        ------
        ValueError
            An id is not a column of the record.

        Examples
        --------
        >>> ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
        >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[1.0, np.nan]], step="1h")
        >>> record.ordered(("B", "A")).depth
        array([[nan,  1.]])
        """
        order = [self.gauges.index(gauge) for gauge in gauges]
        return replace(self, gauges=tuple(gauges), depth=self.depth[:, order], status=self.status[:, order])

"""The spans of time over which one depth is estimated: a step, a rainfall day, the storm."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.rainfall import RainRecord

__all__ = ["EXACT", "KnownTotals", "cut_totals", "month_of", "own_totals", "span_starts"]

EXACT: Final = 1e-9
"""Depths this close to each other, relatively and in mm, are equal."""

_DAY: Final = 86400


def span_starts(record: RainRecord, scale: str) -> npt.NDArray[np.int64]:
    """Return the first steps of the spans that the window falls into, rising from 0.

    Parameters
    ----------
    record
        The window.
    scale
        ``"step"``: every step is a span. ``"day"``: the rainfall days, which begin ``record.day_phase`` seconds after
        midnight; a step belongs to the day that holds its middle. ``"storm"``: the whole window. Totals without times
        are a span each.

    Returns
    -------
    array of int, shape (n_spans,)

    Examples
    --------
    >>> ends = np.array(["2031-05-04T23", "2031-05-05T00", "2031-05-05T01"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [8.0], [2.0]], step="1h")
    >>> [span_starts(record, scale) for scale in ("step", "day", "storm")]
    [array([0, 1, 2]), array([0, 2]), array([0])]
    """
    if scale == "step" or not len(record) or np.isnat(record.ends).any():
        return np.arange(len(record))
    if scale == "storm":
        return np.zeros(1, dtype=np.int64)
    middle = _middle(record.starts, record.ends).astype(np.int64)
    day = (middle - record.day_phase) // _DAY
    return np.concatenate([[0], np.flatnonzero(np.diff(day)) + 1])


def month_of(starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> npt.NDArray[np.int64]:
    """Return the month, 1 to 12, that holds the middle of every interval; 0 where it has no times.

    The middle, since a monthly value ends at the first moment of the next month.

    Examples
    --------
    >>> january = (
    ...     np.array(["2031-01-01", "NaT"], dtype="datetime64[s]"),
    ...     np.array(["2031-02-01", "NaT"], "datetime64[s]"),
    ... )
    >>> month_of(*january)
    array([1, 0])
    """
    middle = _middle(starts, ends)
    month = middle.astype("datetime64[M]").astype(np.int64) % 12 + 1
    return np.where(np.isnat(middle), 0, month)


def own_totals(
    record: RainRecord, first: npt.NDArray[np.int64]
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Return what every gauge measured over spans of a record, and how much of the time of each the record has.

    Parameters
    ----------
    record : RainRecord
        With times.
    first : array of int, shape (n_spans,)
        The first step of each span, rising from 0; every span ends where the next begins.

    Returns
    -------
    totals : array of float, shape (n_spans, n_gauges)
        mm; NaN unless the gauge has its own value at every step of the span.
    seconds : array of float, shape (n_spans,)
        The length of its steps together.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [8.0], [np.nan]], step="1h")
    >>> totals, seconds = own_totals(record, np.array([0, 2]))
    >>> totals.ravel(), seconds
    (array([ 9., nan]), array([7200., 3600.]))
    """
    if not len(first):
        return np.empty((0, len(record.gauges))), np.empty(0)
    own = record.reporting
    known = np.logical_and.reduceat(own, first, axis=0)
    totals = np.where(known, np.add.reduceat(np.where(own, record.depth, 0.0), first, axis=0), np.nan)
    return totals, np.add.reduceat((record.ends - record.starts) / np.timedelta64(1, "s"), first)


def cut_totals(
    record: RainRecord, own: npt.NDArray[np.float64], first: npt.NDArray[np.int64], stop: npt.NDArray[np.int64]
) -> npt.NDArray[np.bool_]:
    """Return where a span holds part of the interval of a gauge's known total, but not all of its depth.

    What fell inside is then known from the pattern of other gauges alone.

    Parameters
    ----------
    record : RainRecord
        With its ``totals``.
    own : array of float, shape (n_steps, n_gauges)
        The gauges' own depths in mm, 0 where there is none.
    first, stop : array of int, shape (n_spans,)
        The steps of each span, ``first`` included, ``stop`` not; rising, none of them in two spans.

    Returns
    -------
    array of bool, shape (n_spans, n_gauges)

    Examples
    --------
    A knows 4 mm for both hours together: of neither hour, but of the two.

    >>> from basinrain.rainfall import KnownTotal, Status
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> total = KnownTotal("A", ends[0] - 3600, ends[1], 4.0)
    >>> depth, status = np.array([[1.0], [3.0]]), np.full((2, 1), Status.SPREAD, dtype=np.uint8)
    >>> record = RainRecord(("A",), ends - 3600, ends, depth, status, step="1h", totals=(total,))
    >>> cut_totals(record, depth, np.array([0, 1]), np.array([1, 2])).ravel()
    array([ True,  True])
    >>> cut_totals(record, depth, np.array([0]), np.array([2])).ravel()
    array([False])
    """
    return KnownTotals.of(record).cut(own, first, stop)


@dataclass(frozen=True, eq=False)
class KnownTotals:
    """The totals of a record that lie in it at least in part: what ``record.totals`` holds, as arrays.

    Parameters
    ----------
    begin, end, gauge : array of int, shape (n_totals,)
        The whole steps of each interval, ``end`` not included, and the gauge's column.
    depth : array of float, shape (n_totals,)
        mm.

    Examples
    --------
    See :func:`cut_totals`.
    """

    begin: npt.NDArray[np.int64]
    end: npt.NDArray[np.int64]
    gauge: npt.NDArray[np.int64]
    depth: npt.NDArray[np.float64]

    @classmethod
    def of(cls, record: RainRecord) -> KnownTotals:
        """Return the totals of a record's gauges; a record of some of the gauges keeps the totals of all."""
        column = {gauge: g for g, gauge in enumerate(record.gauges)}
        totals = [total for total in record.totals if total.gauge in column]
        begin, end = record.steps_of(totals)
        inside = np.flatnonzero(begin < end)
        return cls(
            begin[inside],
            end[inside],
            np.array([column[totals[k].gauge] for k in inside], dtype=np.int64),
            np.array([totals[k].depth for k in inside], dtype=float),
        )

    def within(self, first: int, stop: int) -> KnownTotals:
        """Return those that reach into some steps, with steps counted from ``first``."""
        held = (self.begin < stop) & (self.end > first)
        return KnownTotals(self.begin[held] - first, self.end[held] - first, self.gauge[held], self.depth[held])

    def cut(
        self, own: npt.NDArray[np.float64], first: npt.NDArray[np.int64], stop: npt.NDArray[np.int64]
    ) -> npt.NDArray[np.bool_]:
        """Return where a span holds part of a total's interval, but not all of its depth.

        Parameters
        ----------
        own, first, stop
            As for :func:`cut_totals`.

        Returns
        -------
        array of bool, shape (n_spans, n_gauges)
        """
        cut = np.zeros((len(first), own.shape[1]), dtype=bool)
        if not len(self.begin):
            return cut
        # Every total with every span that it reaches.
        first_span = np.searchsorted(stop, self.begin, "right")
        reached = np.searchsorted(first, self.end) - first_span
        total = np.repeat(np.arange(len(self.begin)), reached)
        span = np.arange(len(total)) - np.repeat(np.cumsum(reached) - reached - first_span, reached)
        gauge, depth = self.gauge[total], self.depth[total]
        through = np.concatenate([np.zeros((1, own.shape[1])), own.cumsum(axis=0)])
        held = (
            through[np.minimum(self.end[total], stop[span]), gauge]
            - through[np.maximum(self.begin[total], first[span]), gauge]
        )
        lost = np.abs(held - depth) > EXACT * np.maximum(depth, 1)
        cut[span[lost], gauge[lost]] = True
        return cut


def _middle(starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> npt.NDArray[np.datetime64]:
    middle: npt.NDArray[np.datetime64] = (starts + (ends - starts) // 2).astype("datetime64[s]")
    return middle

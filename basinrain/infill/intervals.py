"""Spans of steps, cut for gauges that come into service or leave it within one, and sums over them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

__all__ = ["Intervals", "intervals_of", "span_sums"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Intervals:
    """The spans of a block: those of most gauges, and parts of them for gauges that come or go within one.

    Parameters
    ----------
    first, stop : array of int, shape (n_rows,)
        The steps of each, ``stop`` not included; the first ``n_spans`` follow each other without a break.
    n_spans : int
        How many of them are spans of the block; the others are parts.
    row, gauge, span : array of int, shape (n_parts,)
        A part, the gauge that has it, and the span that it is part of.
    """

    first: Ints
    stop: Ints
    n_spans: int
    row: Ints
    gauge: Ints
    span: Ints


def intervals_of(first: Ints, absent: Bools) -> Intervals:
    """Return the spans of a block, those of gauges that come into service or leave it within one cut there.

    Parameters
    ----------
    first : array of int, shape (n_spans,)
        The first step of each, rising from 0; each ends where the next begins.
    absent : array of bool, shape (n_steps, n_gauges)
        Where gauges are not in service.

    Examples
    --------
    The second gauge comes into service in the middle of the second span.

    >>> absent = np.array([[False, True]] * 3 + [[False, False]])
    >>> found = intervals_of(np.array([0, 2]), absent)
    >>> found.first, found.stop, found.n_spans
    (array([0, 2, 2, 3]), array([2, 4, 3, 4]), 2)
    >>> found.row, found.gauge, found.span
    (array([2, 3]), array([1, 1]), array([1, 1]))
    """
    stop = np.append(first[1:], len(absent))
    none = np.empty(0, dtype=np.int64)
    if not absent.any():
        return Intervals(first, stop, len(first), none, none, none)
    before, gauge = np.nonzero(absent[1:] != absent[:-1])
    at = before + 1
    span = np.searchsorted(first, at, "right") - 1
    within = first[span] != at
    order = np.lexsort((at[within], gauge[within], span[within]))
    at, gauge, span = at[within][order], gauge[within][order], span[within][order]
    # What comes between the borders of one gauge in one span.
    opens = np.concatenate([[True], (np.diff(gauge) != 0) | (np.diff(span) != 0)])[: len(at)]
    closes = np.append(opens[1:], np.ones(1, dtype=bool))[: len(at)]
    begin = np.where(opens, first[span], np.roll(at, 1))
    bounds = np.concatenate([np.column_stack([begin, at]), np.column_stack([at, stop[span]])[closes]])
    bounds_of, row = np.unique(bounds, axis=0, return_inverse=True)
    return Intervals(
        np.concatenate([first, bounds_of[:, 0]]),
        np.concatenate([stop, bounds_of[:, 1]]),
        len(first),
        row.ravel() + len(first),
        np.concatenate([gauge, gauge[closes]]),
        np.concatenate([span, span[closes]]),
    )


def span_sums(values: Floats | Bools, intervals: Intervals) -> Floats:
    """Return the sum of values over every interval; of true and false, how many are true.

    Parameters
    ----------
    values : array of float or bool, shape (n_steps, n_gauges)
    intervals
        The intervals.

    Returns
    -------
    array of float, shape (n_rows, n_gauges)

    Examples
    --------
    >>> intervals = intervals_of(np.array([0, 2]), np.zeros((4, 1), dtype=bool))
    >>> span_sums(np.array([[1.0], [2.0], [3.0], [4.0]]), intervals).ravel()
    array([3., 7.])
    >>> span_sums(np.array([[True], [False], [True], [True]]), intervals).ravel()
    array([1., 2.])
    """
    first, stop = intervals.first[: intervals.n_spans], intervals.stop[: intervals.n_spans]
    length = np.unique(stop - first)
    counted = values.dtype == np.bool_
    of_spans: npt.NDArray[np.generic]
    if len(length) == 1:
        # As long as each other: an axis of its own is far quicker to sum over.
        whole = values.reshape(len(first), int(length[0]), values.shape[1])
        small = counted and int(length[0]) < 256
        of_spans = whole.view(np.uint8).sum(axis=1, dtype=np.uint8) if small else whole.sum(axis=1)
    else:
        of_spans = np.add.reduceat(values.astype(np.int32) if counted else values, first, axis=0)
    parts = zip(intervals.first[len(first) :].tolist(), intervals.stop[len(first) :].tolist(), strict=True)
    of_parts = [values[begin:end].sum(axis=0) for begin, end in parts]
    return np.concatenate([of_spans.astype(float), *(part[None, :] for part in of_parts)])

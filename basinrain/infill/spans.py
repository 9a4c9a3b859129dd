"""The spans of time over which one depth is estimated: a step, a rainfall day, the storm."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.rainfall import RainRecord

__all__ = ["month_of", "span_starts"]

_DAY = 86400


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


def _middle(starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> npt.NDArray[np.datetime64]:
    middle: npt.NDArray[np.datetime64] = (starts + (ends - starts) // 2).astype("datetime64[s]")
    return middle

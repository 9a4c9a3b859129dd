"""Gaps in the window: where they are, how long they are, and whether they hide the peak."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status

__all__ = ["gap_mask", "longer_than", "over_peak", "steps_in_words"]

_LISTED: Final = 3


def gap_mask(record: RainRecord) -> npt.NDArray[np.bool_]:
    """Return where a gauge in service has no depth: missing, rejected, or accumulated and not spread.

    Returns
    -------
    array of bool, shape (n_steps, n_gauges)

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    >>> status = np.array([[Status.ZERO, Status.MISSING, Status.REJECTED, Status.NOT_INSTALLED]], dtype=np.uint8)
    >>> depth = np.array([[0.0, np.nan, np.nan, np.nan]])
    >>> gap_mask(RainRecord(("A", "B", "C", "D"), ends - 3600, ends, depth, status, step="1h"))
    array([[False,  True,  True, False]])
    """
    return np.isin(record.status, [int(s) for s in (Status.MISSING, Status.REJECTED, Status.ACCUMULATED)])


def longer_than(record: RainRecord, gaps: npt.NDArray[np.bool_], days: float) -> npt.NDArray[np.bool_]:
    """Return where ``gaps`` last longer than ``days``, shape (n_steps, n_gauges).

    A gap lasts from the start of the first to the end of the last of a gauge's consecutive missing steps in this
    record. Totals without times have no length.

    Examples
    --------
    >>> ends = np.array(["2031-05-04", "2031-05-05", "2031-05-06"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(
    ...     ("A", "B"), ends - 86400, ends, [[np.nan, np.nan], [np.nan, 1.0], [0.0, np.nan]], step="1d"
    ... )
    >>> longer_than(record, gap_mask(record), 1)
    array([[ True, False],
           [ True, False],
           [False, False]])
    """
    edge = np.zeros((1, gaps.shape[1]), dtype=bool)
    change = np.diff(np.concatenate([edge, gaps, edge]).astype(np.int8), axis=0)
    begin, gauge = np.nonzero(change == 1)
    end, gauge_of_end = np.nonzero(change == -1)
    # By gauge, so that the k-th begin and the k-th end belong to one gap of one gauge.
    order = np.argsort(gauge, kind="stable")
    begin, gauge, end = begin[order], gauge[order], end[np.argsort(gauge_of_end, kind="stable")]
    seconds = (record.ends[end - 1] - record.starts[begin]) / np.timedelta64(1, "s")
    result = np.zeros_like(gaps)
    for k in np.flatnonzero(seconds > days * 86400).tolist():
        result[begin[k] : end[k], gauge[k]] = True
    return result


def over_peak(record: RainRecord, gaps: npt.NDArray[np.bool_], completed: npt.NDArray[np.float64]) -> list[Note]:
    """Return a warning for every gauge without a value at the wettest step of the window, or at a step next to it.

    It says whether the gap was infilled there: ``completed`` (n_steps, n_gauges) are the depths after infill in mm, NaN
    where there is none.


    The wettest step is the one at which the mean of the reporting gauges is greatest; all of them where several tie.
    Windows of one step, dry ones and totals without times have none.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(
    ...     ("A", "B"), ends - 3600, ends, [[1.0, 0.0], [8.0, np.nan], [2.0, 1.0]], step="1h"
    ... )
    >>> print(over_peak(record, gap_mask(record), np.array([[1.0, 0.0], [8.0, 4.0], [2.0, 1.0]]))[0])
    Gauge B has no value of its own at the wettest step of the window (ending 2031-05-04T02:00) or \
next to it; what was infilled there may miss the peak.
    >>> print(over_peak(record, gap_mask(record), record.depth)[0].text.split("; ")[1])
    it stays missing there.
    """
    reporting = record.reporting
    count = reporting.sum(axis=1)
    if len(record) < 2 or np.isnat(record.ends).any() or not count.any():
        return []
    mean = np.where(reporting, record.depth, 0.0).sum(axis=1) / np.maximum(count, 1)
    greatest = mean.max()
    if greatest == 0:
        return []
    wettest = mean >= greatest * (1 - 1e-9)
    near = wettest.copy()
    near[1:] |= wettest[:-1]
    near[:-1] |= wettest[1:]
    peak = record.ends[int(np.flatnonzero(wettest)[0])]
    missing = gaps[near]
    left = missing & np.isnan(completed[near])
    return [
        Note(
            code="gap-over-peak",
            text=f"Gauge {record.gauges[g]} has no value of its own at the wettest step of the window "
            f"(ending {_minute(peak)}) or next to it; {_outcome(missing[:, g], left[:, g])}.",
            gauge=record.gauges[g],
        )
        for g in np.flatnonzero(missing.any(axis=0))
    ]


def _outcome(missing: npt.NDArray[np.bool_], left: npt.NDArray[np.bool_]) -> str:
    if (missing == left).all():
        return "it stays missing there"
    infilled = "what was infilled there may miss the peak"
    return f"{infilled}, and in part it stays missing" if left.any() else infilled


def steps_in_words(record: RainRecord, steps: npt.NDArray[np.int64]) -> str:
    """Return steps, in rising order, as text: their number, and the first few runs of them.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[1.0], [8.0], [2.0]], step="1h")
    >>> steps_in_words(record, np.array([0, 1]))
    '2 of 3 steps (2031-05-04T00:00 to 2031-05-04T02:00)'
    """
    runs = np.split(steps, np.flatnonzero(np.diff(steps) > 1) + 1)
    if np.isnat(record.ends).any():
        named = [record.labels[s] if record.labels else f"number {s + 1}" for s in steps.tolist()]
        listed, more, noun = ", ".join(named[:_LISTED]), len(named) - _LISTED, "totals"
    else:
        listed = ", ".join(f"{_minute(record.starts[r[0]])} to {_minute(record.ends[r[-1]])}" for r in runs[:_LISTED])
        more, noun = len(runs) - _LISTED, "steps"
    return f"{len(steps)} of {len(record)} {noun} ({listed}{f' and {more} more' if more > 0 else ''})"


def _minute(time: np.datetime64) -> str:
    return str(time.astype("datetime64[m]"))

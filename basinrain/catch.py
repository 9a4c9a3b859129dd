"""Gauge catch: factors that the user gives, by gauge and month; none is applied otherwise."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from basinrain.rainfall import RainRecord, Status

__all__ = ["correct_catch"]


def correct_catch(record: RainRecord, factors: Mapping[str, npt.NDArray[np.float64]]) -> RainRecord:
    """Return the record with depths multiplied by catch factors.

    Parameters
    ----------
    record : RainRecord
        With its totals spread. Steps without times (storm totals) take the mean of the twelve factors.
    factors : mapping of gauge id to array of float, shape (12,)
        Factors of January to December, above 0. The month is that which holds the middle of a step.

    Returns
    -------
    RainRecord
        Changed values have status ADJUSTED; spread values stay SPREAD, missing ones missing. Totals that were spread
        are those of their corrected steps.

    Examples
    --------
    >>> ends = np.array(["2031-01-31T23", "2031-02-01T01"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[10.0, 10.0], [10.0, 0.0]], step="1h")
    >>> corrected = correct_catch(record, {"A": np.array([1.1] + [1.0] * 11)})
    >>> corrected.depth
    array([[11., 10.],
           [10.,  0.]])
    >>> [Status(s).label for s in corrected.status[:, 0]]
    ['adjusted', 'observed']
    """
    if not factors:
        return record
    depth, status = record.depth.copy(), record.status.copy()
    timeless = np.isnat(record.ends)
    # The middle, since the last step of a month ends at the first moment of the next.
    middle = record.starts + (record.ends - record.starts) // 2
    month = np.where(timeless, 0, middle.astype("datetime64[M]").astype(np.int64) % 12)
    for gauge, months in factors.items():
        column = record.gauges.index(gauge)
        factor = np.where(timeless, months.mean(), months[month])
        changed = (factor != 1) & (depth[:, column] > 0) & (status[:, column] != Status.SPREAD)
        depth[:, column] *= factor
        status[changed, column] = Status.ADJUSTED
    totals = [
        replace(total, depth=float(depth[first:stop, record.gauges.index(total.gauge)].sum()))
        if total.gauge in factors
        else total
        for total, first, stop in zip(record.totals, *record.steps_of(record.totals), strict=True)
    ]
    return replace(record, depth=depth, status=status, totals=tuple(totals))

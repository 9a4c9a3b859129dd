"""Sums of a completed record, small beside it, from which its basin means follow."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averager import Averager
from basinrain.averaging import Weigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.errors import MethodError, Problem
from basinrain.infill.gaps import gap_mask
from basinrain.rainfall import RainRecord, Status

__all__ = ["CompletedSums", "average_sums"]

_MOST_REBUILT: Final = 100
"""Sets of gauges for which the weights may be rebuilt where a method leaves gaps that the job's own fills."""

_BLOCK: Final = 1 << 20
"""Values of the record that are looked at together."""

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class CompletedSums:
    """The steps of a completed record, summed by the sets of gauges that have a depth.

    Parameters
    ----------
    left : int
        Gaps that are left.
    parts : mapping of bytes to array of float, shape (3, n_gauges)
        For every set, by its mask (n_gauges,) as bytes: of each gauge its depth in mm, how much of that is infilled,
        and at how many steps.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(
    ...     ("A", "B"), ends - 3600, ends, [[4.0, 2.0], [6.0, np.nan], [1.0, 1.0]], step="1h"
    ... )
    >>> sums = CompletedSums.of(record)
    >>> sums.left, [part[0].tolist() for part in sums.parts.values()]
    (1, [[5.0, 3.0], [6.0, 0.0]])
    """

    left: int
    parts: Mapping[bytes, Floats]

    @classmethod
    def of(cls, record: RainRecord) -> CompletedSums:
        """Return the sums of a record after infill, or before it."""
        return cls.of_depths(record.depth, record.status == Status.INFILLED, gap_mask(record))

    @classmethod
    def of_depths(cls, depth: Floats, infilled: Bools, gaps: Bools) -> CompletedSums:
        """Return the sums of completed depths.

        Parameters
        ----------
        depth : array of float, shape (n_steps, n_gauges)
            mm; NaN where there is none.
        infilled : array of bool, shape (n_steps, n_gauges)
            Which of them are infilled.
        gaps : array of bool, shape (n_steps, n_gauges)
            Where a gauge in service had no depth before infill.
        """
        runs = ReportingRuns.of(~np.isnan(depth))
        left, n_gauges = 0, depth.shape[1]
        parts = np.zeros((len(runs.sets), 3, n_gauges))
        most = max(_BLOCK // max(n_gauges, 1), 1)
        bounds = zip(runs.first.tolist(), runs.lengths.tolist(), runs.set_of_run.tolist(), strict=True)
        for first, length, k in bounds:
            for begin in range(first, first + length, most):
                steps = slice(begin, min(begin + most, first + length))
                there = np.where(runs.sets[k], depth[steps], 0.0)
                parts[k] += there.sum(axis=0), (there * infilled[steps]).sum(axis=0), infilled[steps].sum(axis=0)
            left += int(np.count_nonzero(gaps[first : first + length] & ~runs.sets[k]))
        return cls(left, {present.tobytes(): part for present, part in zip(runs.sets, parts, strict=True)})

    def unlike(self, own: CompletedSums, n_gaps: int) -> str:
        """Return why a completed record is not to be set beside the job's own: it infills nothing, or far less.

        Parameters
        ----------
        own
            The sums of the job's own.
        n_gaps
            Gaps before infill.

        Returns
        -------
        str
            Empty where it may be set beside it.
        """
        if self.left == n_gaps > 0:
            return "it cannot infill the " + (f"{n_gaps:,} missing values" if n_gaps > 1 else "missing value")
        rebuilt = len(self.parts.keys() - own.parts.keys())
        if rebuilt > _MOST_REBUILT:
            return (
                f"it leaves {self.left:,} of {n_gaps:,} missing values without a depth, and the weights would have to "
                f"be rebuilt for {rebuilt:,} sets of gauges, more than {_MOST_REBUILT}"
            )
        return ""


def average_sums(
    runs: Sequence[CompletedSums], weigher: Weigher | Averager, n_steps: int
) -> tuple[Floats, Floats, dict[int, str]]:
    """Return the basin means of several completed records of one storm by one averaging method.

    Parameters
    ----------
    runs
        Their sums.
    weigher
        Makes the method's weights for any set of gauges that are present, or does so faster for many.
    n_steps
        Steps of the storm.

    Returns
    -------
    totals : array of float, shape (n_runs, n_basins)
        mm; NaN where the method has no number.
    share : array of float, shape (n_runs, n_basins)
        The share of each total that is infilled, by weight where the basin stayed dry; NaN where the total is.
    refused : dict of int to str
        Why there is no number, by run.

    Raises
    ------
    MethodError
        The method refuses every set of gauges.

    Examples
    --------
    >>> from basinrain.weights import WeightTable
    >>> def halves(present):
    ...     return WeightTable("halves", ("all",), ("A", "B"), np.where(present, 1 / present.sum(), 0.0)[None, :])
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[4.0, 2.0], [6.0, np.nan]], step="1h")
    >>> average_sums([CompletedSums.of(record)], halves, 2)  # 3 mm, and A's 6 mm
    (array([[9.]]), array([[0.]]), {})
    """
    sums: dict[int, Floats] = {}
    refused: dict[int, str] = {}
    error: MethodError | None = None
    # Each set once, in a fixed order, whichever runs have it.
    keys = list(dict.fromkeys(key for run in runs for key in run.parts))
    having = {key: [k for k, run in enumerate(runs) if key in run.parts] for key in keys}
    empty = [key for key in keys if not any(key)]
    refused.update(dict.fromkeys((k for key in empty for k in having[key]), "at some step no gauge has a depth"))
    keys = [key for key in keys if any(key)]
    averager = weigher if isinstance(weigher, Averager) else Averager(weigher)
    sets = np.array([np.frombuffer(key, dtype=bool) for key in keys])
    for key, weights in zip(keys, averager.weights(sets) if keys else (), strict=True):
        if isinstance(weights, MethodError):
            error = weights
            refused.update(dict.fromkeys(having[key], str(weights)))
            continue
        weight = weights.sum(axis=1)
        for k in having[key]:
            # Run by run, since a product of more rows need not round like that of these three.
            means = runs[k].parts[key] @ weights.T
            means[2] /= np.where(weight == 0, np.nan, weight)
            sums[k] = sums.get(k, 0.0) + means
    if not sums:
        raise error or MethodError(Problem(item="storm", found="no step with a depth", expected="one at least"))
    nothing = np.full_like(next(iter(sums.values())), np.nan)
    total, infilled, by_weight = np.stack([nothing if k in refused else sums[k] for k in range(len(runs))], axis=1)
    by_depth = np.divide(infilled, total, out=np.full(total.shape, np.nan), where=total > 0)
    return total, np.where(total == 0, by_weight / n_steps, by_depth), refused

"""The completed record of a storm, and how every estimated value came about."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status

__all__ = ["Completed", "Estimate"]


@dataclass(frozen=True, kw_only=True)
class Estimate:
    """One infilled depth: a step's, a day's or a storm's.

    Parameters
    ----------
    gauge
        The gauge that was infilled.
    first, stop
        The steps of the window that the depth belongs to, ``first`` included, ``stop`` not.
    scale
        ``"step"``, ``"day"`` or ``"storm"``.
    depth
        mm over those steps; for a day or storm the whole total, observed steps of it included.
    method
        The infill method's registered name.
    donors
        Weight of every donor, by gauge id: ``depth`` is the weighted sum of the donors' depths over the same steps.
    """

    gauge: str
    first: int
    stop: int
    scale: str
    depth: float
    method: str
    donors: Mapping[str, float]


@dataclass(frozen=True, eq=False)
class Completed:
    """A window of the record with its gaps infilled, as far as they can be.

    Parameters
    ----------
    record : RainRecord
        Estimated values have status INFILLED; what could not be estimated stays without a depth.
    estimates : tuple of Estimate
        How every estimated value came about, by gauge, then time.
    notes : tuple of Note
        Which gauges stayed missing and why, totals raised to what was observed, patterns spread evenly.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[4.0, 2.0], [6.0, 3.0]], step="1h")
    >>> status = record.status.copy()
    >>> status[:, 1] = Status.INFILLED
    >>> filled = RainRecord(record.gauges, record.starts, record.ends, record.depth, status, step="1h")
    >>> estimate = Estimate(
    ...     gauge="B", first=0, stop=2, scale="storm", depth=5.0, method="normal-ratio", donors={"A": 0.5}
    ... )
    >>> completed = Completed(filled, (estimate,), ())
    >>> completed.sources()  # B's 5 mm are half of A's 10 mm
    array([[10.,  0.],
           [ 5.,  0.]])
    >>> completed.donor_table(0)
    array([[1. , 0. ],
           [0.5, 0. ]])
    """

    record: RainRecord
    estimates: tuple[Estimate, ...]
    notes: tuple[Note, ...]

    def donor_table(self, step: int) -> npt.NDArray[np.float64]:
        """Return how the depths of one step rest on reporting gauges, shape (n_gauges, n_gauges).

        Row g holds 1 at g itself where the gauge's own value counts, the donor weights where its value, or the total that
        its value is part of, was estimated, and zeros where it has no depth.
        """
        table = np.diag(self.record.reporting[step].astype(float))
        for estimate in self.estimates:
            if estimate.first <= step < estimate.stop:
                table[self._column(estimate.gauge)] = self._donor_row(estimate)
        return table

    def donor_tables(self) -> list[tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]]:
        """Return the steps that share one donor table, with that table; together they are all steps of the window."""
        reporting = self.record.reporting
        groups: dict[bytes, list[int]] = {}
        for step in range(len(self.record)):
            active = tuple(k for k, e in enumerate(self.estimates) if e.first <= step < e.stop)
            key = reporting[step].tobytes() + np.array(active, dtype=np.int64).tobytes()
            groups.setdefault(key, []).append(step)
        return [(np.array(steps), self.donor_table(steps[0])) for steps in groups.values()]

    def sources(self) -> npt.NDArray[np.float64]:
        """Return the depth in every gauge's window total that comes from each gauge's own values.

        Returns
        -------
        array of float, shape (n_gauges, n_gauges)
            Rows sum to the completed totals (NaN steps left out); columns are the gauges whose own values they rest on.
        """
        own = np.where(self.record.reporting, self.record.depth, 0.0)
        n = len(self.record.gauges)
        result = np.zeros((n, n))
        for steps, table in self.donor_tables():
            result += table * own[steps].sum(axis=0)[None, :]
        return result

    def _column(self, gauge: str) -> int:
        return self.record.gauges.index(gauge)

    def _donor_row(self, estimate: Estimate) -> npt.NDArray[np.float64]:
        row = np.zeros(len(self.record.gauges))
        for donor, weight in estimate.donors.items():
            row[self._column(donor)] = weight
        return row

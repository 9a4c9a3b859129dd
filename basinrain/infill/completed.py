"""The completed record of a storm, and how every estimated value came about."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from basinrain.notes import Note
from basinrain.rainfall import RainRecord

__all__ = ["Completed", "Estimate"]

_OWN = 1
_DONATED = 2


@dataclass(frozen=True, kw_only=True, slots=True)
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

    Examples
    --------
    >>> estimate = Estimate(
    ...     gauge="B", first=0, stop=2, scale="storm", depth=5.0, method="normal-ratio", donors={"A": 0.5}
    ... )
    >>> estimate.stop - estimate.first, estimate.donors["A"]
    (2, 0.5)
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
        How every estimated value came about, by gauge, then time; no two of a gauge share a step.
    notes : tuple of Note
        Which gauges stayed missing and why, totals raised to what was observed, patterns spread evenly.

    Examples
    --------
    >>> from basinrain.rainfall import Status
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

        Row g holds 1 at g itself where the gauge's own value counts, the donor weights where its value, or the total
        that its value is part of, was estimated, and zeros where it has no depth.
        """
        kinds = self._kinds[step]
        table = np.diag((kinds == _OWN).astype(float))
        estimated = kinds >= _DONATED
        table[estimated] = self._donor_rows[1][kinds[estimated] - _DONATED]
        return table

    def influence(
        self, weights: npt.NDArray[np.float64], steps: npt.NDArray[np.int64] | slice
    ) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
        """Return the least and the greatest weight of every gauge's own values over some steps, infill included.

        Parameters
        ----------
        weights : array of float, shape (n_basins, n_gauges)
            Of the gauges that have a depth at these steps.
        steps : array of int or slice
            One step at least.

        Returns
        -------
        least, most : array of float, shape (n_basins, n_gauges)
            Over ``weights @ donor_table(step)``.
        """
        kinds = self._kinds[steps]
        kinds = kinds[np.concatenate([[True], (kinds[1:] != kinds[:-1]).any(axis=1)])]
        # Rows as single values of so many bytes, which compare many times as fast as rows do.
        whole = np.ascontiguousarray(kinds).view(np.dtype((np.void, kinds.shape[1] * kinds.itemsize)))
        kinds = kinds[np.unique(whole.ravel(), return_index=True)[1]]
        least, most = np.full(weights.shape, np.inf), np.full(weights.shape, -np.inf)
        for row in kinds:
            estimated = np.flatnonzero(row >= _DONATED)
            share = np.where(row == _OWN, weights, 0.0)
            share += weights[:, estimated] @ self._donor_rows[1][row[estimated] - _DONATED]
            np.minimum(least, share, out=least)
            np.maximum(most, share, out=most)
        return least, most

    def donor_tables(self) -> Iterator[tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]]:
        """Yield the steps that share one donor table and the same reporting gauges, with that table.

        Together they are all steps of the window; groups come in the order of their first steps. The time taken grows
        with the number of steps and of different tables, not with their product.
        """
        for steps in self._groups:
            yield steps, self.donor_table(int(steps[0]))

    def sources(self, steps: npt.NDArray[np.int64] | slice | None = None) -> npt.NDArray[np.float64]:
        """Return the depth in every gauge's total that comes from each gauge's own values.

        Parameters
        ----------
        steps : array of int, shape (n,), or slice, optional
            Positions of the steps to total, each once; all where not given.

        Returns
        -------
        array of float, shape (n_gauges, n_gauges)
            mm. Rows sum to the completed totals over those steps (steps without a depth left out); columns are the
            gauges whose own values they rest on. A depth that is part of an estimated day's or storm's total rests on
            that total's donors in proportion to what each put into it, whatever the pattern by which it was spread: so
            rows sum to the depths over any choice of steps.

        Examples
        --------
        B's storm total of 5 mm is half of A's and was spread evenly. Of its first hour, too, all comes from A.

        >>> from basinrain.rainfall import Status
        >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
        >>> status = np.array([[Status.ZERO, Status.INFILLED], [Status.OBSERVED, Status.INFILLED]], dtype=np.uint8)
        >>> depth = np.array([[0.0, 2.5], [10.0, 2.5]])
        >>> record = RainRecord(("A", "B"), ends - 3600, ends, depth, status, step="1h")
        >>> estimate = Estimate(
        ...     gauge="B", first=0, stop=2, scale="storm", depth=5.0, method="normal-ratio", donors={"A": 0.5}
        ... )
        >>> Completed(record, (estimate,), ()).sources(np.array([0]))
        array([[0. , 0. ],
               [2.5, 0. ]])
        """
        chosen = np.arange(len(self.record))
        if steps is not None:
            chosen = chosen[steps] if isinstance(steps, slice) else np.asarray(steps, dtype=np.int64)
        kinds, own = self._kinds[chosen], self._own[chosen]
        n = len(self.record.gauges)
        result = np.zeros((n, n))
        result[np.arange(n), np.arange(n)] = np.where(kinds == _OWN, own, 0.0).sum(axis=0)
        for g in np.flatnonzero((kinds >= _DONATED).any(axis=0)):
            at = np.flatnonzero(kinds[:, g] >= _DONATED)
            result[g] += self._donated(int(g), chosen[at], kinds[at, g] - _DONATED)
        return result

    def _donated(self, g: int, steps: npt.NDArray[np.int64], rows: npt.NDArray[np.int32]) -> npt.NDArray[np.float64]:
        """Return what every gauge put into the estimated depths of gauge g at these steps, shape (n_gauges,)."""
        weights = self._donor_rows[1]
        columns = np.flatnonzero((weights[np.unique(rows)] != 0).any(axis=0))
        used = weights[np.ix_(rows, columns)]
        which = self._estimate_at[steps, g]
        single = self._lengths[which] == 1
        put = np.zeros(len(self.record.gauges))
        put[columns] = (used[single] * self._own[np.ix_(steps[single], columns)]).sum(axis=0)
        spread = np.flatnonzero(~single)
        several, first, group = np.unique(which[spread], return_index=True, return_inverse=True)
        given = np.bincount(group.ravel(), weights=self.record.depth[steps[spread], g])
        for k, at, depth in zip(several.tolist(), spread[first].tolist(), given.tolist(), strict=True):
            estimate = self.estimates[k]
            if estimate.depth > 0:
                totals = self._own[estimate.first : estimate.stop, columns].sum(axis=0)
                put[columns] += depth / estimate.depth * used[at] * totals
        return put

    @cached_property
    def _own(self) -> npt.NDArray[np.float64]:
        return np.where(self.record.reporting, self.record.depth, 0.0)

    @cached_property
    def _estimate_at(self) -> npt.NDArray[np.int32]:
        """The position in ``estimates`` of what each depth belongs to, -1 where it is nothing but the gauge's own."""
        at = np.full(self.record.depth.shape, -1, dtype=np.int32)
        column = {gauge: g for g, gauge in enumerate(self.record.gauges)}
        for k, estimate in enumerate(self.estimates):
            at[estimate.first : estimate.stop, column[estimate.gauge]] = k
        return at

    @cached_property
    def _lengths(self) -> npt.NDArray[np.int64]:
        return np.array([estimate.stop - estimate.first for estimate in self.estimates], dtype=np.int64)

    @cached_property
    def _donor_rows(self) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]:
        """The row of weights that each estimate uses, and the different rows, shape (n_rows, n_gauges)."""
        column = {gauge: g for g, gauge in enumerate(self.record.gauges)}
        place: dict[tuple[tuple[str, float], ...], int] = {}
        # Estimates of one pattern share one mapping, whose content is then compared only once.
        known: dict[int, int] = {}
        row_of = np.empty(len(self.estimates), dtype=np.int64)
        for k, estimate in enumerate(self.estimates):
            row = known.get(id(estimate.donors))
            if row is None:
                row = place.setdefault(tuple(sorted(estimate.donors.items())), len(place))
                known[id(estimate.donors)] = row
            row_of[k] = row
        rows = np.zeros((len(place), len(column)))
        for donors, row in place.items():
            for gauge, weight in donors:
                rows[row, column[gauge]] = weight
        return row_of, rows

    @cached_property
    def _kinds(self) -> npt.NDArray[np.int32]:
        """0 without a depth, 1 the gauge's own value, from 2 on the donor row that the depth rests on."""
        kinds = self.record.reporting.astype(np.int32)
        estimated = self._estimate_at >= 0
        kinds[estimated] = self._donor_rows[0][self._estimate_at[estimated]] + _DONATED
        return kinds

    @cached_property
    def _groups(self) -> list[npt.NDArray[np.int64]]:
        if not len(self.record):
            return []
        keys = np.column_stack([self._kinds, self.record.reporting])
        _, first, group = np.unique(keys, axis=0, return_index=True, return_inverse=True)
        group = group.ravel()
        order = np.argsort(group, kind="stable")
        split = np.split(order, np.flatnonzero(np.diff(group[order])) + 1)
        return [split[k] for k in np.argsort(first, kind="stable")]

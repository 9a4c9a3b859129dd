"""Annual totals of complete years, and the neighbours that a gauge's years are held against."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord

__all__ = ["FEWEST_NEIGHBOURS", "AnnualTotals", "annual_totals", "reference_group"]

FEWEST_NEIGHBOURS: Final = 3
"""A mean of fewer gauges is no pattern: the fault of one of them would count for half of it."""

_MOST_NEIGHBOURS: Final = 5
_SHARES: Final = (0.8, 0.5, 0.0)
"""How much of the gauge's own years its neighbours should leave, tried in turn."""


@dataclass(frozen=True, eq=False)
class AnnualTotals:
    """Depth of every calendar year at every gauge.

    Parameters
    ----------
    gauges : tuple of str
        Gauge ids, the columns.
    years : array of int, shape (n_years,)
        Calendar years, increasing; a year in which the record has no step is not there.
    totals : array of float, shape (n_years, n_gauges)
        mm; NaN where the year is not complete.
    ends : array of datetime64[s], shape (n_years,)
        When the last step of every year ends.
    """

    gauges: tuple[str, ...]
    years: npt.NDArray[np.int64]
    totals: npt.NDArray[np.float64]
    ends: npt.NDArray[np.datetime64]

    def __len__(self) -> int:
        return len(self.years)


def annual_totals(record: RainRecord) -> AnnualTotals:
    """Return the totals of complete calendar years.

    Parameters
    ----------
    record
        At any step; a step belongs to the calendar year in which its middle lies, so that a day read at 08:00 on the
        first of January counts for the year before.

    Returns
    -------
    AnnualTotals
        A year is complete at a gauge where every step has the gauge's own value and the steps cover the year. One
        missing step makes it NaN: missing is never zero. Storm totals without times have no years.

    Examples
    --------
    >>> ends = np.arange("2031-02", "2033-02", dtype="datetime64[M]").astype("datetime64[s]")
    >>> starts = np.arange("2031-01", "2033-01", dtype="datetime64[M]").astype("datetime64[s]")
    >>> depths = np.full((24, 2), 50.0)
    >>> depths[20, 1] = np.nan
    >>> annual = annual_totals(RainRecord.from_depths(("A", "B"), starts, ends, depths, step="1mo"))
    >>> annual.years, annual.totals
    (array([2031, 2032]), array([[600., 600.],
           [600.,  nan]]))
    """
    if not len(record) or np.isnat(record.ends).any():
        none = np.empty(0, dtype="datetime64[s]")
        return AnnualTotals(record.gauges, np.empty(0, dtype=np.int64), np.empty((0, len(record.gauges))), none)
    length = record.ends - record.starts
    middle = record.starts + length // 2
    year_of = middle.astype("datetime64[Y]")
    first = np.flatnonzero(np.r_[True, year_of[1:] != year_of[:-1]])
    last = np.r_[first[1:], len(record)] - 1
    begin, finish = year_of[first].astype("datetime64[s]"), (year_of[first] + 1).astype("datetime64[s]")
    covered = np.add.reduceat(length, first) == record.ends[last] - record.starts[first]
    # A step like the first one, just before it, would have its middle in the year if there were room for it.
    covered &= record.starts[first] - length[first] + length[first] // 2 < begin
    covered &= record.ends[last] + length[last] // 2 >= finish
    own = record.reporting
    totals = np.add.reduceat(np.where(own, record.depth, 0.0), first, axis=0)
    totals[~(np.logical_and.reduceat(own, first, axis=0) & covered[:, None])] = np.nan
    years = year_of[first].astype(np.int64) + 1970
    return AnnualTotals(record.gauges, years, totals, record.ends[last])


def reference_group(
    annual: AnnualTotals,
    network: GaugeNetwork,
    target: int,
    *,
    at_least: int,
    distances: npt.NDArray[np.float64],
    trusted: npt.NDArray[np.bool_] | None = None,
) -> npt.NDArray[np.int64]:
    """Return the neighbours whose mean a gauge's years are held against.

    Parameters
    ----------
    annual
        Columns in the network's order.
    network
        The gauges; equal distances go by id.
    target
        The gauge's place in the network.
    at_least
        Years that the gauge and all the neighbours must have in common.
    distances : array of float, shape (n_gauges, n_gauges)
        m, as ``network.distances()`` gives them.
    trusted : array of bool, shape (n_gauges,), optional
        Which gauges may be neighbours; all where not given.

    Returns
    -------
    array of int
        Places of three to five gauges, the nearest first; empty where there are none. A gauge is passed over where
        taking it would leave fewer than ``at_least`` common years or less than 80 % of the target's own; where three
        are not found so, 50 % will do, and then ``at_least`` alone.

    Examples
    --------
    >>> network = GaugeNetwork(ids=tuple("ABCD"), x=[0.0, 1.0, 2.0, 3.0], y=np.zeros(4), crs="local")
    >>> years = np.arange(2001, 2011)
    >>> annual = AnnualTotals(network.ids, years, np.ones((10, 4)), years.astype("datetime64[s]"))
    >>> reference_group(annual, network, 0, at_least=10, distances=network.distances())
    array([1, 2, 3])
    >>> len(reference_group(annual, network, 0, at_least=11, distances=network.distances()))
    0
    """
    has = np.isfinite(annual.totals)
    own = np.count_nonzero(has[:, target])
    order = network.nearest_first(distances[target])
    order = order[order != target] if trusted is None else order[(order != target) & trusted[order]]
    for share in _SHARES:
        needed = max(at_least, share * own)
        common = has[:, target]
        group: list[int] = []
        for gauge in order.tolist():
            left = common & has[:, gauge]
            if np.count_nonzero(left) >= needed:
                common = left
                group.append(gauge)
                if len(group) == _MOST_NEIGHBOURS:
                    break
        if len(group) >= FEWEST_NEIGHBOURS:
            return np.array(group, dtype=np.int64)
    return np.empty(0, dtype=np.int64)

"""What the series of a whole record come to, and how much of that hangs on single gauges."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.rainfall import RainRecord, Status
from basinrain.series.engine import SeriesEngine, SeriesSetup
from basinrain.series.flags import Flag
from basinrain.series.series_source import SeriesSource, copied

__all__ = ["LeftOut", "LongTerm", "gauges_to_leave_out", "left_out", "long_term"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_BLOCK: Final = 1 << 20
"""Values that are looked at together."""
_LEFT_OUT: Final = 20
"""Gauges that are left out in turn, unless others are asked for: those that put most into a mean."""
_WORK: Final = 200_000_000
"""Values of the record, times series, that are averaged again for them at most."""


@dataclass(frozen=True, eq=False, kw_only=True)
class LongTerm:
    """What one series, a policy's and a method's, comes to in every basin.

    Parameters
    ----------
    steps : array of int, shape (n_basins,)
        Steps with a number.
    seconds : array of float, shape (n_basins,)
        How long they last together.
    total : array of float, shape (n_basins,)
        mm over these steps; NaN without any.
    observed_share : array of float, shape (n_basins,)
        Mean observed share of these steps; NaN without any.
    infilled, reweighted, missing : array of int, shape (n_basins,)
        Steps that rest in part on infilled values; at which a gauge with weight had no depth; without a number.
    """

    steps: Ints
    seconds: Floats
    total: Floats
    observed_share: Floats
    infilled: Ints
    reweighted: Ints
    missing: Ints

    def percent_above(self, other: LongTerm) -> Floats:
        """Return by how many per cent the mean is above another's, (n_basins,); NaN where that one is not above 0."""
        with np.errstate(divide="ignore", invalid="ignore"):
            change = 100 * (self.total / self.seconds / (other.total / other.seconds) - 1)
        return np.where(other.total > 0, change, np.nan)


def long_term(stored: SeriesSource, gaps: str, method: str, lengths: Floats) -> LongTerm:
    """Sum up one series, a block of steps at a time.

    Parameters
    ----------
    stored
        The series.
    gaps, method
        Which of them.
    lengths : array of float, shape (n_steps,)
        Seconds of every step.

    Examples
    --------
    >>> class Three:
    ...     n_steps, series = 3, (("infill", "thiessen"),)
    ...     depth = staticmethod(lambda gaps, method: np.array([[4.0], [np.nan], [1.0]]))
    ...     observed_share = staticmethod(lambda gaps, method: np.array([[1.0], [np.nan], [0.5]], dtype=np.float32))
    ...     flags = staticmethod(lambda gaps, method: np.array([[0], [16], [1]], dtype=np.uint8))
    >>> found = long_term(Three(), "infill", "thiessen", np.full(3, 3600.0))
    >>> found.total, found.steps, found.observed_share, found.infilled, found.missing
    (array([5.]), array([2]), array([0.75]), array([1]), array([1]))
    """
    depth, share, flags = stored.depth(gaps, method), stored.observed_share(gaps, method), stored.flags(gaps, method)
    n = depth.shape[1]
    sums = {name: np.zeros(n) for name in ("seconds", "total", "share")}
    counts = {name: np.zeros(n, dtype=np.int64) for name in ("steps", "infilled", "reweighted")}
    basins = slice(0, n)
    for rows in _blocks(stored.n_steps, n):
        values, shares, marks = (copied(kind, rows, basins) for kind in (depth, share, flags))
        known = ~np.isnan(values)
        counts["steps"] += known.sum(axis=0)
        sums["seconds"] += lengths[rows] @ known
        sums["total"] += np.where(known, values, 0.0).sum(axis=0)
        sums["share"] += np.where(known, shares, 0.0).sum(axis=0)
        for name, flag in (("infilled", Flag.INFILLED), ("reweighted", Flag.REWEIGHTED)):
            counts[name] += ((marks & np.uint8(flag)) > 0).sum(axis=0)
    some = counts["steps"] > 0
    return LongTerm(
        steps=counts["steps"],
        seconds=sums["seconds"],
        total=np.where(some, sums["total"], np.nan),
        observed_share=np.where(some, sums["share"] / np.maximum(counts["steps"], 1), np.nan),
        infilled=counts["infilled"],
        reweighted=counts["reweighted"],
        missing=stored.n_steps - counts["steps"],
    )


def _blocks(n_steps: int, width: int) -> Iterable[slice]:
    size = max(_BLOCK // max(width, 1), 1)
    return (slice(first, min(first + size, n_steps)) for first in range(0, n_steps, size))


@dataclass(frozen=True, eq=False, kw_only=True)
class LeftOut:
    """What the mean of one series would be without one gauge.

    Parameters
    ----------
    gauge, gaps, method
        The gauge that is left out, and the series.
    with_it, without : array of float, shape (n_basins,)
        Mean depth of a step in mm, over the steps that have a number either way; NaN where there is none.
    """

    gauge: str
    gaps: str
    method: str
    with_it: Floats
    without: Floats

    @property
    def percent(self) -> Floats:
        """By how many per cent the mean changes, shape (n_basins,); NaN where there is no mean above 0."""
        with np.errstate(divide="ignore", invalid="ignore"):
            change = 100 * (self.without / self.with_it - 1)
        return np.where(self.with_it > 0, change, np.nan)


def gauges_to_leave_out(setup: SeriesSetup, record: RainRecord) -> tuple[str, ...]:
    """Return the gauges whose removal is tried: all of a small network, else those that put most into a basin mean.

    They are at most 20, and fewer of a long record, since everything is computed again for each.

    What a gauge puts in is the product of its mean depth and its weight among all gauges, the greatest in any basin and
    method, in proportion to the basin's mean.
    """
    reporting = record.reporting
    count = reporting.sum(axis=0)
    some = np.flatnonzero(count)
    number = min(_LEFT_OUT, _WORK // max(record.depth.size * len(setup.series), 1))
    if len(some) <= number:
        return tuple(record.gauges[g] for g in some)
    mean = np.where(reporting, record.depth, 0.0).sum(axis=0) / np.maximum(count, 1)
    put = np.zeros(len(mean))
    engine = SeriesEngine(replace(setup, ratios=False))
    for method in setup.methods:
        parts = np.nan_to_num(engine.weights(method, count > 0)) * mean
        put = np.maximum(put, (parts / np.maximum(parts.sum(axis=1, keepdims=True), np.finfo(float).tiny)).max(axis=0))
    chosen = sorted(some.tolist(), key=lambda g: (-put[g], record.gauges[g]))[:number]
    return tuple(record.gauges[g] for g in chosen)


def left_out(
    setup: SeriesSetup,
    chunks: Sequence[Callable[[], tuple[RainRecord, Bools | None]]],
    gauges: Sequence[str],
    *,
    progress: Callable[[str], None] | None = None,
) -> tuple[LeftOut, ...]:
    """Return the mean of every series without each of some gauges, as if it had never been there.

    Parameters
    ----------
    setup
        What the series rest on.
    chunks
        Each gives a chunk of the record and its long gaps.
    gauges
        Ids of the gauges to leave out, one at a time.
    progress
        Called with each gauge's id.

    Examples
    --------
    Without B, A's depth stands for the whole basin.

    >>> import shapely
    >>> from basinrain.basins import Basins
    >>> from basinrain.gauges import GaugeNetwork
    >>> from basinrain.infill import InfillOptions
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 10.0], y=[5.0, 5.0], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(network.ids, ends - 3600, ends, [[4.0, 8.0], [2.0, 4.0]], step="1h")
    >>> setup = SeriesSetup(
    ...     network=network,
    ...     basins=Basins(ids=("all",), polygons=[shapely.box(0, 0, 10, 10)], crs="local"),
    ...     methods={"thiessen": {}},
    ...     gaps=("reweight",),
    ...     infill=InfillOptions(scale="step"),
    ... )
    >>> found = left_out(setup, [lambda: (record, None)], ["B"])
    >>> found[0].with_it, found[0].without, found[0].percent.round(1)
    (array([4.5]), array([3.]), array([-33.3]))
    """
    say = progress or (lambda _: None)
    engine = SeriesEngine(setup)
    n_basins = len(setup.basins)
    sums = {(gauge, *series): np.zeros((3, n_basins)) for gauge in gauges for series in setup.series}
    for task in chunks:
        chunk, long = task()
        whole = engine.means(chunk, long)
        for gauge in gauges:
            say(gauge)
            for series, depth in engine.means(_without(chunk, gauge), long).items():
                both = ~np.isnan(depth) & ~np.isnan(whole[series])
                sums[gauge, *series] += [
                    np.where(both, whole[series], 0.0).sum(axis=0),
                    np.where(both, depth, 0.0).sum(axis=0),
                    both.sum(axis=0),
                ]
    result = []
    for (gauge, gaps, method), (with_it, without, count) in sums.items():
        number = np.where(count > 0, count, np.nan)
        result.append(
            LeftOut(gauge=gauge, gaps=gaps, method=method, with_it=with_it / number, without=without / number)
        )
    return tuple(result)


def _without(record: RainRecord, gauge: str) -> RainRecord:
    """Return a record in which a gauge was never in service."""
    column = record.gauges.index(gauge)
    depth, status = record.depth.copy(), record.status.copy()
    depth[:, column], status[:, column] = np.nan, Status.NOT_INSTALLED
    return replace(record, depth=depth, status=status)

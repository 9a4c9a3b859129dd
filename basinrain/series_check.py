"""What averaging and infill do to the series of a basin: how often it rains in it, how it peaks, how it varies."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.basin_depths import BasinDepths
from basinrain.rainfall import RainRecord

__all__ = [
    "COMPLETED",
    "GAUGES",
    "REPORTING_GAUGES",
    "TOP",
    "WET_DEPTH",
    "SeriesCheck",
    "SeriesFigures",
    "series_check",
]

Floats = npt.NDArray[np.float64]

_ROUNDING: Final = 1e-9
_BLOCK: Final = 1 << 20
"""Values that are looked at together."""

WET_DEPTH: Final = 0.1
"""mm; a step with at least this depth is wet."""

TOP: Final = 20
"""How many of the greatest depths of a series are averaged, where it has so many."""

COMPLETED: Final = "completed"
REPORTING_GAUGES: Final = "reporting gauges"
GAUGES: Final = "gauges, weighted"


@dataclass(frozen=True, kw_only=True)
class SeriesFigures:
    """How often it rains, how high it peaks and how much it varies, in one series.

    Parameters
    ----------
    basin, method
        The basin's id and the averaging method.
    series
        ``"completed"``: the basin means after infill. ``"reporting gauges"``: the basin means with the weights rebuilt
        at every step from the gauges that report. ``"gauges, weighted"``: the figures of every gauge's own measured
        steps, averaged over the gauges by the method's weights.
    steps
        Steps with a number; of the gauges the fewest of any that counts.
    wet_share
        Share of these steps with at least :data:`WET_DEPTH`, 0 to 1; NaN without a step.
    top_mean
        mm a step: mean of the greatest ``top_n`` depths; NaN without a step.
    top_n
        :data:`TOP`, or ``steps`` where that is fewer.
    variance
        mm², about the mean, with n - 1; NaN with fewer than two steps.

    Examples
    --------
    >>> figures = SeriesFigures(
    ...     basin="all",
    ...     method="thiessen",
    ...     series="completed",
    ...     steps=4,
    ...     wet_share=0.5,
    ...     top_mean=1.5,
    ...     top_n=4,
    ...     variance=3.0,
    ... )
    >>> figures.top_n == min(figures.steps, TOP)
    True
    """

    basin: str
    method: str
    series: str
    steps: int
    wet_share: float
    top_mean: float
    top_n: int
    variance: float


@dataclass(frozen=True, kw_only=True)
class SeriesCheck:
    """The series of the basins before and after infill, beside the gauges' own.

    Parameters
    ----------
    figures
        By averaging method, then basin, then series (completed, reporting gauges, gauges).

    Examples
    --------
    Made by :func:`series_check`.
    """

    figures: tuple[SeriesFigures, ...]


def series_check(completed: RainRecord, depths: Mapping[str, BasinDepths]) -> SeriesCheck:
    """Return how the series of the basins look after infill, before it, and beside the gauges' own.

    Parameters
    ----------
    completed : RainRecord
        The storm's window, or the whole record, after infill.
    depths : mapping of str to BasinDepths
        What every averaging method gave for it, by name.

    Returns
    -------
    SeriesCheck

    Notes
    -----
    A mean over a basin rains more often than a gauge, since it rains in it when it rains anywhere, and its peaks are
    lower, since they do not come everywhere at once. With weights that are not negative and sum to 1, and gauges that
    have every step, ``top_mean`` and ``variance`` of the mean are never above those of the gauges. Spread and infilled
    values are no gauge's own steps; spread ones count as reporting. The figures of a gauge that was silent over the
    peak are too low to be set beside the basin's, which has it from other gauges: ``steps`` then is less than the
    basin's.

    Examples
    --------
    Two gauges, one of them wet in every hour: the mean has half of each peak.

    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[4.0, 0.0], [0.0, 6.0]], step="1h")
    >>> from basinrain.basin_depths import average_storm
    >>> from basinrain.infill import Completed
    >>> from basinrain.weights import WeightTable
    >>> def halves(present):
    ...     return WeightTable("halves", ("all",), ("A", "B"), np.where(present, 1 / present.sum(), 0.0)[None, :])
    >>> depths = {"halves": average_storm(Completed(record, (), ()), halves)}
    >>> for row in series_check(record, depths).figures:
    ...     print(row.series, row.steps, row.wet_share, row.top_mean, row.variance)
    completed 2 1.0 2.5 0.5
    reporting gauges 2 1.0 2.5 0.5
    gauges, weighted 2 0.5 2.5 13.0
    """
    if not depths:
        return SeriesCheck(figures=())
    weighted = np.any([(np.nan_to_num(d.table.weights) != 0).any(axis=0) for d in depths.values()], axis=0)
    gauges = _figures(np.where(completed.measured[:, weighted], completed.depth[:, weighted], np.nan))
    rows: list[SeriesFigures] = []
    for method, result in depths.items():
        kinds = {
            COMPLETED: _figures(result.depth),
            REPORTING_GAUGES: _figures(result.reporting),
            GAUGES: gauges.over_gauges(result.table.weights[:, weighted]),
        }
        rows += [
            figures.row(b, basin, method, series)
            for b, basin in enumerate(result.table.basins)
            for series, figures in kinds.items()
        ]
    return SeriesCheck(figures=tuple(rows))


@dataclass(frozen=True, eq=False)
class _Figures:
    """The figures of several series, each of shape (n_series,)."""

    steps: npt.NDArray[np.int64]
    wet_share: Floats
    top_mean: Floats
    variance: Floats

    def row(self, k: int, basin: str, method: str, series: str) -> SeriesFigures:
        steps = int(self.steps[k])
        return SeriesFigures(
            basin=basin,
            method=method,
            series=series,
            steps=steps,
            wet_share=float(self.wet_share[k]),
            top_mean=float(self.top_mean[k]),
            top_n=min(steps, TOP),
            variance=float(self.variance[k]),
        )

    def over_gauges(self, weights: Floats) -> _Figures:
        """Return the figures averaged over gauges by weights (n_basins, n_gauges); gauges without a step left out."""
        counts = (np.nan_to_num(weights) != 0) & (self.steps > 0)
        fewest = np.where(counts, self.steps, np.iinfo(np.int64).max).min(axis=1, initial=np.iinfo(np.int64).max)
        return _Figures(
            steps=np.where(counts.any(axis=1), fewest, 0),
            wet_share=_weighted(weights, self.wet_share),
            top_mean=_weighted(weights, self.top_mean),
            variance=_weighted(weights, self.variance),
        )


def _weighted(weights: Floats, values: Floats) -> Floats:
    known = np.where(np.isnan(values), 0.0, np.nan_to_num(weights))
    total = known.sum(axis=1)
    mean = np.full(len(weights), np.nan)
    np.divide(known @ np.nan_to_num(values), total, out=mean, where=total > 0)
    return mean


def _figures(series: Floats) -> _Figures:
    """Return the figures of series (n_steps, n_series), steps without a number (NaN) left out."""
    n_steps, n_series = series.shape
    size = max(_BLOCK // max(n_steps, 1), 1)
    # At least one block, if an empty one.
    blocks = [_block(series[:, first : first + size]) for first in range(0, max(n_series, 1), size)]
    return _Figures(*(np.concatenate(figures) for figures in zip(*blocks, strict=True)))


def _top_sum(depth: Floats) -> float:
    # Depths are never below 0, and finding the greatest among many zeros takes far longer than without them.
    wet = depth[depth > 0]
    return float(np.sort(np.partition(wet, -TOP)[-TOP:] if len(wet) > TOP else wet)[::-1].sum())


def _block(columns: Floats) -> tuple[npt.NDArray[np.int64], Floats, Floats, Floats]:
    """Return the figures of a few series, each in one piece of memory."""
    series = np.ascontiguousarray(columns.T)
    known = ~np.isnan(series)
    steps = known.sum(axis=1)
    some = np.maximum(steps, 1)
    depth = np.where(known, series, 0.0)
    top_n = np.minimum(steps, TOP)
    top_sum = np.array([_top_sum(row) for row in depth])
    apart = np.where(known, depth - (depth.sum(axis=1) / some)[:, None], 0.0)
    wet = (known & (depth >= WET_DEPTH - _ROUNDING)).sum(axis=1)
    return (
        steps.astype(np.int64),
        np.where(steps > 0, wet / some, np.nan),
        np.where(steps > 0, top_sum / np.maximum(top_n, 1), np.nan),
        np.where(steps > 1, (apart**2).sum(axis=1) / np.maximum(steps - 1, 1), np.nan),
    )

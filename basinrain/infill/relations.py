"""Relations between gauges in the record: correlation, and slope through the origin, of every pair."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.infill.days import day_totals
from basinrain.infill.record_normals import NormalRatios
from basinrain.rainfall import RainRecord

__all__ = ["AT_LEAST", "Relations", "relations_of", "relations_of_record", "relations_without_parts"]

AT_LEAST: Final = 30
"""Common cases that a pair of gauges needs."""

_CONSTANT: Final = 1e-9
"""Where the variance is below this part of the mean square, the gauge does not vary."""

_NONE: Final = 1e-9
"""Correlations this close to 0 are 0, so that rounding does not decide who donates."""

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Relations:
    """How the gauges of a network go together in the record, pair by pair.

    Parameters
    ----------
    gauges : tuple of str
        Gauge ids, the rows and the columns.
    common : array of int, shape (n_gauges, n_gauges)
        Cases in which both gauges have a depth, dry ones too.
    correlation : array of float, shape (n_gauges, n_gauges)
        Pearson's correlation over all common cases, symmetric; NaN where there are too few, or a gauge does not vary.
    slope : array of float, shape (n_gauges, n_gauges)
        ``slope[i, j] = Σ P_i P_j / Σ P_j²``: gauge i on gauge j through the origin, 0 or more; NaN where there are
        too few common cases, or gauge j was always dry.
    ratio_correlation, ratio_slope : array of float, shape (n_gauges, n_gauges), optional
        The same of the ratios to normals ``P_i / N_i``, of the case's month where there are monthly normals; a value
        whose normal is missing or not above 0 does not count. None where no normals are known.

    Examples
    --------
    See :func:`relations_of`.
    """

    gauges: tuple[str, ...]
    common: npt.NDArray[np.int64]
    correlation: Floats
    slope: Floats
    ratio_correlation: Floats | None = None
    ratio_slope: Floats | None = None

    def of(self, network: GaugeNetwork, *, ratios: bool = False) -> tuple[Floats, Floats]:
        """Return correlation and slope, of depths or of ratios to normals.

        Raises
        ------
        DataError
            The relations are another network's, or they were made without normals and ``ratios`` asks for them.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
        >>> relations_of(np.ones((2, 2)), network).of(network, ratios=True)
        Traceback (most recent call last):
            ...
        basinrain.errors.DataError: relations between gauges: found none of ratios to normals; expected relations of \
the record and normals; give normals, or choose another infill method
        """
        if self.gauges != network.ids:
            raise DataError(
                Problem(
                    item="relations between gauges",
                    found="other gauges than the network's, or another order",
                    expected=", ".join(network.ids),
                    remedy="make them of the record in the network's order",
                )
            )
        if not ratios:
            return self.correlation, self.slope
        if self.ratio_correlation is None or self.ratio_slope is None:
            raise DataError(
                Problem(
                    item="relations between gauges",
                    found="none of ratios to normals",
                    expected="relations of the record and normals",
                    remedy="give normals, or choose another infill method",
                )
            )
        return self.ratio_correlation, self.ratio_slope


@dataclass(eq=False)
class _Sums:
    """Sums over the common cases of every pair, (n, n): of i's values, their squares, products, and the count."""

    count: Floats
    total: Floats
    square: Floats
    product: Floats

    @classmethod
    def of(cls, values: Floats) -> _Sums:
        there = (~np.isnan(values)).astype(float)
        count = there.T @ there
        filled = np.where(there > 0, values, 0.0)
        # Where all are dry only the count grows.
        wet = filled.any(axis=1)
        filled, there = filled[wet], there[wet]
        return cls(count, filled.T @ there, (filled**2).T @ there, filled.T @ filled)

    @classmethod
    def zero(cls, n: int) -> _Sums:
        return cls(*(np.zeros((n, n)) for _ in range(4)))

    def __add__(self, other: _Sums) -> _Sums:
        return _Sums(
            self.count + other.count, self.total + other.total, self.square + other.square, self.product + other.product
        )

    def add(self, other: _Sums, means: Floats) -> None:
        """Add the sums of one month, each value divided by its gauge's mean over the years of the pair."""
        known = np.isfinite(means) & (means > 0)
        known &= known.T
        share = np.where(known, 1 / np.where(known, means, 1.0), 0.0)
        self.count += np.where(known, other.count, 0.0)
        self.total += other.total * share
        self.square += other.square * share**2
        self.product += other.product * share * share.T

    def correlation(self, at_least: int) -> Floats:
        n = np.maximum(self.count, 1)
        spread = self.square - self.total**2 / n
        varies = (spread > _CONSTANT * self.square) & (self.count >= max(at_least, 2))
        varies &= varies.T
        covariance = self.product - self.total * self.total.T / n
        r = covariance / np.sqrt(np.where(varies, spread * spread.T, 1.0))
        r = np.where(np.abs(r) < _NONE, 0.0, np.clip(r, -1.0, 1.0))
        return np.where(varies, r, np.nan)

    def slope(self, at_least: int) -> Floats:
        known = (self.square.T > 0) & (self.count >= max(at_least, 1))
        return np.where(known, self.product / np.where(known, self.square.T, 1.0), np.nan)


def relations_of(
    depths: npt.ArrayLike,
    network: GaugeNetwork,
    months: npt.ArrayLike | None = None,
    *,
    ratios: NormalRatios | None = None,
    at_least: int = AT_LEAST,
) -> Relations:
    """Return the relations between gauges over some cases: rainfall days, or the steps of a coarser record.

    Parameters
    ----------
    depths : array-like of float, shape (n_cases, n_gauges)
        mm; NaN where a gauge has no value of its own. Every case counts for the pairs that both have it, so the case
        that is to be infilled is among those that its relation rests on wherever the gauge did report; a comparison of
        methods has to leave its cases out itself.
    network : GaugeNetwork
        The gauges, in the order of the columns, with their normals where ratios to normals are wanted.
    months : array-like of int, shape (n_cases,), optional
        1 to 12, the month of every case, whose normals are used where the network has monthly ones; 0, or not given:
        the year's.
    ratios : NormalRatios, optional
        Normals from the record, instead of the network's.
    at_least : int
        Common cases that a pair needs.

    Returns
    -------
    Relations

    Raises
    ------
    DataError
        The arrays' shapes do not fit the network.

    Notes
    -----
    Sums over common cases are products of masked matrices, so that no pair is looked at by itself.

    Examples
    --------
    B always has twice A's depth. C does not vary, so it has no correlation.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> depths = [[1.0, 2.0, 3.0], [0.0, 0.0, 3.0], [4.0, 8.0, 3.0], [5.0, np.nan, 3.0]]
    >>> relations = relations_of(depths, network, at_least=3)
    >>> relations.common
    array([[4, 3, 4],
           [3, 3, 3],
           [4, 3, 4]])
    >>> relations.correlation.round(9)
    array([[ 1.,  1., nan],
           [ 1.,  1., nan],
           [nan, nan, nan]])
    >>> relations.slope[1, 0], relations.slope[0, 1]
    (np.float64(2.0), np.float64(0.5))
    >>> np.isnan(relations_of(depths, network).slope).all()  # 30 common cases are asked for
    np.True_
    """
    values = np.asarray(depths, dtype=float)
    month = np.zeros(len(values), dtype=np.int64) if months is None else np.asarray(months, dtype=np.int64)
    _check(values, month, network, (ratios,))
    return _relations([(values, month)], [(0,)], network, (ratios,), at_least)[0]


def relations_without_parts(
    depths: npt.ArrayLike,
    network: GaugeNetwork,
    months: npt.ArrayLike,
    part: npt.ArrayLike,
    *,
    ratios: Sequence[NormalRatios | None],
    at_least: int = AT_LEAST,
) -> tuple[Relations, ...]:
    """Return the relations between gauges without each part of the cases in turn.

    Parameters
    ----------
    depths, network, months, at_least
        As for :func:`relations_of`.
    part : array-like of int, shape (n_cases,)
        The part of every case, from 0.
    ratios : sequence of NormalRatios or None
        One a part: normals from the record for the relations without it; None for the network's.

    Returns
    -------
    tuple of Relations
        One a part, of the cases of all other parts.

    Raises
    ------
    DataError
        The arrays' shapes do not fit the network.

    Notes
    -----
    Every part is summed once, and the sums of the others are added; nothing is subtracted, so nothing cancels.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
    >>> depths = [[1.0, 2.0], [2.0, 4.0], [1.0, 3.0]]
    >>> found = relations_without_parts(depths, network, [5, 5, 5], [0, 0, 1], ratios=(None, None), at_least=1)
    >>> [float(relations.slope[1, 0]) for relations in found]
    [3.0, 2.0]
    """
    values, month = np.asarray(depths, dtype=float), np.asarray(months, dtype=np.int64)
    _check(values, month, network, ratios)
    groups = [np.asarray(part) == k for k in range(len(ratios))]
    others = [tuple(k for k in range(len(ratios)) if k != left) for left in range(len(ratios))]
    return _relations([(values[mine], month[mine]) for mine in groups], others, network, ratios, at_least)


def relations_of_record(
    record: RainRecord, network: GaugeNetwork, *, ratios: NormalRatios | None = None, at_least: int = AT_LEAST
) -> Relations:
    """Return the relations between gauges over the rainfall days of a record, or over its steps where these are longer.

    Parameters
    ----------
    record : RainRecord
        The whole record, its columns in the network's order; of a storm alone there are seldom enough days.
    network, ratios, at_least
        As for :func:`relations_of`.

    Returns
    -------
    Relations

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
    >>> ends = np.array(["2031-05-05", "2031-05-06", "2031-05-07"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 86400, ends, [[1.0, 2.0], [0.0, 0.0], [4.0, 8.0]], step="1d")
    >>> relations_of_record(record, network, at_least=3).slope[1, 0]
    np.float64(2.0)
    """
    days = day_totals(record)
    return relations_of(days.totals, network, days.months, ratios=ratios, at_least=at_least)


def _relations(
    parts: list[tuple[Floats, Ints]],
    kept: Sequence[tuple[int, ...]],
    network: GaugeNetwork,
    ratios: Sequence[NormalRatios | None],
    at_least: int,
) -> tuple[Relations, ...]:
    """Return the relations of some choices of parts, each with its own normals; a part is depths and their months."""
    sums = _sums_of_kept([_Sums.of(values) for values, _ in parts], kept, len(network))
    return tuple(
        Relations(
            network.ids,
            mine.count.astype(np.int64),
            mine.correlation(at_least),
            mine.slope(at_least),
            None if of_ratios is None else of_ratios.correlation(at_least),
            None if of_ratios is None else of_ratios.slope(at_least),
        )
        for mine, of_ratios in zip(sums, _ratio_sums(parts, kept, network, ratios), strict=True)
    )


def _sums_of_kept(sums: list[_Sums], kept: Sequence[tuple[int, ...]], n: int) -> list[_Sums]:
    return [sum((sums[k] for k in chosen), start=_Sums.zero(n)) for chosen in kept]


def _ratio_sums(
    parts: list[tuple[Floats, Ints]],
    kept: Sequence[tuple[int, ...]],
    network: GaugeNetwork,
    ratios: Sequence[NormalRatios | None],
) -> Sequence[_Sums | None]:
    """Return the sums over ratios to normals, one a choice of parts; None without normals."""
    n = len(network)
    from_record = [found for found in ratios if found is not None]
    if from_record:
        totals = [_Sums.zero(n) for _ in kept]
        # Month by month, since every pair has its own means: the sums of all months at once would not fit.
        for month in range(1, 13):
            by_part = [_Sums.of(values[months == month]) for values, months in parts]
            for total, mine, found in zip(totals, _sums_of_kept(by_part, kept, n), from_record, strict=True):
                total.add(mine, found.means[month - 1])
        return totals
    if network.normals is None:
        return [None] * len(kept)
    return _sums_of_kept([_Sums.of(_over_normals(*part, network.normals)) for part in parts], kept, n)


def _over_normals(values: Floats, months: Ints, given: Floats) -> Floats:
    """Return depths divided by the normals of the case's month, NaN where there is none."""
    if given.shape[1] == 1:
        normals = np.broadcast_to(given[:, 0], values.shape)
    else:
        normals = np.vstack([given.sum(axis=1), given.T])[months]
    usable = np.isfinite(normals) & (normals > 0)
    return np.where(usable, values / np.where(usable, normals, 1.0), np.nan)


def _check(values: Floats, months: Ints, network: GaugeNetwork, ratios: Sequence[NormalRatios | None]) -> None:
    problems = Problems()
    if values.ndim != 2 or values.shape[1] != len(network):
        problems.add(
            item="depths", found=f"an array of shape {values.shape}", expected=f"{len(network)} columns, one a gauge"
        )
    if months.shape != values.shape[:1] or not ((months >= 0) & (months <= 12)).all():
        problems.add(item="months", found="other values", expected="a month from 1 to 12, or 0, for every case")
    if any(found is not None and found.gauges != network.ids for found in ratios):
        problems.add(
            item="normals from the record",
            found="other gauges than the network's, or another order",
            expected=", ".join(network.ids),
        )
    problems.raise_as(DataError)

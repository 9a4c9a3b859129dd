"""Regression through the origin on the gauges that went most closely with the target in the record."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest, choose_donors
from basinrain.infill.relations import Relations

__all__ = ["best_correlated", "regression_weights", "shares_by_square"]


def regression_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    relations: Relations,
    nearest: Nearest = 4,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by regression through the origin.

    ``P_x = Σ r_i² b_i P_i / Σ r_i²`` with ``b_i = Σ_t P_x(t) P_i(t) / Σ_t P_i(t)²`` over the cases t that the record
    has of both: ``P_x`` the depth at the target (mm), ``P_i`` the depth at donor i (mm), ``b_i`` the slope of the least
    squares line through the origin and ``r_i`` the correlation. Through the origin, so that a dry donor gives 0 and
    nothing is ever negative. Simple regression on neighbours is common practice; estimates are averaged by the share of
    variance that each explains.

    Parameters
    ----------
    relations : Relations
        The relations between the gauges in the record.
    nearest
        How many reporting gauges donate, those of the highest correlation with the target first; it must be known and
        above 0.
    network, target, reporting, radius, min_donors, elevation_limit, distances
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Weights, which need not sum to 1; 0 at gauges that do not donate, all 0 where there are fewer than
        ``min_donors`` donors.

    Raises
    ------
    DataError
        The relations are another network's; or ``elevation_limit`` is given, and the target or a reporting gauge has no
        elevation.

    Examples
    --------
    Slopes of 1.2 on A and 0.5 on B, whose squared correlations are as 0.8 to 0.2.

    >>> network = GaugeNetwork(ids=("X", "A", "B"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> correlation, slope = np.eye(3), np.ones((3, 3))
    >>> correlation[0, 1:], slope[0, 1:] = np.sqrt([0.8, 0.2]), [1.2, 0.5]
    >>> relations = Relations(network.ids, np.full((3, 3), 99), correlation, slope)
    >>> regression_weights(network, 0, np.array([False, True, True]), relations=relations)
    array([0.  , 0.96, 0.1 ])
    >>> regression_weights(network, 0, np.array([False, True, False]), relations=relations)  # one donor is too few
    array([0., 0., 0.])
    """
    correlations, slopes = relations.of(network)
    correlation, slope = np.nan_to_num(correlations[target]), np.nan_to_num(slopes[target])
    among, rank_by = best_correlated(correlation, slope)
    donors = choose_donors(
        network,
        target,
        reporting,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
        among=among,
        rank_by=rank_by,
    )
    return np.asarray(slope * shares_by_square(donors, correlation), dtype=float)


def best_correlated(
    correlation: npt.NDArray[np.float64], slope: npt.NDArray[np.float64]
) -> tuple[npt.NDArray[np.bool_], npt.NDArray[np.float64]]:
    """Return which gauges may donate by regression, and what puts the best correlated first.

    Parameters
    ----------
    correlation, slope : array of float, shape (n_gauges,)
        Of the target with every gauge, 0 where not known.

    Returns
    -------
    among : array of bool, shape (n_gauges,)
        Where both are above 0.
    rank_by : array of float, shape (n_gauges,)
        The smaller, the higher the correlation.

    Examples
    --------
    >>> best_correlated(np.array([0.5, 0.0, 0.75]), np.array([1.0, 1.0, 2.0]))
    (array([ True, False,  True]), array([1.5 , 2.  , 1.25]))
    """
    # Between 1 and 3, so that correlations that differ by rounding alone are ties.
    return (correlation > 0) & (slope > 0), 2.0 - correlation


def shares_by_square(donors: npt.NDArray[np.bool_], correlation: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return the donors' shares by squared correlation.

    Parameters
    ----------
    donors : array of bool, shape (..., n_gauges)
        Who donates.
    correlation : array of float, shape (n_gauges,)
        Above 0 at donors.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Shares that sum to 1; all 0 where nobody donates.

    Examples
    --------
    >>> shares_by_square(np.array([True, False, True]), np.array([1.0, 0.9, 0.5]))
    array([0.8, 0. , 0.2])
    """
    squares = np.where(donors, correlation**2, 0.0)
    total = squares.sum(axis=-1, keepdims=True)
    return np.asarray(squares / np.where(total > 0, total, 1.0), dtype=float)

"""Regression through the origin on ratios to normals."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest
from basinrain.infill.ratio_donors import choose_ratio_donors
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.regression import best_correlated, shares_by_square
from basinrain.infill.relations import Relations

__all__ = ["ratio_regression_weights"]


def ratio_regression_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    relations: Relations,
    month: int | None = None,
    ratios: NormalRatios | None = None,
    nearest: Nearest = 4,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by regression through the origin on ratios to normals.

    ``P_x = N_x Σ r_i² b_i (P_i / N_i) / Σ r_i²``, where ``b_i`` is the slope of ``P_x/N_x`` on ``P_i/N_i`` through the
    origin and ``r_i`` the correlation of these ratios, over the cases that the record has of both; ``P_x`` the depth at
    the target (mm), ``P_i`` the depth at donor i (mm), ``N_x``, ``N_i`` their normals of the month (mm). So a relation
    found over all months holds in each of them, however their normals differ. Common practice, as regression.

    Parameters
    ----------
    relations : Relations
        The relations between the gauges in the record, with those of ratios.
    month
        The month whose normals are used, 1 to 12, where the network has monthly ones; None for the year's.
    ratios : NormalRatios, optional
        Normals from the record, instead of the network's; a gauge without a ratio to the target does not donate.
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
        The relations are another network's, or have none of ratios; the target or a donor has no normal above 0, all
        such gauges together; or ``elevation_limit`` is given, and the target or a reporting gauge has no elevation.

    Examples
    --------
    Slopes of 1.2 on A and 0.5 on B, whose squared correlations are as 0.8 to 0.2; normals' ratios of 1.5 and 2.

    >>> normals = np.array([[1500.0], [1000.0], [750.0]])
    >>> network = GaugeNetwork(ids=("X", "A", "B"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local", normals=normals)
    >>> correlation, slope = np.eye(3), np.ones((3, 3))
    >>> correlation[0, 1:], slope[0, 1:] = np.sqrt([0.8, 0.2]), [1.2, 0.5]
    >>> relations = Relations(network.ids, np.full((3, 3), 99), np.eye(3), np.ones((3, 3)), correlation, slope)
    >>> ratio_regression_weights(network, 0, np.array([False, True, True]), relations=relations)
    array([0.  , 1.44, 0.2 ])
    >>> ratio_regression_weights(network, 0, np.array([False, True, False]), relations=relations)  # one is too few
    array([0., 0., 0.])
    """
    correlations, slopes = relations.of(network, ratios=True)
    correlation, slope = np.nan_to_num(correlations[target]), np.nan_to_num(slopes[target])
    among, rank_by = best_correlated(correlation, slope)
    donors, ratio = choose_ratio_donors(
        network,
        target,
        reporting,
        method="ratio-regression",
        month=month,
        ratios=ratios,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
        among=among,
        rank_by=rank_by,
    )
    return np.asarray(ratio * slope * shares_by_square(donors, correlation), dtype=float)

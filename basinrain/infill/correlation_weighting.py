"""Correlation weighting: gauges count by how closely they went with the target in the record."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest, choose_donors
from basinrain.infill.relations import Relations

__all__ = ["correlation_weights"]


def correlation_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    relations: Relations,
    nearest: Nearest = 5,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by correlation.

    ``P_x = Σ R_i P_i / Σ R_i`` with ``P_x`` the depth at the target (mm), ``P_i`` the depth at donor i (mm) and ``R_i``
    the correlation between the two in the record. Teegavarapu and Chandramouli (2005), Journal of Hydrology 312,
    191-206 (from memory). The donors are the nearest reporting gauges whose correlation with the target is known and
    above 0.

    Parameters
    ----------
    relations : Relations
        The relations between the gauges in the record.
    network, target, reporting, nearest, radius, min_donors, elevation_limit, distances
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Weights that sum to 1; 0 at gauges that do not donate, all 0 where there are fewer than ``min_donors`` donors.

    Raises
    ------
    DataError
        The relations are another network's; or ``elevation_limit`` is given, and the target or a reporting gauge has no
        elevation.

    Examples
    --------
    Correlations of 0.9 with A and 0.6 with B; C goes against the target and does not donate.

    >>> network = GaugeNetwork(ids=("X", "A", "B", "C"), x=[0.0, 1e3, 2e3, 3e3], y=[0.0, 0.0, 0.0, 0.0], crs="local")
    >>> correlation = np.eye(4)
    >>> correlation[0, 1:] = correlation[1:, 0] = [0.9, 0.6, -0.2]
    >>> relations = Relations(network.ids, np.full((4, 4), 99), correlation, np.ones((4, 4)))
    >>> correlation_weights(network, 0, np.array([False, True, True, True]), relations=relations)
    array([0. , 0.6, 0.4, 0. ])
    >>> correlation_weights(network, 0, np.array([False, True, False, True]), relations=relations)  # one is too few
    array([0., 0., 0., 0.])
    """
    strength = np.nan_to_num(relations.of(network)[0][target])
    donors = choose_donors(
        network,
        target,
        reporting,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
        among=strength > 0,
    )
    weights = np.where(donors, strength, 0.0)
    total = weights.sum(axis=-1, keepdims=True)
    return np.asarray(weights / np.where(total > 0, total, 1.0), dtype=float)

"""Inverse distance: the nearer a gauge, the more it donates."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest, choose_donors, distances_from

__all__ = ["POWER", "inverse_distance_weights", "shares_by_distance"]

POWER: Final = 2.0
"""The exponent of the distance unless the user says otherwise."""


def inverse_distance_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    power: float = POWER,
    nearest: Nearest = 5,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by inverse distance.

    ``P_x = Σ P_i d_i^-b / Σ d_i^-b`` with ``P_x`` the depth at the target (mm), ``P_i`` the depth at donor i (mm),
    ``d_i`` its distance from the target (m) and ``b`` the power. With b = 2 the reciprocal-distance-squared weighting
    of the US National Weather Service (general form: Shepard 1968, Proc. 23rd ACM National Conference, 517-524).

    Parameters
    ----------
    power
        The exponent b, above 0.
    network, target, reporting, nearest, radius, min_donors, elevation_limit, distances
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Weights that sum to 1; 0 at gauges that do not donate, all 0 where there are fewer than ``min_donors`` donors.

    Raises
    ------
    DataError
        ``elevation_limit`` is given, and the target or a reporting gauge has no elevation.

    Examples
    --------
    Distances of 1 and 2 km: the squares are as 1 to 4.

    >>> network = GaugeNetwork(ids=("A", "T", "B"), x=[0.0, 1e3, 3e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> inverse_distance_weights(network, 1, np.array([True, False, True]))
    array([0.8, 0. , 0.2])
    >>> inverse_distance_weights(network, 1, np.array([False, False, True]))  # one donor is too few
    array([0., 0., 0.])
    """
    if distances is None:
        distances = distances_from(network, target)
    donors = choose_donors(
        network,
        target,
        reporting,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
    )
    return shares_by_distance(donors, distances, power)


def shares_by_distance(
    donors: npt.NDArray[np.bool_], distances: npt.NDArray[np.float64], power: float
) -> npt.NDArray[np.float64]:
    """Return the donors' shares by inverse distance.

    Parameters
    ----------
    donors : array of bool, shape (..., n_gauges)
        Who donates.
    distances : array of float, shape (n_gauges,)
        m, above 0 at donors.
    power
        The exponent of the distance.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Shares that sum to 1; all 0 where nobody donates.

    Examples
    --------
    >>> shares_by_distance(np.array([[True, False, True], [False] * 3]), np.array([1e3, 5e2, 2e3]), 2.0)
    array([[0.8, 0. , 0.2],
           [0. , 0. , 0. ]])
    """
    away = np.where(donors, distances, np.inf)
    # Relative to the nearest donor, so that no power under- or overflows.
    closest = away.min(axis=-1, keepdims=True, initial=np.inf)
    strength = np.where(donors, np.where(donors, closest, 0.0) / away, 0.0) ** power
    total = strength.sum(axis=-1, keepdims=True)
    return np.asarray(strength / np.where(total > 0, total, 1.0), dtype=float)

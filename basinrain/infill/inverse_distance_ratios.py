"""Inverse distance on ratios to normals: near gauges count for more, and each as a part of its own normal."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest, distances_from
from basinrain.infill.inverse_distance import POWER, shares_by_distance
from basinrain.infill.ratio_donors import choose_ratio_donors
from basinrain.infill.record_normals import NormalRatios

__all__ = ["inverse_distance_ratio_weights"]


def inverse_distance_ratio_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    power: float = POWER,
    month: int | None = None,
    ratios: NormalRatios | None = None,
    nearest: Nearest = 5,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by inverse distance on ratios to normals.

    ``P_x = N_x Σ w_i P_i / N_i`` with ``w_i = d_i^-b / Σ d_j^-b``: ``P_x`` the depth at the target (mm), ``P_i`` the
    depth at donor i (mm), ``N_x``, ``N_i`` their normals (mm), ``d_i`` the donor's distance from the target (m) and
    ``b`` the power. Common practice where relief makes normals differ: the ratios are what is interpolated, as on an
    isopercental map.

    Parameters
    ----------
    power
        The exponent b, above 0.
    month
        The month whose normals are used, 1 to 12, where the network has monthly ones; None for the year's.
    ratios : NormalRatios, optional
        Normals from the record, instead of the network's; a gauge without a ratio to the target does not donate.
    network, target, reporting, nearest, radius, min_donors, elevation_limit, distances
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Weights, which do not sum to 1: rain equal to the donors' normals gives the target's normal. 0 at gauges that do
        not donate, all 0 where there are fewer than ``min_donors`` donors.

    Raises
    ------
    DataError
        The target or a donor has no normal above 0, all such gauges together; or ``elevation_limit`` is given, and the
        target or a reporting gauge has no elevation.

    Examples
    --------
    Distances of 1 and 2 km give shares of 0.8 and 0.2; the normals' ratios are 1.5 and 1.25.

    >>> normals = np.array([[1500.0], [1000.0], [1200.0]])
    >>> network = GaugeNetwork(ids=("X", "A", "B"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local", normals=normals)
    >>> inverse_distance_ratio_weights(network, 0, np.array([False, True, True]))
    array([0.  , 1.2 , 0.25])
    >>> inverse_distance_ratio_weights(network, 0, np.array([False, True, False]))  # one donor is too few
    array([0., 0., 0.])
    """
    if distances is None:
        distances = distances_from(network, target)
    donors, ratio = choose_ratio_donors(
        network,
        target,
        reporting,
        method="inverse-distance-ratios",
        month=month,
        ratios=ratios,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
    )
    return ratio * shares_by_distance(donors, distances, power)

"""Normal ratio: donors' depths scaled by the ratio of the normals."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest
from basinrain.infill.ratio_donors import choose_ratio_donors
from basinrain.infill.record_normals import NormalRatios

__all__ = ["normal_ratio_weights"]


def normal_ratio_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    month: int | None = None,
    ratios: NormalRatios | None = None,
    nearest: Nearest = 4,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by the normal ratio.

    ``P_x = (1/n) Σ (N_x / N_i) P_i`` with ``P_x`` the depth at the target (mm), ``P_i`` the depths at its n donors
    (mm), and ``N_x``, ``N_i`` their normals (mm). Paulhus and Kohler (1952), Monthly Weather Review 80, 129-133.

    Parameters
    ----------
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
    >>> normals = np.array([[1500.0], [1000.0], [1200.0]])
    >>> network = GaugeNetwork(ids=("X", "A", "B"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local", normals=normals)
    >>> normal_ratio_weights(network, 0, np.array([False, True, True]))
    array([0.   , 0.75 , 0.625])
    >>> normal_ratio_weights(network, 0, np.array([False, True, False]))  # one donor is too few
    array([0., 0., 0.])
    """
    donors, ratio = choose_ratio_donors(
        network,
        target,
        reporting,
        method="normal-ratio",
        month=month,
        ratios=ratios,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
    )
    return np.asarray(np.where(donors, ratio, 0.0) / np.maximum(donors.sum(axis=-1, keepdims=True), 1), dtype=float)

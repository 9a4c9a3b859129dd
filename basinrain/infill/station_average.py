"""Station average: the plain mean of the nearest reporting gauges."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest, choose_donors

__all__ = ["station_average_weights"]


def station_average_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    nearest: Nearest = 5,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by the station average.

    ``P_x = (1/n) Σ P_i`` with ``P_x`` the depth at the target (mm), ``P_i`` the depths at its n donors (mm). Common
    practice where the donors' normals are within 10 % of the target's (Paulhus and Kohler 1952, Monthly Weather Review
    80, 129-133). The donors are the 5 nearest reporting gauges unless ``nearest`` says otherwise.

    Parameters
    ----------
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
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> station_average_weights(network, 1, np.array([True, False, True]))
    array([0.5, 0. , 0.5])
    >>> station_average_weights(network, 1, np.array([True, False, False]))  # one donor is too few
    array([0., 0., 0.])
    """
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
    return np.asarray(donors / np.maximum(donors.sum(axis=-1, keepdims=True), 1), dtype=float)

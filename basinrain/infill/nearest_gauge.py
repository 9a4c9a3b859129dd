"""Nearest gauge: the depth of the nearest reporting gauge, as it is."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import choose_donors

__all__ = ["nearest_gauge_weights"]


def nearest_gauge_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    radius: float | None = None,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by the nearest gauge.

    ``P_x = P_1`` with ``P_x`` the depth at the target (mm) and ``P_1`` that of the nearest reporting gauge (mm). Common
    practice; of two equally near gauges the one whose id comes first is taken.

    Parameters
    ----------
    network, target, reporting, radius, elevation_limit, distances
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    array of float, shape (..., n_gauges)
        1 at the nearest reporting gauge, 0 elsewhere; all 0 where nobody reports.

    Raises
    ------
    DataError
        ``elevation_limit`` is given, and the target or a reporting gauge has no elevation.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "T", "B"), x=[0.0, 1e3, 3e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> nearest_gauge_weights(network, 1, np.array([True, True, True]))
    array([1., 0., 0.])
    >>> nearest_gauge_weights(network, 1, np.array([False, False, True]))
    array([0., 0., 1.])
    >>> nearest_gauge_weights(network, 1, np.array([False, True, False]))  # nobody else reports
    array([0., 0., 0.])
    """
    donors = choose_donors(
        network,
        target,
        reporting,
        nearest=1,
        radius=radius,
        min_donors=1,
        elevation_limit=elevation_limit,
        distances=distances,
    )
    return donors.astype(float)

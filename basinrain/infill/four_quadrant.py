"""Four quadrants: reciprocal distance squared over the nearest gauge of each quadrant around the target."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import distances_from, donor_order
from basinrain.infill.inverse_distance import shares_by_distance

__all__ = ["four_quadrant_weights", "quadrants_from"]

_POWER: Final = 2.0

_ON_AXIS: Final = 1e-7


def four_quadrant_weights(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.float64]:
    """Return donor weights by reciprocal distance squared over the nearest gauge of each quadrant.

    ``P_x = Σ P_i d_i^-2 / Σ d_i^-2`` with ``P_x`` the depth at the target (mm), ``P_i`` the depth at donor i (mm) and
    ``d_i`` its distance from the target (m); one donor from each quadrant that has a reporting gauge: practice of the
    US National Weather Service (NWS 1972, HYDRO-14; from memory). So a cluster of gauges on one side counts once.

    Parameters
    ----------
    min_donors
        With fewer quadrants than this that have a reporting gauge nothing is estimated.
    network, target, reporting, radius, elevation_limit, distances
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    array of float, shape (..., n_gauges)
        Weights that sum to 1, at most four of them above 0; all 0 where there are fewer than ``min_donors`` donors.

    Raises
    ------
    DataError
        ``elevation_limit`` is given, and the target or a reporting gauge has no elevation.

    See Also
    --------
    quadrants_from : Which quadrant a gauge lies in.

    Examples
    --------
    Two gauges to the north-east, of which the nearer counts, and one to the south-west, twice as far.

    >>> network = GaugeNetwork(ids=("T", "A", "B", "C"), x=[0.0, 1e3, 3e3, -2e3], y=[0.0, 1e3, 3e3, -2e3], crs="local")
    >>> four_quadrant_weights(network, 0, np.array([False, True, True, True]))
    array([0. , 0.8, 0. , 0.2])
    >>> four_quadrant_weights(network, 0, np.array([False, True, True, False]))  # one quadrant is too few
    array([0., 0., 0., 0.])
    """
    if distances is None:
        distances = distances_from(network, target)
    order = donor_order(network, target, reporting, radius=radius, elevation_limit=elevation_limit, distances=distances)
    quadrant = quadrants_from(network, target)[order]
    chosen = np.asarray(reporting, dtype=bool)[..., order]
    for q in range(4):
        mine = quadrant == q
        held = chosen[..., mine]
        chosen[..., mine] = held & (held.cumsum(axis=-1) <= 1)
    chosen &= chosen.sum(axis=-1, keepdims=True) >= min_donors
    donors = np.zeros(np.shape(reporting), dtype=bool)
    donors[..., order] = chosen
    return shares_by_distance(donors, distances, _POWER)


def quadrants_from(network: GaugeNetwork, target: int) -> npt.NDArray[np.int64]:
    """Return the quadrant in which every gauge lies as seen from one of them.

    Parameters
    ----------
    network
        The gauges.
    target
        Position of the gauge that looks around.

    Returns
    -------
    array of int, shape (n_gauges,)
        0 north-east, 1 south-east, 2 south-west, 3 north-west, by azimuth (geodesic; planar where the network is
        local). Each quadrant holds its first edge, clockwise: a gauge due north is in the north-east, due east in the
        south-east, due south in the south-west, due west in the north-west. Without meaning for a gauge at the place
        itself.

    Examples
    --------
    >>> network = GaugeNetwork(
    ...     ids=("T", "N", "E", "S", "W", "NW"),
    ...     x=[0.0, 0.0, 1.0, 0.0, -1.0, -1.0],
    ...     y=[0.0, 1.0, 0.0, -1.0, 0.0, 1.0],
    ...     crs="local",
    ... )
    >>> quadrants_from(network, 0)[1:]
    array([0, 1, 2, 3, 3])
    """
    here = slice(target, target + 1)
    quarter = ground.azimuths(network.x[here], network.y[here], network.x, network.y, network.crs)[0] / 90
    # On an axis but for rounding is on the axis.
    near = np.round(quarter)
    quarter = np.where(np.abs(quarter - near) * 90 < _ON_AXIS, near, quarter)
    return np.asarray(np.floor(quarter), dtype=np.int64) % 4

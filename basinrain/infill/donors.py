"""Which gauges donate: the nearest reporting ones, the same for every method."""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.gauges import GaugeNetwork

__all__ = ["ALL", "Nearest", "choose_donors", "distances_from"]

ALL: Final = "all"
"""Written for ``nearest`` when every reporting gauge is to donate."""

Nearest = int | Literal["all"]
"""How many of the nearest reporting gauges donate."""

_TIE: Final = 1e-9


def choose_donors(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    nearest: Nearest,
    radius: float | None = None,
    min_donors: int = 2,
    distances: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.bool_]:
    """Return which gauges donate to ``target``.

    Parameters
    ----------
    network
        The gauges.
    target
        Position of the gauge to infill. It never donates to itself, nor does a gauge at its very place.
    reporting : array of bool, shape (..., n_gauges)
        Which gauges have a value of their own, for one case or many.
    nearest
        How many of the nearest reporting gauges donate; ``"all"`` for every one.
    radius
        m; farther gauges do not donate. None: no limit.
    min_donors
        With fewer donors than this nobody donates.
    distances : array of float, shape (n_gauges,), optional
        m, from the target to every gauge; taken from the network where not given.

    Returns
    -------
    array of bool, shape (..., n_gauges)

    Examples
    --------
    >>> network = GaugeNetwork(ids=("T", "A", "B", "C"), x=[0.0, 1e3, 2e3, 3e3], y=[0.0, 0.0, 0.0, 0.0], crs="local")
    >>> choose_donors(network, 0, np.array([[0, 1, 1, 1], [0, 0, 1, 1], [0, 0, 0, 1]], dtype=bool), nearest=2)
    array([[False,  True,  True, False],
           [False, False,  True,  True],
           [False, False, False, False]])
    """
    if distances is None:
        distances = distances_from(network, target)
    eligible = distances > 0
    eligible[target] = False
    if radius is not None:
        eligible &= distances <= radius * (1 + _TIE)
    order = network.nearest_first(distances)
    order = order[eligible[order]]
    chosen = np.asarray(reporting, dtype=bool)[..., order]
    if nearest != ALL:
        chosen &= chosen.cumsum(axis=-1) <= nearest
    chosen &= chosen.sum(axis=-1, keepdims=True) >= min_donors
    donors = np.zeros(np.shape(reporting), dtype=bool)
    donors[..., order] = chosen
    return donors


def distances_from(network: GaugeNetwork, target: int) -> npt.NDArray[np.float64]:
    """Return the distances in m from one gauge to all, shape (n_gauges,); geodesic unless the network is local.

    Examples
    --------
    >>> distances_from(GaugeNetwork(ids=("A", "B"), x=[0.0, 3e3], y=[0.0, 4e3], crs="local"), 0)
    array([   0., 5000.])
    """
    here = slice(target, target + 1)
    row: npt.NDArray[np.float64] = ground.distances(
        network.x[here], network.y[here], network.x, network.y, network.crs
    )[0]
    return row

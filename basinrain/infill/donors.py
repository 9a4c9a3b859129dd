"""Which gauges donate: the nearest reporting ones, the same for every method."""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.gauges import GaugeNetwork

__all__ = ["ALL", "Nearest", "choose_donors", "distances_from", "nearness"]

ALL: Final = "all"
"""Written for ``nearest`` when every reporting gauge is to donate."""

Nearest = int | Literal["all"]
"""How many of the nearest reporting gauges donate."""

_TIE: Final = 1e-9


def nearness(network: GaugeNetwork, distances: npt.NDArray[np.float64]) -> npt.NDArray[np.int64]:
    """Return the positions of all gauges, the nearest first.

    Parameters
    ----------
    network
        The gauges.
    distances : array of float, shape (n_gauges,)
        m, from one place to every gauge. Distances that differ by less than one part in 10⁹ are ties, which go by gauge
        id, so that neither the plane's origin nor the order of the file decides.

    Returns
    -------
    array of int, shape (n_gauges,)

    Examples
    --------
    >>> network = GaugeNetwork(ids=("B", "C", "A"), x=[0.0, 0.0, 0.0], y=[0.0, 0.0, 0.0], crs="local")
    >>> nearness(network, np.array([5.0, 3.0, 5.0 + 1e-10]))
    array([1, 2, 0])
    """
    order = np.argsort(distances, kind="stable")
    ranked = distances[order]
    place = np.empty(len(order), dtype=np.int64)
    place[order] = np.concatenate(([0], np.cumsum(ranked[1:] > ranked[:-1] * (1 + _TIE)))) if len(order) else []
    return np.lexsort((network.id_rank, place))


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
    order = nearness(network, distances)
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

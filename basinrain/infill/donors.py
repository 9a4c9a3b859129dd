"""Which gauges donate: the nearest reporting ones, the same for every method."""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.errors import DataError, Problems
from basinrain.gauges import GaugeNetwork

__all__ = ["ALL", "Nearest", "choose_donors", "distances_from", "donor_order", "require_elevations"]

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
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
    among: npt.NDArray[np.bool_] | None = None,
    rank_by: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.bool_]:
    """Return which gauges donate to ``target``.

    They are the first reporting ones in an order that does not depend on who reports: so a gauge that does not donate
    can go missing without any change.

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
    elevation_limit
        m; gauges whose elevation differs by more from the target's do not donate. None: no limit.
    distances : array of float, shape (n_gauges,), optional
        m, from the target to every gauge; taken from the network where not given.
    among : array of bool, shape (n_gauges,), optional
        Gauges that may donate; all where not given.
    rank_by : array of float, shape (n_gauges,), optional
        What is used instead of the distance to say which gauges come first: the smallest first; 0 or more.

    Returns
    -------
    array of bool, shape (..., n_gauges)

    Raises
    ------
    DataError
        ``elevation_limit`` is given, and the target or a reporting gauge has no elevation; all such gauges together.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("T", "A", "B", "C"), x=[0.0, 1e3, 2e3, 3e3], y=[0.0, 0.0, 0.0, 0.0], crs="local")
    >>> choose_donors(network, 0, np.array([[0, 1, 1, 1], [0, 0, 1, 1], [0, 0, 0, 1]], dtype=bool), nearest=2)
    array([[False,  True,  True, False],
           [False, False,  True,  True],
           [False, False, False, False]])
    """
    order = donor_order(
        network,
        target,
        reporting,
        radius=radius,
        elevation_limit=elevation_limit,
        distances=distances,
        among=among,
        rank_by=rank_by,
    )
    chosen = np.asarray(reporting, dtype=bool)[..., order]
    if nearest != ALL:
        chosen &= chosen.cumsum(axis=-1, dtype=np.int32) <= nearest
    chosen &= chosen.sum(axis=-1, keepdims=True) >= min_donors
    donors = np.zeros(np.shape(reporting), dtype=bool)
    donors[..., order] = chosen
    return donors


def donor_order(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    radius: float | None = None,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
    among: npt.NDArray[np.bool_] | None = None,
    rank_by: npt.NDArray[np.float64] | None = None,
) -> npt.NDArray[np.int64]:
    """Return the gauges that may donate to ``target``, those that come first, first.

    Parameters
    ----------
    network, target, radius, elevation_limit, distances, among, rank_by
        As for :func:`choose_donors`.
    reporting : array of bool, shape (..., n_gauges)
        Only says whose elevation must be known.

    Returns
    -------
    array of int, shape (n_eligible,)
        Positions of gauges, whether they report or not. Ties go by gauge id.

    Raises
    ------
    DataError
        As :func:`choose_donors`.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("T", "B", "A", "C"), x=[0.0, 1e3, -1e3, 3e3], y=[0.0, 0.0, 0.0, 0.0], crs="local")
    >>> donor_order(network, 0, np.ones(4, dtype=bool), radius=2e3)
    array([2, 1])
    """
    if distances is None:
        distances = distances_from(network, target)
    eligible = distances > 0 if among is None else (distances > 0) & among
    eligible[target] = False
    if radius is not None:
        eligible &= distances <= radius * (1 + _TIE)
    if elevation_limit is not None:
        taking_part = np.array(np.asarray(reporting, dtype=bool).reshape(-1, len(network)).any(axis=0))
        taking_part[target] = True
        require_elevations(network, taking_part)
        eligible &= np.abs(network.elevation - network.elevation[target]) <= elevation_limit * (1 + _TIE)
    order = network.nearest_first(distances if rank_by is None else rank_by)
    return order[eligible[order]]


def require_elevations(network: GaugeNetwork, gauges: npt.NDArray[np.bool_]) -> None:
    """Raise an error that names every gauge that has no elevation where ``elevation_limit`` needs one.

    Parameters
    ----------
    network
        The gauges.
    gauges : array of bool, shape (n_gauges,)
        The gauges whose elevations are needed.

    Raises
    ------
    DataError
        An elevation is not known.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local", elevation=[310.0, np.nan])
    >>> require_elevations(network, np.array([True, True]))
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauge B: found no elevation; expected one, since [infill] elevation_limit is set; \
give it, leave the gauge out, or remove elevation_limit
    """
    problems = Problems()
    for g in np.flatnonzero(np.isnan(network.elevation) & np.asarray(gauges, dtype=bool)):
        problems.add(
            item=f"gauge {network.ids[g]}",
            found="no elevation",
            expected="one, since [infill] elevation_limit is set",
            remedy="give it, leave the gauge out, or remove elevation_limit",
            gauge=network.ids[g],
        )
    problems.raise_as(DataError)


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

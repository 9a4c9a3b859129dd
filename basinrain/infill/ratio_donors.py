"""Donors of the methods that work on ratios to normals, and the ratio of the target's normal to each of theirs."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest, choose_donors
from basinrain.infill.normals import normals_of, require_normals
from basinrain.infill.record_normals import NormalRatios

__all__ = ["choose_ratio_donors"]


def choose_ratio_donors(
    network: GaugeNetwork,
    target: int,
    reporting: npt.NDArray[np.bool_],
    *,
    method: str,
    month: int | None,
    ratios: NormalRatios | None,
    nearest: Nearest,
    radius: float | None = None,
    min_donors: int = 2,
    elevation_limit: float | None = None,
    distances: npt.NDArray[np.float64] | None = None,
    among: npt.NDArray[np.bool_] | None = None,
    rank_by: npt.NDArray[np.float64] | None = None,
) -> tuple[npt.NDArray[np.bool_], npt.NDArray[np.float64]]:
    """Return which gauges donate to ``target``, and its normal over theirs.

    Parameters
    ----------
    method
        The infill method's name, for messages.
    month
        The month whose normals are used, 1 to 12, where there are monthly ones; None for the year's.
    ratios : NormalRatios, optional
        Normals from the record, instead of the network's: a gauge without a ratio to the target does not donate.
    network, target, reporting, nearest, radius, min_donors, elevation_limit, distances, among, rank_by
        As for :func:`basinrain.infill.donors.choose_donors`.

    Returns
    -------
    donors : array of bool, shape (..., n_gauges)
    ratio : array of float, shape (n_gauges,)
        ``N_x / N_i``, above 0 at every gauge that donates in any case; 0 at the others.

    Raises
    ------
    DataError
        The target or a donor has no normal above 0; all such gauges together.

    Examples
    --------
    >>> normals = np.array([[1500.0], [1000.0], [1200.0]])
    >>> network = GaugeNetwork(ids=("X", "A", "B"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local", normals=normals)
    >>> choose_ratio_donors(
    ...     network, 0, np.array([False, True, True]), method="normal-ratio", month=None, ratios=None, nearest=4
    ... )
    (array([False,  True,  True]), array([0.  , 1.5 , 1.25]))
    """
    ratio = None
    if ratios is not None:
        ratio = np.nan_to_num(ratios.of(network, target, month))
        among = ratio > 0 if among is None else among & (ratio > 0)
    donors = choose_donors(
        network,
        target,
        reporting,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
        among=among,
        rank_by=rank_by,
    )
    needed = np.asarray(donors.reshape(-1, len(network)).any(axis=0))
    if ratio is None:
        if not needed.any():
            return donors, np.zeros(len(network))
        taking_part = needed.copy()
        taking_part[target] = True
        require_normals(network, taking_part, [month], method=method)
        normals = normals_of(network, month)
        ratio = normals[target] / np.where(needed, normals, 1.0)
    return donors, np.where(needed, ratio, 0.0)

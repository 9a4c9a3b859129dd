"""Ten per cent rule: the station average where all normals are alike, else the normal ratio."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import Nearest
from basinrain.infill.ratio_donors import choose_ratio_donors
from basinrain.infill.record_normals import NormalRatios

__all__ = ["ten_percent_rule_weights"]

_ALIKE: Final = 0.1

_TIE: Final = 1e-9


def ten_percent_rule_weights(
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
    """Return donor weights by the 10 % rule.

    ``P_x = (1/n) Σ P_i`` where ``|N_i - N_x| <= 0.1 N_x`` for every donor i, else ``P_x = (1/n) Σ (N_x / N_i) P_i``,
    with ``P_x`` the depth at the target (mm), ``P_i`` the depths at its n donors (mm), and ``N_x``, ``N_i`` their
    normals (mm). Paulhus and Kohler (1952), Monthly Weather Review 80, 129-133. A normal that is just 10 % off is
    within the rule. The donors of the case decide: with another one silent, the other formula may hold.

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
        Weights, which sum to 1 under the station average only; 0 at gauges that do not donate, all 0 where there are
        fewer than ``min_donors`` donors.

    Raises
    ------
    DataError
        The target or a donor has no normal above 0, all such gauges together; or ``elevation_limit`` is given, and the
        target or a reporting gauge has no elevation.

    Examples
    --------
    A's normal is just 10 % above the target's; B's is 25 % above, and where B donates all normals count.

    >>> normals = np.array([[1000.0], [1100.0], [1250.0], [950.0]])
    >>> network = GaugeNetwork(
    ...     ids=("X", "A", "B", "C"), x=[0.0, 1e3, 2e3, 3e3], y=[0.0, 0.0, 0.0, 0.0], crs="local", normals=normals
    ... )
    >>> ten_percent_rule_weights(network, 0, np.array([[0, 1, 0, 1], [0, 1, 1, 0], [0, 1, 0, 0]], dtype=bool)).round(4)
    array([[0.    , 0.5   , 0.    , 0.5   ],
           [0.    , 0.4545, 0.4   , 0.    ],
           [0.    , 0.    , 0.    , 0.    ]])
    """
    donors, ratio = choose_ratio_donors(
        network,
        target,
        reporting,
        method="ten-percent-rule",
        month=month,
        ratios=ratios,
        nearest=nearest,
        radius=radius,
        min_donors=min_donors,
        elevation_limit=elevation_limit,
        distances=distances,
    )
    theirs = 1 / np.where(ratio > 0, ratio, 1.0)
    unlike = np.abs(theirs - 1) > _ALIKE * (1 + _TIE)
    by_ratio = (donors & unlike).any(axis=-1, keepdims=True)
    factors = np.where(by_ratio, ratio, 1.0)
    return np.asarray(np.where(donors, factors, 0.0) / np.maximum(donors.sum(axis=-1, keepdims=True), 1), dtype=float)

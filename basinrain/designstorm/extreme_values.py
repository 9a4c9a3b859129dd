"""The Gumbel and the generalised extreme value distribution, fitted by L-moments."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt
from scipy import special

from basinrain.designstorm.l_moments import LMoments
from basinrain.errors import JobError, unknown

__all__ = [
    "DISTRIBUTIONS",
    "GEV",
    "GUMBEL",
    "GUMBEL_RATIO",
    "ExtremeValues",
    "check_distribution",
    "fit_gev",
    "fit_gumbel",
    "quantiles_of_shape",
]

Floats = npt.NDArray[np.float64]

GUMBEL: Final = "gumbel"
GEV: Final = "gev"

GUMBEL_RATIO: Final = float(np.log2(9 / 8))
"""L-skewness of every Gumbel distribution, log2(9/8) = 0.1699."""

_LN2: Final = float(np.log(2))
_LN3: Final = float(np.log(3))
_SMALL: Final = 1e-4
"""Shapes closer to 0 are reckoned by series, where differences would lose digits."""
_ZETA3: Final = float(special.zeta(3))
_MOST_STEPS: Final = 100


@dataclass(frozen=True, eq=False, kw_only=True)
class ExtremeValues:
    """Extreme value distributions; all arrays have one shape.

    Parameters
    ----------
    location, scale : array of float
        In the unit of the values; NaN where there is no fit.
    shape : array of float
        0 for Gumbel. Below 0 the upper tail is heavier than Gumbel's; above 0 no value exceeds ``bound``.

    Notes
    -----
    ``x = location + scale (1 - exp(-shape y)) / shape`` with the Gumbel reduced variate ``y = -ln(-ln F)``; the sign of
    the shape is Hosking's (1997), and the opposite of the one used where a heavy tail has a positive shape.

    Examples
    --------
    The 2-year and 100-year values of a Gumbel distribution and one with a heavier tail.

    >>> both = ExtremeValues(location=np.full(2, 30.0), scale=np.full(2, 10.0), shape=np.array([0.0, -0.1]))
    >>> both.quantiles(np.array([0.36651, 4.60015])).round(2)
    array([[33.67, 76.  ],
           [33.73, 88.41]])
    >>> both.bound
    array([inf, inf])
    """

    location: Floats
    scale: Floats
    shape: Floats

    def quantiles(self, variates: Floats) -> Floats:
        """Return the values at Gumbel reduced variates, a last axis added; NaN where there is no fit."""
        return self.location[..., None] + self.scale[..., None] * quantiles_of_shape(self.shape[..., None], variates)

    @property
    def bound(self) -> Floats:
        """The value that is never exceeded; infinite where there is none, NaN where there is no fit."""
        bounded = self.shape > 0
        above = self.scale / np.where(bounded, self.shape, 1.0)
        return np.where(bounded, self.location + above, self.location + np.inf)


def quantiles_of_shape(shape: Floats, variates: Floats) -> Floats:
    """Return the values at Gumbel reduced variates of distributions of location 0 and scale 1.

    Shapes and variates are broadcast together.

    Examples
    --------
    >>> quantiles_of_shape(np.array([-0.1, 0.0, 0.1]), np.array([3.0])).round(3)
    array([3.499, 3.   , 2.592])
    """
    none = shape == 0
    if np.all(none):
        return np.broadcast_to(variates, np.broadcast_shapes(np.shape(shape), np.shape(variates)))
    k = np.where(none, 1.0, shape)
    return np.where(none, variates, -np.expm1(-k * variates) / k)


def fit_gumbel(moments: LMoments) -> ExtremeValues:
    """Return the Gumbel distributions of L-moments.

    Parameters
    ----------
    moments
        Where the scale is 0, so is that of the distribution, and all its values are the mean.

    Returns
    -------
    ExtremeValues
        Arrays of the shape of the moments; NaN where these are.

    Notes
    -----
    Scale ``l2 / ln 2``, location ``l1 - 0.5772 scale`` (Hosking and Wallis, 1997, appendix A.4).

    Examples
    --------
    Of 20, 24, 31, 45 the mean is 30; the six pairs differ by 82 in all, so l2 is 82 / 12.

    >>> from basinrain.designstorm.l_moments import l_moments
    >>> fit = fit_gumbel(l_moments(np.array([20.0, 24.0, 31.0, 45.0])))
    >>> round(float(fit.location), 3), round(float(fit.scale), 3)
    (24.31, 9.858)
    """
    scale = moments.scale / _LN2
    return ExtremeValues(
        location=np.asarray(moments.mean - np.euler_gamma * scale),
        scale=np.asarray(scale),
        shape=np.asarray(np.where(np.isnan(scale), np.nan, 0.0)),
    )


def fit_gev(moments: LMoments) -> ExtremeValues:
    """Return the generalised extreme value distributions of L-moments.

    Parameters
    ----------
    moments
        Where the values are all equal, or L-skewness is 1 or -1, no distribution has these moments: NaN.

    Returns
    -------
    ExtremeValues
        Arrays of the shape of the moments.

    Notes
    -----
    The shape ``k`` solves ``ratio = 2 (1 - 3^-k) / (1 - 2^-k) - 3`` to rounding, by Newton's method from the
    approximation ``k = 7.8590 c + 2.9554 c^2``, ``c = 2 / (3 + ratio) - ln 2 / ln 3``, of Hosking, J. R. M., Wallis,
    J. R. and Wood, E. F. (1985), Estimation of the generalized extreme-value distribution by the method of
    probability-weighted moments, Technometrics 27, 251-261. The right side falls with ``k`` and is convex, so that
    every start leads to the one solution.

    Examples
    --------
    >>> from basinrain.designstorm.l_moments import l_moments
    >>> fit = fit_gev(l_moments(np.array([20.0, 24.0, 31.0, 45.0])))
    >>> round(float(fit.location), 3), round(float(fit.scale), 3), round(float(fit.shape), 4)
    (23.257, 7.007, -0.2838)
    """
    shape = _shape_of_ratio(np.asarray(moments.ratio, dtype=np.float64))
    near = np.abs(shape) < _SMALL
    k = np.where(near, 1.0, shape)
    # ln of gamma(1 + k) about 0, where forming 1 + k would round k away.
    log_gamma = np.where(
        near,
        shape * (-np.euler_gamma + shape * (np.pi**2 / 12 - shape * _ZETA3 / 3)),
        special.gammaln(1 + k),
    )
    # (1 - 2^-k) / k and (1 - gamma(1 + k)) / k, which have limits at 0.
    some = np.where(shape == 0, 1.0, shape)
    spread = np.where(shape == 0, _LN2, -np.expm1(-some * _LN2) / some)
    shift = np.where(shape == 0, np.euler_gamma, -np.expm1(log_gamma) / some)
    scale = moments.scale / (spread * np.exp(log_gamma))
    return ExtremeValues(
        location=np.asarray(moments.mean - scale * shift), scale=np.asarray(scale), shape=np.asarray(shape)
    )


def _shape_of_ratio(ratio: Floats) -> Floats:
    """Return the shape of every L-skewness; NaN where that is not between -1 and 1."""
    t = np.where(np.abs(ratio) < 1, ratio, np.nan)
    c = 2 / (3 + t) - _LN2 / _LN3
    k = 7.8590 * c + 2.9554 * c**2
    for _ in range(_MOST_STEPS):
        near = np.abs(k) < _SMALL
        safe = np.where(k == 0, 1.0, k)
        upper, lower = -np.expm1(-safe * _LN3), -np.expm1(-safe * _LN2)
        part = np.where(k == 0, _LN3 / _LN2, upper / lower)
        steep = (_LN3 * (1 - upper) * lower - _LN2 * (1 - lower) * upper) / lower**2
        slope = 2 * np.where(near, -(_LN3 / _LN2) * (_LN3 - _LN2) / 2, steep)
        step = (2 * part - 3 - t) / slope
        k = k - step
        if not np.any(np.abs(step) > 1e-13 * (1 + np.abs(k))):
            break
    return np.asarray(k)


DISTRIBUTIONS: Final[Mapping[str, Callable[[LMoments], ExtremeValues]]] = MappingProxyType(
    {GUMBEL: fit_gumbel, GEV: fit_gev}
)
"""The distributions by name, and how each is fitted."""


def check_distribution(name: str) -> None:
    """Refuse the name of no distribution.

    Raises
    ------
    JobError
        The nearest known one is named.

    Examples
    --------
    >>> check_distribution("gumbell")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: distribution: found 'gumbell'; expected one of: gumbel, gev; did you mean 'gumbel'?
    """
    if name not in DISTRIBUTIONS:
        raise JobError(unknown("distribution", name, DISTRIBUTIONS))

"""How well a fitted distribution agrees with the annual maxima that it was fitted to."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from basinrain.designstorm.extreme_values import quantiles_of_shape

__all__ = ["Goodness", "plot_correlation", "plotting_variates", "shape_test", "share_at_or_below"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_SHAPE_VARIANCE = 0.5633


@dataclass(frozen=True, eq=False, kw_only=True)
class Goodness:
    """Agreement of one distribution with the annual maxima; arrays of shape (n_areas, n_durations).

    Parameters
    ----------
    correlation : array of float
        Probability-plot correlation coefficient; 1 where the plot is a straight line. NaN where there is no fit.
    p_value : array of float
        Share of samples of the fitted distribution, fitted anew, whose plot is no straighter. A small one speaks
        against the distribution; a large one does not prove it. NaN where there is no fit.
    """

    correlation: Floats
    p_value: Floats


def plotting_variates(n: int) -> Floats:
    """Return the Gumbel reduced variates at which ``n`` ranked values are plotted, rising.

    Notes
    -----
    At Gringorten's (1963) positions ``(i - 0.44) / (n + 0.12)``, made for the Gumbel distribution: A plotting rule for
    extreme probability paper, Journal of Geophysical Research 68, 813-814.

    Examples
    --------
    >>> plotting_variates(3).round(3)
    array([-0.541,  0.367,  1.62 ])
    """
    return np.asarray(-np.log(-np.log((np.arange(1, n + 1) - 0.44) / (n + 0.12))))


def plot_correlation(ranked: Floats, shape: Floats) -> Floats:
    """Return the probability-plot correlation coefficient of ranked values with a distribution of a shape.

    Parameters
    ----------
    ranked : array of float, shape (..., n)
        Rising along the last axis; no NaN.
    shape : array of float, shape (...)
        Of the fitted distribution. Its location and scale do not matter.

    Returns
    -------
    array of float, shape (...)
        NaN where the values are all equal, or the shape is NaN.

    Notes
    -----
    Filliben, J. J. (1975), The probability plot correlation coefficient test for normality, Technometrics 17, 111-117;
    for Gumbel Vogel, R. M. (1986), Water Resources Research 22, 587-590; for the generalised extreme value distribution
    Chowdhury, J. U., Stedinger, J. R. and Lu, L.-H. (1991), Water Resources Research 27, 1657-1671.

    Examples
    --------
    >>> x = plotting_variates(20)
    >>> float(plot_correlation(30 + 10 * x, np.array(0.0)).round(12))
    1.0
    >>> float(plot_correlation(x**3, np.array(0.0)).round(3))
    0.787
    """
    variates = plotting_variates(ranked.shape[-1])
    # The same line for all where all are Gumbel.
    expected = quantiles_of_shape(np.asarray(shape)[..., None], variates) if np.any(shape) else variates
    a = ranked - ranked.mean(axis=-1, keepdims=True)
    b = expected - expected.mean(axis=-1, keepdims=True)
    together, a_alone, b_alone = (np.einsum("...i,...i->...", *two) for two in ((a, b), (a, a), (b, b)))
    apart = np.sqrt(a_alone * b_alone)
    return np.asarray(np.divide(together, apart, out=np.full(together.shape, np.nan), where=apart > 0))


def share_at_or_below(simulated: Floats, found: Floats) -> Floats:
    """Return the p-value of statistics of which low ones speak against the fit.

    Parameters
    ----------
    simulated : array of float, shape (n_samples, ...)
        NaN for samples that could not be fitted, which are left out.
    found : array of float, shape (...)

    Returns
    -------
    array of float, shape (...)
        ``(1 + number at or below) / (1 + number)``, never 0; NaN where ``found`` is.

    Examples
    --------
    >>> float(share_at_or_below(np.array([0.9, 0.95, 0.97, np.nan]), np.array(0.92)))
    0.5
    """
    below = np.count_nonzero(simulated <= found, axis=0)
    number = np.count_nonzero(~np.isnan(simulated), axis=0)
    return np.asarray(np.where(np.isnan(found), np.nan, (1 + below) / (1 + number)))


def shape_test(shape: Floats, n: Ints) -> tuple[Floats, Floats]:
    """Return the statistic and the two-sided p-value of the test whether the shape is 0, that is Gumbel.

    Parameters
    ----------
    shape : array of float
        As fitted by L-moments.
    n : array of int
        Years; of the shape of ``shape``.

    Returns
    -------
    statistic, p_value : array of float
        The statistic is standard normal for Gumbel; a negative one tells of a heavier tail.

    Notes
    -----
    ``shape sqrt(n / 0.5633)`` of Hosking, Wallis and Wood (1985), Technometrics 27, 251-261, section 7 (from memory).

    Examples
    --------
    >>> [round(float(x), 3) for x in shape_test(np.array(-0.2), np.array(40))]
    [-1.685, 0.092]
    """
    statistic = np.asarray(shape * np.sqrt(n / _SHAPE_VARIANCE))
    return statistic, np.asarray(2 * special.ndtr(-np.abs(statistic)))

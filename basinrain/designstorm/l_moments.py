"""Sample L-moments of annual maxima."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

__all__ = ["LEAST_VALUES", "LMoments", "l_moments", "l_moments_of_sorted"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

LEAST_VALUES: Final = 3
"""How many values the third L-moment needs."""


@dataclass(frozen=True, eq=False, kw_only=True)
class LMoments:
    """The first three sample L-moments; all arrays have one shape.

    Parameters
    ----------
    n : array of int
        How many values they are of.
    mean : array of float
        The first L-moment, in the unit of the values; NaN where ``n`` is below 3.
    scale : array of float
        The second, never negative: half the expected difference of two values. NaN where ``n`` is below 3.
    ratio : array of float
        L-skewness, the third over the second, from -1 to 1; NaN where ``n`` is below 3 or the values are all equal.
    """

    n: Ints
    mean: Floats
    scale: Floats
    ratio: Floats


def l_moments(values: Floats) -> LMoments:
    """Return the unbiased sample L-moments along the first axis.

    Parameters
    ----------
    values : array of float, shape (n_years, ...)
        NaN where a year does not count.

    Returns
    -------
    LMoments
        Arrays of shape ``(...)``.

    Notes
    -----
    They are the unbiased sample L-moments of Hosking, J. R. M. and Wallis, J. R. (1997), Regional frequency analysis,
    Cambridge University Press, section 2.7, written as sums over the gaps between neighbours in rank: with ``c`` of
    ``n`` values below a gap ``g``, the second is the sum of ``g c (n - c) / (n (n - 1))`` and the third that of
    ``g c (n - c) (2 c - n) / (n (n - 1) (n - 2))``. No term of the second is negative, so that equal values give
    exactly 0.

    Examples
    --------
    Of 1, 2, 4 the pairs differ by 1, 2 and 3, on the mean by 2, half of which is 1; the third is (4 - 2 x 2 + 1) / 3.

    >>> found = l_moments(np.array([4.0, 1.0, np.nan, 2.0]))
    >>> int(found.n), round(float(found.mean), 3), float(found.scale), round(float(found.ratio), 3)
    (3, 2.333, 1.0, 0.333)

    Equal values have no L-skewness, and two values no L-moments here.

    >>> found = l_moments(np.array([[7.0, 7.0], [7.0, 8.0], [7.0, np.nan]]))
    >>> found.mean, found.scale, found.ratio
    (array([ 7., nan]), array([ 0., nan]), array([nan, nan]))
    """
    ranked = np.sort(np.moveaxis(np.asarray(values, dtype=np.float64), 0, -1), axis=-1)
    n = np.count_nonzero(~np.isnan(ranked), axis=-1)
    # Those that do not count stand last; a gap of 0 before them adds nothing.
    gaps = np.nan_to_num(np.diff(ranked, axis=-1), nan=0.0)
    mean, scale, third = _of_gaps(np.sum(ranked, axis=-1, where=~np.isnan(ranked)), gaps, np.asarray(n)[..., None])
    return _moments(np.asarray(n), mean, scale, third)


def l_moments_of_sorted(values: Floats) -> LMoments:
    """Return the L-moments of many samples of one size that are sorted along their last axis, and whole.

    Parameters
    ----------
    values : array of float, shape (..., n)
        Rising along the last axis; no NaN.

    Returns
    -------
    LMoments
        Arrays of shape ``(...)``, the numbers of :func:`l_moments`.

    Examples
    --------
    >>> l_moments_of_sorted(np.array([[1.0, 2.0, 4.0], [0.0, 0.0, 3.0]])).scale
    array([1., 1.])
    """
    n = values.shape[-1]
    mean, scale, third = _of_gaps(values.sum(axis=-1), np.diff(values, axis=-1), np.array([n]))
    return _moments(np.full(mean.shape, n), mean, scale, third)


def _of_gaps(total: Floats, gaps: Floats, n: Ints) -> tuple[Floats, Floats, Floats]:
    """Return the L-moments of sums and the gaps along the last axis; ``n`` has a last axis of length 1."""
    c = np.arange(1, gaps.shape[-1] + 1)
    # Too few values have no moments rather than a division by zero.
    m = np.where(n >= LEAST_VALUES, n, np.nan)
    second = c * (m - c) / (m * (m - 1))
    third = second * (2 * c - m) / (m - 2)
    return (
        np.asarray(total / m[..., 0]),
        np.asarray(np.einsum("...i,...i->...", gaps, second)),
        np.asarray(np.einsum("...i,...i->...", gaps, third)),
    )


def _moments(n: Ints, mean: Floats, scale: Floats, third: Floats) -> LMoments:
    ratio = np.divide(third, scale, out=np.full(np.shape(scale), np.nan), where=scale > 0)
    return LMoments(n=n.astype(np.int64), mean=mean, scale=scale, ratio=ratio)

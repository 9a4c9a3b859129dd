"""The alternating block storm: what each further step adds to the depth, laid out around the peak."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.depth_source import Curve
from basinrain.designstorm.patterns.increments import check_step, falling_increments, known_depth
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.designstorm.patterns.peak import CENTRE, peak_fraction, peak_step

__all__ = ["ALTERNATING_BLOCK", "alternating_block", "around_peak", "blocks"]

Floats = npt.NDArray[np.float64]

_NAME: Final = "alternating-block"


def alternating_block(case: PatternCase, *, peak: str | float = CENTRE, smooth: bool = False) -> Shaped:
    """Return the alternating block hyetograph of one depth-duration curve.

    Depths of 1, 2, ... n steps are taken from the curve that has the areal reduction of the whole duration; what every
    further step adds is a block. The largest block stands at the peak, the second to its right, the third to its left,
    and so on in turn; when one side is full the rest go to the other.

    Parameters
    ----------
    case
        The depth and its curve ``curve``.
    peak
        ``"early"``, ``"centre"``, ``"late"``, or the fraction of the duration before the peak.
    smooth
        Whether blocks that grow with duration may be evened out, see
        :func:`~basinrain.designstorm.patterns.increments.falling_increments`.

    Returns
    -------
    Shaped

    Raises
    ------
    JobError
        ``peak`` is no such word or number.
    MethodError
        The step does not divide the duration; the curve has no depth for a duration; blocks grow with duration, or are
        negative.

    Notes
    -----
    Chow, V. T., Maidment, D. R. and Mays, L. W. (1988), Applied Hydrology, section 14.4. Any k steps that stand side by
    side around the peak hold the k largest blocks, so that the greatest depth in every duration is that of the curve.
    Where the largest block stands, see :func:`~basinrain.designstorm.patterns.peak.peak_step`.

    Examples
    --------
    >>> def curve(minutes):
    ...     return 10 * minutes**0.5
    >>> case = PatternCase(minutes=60, step=10, total=10 * 60**0.5, curve=curve, curve_by_duration=curve, area=1e6)
    >>> alternating_block(case).depth.round(1)
    array([ 7.5, 10.1, 31.6, 13.1,  8.5,  6.7])
    >>> alternating_block(case, peak="early").depth.round(1)
    array([10.1, 31.6, 13.1,  8.5,  7.5,  6.7])
    """
    return blocks(case, case.curve, shape=_NAME, peak=peak, smooth=smooth)


def blocks(case: PatternCase, curve: Curve, *, shape: str, peak: str | float, smooth: bool) -> Shaped:
    """Return the hyetograph whose greatest depth in every whole number of steps is that of a curve.

    Parameters
    ----------
    case
        Duration, step and total.
    curve
        Depths in mm of durations in minutes.
    shape
        The pattern that asks, for messages.
    peak, smooth
        As for :func:`alternating_block`.

    Returns
    -------
    Shaped

    Raises
    ------
    JobError, MethodError
        As :func:`alternating_block`.

    Examples
    --------
    >>> def curve(minutes):
    ...     return np.minimum(minutes, 30.0)
    >>> case = PatternCase(minutes=40, step=10, total=30.0, curve=curve, curve_by_duration=curve, area=1e6)
    >>> blocks(case, curve, shape="nested", peak="late", smooth=False).depth
    array([ 0., 10., 10., 10.])
    """
    fraction = peak_fraction(peak)
    check_step(case.minutes, case.step)
    minutes: Floats = np.arange(1.0, case.n_steps + 1) * case.step
    by_duration = known_depth(curve, minutes, shape=shape, remedy="take a longer step, or depths of shorter durations")
    increments, remarks = falling_increments(by_duration, case.step, shape=shape, smooth=smooth)
    depth = around_peak(increments * (case.total / increments.sum()), peak_step(fraction, case.n_steps))
    return Shaped(depth, remarks)


def around_peak(increments: Floats, peak: int) -> Floats:
    """Return blocks laid out around the peak: the first on it, the second to the right, the third to the left ...

    When one side is full the rest go to the other, so that the first k always stand side by side.

    Parameters
    ----------
    increments : array of float, shape (n_steps,)
        The blocks, from the largest.
    peak
        The step of the first block, counted from 0.

    Returns
    -------
    array of float, shape (n_steps,)

    Examples
    --------
    >>> around_peak(np.array([6.0, 5, 4, 3, 2, 1]), 2), around_peak(np.array([6.0, 5, 4, 3, 2, 1]), 5)
    (array([2., 4., 6., 5., 3., 1.]), array([1., 2., 3., 4., 5., 6.]))
    >>> around_peak(np.array([6.0]), 0)
    array([6.])
    """
    n_steps = len(increments)
    offsets = np.zeros(2 * n_steps - 1, dtype=np.int64)
    offsets[1::2] = np.arange(1, n_steps)
    offsets[2::2] = -offsets[1::2]
    places = peak + offsets
    laid = np.empty(n_steps)
    laid[places[(places >= 0) & (places < n_steps)]] = increments
    return laid


ALTERNATING_BLOCK: Final = Pattern(
    name=_NAME,
    title="Alternating block",
    shape=alternating_block,
    options=("peak", "smooth"),
    by_curve=True,
    source="Chow, V. T., Maidment, D. R. and Mays, L. W. (1988), Applied Hydrology, section 14.4",
    evidence="The method and its worked example (14.4.1) are from memory.",
)

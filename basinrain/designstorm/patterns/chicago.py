"""The Chicago storm: the intensity that any depth-duration curve implies on both sides of a peak."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.patterns.increments import (
    check_growth,
    check_step,
    increments_of,
    known_depth,
    runs,
    span_in_words,
)
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.designstorm.patterns.peak import CENTRE, peak_fraction

__all__ = ["CHICAGO", "chicago"]

Floats = npt.NDArray[np.float64]

_NAME: Final = "chicago"

# Rises of less than this share of the whole depth are rounding and no finding.
_ROUNDING: Final = 1e-9

# Minutes from a whole number of them that are rounding.
_NEAR: Final = 1e-6


def chicago(case: PatternCase, *, peak: str | float = CENTRE) -> Shaped:
    """Return the Chicago hyetograph of a depth-duration curve.

    Parameters
    ----------
    case
        The depth and its curve ``curve``.
    peak
        ``"early"``, ``"centre"``, ``"late"``, or the fraction r of the duration before the peak.

    Returns
    -------
    Shaped

    Raises
    ------
    JobError
        ``peak`` is no such word or number.
    MethodError
        The step does not divide the duration; the curve has no depth for a duration, or one that falls with duration.

    Notes
    -----
    Keifer, C. J. and Chu, H. H. (1957), Synthetic storm pattern for drainage design, Journal of the Hydraulics
    Division, ASCE, 83(HY4). Around the peak at ``tp = r T`` the depth P(d) of every duration d falls in the r d minutes
    before and the (1 - r) d minutes after it. What has fallen by the time t is therefore ::

        F(t) = r P(T) - r P((tp - t) / r)                    before the peak
        F(t) = r P(T) + (1 - r) P((t - tp) / (1 - r))        after it,       P(0) = 0

    for any curve, and a step holds what F rises by in it; no intensity is sampled. For ``i = a / (t^b + c)`` the slope
    of F is the published ``i = a ((1 - b) x^b + c) / (x^b + c)^2``, with x the minutes before the peak over r, or after
    it over 1 - r.

    A peak on the border of two steps needs no depth of a duration under ``step / max(r, 1 - r)``. One inside a step
    needs durations down to the distance from it to the nearer border.

    Where the curve is not concave the intensity rises away from the peak, which is told and kept.

    Examples
    --------
    >>> def curve(minutes):
    ...     return 10 * minutes**0.5
    >>> case = PatternCase(minutes=60, step=10, total=10 * 60**0.5, curve=curve, curve_by_duration=curve, area=1e6)
    >>> chicago(case).depth.round(1)
    array([ 7.1,  9.3, 22.4, 22.4,  9.3,  7.1])

    A single step holds all of it.

    >>> case = PatternCase(minutes=60, step=60, total=77.0, curve=curve, curve_by_duration=curve, area=1e6)
    >>> chicago(case).depth
    array([77.])
    """
    fraction = peak_fraction(peak)
    check_step(case.minutes, case.step)
    borders: Floats = np.arange(1.0, case.n_steps) * case.step
    away = borders - fraction * case.minutes
    # Durations around the peak, negative before it.
    around = _to_whole(np.where(away < 0, away / fraction, away / (1 - fraction)))
    inner = _depth_around(case, np.abs(around), on_border=not np.all(around))
    before = fraction * (case.total - inner)
    after = fraction * case.total + (1 - fraction) * inner
    cumulative = np.concatenate([[0.0], np.where(around < 0, before, after), [case.total]])
    depth = increments_of(cumulative, case.total)
    return Shaped(depth, _rises_away(depth, case.step))


def _to_whole(minutes: Floats) -> Floats:
    """Minutes, whole where they are so but for rounding, which could lie outside what the curve knows."""
    whole = np.rint(minutes)
    return np.where(np.abs(minutes - whole) < _NEAR, whole, minutes)


def _depth_around(case: PatternCase, minutes: Floats, *, on_border: bool) -> Floats:
    """Depths of durations, of which 0 has none; checked to grow up to the whole duration."""
    wanted, places = np.unique(minutes, return_inverse=True)
    known = wanted > 0
    depth = np.zeros(len(wanted))
    depth[known] = known_depth(
        case.curve,
        wanted[known],
        shape=_NAME,
        remedy="take a longer step, or depths of shorter durations"
        if on_border
        else "put the peak on the border of two steps, take a longer step, or depths of shorter durations",
    )
    check_growth(np.append(wanted, case.minutes), np.append(depth, case.total), shape=_NAME)
    return depth[places]


def _rises_away(depth: Floats, step: int) -> tuple[str, ...]:
    """Tell where the hyetograph does not fall away on both sides of its greatest step."""
    peak = int(np.argmax(depth))
    change = np.diff(depth)
    change[:peak] *= -1
    spans = [
        span_in_words(first * step, (last + 1) * step) for first, last in runs(change > _ROUNDING * float(depth.sum()))
    ]
    remark = (
        f"The intensity rises away from the peak from {', '.join(spans)} after the begin, as the depths there add more "
        "in a longer duration than in a shorter one."
    )
    return (remark,) if spans else ()


CHICAGO: Final = Pattern(
    name=_NAME,
    title="Chicago",
    shape=chicago,
    options=("peak",),
    by_curve=True,
    source="Keifer, C. J. and Chu, H. H. (1957), Synthetic storm pattern for drainage design, Journal of the "
    "Hydraulics Division, ASCE, 83(HY4)",
    evidence="The form of the intensity was seen for another equation of the same kind; its figures are derived.",
)

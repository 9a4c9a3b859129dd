"""Depths of the steps of a storm, from depths that add up in time or with duration."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import pairwise
from typing import Final

import numpy as np
import numpy.typing as npt
from scipy.optimize import isotonic_regression

from basinrain.designstorm.depth_source import Curve
from basinrain.designstorm.measures import duration_text
from basinrain.errors import MethodError, Problem, Problems

__all__ = ["check_growth", "check_step", "falling_increments", "increments_of", "known_depth", "runs", "span_in_words"]

Floats = npt.NDArray[np.float64]

# Differences below this share of the whole depth are rounding and no finding.
_ROUNDING: Final = 1e-9


def check_step(minutes: int, step: int) -> None:
    """Make sure that a duration is a whole number of steps, one at least.

    Parameters
    ----------
    minutes, step
        The duration and the step, minutes.

    Raises
    ------
    MethodError
        It is not.

    Examples
    --------
    >>> check_step(120, 10)
    >>> check_step(25, 10)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: [design] step: found 10 min for a duration of 25 min; expected a step that divides \
the duration; a step of 5 min does
    >>> check_step(10, 60)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: [design] step: found 1 h for a duration of 10 min; expected a step no longer than \
the duration; a step of 10 min is
    """
    if minutes > 0 and step > 0 and minutes % step == 0:
        return
    if minutes <= 0 or step <= 0:
        problem = Problem(
            item="[design] step",
            found=f"{step} min for a duration of {minutes} min",
            expected="minutes above 0",
            remedy="correct it",
        )
    else:
        divides = int(np.gcd(minutes, step))
        short = minutes < step
        problem = Problem(
            item="[design] step",
            found=f"{duration_text(step)} for a duration of {duration_text(minutes)}",
            expected="a step no longer than the duration" if short else "a step that divides the duration",
            remedy=f"a step of {duration_text(divides)} {'is' if short else 'does'}",
        )
    raise MethodError(problem)


def increments_of(cumulative: Floats, total: float) -> Floats:
    """Return the depths of steps whose cumulative shape is known at their borders.

    Parameters
    ----------
    cumulative : array of float, shape (n_steps + 1,)
        What has fallen by every border of a step, the begin and the end of the storm included, in any unit.
    total
        The depth of the storm, mm.

    Returns
    -------
    array of float, shape (n_steps,)
        mm; sums to ``total``. None is negative.

    Raises
    ------
    MethodError
        It falls somewhere by more than rounding, does not rise from first to last, or holds what is no number.

    Examples
    --------
    >>> increments_of(np.array([0.0, 0.1, 0.9, 1.0]), 50.0)
    array([ 5., 40.,  5.])
    >>> increments_of(np.array([2.0, 2.0]), 50.0)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: cumulative depth: found none between the begin and the end; expected a depth that \
rises; check the pattern
    """
    rise = cumulative[-1] - cumulative[0]
    steps = np.diff(cumulative)
    found = ""
    if not np.isfinite(cumulative).all():
        found = f"no number at border {int(np.argmin(np.isfinite(cumulative)))} of a step"
    elif rise <= 0:
        found = "none between the begin and the end"
    elif steps.min() < -_ROUNDING * rise:
        found = f"a fall in step {int(np.argmin(steps)) + 1} of {len(steps)}"
    if found:
        raise MethodError(
            Problem(item="cumulative depth", found=found, expected="a depth that rises", remedy="check the pattern")
        )
    return _scaled(steps, total)


def falling_increments(depth: Floats, step: int, *, shape: str, smooth: bool = False) -> tuple[Floats, tuple[str, ...]]:
    """Return what every further step adds to the depth, from the first on, never rising.

    Parameters
    ----------
    depth : array of float, shape (n_steps,)
        Depths in mm of 1, 2, ... n steps.
    step
        Minutes.
    shape
        The pattern that needs them, for the message.
    smooth
        Whether increments that rise may be evened out.

    Returns
    -------
    array of float, shape (n_steps,)
        mm; they fall or stay the same, are not negative, and sum to the last depth.
    tuple of str
        What was evened out, and the greatest change that this makes to the depth of any duration.

    Raises
    ------
    MethodError
        The depth falls with duration, or what a step adds rises with duration; all places together. With ``smooth``
        only where a fall remains after evening out.

    Notes
    -----
    A depth by duration that is to be laid out around one peak has to be concave, that is, its increments must not rise.
    Evening out is the isotonic regression by pooling adjacent violators (Barlow, R. E., Bartholomew, D. J., Bremner,
    J. M. and Brunk, H. D., 1972: Statistical Inference under Order Restrictions): increments that rise are replaced by
    their mean. The depths that result are the least concave ones that nowhere lie below those given: they only ever
    become greater, and the last stays as it is. Differences under 1e-9 of the depth are rounding.

    Examples
    --------
    >>> falling_increments(np.array([50.0, 55.0, 66.0, 73.0]), 60, shape="nested")
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: shape "nested": found a depth per step that rises with duration, from 5 mm in 1 to \
2 h to 11 mm in 2 to 3 h; expected one that never rises with duration; check the depths and areal reductions of these \
durations, or even them out with smooth = true
    >>> falling_increments(np.array([50.0, 55.0, 66.0, 73.0]), 60, shape="nested", smooth=True)
    (array([50.,  8.,  8.,  7.]), ('What a step adds to the depth rose with duration and was evened out over 1 to 3 h: \
the depth of 2 h is 3 mm greater, the largest change; the total is kept.',))
    """
    tolerance = _ROUNDING * float(np.abs(depth).max())
    minutes: Floats = np.arange(1.0, len(depth) + 1) * step
    raw = np.diff(depth, prepend=0.0)
    problems = Problems()
    _add_rises(problems, raw, step, tolerance, shape=shape)
    _add_falls(problems, minutes, depth, tolerance, shape=shape)
    if not len(problems):
        return _scaled(np.sort(raw)[::-1], depth[-1]), ()
    if not smooth:
        problems.raise_as(MethodError)
    fitted = isotonic_regression(raw, increasing=False)
    even = np.asarray(fitted.x, dtype=np.float64)
    left = Problems()
    _add_falls(left, minutes, np.cumsum(even), tolerance, shape=shape)
    left.raise_as(MethodError)
    change = np.cumsum(even) - depth
    borders = np.asarray(fitted.blocks, dtype=np.int64)
    spans = [
        span_in_words(int(first) * step, int(last) * step)
        for first, last in pairwise(borders)
        if np.abs(change[first:last]).max() > tolerance
    ]
    largest = int(np.argmax(change))
    remark = (
        f"What a step adds to the depth rose with duration and was evened out over {', '.join(spans)}: the depth of "
        f"{duration_text((largest + 1) * step)} is {change[largest]:.3g} mm greater, the largest change; the total is "
        "kept."
    )
    return _scaled(np.sort(even)[::-1], depth[-1]), (remark,)


def known_depth(curve: Curve, minutes: Floats, *, shape: str, remedy: str) -> Floats:
    """Return the depths of a curve; where it has none, its own message and what to do about the pattern.

    Parameters
    ----------
    curve
        Depths in mm of durations in minutes.
    minutes : array of float, shape (n,)
        Durations that the pattern needs; none of them is no question to the curve.
    shape
        The pattern that needs them, for the message.
    remedy
        What would make the pattern do without the shortest of them.

    Returns
    -------
    array of float, shape (n,)
        mm.

    Raises
    ------
    MethodError
        The curve has no depth for a duration.

    Examples
    --------
    >>> known_depth(lambda minutes: minutes / 2, np.array([10.0, 20.0]), shape="nested", remedy="take a longer step")
    array([ 5., 10.])
    >>> known_depth(lambda minutes: minutes * np.nan, np.array([10.0]), shape="nested", remedy="take a longer step")
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: shape "nested": found no depth of 10 min; expected depths of durations from 10 to 10 \
min; take a longer step
    """
    if not len(minutes):
        return np.empty(0)
    wanted = f"durations from {span_in_words(minutes.min(), minutes.max())}"
    try:
        depth = curve(minutes)
    except MethodError as error:
        advice = f'shape "{shape}" needs {wanted}: {remedy}'
        problems = [
            replace(problem, remedy=f"{problem.remedy}; {advice}" if problem.remedy else advice)
            for problem in error.problems
        ]
        raise MethodError(problems, unlisted=error.unlisted) from error
    if not np.isfinite(depth).all():
        first = duration_text(minutes[np.argmin(np.isfinite(depth))])
        raise MethodError(
            Problem(
                item=f'shape "{shape}"', found=f"no depth of {first}", expected=f"depths of {wanted}", remedy=remedy
            )
        )
    return depth


def check_growth(minutes: Floats, depth: Floats, *, shape: str) -> None:
    """Make sure that the depth nowhere falls with duration.

    Parameters
    ----------
    minutes, depth : array of float, shape (n,)
        Durations, rising, and their depths in mm.
    shape
        The pattern that needs them, for the message.

    Raises
    ------
    MethodError
        It falls by more than rounding; all places together.

    Examples
    --------
    >>> check_growth(np.array([30.0, 60, 90]), np.array([20.0, 20, 19]), shape="chicago")
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: shape "chicago": found a depth that falls with duration, from 20 mm in 1 h to 19 mm \
in 90 min; expected one that never falls with duration; check the depths and areal reductions of these durations
    """
    problems = Problems()
    _add_falls(problems, minutes, depth, _ROUNDING * float(np.abs(depth).max()), shape=shape)
    problems.raise_as(MethodError)


def runs(marked: npt.NDArray[np.bool_]) -> Iterator[tuple[int, int]]:
    """Return the first and one past the last of every run of marks.

    Examples
    --------
    >>> list(runs(np.array([True, False, True, True]))), list(runs(np.array([], dtype=bool)))
    ([(0, 1), (2, 4)], [])
    """
    edges = np.diff(np.concatenate([[0], marked.astype(np.int8), [0]]))
    return zip(np.flatnonzero(edges == 1).tolist(), np.flatnonzero(edges == -1).tolist(), strict=True)


def span_in_words(start: float, end: float) -> str:
    """Return minutes to minutes in words, both in one unit: hours where they are whole.

    Examples
    --------
    >>> span_in_words(120, 180), span_in_words(60, 90), span_in_words(0, 60)
    ('2 to 3 h', '60 to 90 min', '0 to 1 h')
    """
    hours = start % 60 == end % 60 == 0
    unit, length = ("h", 60.0) if hours else ("min", 1.0)
    return f"{start / length:.6g} to {end / length:.6g} {unit}"


def _scaled(increments: Floats, total: float) -> Floats:
    """Without negative ones that rounding left, and with the exact sum."""
    kept: Floats = np.maximum(increments, 0.0)
    kept *= total / kept.sum()
    return kept


def _add_rises(problems: Problems, raw: Floats, step: int, tolerance: float, *, shape: str) -> None:
    for first, last in runs(np.diff(raw) > tolerance):
        less, more = _told_apart(raw[first], raw[last])
        problems.add(
            item=f'shape "{shape}"',
            found=f"a depth per step that rises with duration, from {less} mm in "
            f"{span_in_words(first * step, (first + 1) * step)} to {more} mm in "
            f"{span_in_words(last * step, (last + 1) * step)}",
            expected="one that never rises with duration",
            remedy="check the depths and areal reductions of these durations, or even them out with smooth = true",
        )


def _add_falls(problems: Problems, minutes: Floats, depth: Floats, tolerance: float, *, shape: str) -> None:
    times, reached = np.concatenate([[0.0], minutes]), np.concatenate([[0.0], depth])
    for first, last in runs(np.diff(reached) < -tolerance):
        more, less = _told_apart(reached[first], reached[last])
        problems.add(
            item=f'shape "{shape}"',
            found=f"a depth that falls with duration, from {more} mm in {duration_text(times[first])} to {less} mm in "
            f"{duration_text(times[last])}",
            expected="one that never falls with duration",
            remedy="check the depths and areal reductions of these durations",
        )


def _told_apart(one: float, other: float) -> tuple[str, str]:
    """Two numbers in as few digits as show that they differ, four at least."""
    return next(
        (words for words in ((f"{one:.{n}g}", f"{other:.{n}g}") for n in range(4, 17)) if words[0] != words[1]),
        (f"{one:.17g}", f"{other:.17g}"),
    )

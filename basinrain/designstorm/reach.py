"""How far the depths of a source reach, and the way between the durations and frequencies that it knows."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.measures import depth_words, duration_text
from basinrain.errors import MethodError, Problems

__all__ = ["SLACK", "bracket", "check_reach", "refuse_unphysical"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.intp]

SLACK: Final = 1e-9
"""Relative; depths, durations and reduced variates that differ by less are equal."""

_REMEDY: Final = "give depths for it, or allow it with extrapolate = true"


def bracket(known: Floats, wanted: Floats) -> tuple[Ints, Ints, Floats]:
    """Return between which known values every wanted one lies, and how far along.

    Parameters
    ----------
    known : array of float, shape (n,)
        Rising; at least one.
    wanted : array of float, shape (m,)

    Returns
    -------
    low, high : array of int, shape (m,)
        Places in ``known``: the neighbours, or those of the last segment outside; both 0 where only one is known.
    share : array of float, shape (m,)
        0 at ``low``, 1 at ``high``; outside 0 to 1 where ``wanted`` lies outside.

    Examples
    --------
    >>> bracket(np.array([1.0, 2.0, 4.0]), np.array([1.0, 3.0, 5.0]))
    (array([0, 1, 1]), array([1, 2, 2]), array([0. , 0.5, 1.5]))
    """
    last = len(known) - 1
    low = np.clip(np.searchsorted(known, wanted, side="right") - 1, 0, max(last - 1, 0))
    high = np.minimum(low + 1, last)
    width = known[high] - known[low]
    share = np.divide(wanted - known[low], width, out=np.zeros(len(wanted)), where=width > 0)
    return low, high, share


def check_reach(
    minutes: Floats,
    frequency: Frequency,
    *,
    durations: Sequence[float] | Floats,
    frequencies: Sequence[Frequency],
    extrapolate: bool,
    fixed_law: bool = False,
) -> bool:
    """Refuse what a source of depths does not reach.

    Parameters
    ----------
    minutes : array of float, shape (n,)
        Durations asked for.
    frequency
        The frequency asked for.
    durations, frequencies
        What the source knows, rising; the reach is from the first to the last.
    extrapolate
        Whether to go on beyond the ends.
    fixed_law
        Whether the source goes on by a law of its own, so that one duration or frequency is enough to go on from.

    Returns
    -------
    bool
        Whether anything that is asked for lies outside.

    Raises
    ------
    MethodError
        All of: the frequency is counted in another series; a duration is not above 0; a duration or the frequency lies
        outside and ``extrapolate`` is false, or nothing is known to go on from.

    Examples
    --------
    >>> known = {"durations": (60.0, 240.0), "frequencies": [Frequency(years, "annual-maximum") for years in (2, 10)]}
    >>> five = Frequency(5, "annual-maximum")
    >>> check_reach(np.array([60.0, 90.0]), five, **known, extrapolate=False)
    False
    >>> check_reach(np.array([30.0]), five, **known, extrapolate=True)
    True
    >>> check_reach(np.array([30.0]), five, **known, extrapolate=False)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: duration 30 min: found that the depths are of 1 h to 4 h; expected a duration within \
them; give depths for it, or allow it with extrapolate = true
    """
    problems = Problems()
    first, last = frequencies[0], frequencies[-1]
    if frequency.series != first.series:
        problems.add(
            item=frequency.label,
            found=f"that it is counted in {_kind(frequency.series)}, the depths in {_kind(first.series)}",
            expected="one kind of series",
            remedy="ask for frequencies of the depths' series, or have them brought over with convert = true",
        )
        problems.raise_as(MethodError)
    span = " to ".join(duration_text(float(end)) for end in dict.fromkeys((durations[0], durations[-1])))
    lone = len(durations) == 1 and not fixed_law
    outside = (minutes < durations[0] * (1 - SLACK)) | (minutes > durations[-1] * (1 + SLACK))
    for asked in minutes[~(minutes > 0) | np.isinf(minutes)]:
        problems.add(item="duration", found=f"{asked:g} minutes", expected="more than 0 and finite")
    asked_outside = np.unique(minutes[outside & (minutes > 0) & np.isfinite(minutes)])
    for side in (asked_outside[asked_outside < durations[0]], asked_outside[asked_outside > durations[-1]]):
        if not len(side) or (extrapolate and not lone):
            continue
        ends = " to ".join(duration_text(float(end)) for end in dict.fromkeys((side[0], side[-1])))
        problems.add(
            item=f"duration{'s' if len(side) > 1 else ''} {ends}",
            found=f"that the depths have only {span}" if lone else f"that the depths are of {span}",
            expected="a duration within them",
            remedy="give depths of two durations or more" if lone else _REMEDY,
        )
    beyond = not first.variate - SLACK <= frequency.variate <= last.variate + SLACK
    lone = len(frequencies) == 1 and not fixed_law
    if beyond and (lone or not extrapolate):
        reach = first.label if len(frequencies) == 1 else f"{first.label} to {last.label}"
        problems.add(
            item=frequency.label,
            found=f"that the depths have only {reach}" if lone else f"that the depths are of {reach}",
            expected="a frequency within them",
            remedy="give depths of two frequencies or more" if lone else _REMEDY,
        )
    problems.raise_as(MethodError)
    return beyond or bool(outside.any())


def refuse_unphysical(depth: Floats, minutes: Floats, points: Sequence[str], frequency: Frequency) -> None:
    """Refuse depths, gone on beyond what is known, that no rain can have.

    Parameters
    ----------
    depth : array of float, shape (n_points, n)
        mm.
    minutes : array of float, shape (n,)
        Rising.
    points, frequency
        For the message.

    Raises
    ------
    MethodError
        A depth is not above 0 or falls with duration, or an intensity rises with it; every point once.

    Examples
    --------
    >>> refuse_unphysical(
    ...     np.array([[20.0, 18.0]]), np.array([60.0, 120.0]), ["Quill"], Frequency(10, "annual-maximum")
    ... )
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: point Quill, 2 h, AEP 0.1 (1 in 10): found 18 mm (9 mm/h) after 20 mm (20 mm/h) of \
1 h by extrapolation; expected a depth above 0 that does not fall with duration, and an intensity that does not rise; \
ask for less far outside, or give depths for it
    """
    wrong = ~(depth > 0)
    with np.errstate(invalid="ignore"):
        wrong[:, 1:] |= depth[:, 1:] < depth[:, :-1] * (1 - SLACK)
        rate = depth / minutes
        wrong[:, 1:] |= rate[:, 1:] > rate[:, :-1] * (1 + SLACK)
    problems = Problems()
    for p in np.flatnonzero(wrong.any(axis=1)).tolist():
        d = int(wrong[p].argmax())
        before = f" after {depth_words(depth[p, d - 1], minutes[d - 1])} of {duration_text(minutes[d - 1])}"
        problems.add(
            item=f"point {points[p]}, {duration_text(minutes[d])}, {frequency.label}",
            found=depth_words(depth[p, d], minutes[d]) + (before if d else "") + " by extrapolation",
            expected="a depth above 0 that does not fall with duration, and an intensity that does not rise",
            remedy="ask for less far outside, or give depths for it",
        )
    problems.raise_as(MethodError)


def _kind(series: str) -> str:
    return "an annual maximum series" if series == ANNUAL_MAXIMUM else "a partial duration series"

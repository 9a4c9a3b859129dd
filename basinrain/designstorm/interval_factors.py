"""Factors that raise depths of fixed clock intervals to those of any interval of the same length.

The greatest depth between two full hours is at most that of any 60 minutes. Nothing in the package applies these
factors unless a job asks for them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.measures import duration_text
from basinrain.errors import JobError, MethodError, Problem, Problems

__all__ = ["INTERVAL_FACTORS", "IntervalFactor", "hershfield", "interval_factor", "weiss"]

Floats = npt.NDArray[np.float64]

# From memory. One entry a number of intervals, from 1 on.
_ROUNDED: Final = (1.13, 1.04, 1.03, 1.03, *(1.02,) * 4, *(1.01,) * 16)
_ENTRIES: Final = len(_ROUNDED)
_HAIR: Final = 1e-9


@dataclass(frozen=True, kw_only=True)
class IntervalFactor:
    """A set of factors, as the registry has it.

    Parameters
    ----------
    name
        As a job says it.
    factor
        Gives factors of numbers of intervals.
    covers
        Says for which numbers of intervals there is one, which ``range`` puts in words.
    range
    source
        Where it is published.
    evidence
        Where values are not from a text that was seen, that is said; else empty.
    """

    name: str
    factor: Callable[[Floats], Floats]
    covers: Callable[[Floats], npt.NDArray[np.bool_]]
    range: str
    source: str
    evidence: str = ""


def weiss(intervals: Floats) -> Floats:
    """Return the factors of Weiss (1964), 8n / (8n - 1).

    Of rain that falls at once, the wettest clock interval catches all; of steady rain as long as the interval, 3/4 on
    average. The factor of one interval is one over the mean of the two.

    Parameters
    ----------
    intervals : array of float
        The duration over the interval of observation, n: 1 or more, whole or not.

    Returns
    -------
    array of float, shape as ``intervals``

    Raises
    ------
    MethodError
        n is below 1, or not finite; each such n.

    Examples
    --------
    >>> weiss(np.array([1.0, 2.0, 24.0])).round(4)
    array([1.1429, 1.0667, 1.0052])
    """
    return _checked("weiss", np.asarray(intervals, dtype=np.float64))


def hershfield(intervals: Floats) -> Floats:
    """Return the rounded factors of Hershfield (1961) and the World Meteorological Organization, from memory.

    Parameters
    ----------
    intervals : array of float
        The duration over the interval of observation, n: a whole number from 1 to 24, where the table ends.

    Returns
    -------
    array of float, shape as ``intervals``

    Raises
    ------
    MethodError
        n is none of these; each such n.

    Examples
    --------
    >>> hershfield(np.array([1.0, 2.0, 6.0, 24.0]))
    array([1.13, 1.04, 1.02, 1.01])
    """
    return _checked("hershfield", np.asarray(intervals, dtype=np.float64))


def interval_factor(method: str, minutes: Floats, observed_every: float) -> Floats:
    """Return the factors of durations whose depths were observed at fixed intervals.

    Parameters
    ----------
    method
        One of :data:`INTERVAL_FACTORS`.
    minutes : array of float, shape (n,)
        Durations.
    observed_every
        The interval of observation, minutes.

    Returns
    -------
    array of float, shape (n,)
        Above 1.

    Raises
    ------
    JobError
        The method is not known, or the interval is not above 0.
    MethodError
        A duration is below the interval of observation, or the method has no factor for it; all together.

    Examples
    --------
    >>> interval_factor("weiss", np.array([60.0, 1440.0]), 60.0).round(4)
    array([1.1429, 1.0052])
    >>> interval_factor("weiss", np.array([30.0]), 60.0)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: [design.depths] interval_factor 'weiss': found a duration of 30 min, 0.5 intervals \
of 1 h; expected one interval or more; leave the duration out, or the factor
    """
    problems = Problems()
    problems.check_known("[design.depths] interval_factor", method, INTERVAL_FACTORS)
    if not (np.isfinite(observed_every) and observed_every > 0):
        problems.add(item="[design.depths] observed_every", found=f"{observed_every:g} minutes", expected="more than 0")
    problems.raise_as(JobError)
    return _checked(method, np.atleast_1d(np.asarray(minutes, dtype=np.float64)) / observed_every, every=observed_every)


def _checked(method: str, intervals: Floats, *, every: float | None = None) -> Floats:
    known = INTERVAL_FACTORS[method]
    wrong = intervals[~known.covers(intervals)]
    if wrong.size:
        raise MethodError(
            Problem(
                item=f"[design.depths] interval_factor '{method}'",
                found=f"{n:g} intervals"
                if every is None
                else f"a duration of {duration_text(float(n) * every)}, {n:g} intervals of {duration_text(every)}",
                expected=known.range,
                remedy="leave the duration out, or the factor",
            )
            for n in wrong
        )
    return known.factor(intervals)


def _weiss(n: Floats) -> Floats:
    factors: Floats = 8 * n / (8 * n - 1)
    return factors


def _one_or_more(n: Floats) -> npt.NDArray[np.bool_]:
    return np.isfinite(n) & (n >= 1)


def _rounded(n: Floats) -> Floats:
    return np.array(_ROUNDED)[np.rint(n).astype(np.int64) - 1]


def _in_table(n: Floats) -> npt.NDArray[np.bool_]:
    whole = np.rint(n)
    return (np.abs(n - whole) <= _HAIR * whole) & (whole >= 1) & (whole <= _ENTRIES)


INTERVAL_FACTORS: Final[Mapping[str, IntervalFactor]] = MappingProxyType(
    {
        known.name: known
        for known in (
            IntervalFactor(
                name="weiss",
                factor=_weiss,
                covers=_one_or_more,
                range="one interval or more",
                source="Weiss, L. L. (1964): Ratio of true to fixed-interval maximum rainfall, Journal of the "
                "Hydraulics Division, ASCE, 90",
            ),
            IntervalFactor(
                name="hershfield",
                factor=_rounded,
                covers=_in_table,
                range=f"a whole number of intervals, 1 to {_ENTRIES}",
                source="Hershfield, D. M. (1961): Rainfall frequency atlas of the United States, Weather Bureau "
                "Technical Paper 40, for one interval; World Meteorological Organization, rounded, for 2 to 24",
                evidence="from memory",
            ),
        )
    }
)
"""The factors, by the name that a job gives."""

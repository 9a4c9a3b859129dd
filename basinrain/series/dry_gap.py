"""The dry gap that separates independent storms, estimated from a series by the exponential-gap test."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import MethodError, Problem
from basinrain.series.steps import check_between, check_steps, constant_step, in_words
from basinrain.series_check import WET_DEPTH

__all__ = ["LEAST_SPELLS", "DryGap", "estimate_dry_gap"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]

LEAST_SPELLS: Final = 30
"""Fewest dry spells from which a coefficient of variation is taken; its standard error is then about 0.2."""


@dataclass(frozen=True, eq=False, kw_only=True)
class DryGap:
    """The result of the exponential-gap test.

    Parameters
    ----------
    gap : timedelta64[s]
        The smallest candidate at which the coefficient of variation is 1 or less.
    candidates : array of timedelta64[s], shape (n_candidates,)
        Whole steps, from one step up, as far as :data:`LEAST_SPELLS` spells are left.
    cv : array of float, shape (n_candidates,)
        Coefficient of variation of the dry spells of at least each candidate, dimensionless.
    spells : array of int, shape (n_candidates,)
        How many spells these are.
    left_out : int
        Dry spells that are not counted: a step without a number or the series' own end is at one of their ends, so
        that their length is not known.
    at_step : bool
        Whether the first candidate is already enough: the gap is one step, or shorter than the steps can show.

    Examples
    --------
    See :func:`estimate_dry_gap`.
    """

    gap: np.timedelta64
    candidates: npt.NDArray[np.timedelta64]
    cv: Floats
    spells: Ints
    left_out: int
    at_step: bool


def estimate_dry_gap(starts: Times, ends: Times, depth: Floats, *, wet_depth: float = WET_DEPTH) -> DryGap:
    """Return the smallest dry gap between storms for which the times between them may be exponential.

    Storms that come independently of each other, and are short against the times between them, have exponential times
    between them, whose standard deviation is their mean. Pauses inside storms are many and short and raise the
    coefficient of variation above 1. So dry spells shorter than a candidate are taken for pauses, and the smallest
    candidate is sought for which the spells of at least its length have a coefficient of variation of 1
    (Restrepo-Posada and Eagleson 1982; the rule from memory). The spells enter at their full length, not at what
    exceeds the candidate: the time between two storms is all of the dry time between them, and the coefficient of
    exponential excesses is 1 for every candidate that is long enough, which singles out none.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``, and the next begins where it ends; all of one length.
    depth : array of float, shape (n,)
        mm, of one basin; NaN where it is missing.
    wet_depth
        mm in a step; a step with at least so much is wet and ends a dry spell.

    Returns
    -------
    DryGap
        With ``dry_gap=result.gap``, :func:`~basinrain.series.events.find_events` separates at just the spells that were
        counted at that candidate.

    Raises
    ------
    DataError
        The series is none.
    JobError
        ``wet_depth`` is not above 0.
    MethodError
        Steps differ in length; fewer than :data:`LEAST_SPELLS` dry spells; or the coefficient of variation is still
        above 1 with the fewest spells that may be used.

    Notes
    -----
    Mean and standard deviation (with n - 1) are of spells from the whole series, all seasons together. A spell that
    holds a step without a number is left out, which loses long spells sooner than short ones.

    Examples
    --------
    Storms of two wet hours each, between which it is dry for 11, 12, 13, 14 ... hours, and with one dry hour
    between the two.

    >>> hours = [hour for k in range(31) for hour in [1, 0, 1] + [0] * (11 + k)]
    >>> ends = np.datetime64("2031-01-01T00", "s") + np.arange(1, len(hours) + 1) * np.timedelta64(3600, "s")
    >>> found = estimate_dry_gap(ends - 3600, ends, np.array(hours, dtype=float))
    >>> found.gap.astype("timedelta64[h]"), found.spells[:3], found.cv[:2].round(3)
    (np.timedelta64(2,'h'), array([61, 30, 30]), array([1.056, 0.345]))
    """
    begin, end, values = check_steps(starts, ends, depth, basins=False)
    check_between(wet_depth, 0, np.inf, item="wet_depth", closed=False)
    step = constant_step(begin, end, wanted_for="dry gap")
    lengths, left_out = _dry_spells(values, wet_depth)
    if len(lengths) < LEAST_SPELLS:
        raise MethodError(
            Problem(
                item="dry gap",
                found=f"{len(lengths)} dry spells between wet steps",
                expected=f"{LEAST_SPELLS} at least, to tell pauses of storms from times between them",
                remedy="give the dry gap, or a longer series",
            )
        )
    # In whole steps, so that sums are exact: spells of at least k steps are the tail of the sorted lengths.
    rising = np.sort(lengths)
    steps = np.arange(1, rising[-LEAST_SPELLS] + 1)
    at = np.searchsorted(rising, steps)
    spells = len(rising) - at
    once, twice = (np.cumsum(rising[::-1] ** power)[::-1][at] for power in (1, 2))
    cv = np.sqrt((spells * twice - once**2) / (spells - 1.0) / spells) * spells / once
    enough = np.flatnonzero(cv <= 1)
    if not len(enough):
        raise MethodError(
            Problem(
                item="dry gap",
                found=f"a coefficient of variation of the dry spells from {cv.max():.2f} down to {cv.min():.2f}, with "
                f"gaps up to {in_words(int(steps[-1]) * step)} and {spells[-1]} spells left",
                expected="1 at some gap",
                remedy="give the dry gap, or take one season or a longer series",
            )
        )
    candidates = (steps * step).astype("timedelta64[s]")
    return DryGap(
        gap=candidates[enough[0]],
        candidates=candidates,
        cv=cv,
        spells=spells,
        left_out=left_out,
        at_step=bool(enough[0] == 0),
    )


def _dry_spells(values: Floats, wet_depth: float) -> tuple[Ints, int]:
    """Return the lengths in steps of the dry spells with a wet step at either end, and how many have none at one."""
    dry = values < wet_depth
    edges = np.diff(np.concatenate([[False], dry, [False]]).astype(np.int8))
    first, stop = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    missing = np.concatenate([[True], np.isnan(values), [True]])
    whole = ~(missing[first] | missing[stop + 1])
    return (stop - first)[whole], int((~whole).sum())

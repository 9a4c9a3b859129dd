"""Whether annual maxima, and the frequencies asked of them, can be used."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.l_moments import LMoments
from basinrain.designstorm.measures import duration_text
from basinrain.errors import DataError, MethodError, Problems

__all__ = ["FEWEST_YEARS", "REACH", "check_asked", "check_depths", "check_maxima", "check_series"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

FEWEST_YEARS: Final = 10
"""Series of fewer years are refused."""

REACH: Final = 2
"""Times the years of the record up to which return periods are given without being asked twice."""


def check_maxima(maxima: Floats, years: Ints, minutes: Floats, areas: Sequence[str]) -> None:
    """Refuse annual maxima that are none, or do not go with their axes.

    Parameters
    ----------
    maxima : array of float, shape (n_years, n_durations, n_areas)
        mm; NaN where a year does not count.
    years, minutes : array
        Rising.
    areas
        All different.

    Raises
    ------
    DataError
        All problems together.

    Examples
    --------
    >>> check_maxima(np.array([[[20.0]], [[-1.0]]]), np.array([2031, 2031]), np.array([60.0]), ["Quill"])
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: years: found 2031 after 2031; expected each once, rising
    area Quill, 1 h, 2031: found -1 mm; expected a finite depth of 0 or more, or none
    """
    problems = Problems()
    shape = (len(years), len(minutes), len(areas))
    if np.shape(maxima) != shape:
        problems.add(item="annual maxima", found=f"an array of shape {np.shape(maxima)}", expected=f"{shape}")
        problems.raise_as(DataError)
    for what, size in zip(("years", "durations", "areas"), shape, strict=True):
        if not size:
            problems.add(item="annual maxima", found=f"no {what}", expected="one at least")
    for place in np.flatnonzero(~(np.isfinite(minutes) & (minutes > 0))):
        problems.add(item="a duration", found=f"{minutes[place]:g} minutes", expected="more than 0 and finite")
    for what, axis in (("years", years), ("durations", minutes)):
        for place in np.flatnonzero(np.diff(axis) <= 0):
            problems.add(item=what, found=f"{axis[place + 1]:g} after {axis[place]:g}", expected="each once, rising")
    for name in sorted({name for name in areas if list(areas).count(name) > 1}):
        problems.add(item=f"area {name}", found="the id twice", expected="each area once")
    for t, d, a in np.argwhere((maxima < 0) | np.isinf(maxima)).tolist():
        problems.add(
            item=f"area {areas[a]}, {duration_text(minutes[d])}, {years[t]}",
            found=f"{maxima[t, d, a]:g} mm",
            expected="a finite depth of 0 or more, or none",
        )
    problems.raise_as(DataError)


def check_series(
    moments: LMoments, minutes: Floats, areas: Sequence[str], problems: Problems, *, shape_wanted: bool
) -> None:
    """Report series that no distribution can be fitted to.

    Parameters
    ----------
    moments : LMoments
        Of the annual maxima; arrays of shape (n_areas, n_durations).
    minutes, areas
        Their axes.
    problems
        Takes series that are too short, and those whose maxima are all equal.
    shape_wanted
        Whether a shape is fitted, which maxima of which all but one are equal do not have.

    Examples
    --------
    >>> from basinrain.designstorm.l_moments import l_moments
    >>> problems = Problems()
    >>> moments = l_moments(np.full((12, 1, 1), 30.0))
    >>> check_series(moments, np.array([60.0]), ["Quill"], problems, shape_wanted=False)
    >>> problems.raise_as(MethodError)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: area Quill, 1 h: found annual maxima that are all 30 mm; expected maxima that \
differ; look at the record
    """
    for a, d in np.ndindex(moments.n.shape):
        where = f"area {areas[a]}, {duration_text(float(minutes[d]))}"
        if moments.n[a, d] < FEWEST_YEARS:
            problems.add(
                item=where,
                found=f"{moments.n[a, d]} years with an annual maximum",
                expected=f"{FEWEST_YEARS} at least",
                remedy="take a longer record, or depths of a table",
            )
        elif not moments.scale[a, d] > 0:
            problems.add(
                item=where,
                found=f"annual maxima that are all {moments.mean[a, d]:g} mm",
                expected="maxima that differ",
                remedy="look at the record",
            )
        elif shape_wanted and not abs(moments.ratio[a, d]) < 1:
            problems.add(
                item=where,
                found="annual maxima of which all but one are equal",
                expected="maxima that differ, to fit a shape to",
                remedy='look at the record, or write distribution = "gumbel"',
            )


def check_asked(
    frequencies: Sequence[Frequency],
    moments: LMoments,
    minutes: Floats,
    areas: Sequence[str],
    problems: Problems,
    *,
    beyond_record: bool,
) -> tuple[Frequency, ...]:
    """Return the frequencies once each, the most frequent first; report those that the record cannot tell.

    Parameters
    ----------
    frequencies
        As asked for.
    moments, minutes, areas
        As for :func:`check_series`.
    problems
        Takes frequencies of another series, return periods of more than twice the years of the shortest series unless
        ``beyond_record``, and no frequency at all.
    beyond_record
        Whether those are given all the same.

    Returns
    -------
    tuple of Frequency

    Examples
    --------
    >>> from basinrain.designstorm.l_moments import l_moments
    >>> moments = l_moments(np.arange(20.0, 32.0)[:, None, None])
    >>> often = [Frequency(years, "annual-maximum") for years in (100, 2, 2)]
    >>> problems = Problems()
    >>> asked = check_asked(often, moments, np.array([60.0]), ["Quill"], problems, beyond_record=False)
    >>> [frequency.return_period for frequency in asked]
    [2, 100]
    >>> problems.raise_as(MethodError)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: AEP 0.01 (1 in 100): found a return period of over 2 times the 12 years of area \
Quill, 1 h; expected 24 years at most; ask for a less rare one, or allow it with beyond_record = true
    """
    if not frequencies:
        problems.add(item="frequencies", found="none", expected="one at least")
    a, d = divmod(int(moments.n.argmin()), moments.n.shape[1])
    n = int(moments.n[a, d])
    for frequency in sorted(set(frequencies)):
        if frequency.series != ANNUAL_MAXIMUM:
            problems.add(
                item=frequency.label,
                found="that it is not counted in an annual maximum series, as the record's depths are",
                expected="one kind of series",
                remedy="ask for frequencies of an annual maximum series, or have them brought over with convert = true",
            )
        # A probability that is written in decimals need not give whole years.
        elif frequency.return_period > REACH * n * (1 + 1e-9) and not beyond_record:
            problems.add(
                item=frequency.label,
                found=f"a return period of over {REACH} times the {n} years of area {areas[a]}, "
                f"{duration_text(minutes[d])}",
                expected=f"{REACH * n} years at most",
                remedy="ask for a less rare one, or allow it with beyond_record = true",
            )
    return tuple(sorted(set(frequencies)))


def check_depths(depth: Floats, minutes: Floats, areas: Sequence[str], frequencies: Sequence[Frequency]) -> None:
    """Refuse fitted depths that no rain can have.

    Parameters
    ----------
    depth : array of float, shape (n_areas, n_durations, n_frequencies)
        mm.
    minutes, areas, frequencies
        Its axes.

    Raises
    ------
    MethodError
        A depth is not above 0; all of them together.

    Examples
    --------
    >>> often = [Frequency(1.01, "annual-maximum")]
    >>> check_depths(np.array([[[-0.5]]]), np.array([60.0]), ["Quill"], often)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: area Quill, 1 h, AEP 0.9901 (1 in 1.01): found -0.5 mm from the fitted \
distribution; expected a depth above 0; ask for a rarer frequency; the fit does not reach to so frequent a one
    """
    problems = Problems()
    for a, d, t in np.argwhere(~(depth > 0)).tolist():
        problems.add(
            item=f"area {areas[a]}, {duration_text(minutes[d])}, {frequencies[t].label}",
            found=f"{depth[a, d, t]:.3g} mm from the fitted distribution",
            expected="a depth above 0",
            remedy="ask for a rarer frequency; the fit does not reach to so frequent a one",
        )
    problems.raise_as(MethodError)

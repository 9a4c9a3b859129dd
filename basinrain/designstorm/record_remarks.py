"""What a reader must know of depths that come from the record, in sentences."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.extreme_values import GEV, GUMBEL
from basinrain.designstorm.l_moments import LMoments
from basinrain.designstorm.maxima_check import REACH
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.record_fit import RecordFit

__all__ = ["SHORT_TITLES", "TITLES", "record_remarks"]

Floats = npt.NDArray[np.float64]

TITLES: Final[Mapping[str, str]] = MappingProxyType({GUMBEL: "Gumbel", GEV: "generalised extreme value"})
"""The distributions by name, as they are said."""

SHORT_TITLES: Final[Mapping[str, str]] = MappingProxyType({**TITLES, GEV: "GEV"})
"""The same where there is little room."""

_DOUBTFUL: Final = 0.05
_LISTED: Final = 6


def record_remarks(
    distribution: str,
    fits: Mapping[str, RecordFit],
    moments: LMoments,
    *,
    shape_p_value: Floats,
    minutes: Floats,
    areas: Sequence[str],
    frequencies: Sequence[Frequency],
    n_years: int,
) -> tuple[str, ...]:
    """Return what must be said of a fit to the record.

    Parameters
    ----------
    distribution
        The one that was taken.
    fits
        Both, by name.
    moments : LMoments
        Of the annual maxima; arrays of shape (n_areas, n_durations).
    shape_p_value : array of float, shape (n_areas, n_durations)
        Of the test whether the shape is 0.
    minutes, areas, frequencies
        The axes.
    n_years
        Years that count anywhere.
    """
    words = _Words(minutes, areas, frequencies)
    return tuple(
        remark
        for remark in (
            *_of_choice(distribution, fits, moments, frequencies),
            *_of_shape(distribution, fits[GEV], shape_p_value, words),
            _of_goodness(distribution, fits[distribution], words),
            *_of_reach(moments, frequencies, n_years, words),
            _of_raising(fits[distribution], words),
        )
        if remark
    )


class _Words:
    """Names the entries of arrays by area and duration, and by frequency where there is a third axis."""

    def __init__(self, minutes: Floats, areas: Sequence[str], frequencies: Sequence[Frequency]) -> None:
        self._axes = (areas, [duration_text(each) for each in minutes], [each.label for each in frequencies])

    def __call__(self, place: Sequence[int]) -> str:
        return " ".join(axis[k] for axis, k in zip(self._axes, place, strict=False))

    def of(self, wrong: npt.NDArray[np.bool_]) -> str:
        places = [self(place) for place in np.argwhere(wrong).tolist()]
        more = f" and {len(places) - _LISTED} more" if len(places) > _LISTED else ""
        return ", ".join(places[:_LISTED]) + more


def _of_choice(
    distribution: str, fits: Mapping[str, RecordFit], moments: LMoments, frequencies: Sequence[Frequency]
) -> list[str]:
    least, most = int(moments.n.min()), int(moments.n.max())
    years = f"{least} years" if least == most else f"{least} to {most} years"
    with np.errstate(invalid="ignore"):
        change = 100 * (fits[GEV].depth[..., -1] / fits[GUMBEL].depth[..., -1] - 1)
    said = f"The {TITLES[distribution]} distribution is fitted to annual maxima of {years} by L-moments."
    if distribution == GUMBEL:
        said += " Gumbel underestimates rare depths where the true upper tail is heavier."
    known = change[np.isfinite(change)]
    if known.size:
        said += (
            f" At {frequencies[-1].label} depths of the generalised extreme value distribution differ from Gumbel's by "
            f"{known.min():+.1f} to {known.max():+.1f} %."
        )
    return [said]


def _of_shape(distribution: str, gev: RecordFit, p_value: Floats, words: _Words) -> list[str]:
    said = []
    shape = gev.parameters.shape
    none = np.isnan(shape)
    if none.any():
        said.append(f"No shape can be fitted where all maxima but one are equal: {words.of(none)}.")
    doubtful = p_value < _DOUBTFUL
    if distribution == GUMBEL and doubtful.any():
        heavier, lighter = doubtful & (shape < 0), doubtful & (shape > 0)
        parts = [
            f"{tail} tail: {words.of(which)}"
            for tail, which in (("heavier", heavier), ("lighter", lighter))
            if which.any()
        ]
        said.append(f"The test of the shape speaks against Gumbel at 5 %, {'; '.join(parts)}.")
    bounded = shape > 0
    if distribution == GEV and bounded.any():
        least = np.unravel_index(np.where(bounded, gev.parameters.bound, np.inf).argmin(), shape.shape)
        said.append(
            f"The fitted distribution has an upper bound, which rain does not have to respect: {words.of(bounded)}; "
            f"the lowest is {gev.parameters.bound[least]:.1f} mm ({words([int(k) for k in least])})."
        )
    return said


def _of_goodness(distribution: str, fit: RecordFit, words: _Words) -> str:
    doubtful = fit.goodness.p_value < _DOUBTFUL
    if not doubtful.any():
        return ""
    return (
        f"The probability plot of the {TITLES[distribution]} distribution is less straight than 95 % of its own "
        f"samples: {words.of(doubtful)}."
    )


def _of_reach(moments: LMoments, frequencies: Sequence[Frequency], n_years: int, words: _Words) -> list[str]:
    said = []
    least = int(moments.n.min())
    far = [each.label for each in frequencies if each.return_period > REACH * least * (1 + 1e-9)]
    if far:
        said.append(f"Beyond {REACH} times the {least} years of the shortest series: {', '.join(far)}.")
    short = moments.n < n_years
    if short.any():
        place = np.unravel_index(moments.n.argmin(), moments.n.shape)
        said.append(
            f"Not all of the {n_years} years count in {words.of(short)}; the fewest, {least}, in "
            f"{words([int(k) for k in place])}."
        )
    return said


def _of_raising(fit: RecordFit, words: _Words) -> str:
    raised = fit.depth > fit.quantiles * (1 + 1e-9)
    if not raised.any():
        return ""
    places = np.argwhere(raised).tolist()
    parts = [
        f"{words(place)} from {fit.quantiles[tuple(place)]:.2f} to {fit.depth[tuple(place)]:.2f} mm"
        for place in places[:_LISTED]
    ]
    more = f" and {len(places) - _LISTED} more" if len(places) > _LISTED else ""
    most = 100 * float((fit.depth[raised] / fit.quantiles[raised] - 1).max())
    return (
        f"Fits of different durations cross; so that depth does not fall with duration nor intensity rise, these are "
        f"raised by up to {most:.2f} %: {'; '.join(parts)}{more}."
    )

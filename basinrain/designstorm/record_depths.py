"""Depths by duration and frequency from the record: extreme value distributions fitted to annual maxima."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.extreme_values import DISTRIBUTIONS, GEV, GUMBEL, check_distribution
from basinrain.designstorm.goodness import shape_test
from basinrain.designstorm.l_moments import LMoments, l_moments
from basinrain.designstorm.maxima_check import check_asked, check_depths, check_maxima, check_series
from basinrain.designstorm.point_depths import PointDepths
from basinrain.designstorm.record_fit import RecordFit, fit_record
from basinrain.designstorm.record_remarks import TITLES, record_remarks
from basinrain.designstorm.resampling import SEED, draw_years
from basinrain.errors import MethodError, Problems

__all__ = ["YEARS_FOR_GEV", "RecordDepths", "record_depths"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

YEARS_FOR_GEV: Final = 50
"""From how many years on the generalised extreme value distribution is fitted unless another is asked for."""


@dataclass(frozen=True, eq=False, kw_only=True)
class RecordDepths:
    """Depths by duration and frequency from annual maxima of a record.

    Parameters
    ----------
    depths : PointDepths
        The depths of the distribution that was taken; areal, in an annual maximum series.
    distribution : str
        Its name, of :data:`~basinrain.designstorm.extreme_values.DISTRIBUTIONS`.
    fits : mapping of str to RecordFit
        Both distributions by name.
    moments : LMoments
        Of the annual maxima; arrays of shape (n_areas, n_durations).
    shape_p_value : array of float, shape (n_areas, n_durations)
        Of the test whether the shape of the generalised extreme value distribution is 0, that is Gumbel; NaN where
        there is no shape.
    remarks : tuple of str
        Whole sentences on what a reader must know.
    """

    depths: PointDepths
    distribution: str
    fits: Mapping[str, RecordFit]
    moments: LMoments
    shape_p_value: Floats
    remarks: tuple[str, ...]

    @property
    def fit(self) -> RecordFit:
        """The fit that was taken."""
        return self.fits[self.distribution]

    @property
    def lower(self) -> Floats:
        """The lower end of the 90 % interval of the depths, mm."""
        return self.fit.lower

    @property
    def upper(self) -> Floats:
        """The upper end of the 90 % interval of the depths, mm."""
        return self.fit.upper

    @property
    def n_years(self) -> Ints:
        """Years that count, shape (n_areas, n_durations)."""
        return self.moments.n


def record_depths(
    maxima: Floats,
    years: Ints,
    minutes: Floats,
    areas: Sequence[str],
    *,
    frequencies: Sequence[Frequency],
    distribution: str | None = None,
    beyond_record: bool = False,
    resamples: int = 1000,
    seed: int = SEED,
) -> RecordDepths:
    """Return depths by duration and frequency from the annual maxima of areas.

    Parameters
    ----------
    maxima : array of float, shape (n_years, n_durations, n_areas)
        Greatest depth of every year, mm, 0 or more; NaN where a year does not count. Years that count nowhere do not
        change anything.
    years : array of int, shape (n_years,)
        Rising.
    minutes : array of float, shape (n_durations,)
        Durations, rising.
    areas
        Ids of the areas, all different.
    frequencies
        Counted in an annual maximum series; the table has them once each, the most frequent first.
    distribution
        ``"gumbel"`` or ``"gev"``, for all areas and durations. By default Gumbel where any series has fewer than
        :data:`YEARS_FOR_GEV` years, else the generalised extreme value distribution.
    beyond_record
        Whether return periods of more than twice the years of the shortest series are given.
    resamples
        Samples for intervals and goodness of fit.
    seed
        Of their drawing; the same one gives the same result.

    Returns
    -------
    RecordDepths

    Raises
    ------
    DataError
        Arrays do not fit each other; depths are below 0 or infinite; axes are not rising.
    JobError
        The distribution is not known; too few samples are asked for.
    MethodError
        All of: a series of fewer than 10 years, or whose maxima are all equal, or all but one; a frequency of another
        series; return periods beyond what the record can tell. A depth that comes out at 0 or below.

    Notes
    -----
    Both distributions are fitted by L-moments. Intervals and p-values are by parametric bootstrap: every sample has the
    length of the record, its years are drawn with replacement, and the value of a series in a drawn year is the fitted
    quantile at the rank that the year has in the series, moved by chance within the width of one rank, by the same for
    all series of that year. So each series is a random sample of its fitted distribution, while wet years are wet in
    all durations and areas together. Every sample is fitted anew and made to agree by duration; the interval runs from
    the 5 % to the 95 % point of its depths. It tells how far a record of this length may lead astray if the
    distribution is right, and nothing of what a wrong distribution adds.

    Examples
    --------
    >>> years = np.arange(2001, 2013)
    >>> hour = np.array([18.0, 25.0, 21.0, 30.0, 16.0, 41.0, 23.0, 27.0, 20.0, 33.0, 19.0, 24.0])
    >>> maxima = np.stack([hour, hour + 12], axis=1)[:, :, None]
    >>> ten = Frequency(10.0, "annual-maximum")
    >>> found = record_depths(maxima, years, np.array([60.0, 180.0]), ["Quill"], frequencies=[ten])
    >>> found.distribution, found.depths.depth.round(2)
    ('gumbel', array([[[34.53],
            [46.53]]]))
    >>> bool(found.lower[0, 0, 0] < 34.53 < found.upper[0, 0, 0])
    True
    >>> record_depths(maxima[:8], years[:8], np.array([60.0, 180.0]), ["Quill"], frequencies=[ten])
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: area Quill, 1 h: found 8 years with an annual maximum; expected 10 at least; take a \
longer record, or depths of a table
    area Quill, 3 h: found 8 years with an annual maximum; expected 10 at least; take a longer record, or depths of a \
table
    """
    check_maxima(maxima, years, minutes, areas)
    if distribution is not None:
        check_distribution(distribution)
    names = tuple(areas)
    counting = ~np.isnan(maxima).all(axis=(1, 2))
    values, counted = maxima[counting], years[counting]
    moments = l_moments(values.transpose(0, 2, 1))
    name = distribution or (GUMBEL if moments.n.min() < YEARS_FOR_GEV else GEV)
    problems = Problems()
    check_series(moments, minutes, names, problems, shape_wanted=name == GEV)
    asked = check_asked(frequencies, moments, minutes, names, problems, beyond_record=beyond_record)
    problems.raise_as(MethodError)
    drawn = draw_years(len(values), resamples, seed=seed)
    variates = np.array([frequency.variate for frequency in asked])
    fits = {
        one: fit_record(one, values, moments, minutes=minutes, variates=variates, drawn=drawn) for one in DISTRIBUTIONS
    }
    check_depths(fits[name].quantiles, minutes, names, asked)
    _, p_value = shape_test(fits[GEV].parameters.shape, moments.n)
    return RecordDepths(
        depths=PointDepths(
            points=names,
            durations=minutes,
            return_periods=np.array([frequency.return_period for frequency in asked]),
            depth=fits[name].depth,
            series=ANNUAL_MAXIMUM,
            source=f"annual maxima of the record, {_length(moments)} years, {TITLES[name]} distribution by L-moments",
            date=f"{counted[0]} to {counted[-1]}",
            areal=True,
        ),
        distribution=name,
        fits=MappingProxyType(fits),
        moments=moments,
        shape_p_value=p_value,
        remarks=record_remarks(
            name,
            fits,
            moments,
            shape_p_value=p_value,
            minutes=minutes,
            areas=names,
            frequencies=asked,
            n_years=len(values),
        ),
    )


def _length(moments: LMoments) -> str:
    least, most = int(moments.n.min()), int(moments.n.max())
    return f"{least}" if least == most else f"{least} to {most}"

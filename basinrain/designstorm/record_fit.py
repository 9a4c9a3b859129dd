"""One distribution fitted to the annual maxima of areas and durations, with its intervals and its goodness."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.extreme_values import DISTRIBUTIONS, ExtremeValues, quantiles_of_shape
from basinrain.designstorm.goodness import Goodness, plot_correlation, share_at_or_below
from basinrain.designstorm.l_moments import LMoments, l_moments_of_sorted
from basinrain.designstorm.monotone_depths import monotone_depths
from basinrain.designstorm.resampling import DrawnYears, interval_of_samples

__all__ = ["RecordFit", "fit_record"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class RecordFit:
    """One distribution fitted to annual maxima, by area and duration.

    Parameters
    ----------
    parameters : ExtremeValues
        Arrays of shape (n_areas, n_durations); NaN where there is no fit.
    quantiles : array of float, shape (n_areas, n_durations, n_frequencies)
        mm, as fitted, every duration by itself.
    depth : array of float, as ``quantiles``
        mm, the least that are not below ``quantiles`` and agree with each other by duration; NaN for all durations
        of an area where one has no fit.
    lower, upper : array of float, as ``quantiles``
        mm, the ends of the 90 % interval of ``depth``; ``lower`` is 0 at least.
    goodness : Goodness
        Of every fit.
    ratio_error : array of float, shape (n_areas, n_durations)
        Standard error of L-skewness, if the distribution is right.
    """

    parameters: ExtremeValues
    quantiles: Floats
    depth: Floats
    lower: Floats
    upper: Floats
    goodness: Goodness
    ratio_error: Floats


def fit_record(
    distribution: str, maxima: Floats, moments: LMoments, *, minutes: Floats, variates: Floats, drawn: DrawnYears
) -> RecordFit:
    """Return the fit of one distribution to annual maxima.

    Parameters
    ----------
    distribution
        Its name, of :data:`~basinrain.designstorm.extreme_values.DISTRIBUTIONS`.
    maxima : array of float, shape (n_years, n_durations, n_areas)
        mm; NaN where a year does not count.
    moments : LMoments
        Of these; arrays of shape (n_areas, n_durations).
    minutes : array of float, shape (n_durations,)
        Rising.
    variates : array of float, shape (n_frequencies,)
        Gumbel reduced variates of the frequencies, rising.
    drawn
        The years of every sample, the same for all areas.

    Returns
    -------
    RecordFit

    Examples
    --------
    >>> from basinrain.designstorm.l_moments import l_moments
    >>> from basinrain.designstorm.resampling import draw_years
    >>> hour = np.array([18.0, 25.0, 21.0, 30.0, 16.0, 41.0, 23.0, 27.0, 20.0, 33.0])
    >>> maxima = np.stack([hour, hour + 12], axis=1)[:, :, None]
    >>> moments = l_moments(maxima.transpose(0, 2, 1))
    >>> axes = {"minutes": np.array([60.0, 180.0]), "variates": np.array([2.25])}
    >>> found = fit_record("gumbel", maxima, moments, **axes, drawn=draw_years(10, 200))
    >>> found.quantiles.round(2).tolist()
    [[[36.13], [48.13]]]
    """
    fit = DISTRIBUTIONS[distribution]
    parameters = fit(moments)
    quantiles = parameters.quantiles(variates)
    correlation, p_value, ratio_error = (np.full(moments.mean.shape, np.nan) for _ in range(3))
    lower, upper = np.full_like(quantiles, np.nan), np.full_like(quantiles, np.nan)
    for a in range(len(quantiles)):
        samples = np.full((len(drawn.year), *quantiles.shape[1:]), np.nan)
        for series, variate in drawn.variates(maxima[:, :, a]):
            n = variate.shape[-1]
            location, scale, shape = (
                part[a, series] for part in (parameters.location, parameters.scale, parameters.shape)
            )
            # In units of the scale from the location, which L-moments follow.
            values = quantiles_of_shape(shape[:, None], variate)
            again = l_moments_of_sorted(values)
            refit = fit(again)
            samples[:, series] = location[:, None] + scale[:, None] * refit.quantiles(variates)
            ratio_error[a, series] = again.ratio.std(axis=0)
            found = plot_correlation(np.sort(maxima[:, series, a], axis=0)[:n].T, shape)
            correlation[a, series] = found
            p_value[a, series] = share_at_or_below(plot_correlation(values, refit.shape), found)
        lower[a], upper[a] = interval_of_samples(monotone_depths(samples, minutes))
    return RecordFit(
        parameters=parameters,
        quantiles=quantiles,
        depth=monotone_depths(quantiles, minutes),
        lower=np.maximum(lower, 0),
        upper=upper,
        goodness=Goodness(correlation=correlation, p_value=p_value),
        ratio_error=ratio_error,
    )

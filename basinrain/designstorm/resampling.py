"""Samples drawn from fitted distributions, in which the durations and areas of a year stay together."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem

__all__ = ["COVERAGE", "FEWEST_RESAMPLES", "SEED", "DrawnYears", "draw_years", "interval_of_samples"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

SEED: Final = 1985
"""Seed of the drawing unless another is given; any will do, but always the same one gives the same interval."""

COVERAGE: Final = 0.90
"""Share of the samples within an interval, as many below it as above."""

FEWEST_RESAMPLES: Final = 100
"""Fewer leave too few beyond the ends of an interval to place them."""


_SMALLEST: Final = 2.0**-54


@dataclass(frozen=True, eq=False, kw_only=True)
class DrawnYears:
    """Years drawn with replacement into many samples, each as long as the record.

    Parameters
    ----------
    year : array of int, shape (n_samples, n_years)
        Which year of the record.
    within : array of float, shape (n_samples, n_years)
        Where between its neighbours in rank it falls, from 0 to 1; the same for all series of that year.
    fresh : array of float, shape (n_samples, n_years)
        Probabilities for series in which the year drawn does not count.
    """

    year: Ints
    within: Floats
    fresh: Floats

    def variates(self, maxima: Floats) -> Iterator[tuple[Ints, Floats]]:
        """Return the sorted Gumbel reduced variates of every sample, series of equally many years together.

        Parameters
        ----------
        maxima : array of float, shape (n_years, n_series)
            NaN where a year does not count. Only the ranks matter; equal values rank by their place.

        Yields
        ------
        series : array of int, shape (n,)
            The columns concerned.
        variates : array of float, shape (n_samples, n, n_counting)
            Rising along the last axis. In every series they are a random sample, as long as the years that count in
            it: the rank of a drawn year is any rank with equal probability, and where between the ranks it falls as
            well. What is kept of the record is which ranks its series have in one year.
        """
        missing = np.isnan(maxima)
        counting = np.count_nonzero(~missing, axis=0)
        order = np.argsort(maxima, axis=0, kind="stable")
        rank = np.empty_like(order)
        np.put_along_axis(rank, order, np.arange(len(maxima))[:, None], axis=0)
        for n in np.unique(counting):
            series = np.flatnonzero(counting == n)
            chance = np.empty((len(self.year), len(series), n))
            for place, column in enumerate(series):
                chance[:, place] = self._chances(rank[:, column], missing[:, column], int(n))
            chance.sort(axis=-1)
            # A generator can give 0 itself, which has no variate.
            np.clip(chance, _SMALLEST, 1 - 2 * _SMALLEST, out=chance)
            yield series, -np.log(-np.log(chance))

    def _chances(self, rank: Ints, missing: npt.NDArray[np.bool_], n: int) -> Floats:
        chance = (rank[self.year] + self.within) / n
        if not missing.any():
            return chance
        absent = missing[self.year]
        chance = np.where(absent, self.fresh, chance)
        first = np.argsort(absent, axis=1, kind="stable")[:, :n]
        return np.take_along_axis(chance, first, axis=1)


def draw_years(n_years: int, resamples: int, *, seed: int = SEED) -> DrawnYears:
    """Return years drawn with replacement; the same for the same arguments.

    Parameters
    ----------
    n_years
        Years of the record.
    resamples
        How many samples.
    seed
        Of numpy's default generator.

    Returns
    -------
    DrawnYears

    Raises
    ------
    JobError
        Fewer than :data:`FEWEST_RESAMPLES` samples.

    Examples
    --------
    Two series whose years rank alike have the same variates in every sample.

    >>> drawn = draw_years(4, 100)
    >>> ((series, variates),) = drawn.variates(np.array([[3.0, 30.0], [1.0, 12.0], [9.0, 70.0], [4.0, 31.0]]))
    >>> variates.shape, bool(np.all(variates[:, 0] == variates[:, 1]))
    ((100, 2, 4), True)
    >>> draw_years(4, 5)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: resamples: found 5; expected 100 at least
    """
    if resamples < FEWEST_RESAMPLES:
        raise JobError(Problem(item="resamples", found=f"{resamples}", expected=f"{FEWEST_RESAMPLES} at least"))
    generator = np.random.default_rng(seed)
    shape = (resamples, n_years)
    return DrawnYears(
        year=generator.integers(n_years, size=shape),
        within=generator.random(shape),
        fresh=generator.random(shape),
    )


def interval_of_samples(samples: Floats) -> tuple[Floats, Floats]:
    """Return the ends of the interval that holds :data:`COVERAGE` of the samples, as many below as above.

    Parameters
    ----------
    samples : array of float, shape (n_samples, ...)
        NaN for samples without a value, which are left out.

    Returns
    -------
    lower, upper : array of float, shape (...)
        Between neighbours in rank by a straight line; NaN where no sample has a value.

    Examples
    --------
    >>> interval_of_samples(np.append(np.arange(101.0), np.nan))
    (array(5.), array(95.))
    """
    ranked = np.sort(samples, axis=0)
    last = np.count_nonzero(~np.isnan(ranked), axis=0) - 1
    ends = []
    for share in ((1 - COVERAGE) / 2, (1 + COVERAGE) / 2):
        # The product is rounded so that a whole place is one.
        place = np.round(share * np.maximum(last, 0), 9)
        below = np.floor(place).astype(np.int64)
        above = np.ceil(place).astype(np.int64)
        low, high = (np.take_along_axis(ranked, at[None], axis=0)[0] for at in (below, above))
        ends.append(np.asarray(low + (high - low) * (place - below)))
    return ends[0], ends[1]

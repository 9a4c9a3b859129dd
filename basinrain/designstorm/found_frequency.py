"""How rare an observed depth is: where it lies on the ladder of depths that a table has for one duration."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.errors import DataError, Problems

__all__ = ["FoundFrequencies", "FoundFrequency", "check_frequencies", "found_frequencies", "found_frequency", "odds"]

Floats = npt.NDArray[np.float64]

_SAME: Final = 1e-9
"""Depths that differ by no more than this share are the same: the sums of a record are not exact in binary."""


@dataclass(frozen=True)
class FoundFrequency:
    """How often a depth is exceeded, as far as a table tells.

    Parameters
    ----------
    depth : float
        mm; NaN where it is not known.
    estimate : Frequency or None
        Interpolated between the tabulated neighbours; None beyond the table's ends, and where nothing is known.
    commoner, rarer : Frequency or None
        The tabulated neighbours: the range. Both the same where the depth is a tabulated one. Below the table's depths
        there is no ``commoner``, above them no ``rarer``; where nothing is known there is neither.
    words : str
        The same for people.
    """

    depth: float
    estimate: Frequency | None
    commoner: Frequency | None
    rarer: Frequency | None
    words: str

    @property
    def known(self) -> bool:
        """Whether anything is known of it."""
        return self.commoner is not None or self.rarer is not None

    @property
    def beyond(self) -> bool:
        """Whether it is rarer than the rarest depth of the table."""
        return self.commoner is not None and self.rarer is None

    @property
    def rank(self) -> float:
        """A number that is higher the rarer it is: the reduced variate, infinite beyond the ends, NaN if not known."""
        if self.estimate is not None:
            return self.estimate.variate
        return math.nan if not self.known else math.inf if self.beyond else -math.inf


@dataclass(frozen=True, eq=False, kw_only=True)
class FoundFrequencies:
    """How often each of many depths is exceeded, as far as a table tells.

    Parameters
    ----------
    depth : array of float, any shape
        mm.
    estimate, commoner, rarer : array of float, as ``depth``
        Return periods in years, counted in ``series``; NaN where :class:`FoundFrequency` has None.
    ends_table : array of bool, as ``depth``
        Whether ``commoner`` or ``rarer`` is the rarest frequency that the table has a depth for.
    series : str
        The series that the return periods are counted in.
    """

    depth: Floats
    estimate: Floats
    commoner: Floats
    rarer: Floats
    ends_table: npt.NDArray[np.bool_]
    series: str

    def one(self, place: tuple[int, ...]) -> FoundFrequency:
        """Return one of them.

        Parameters
        ----------
        place
            Its index, one number for every axis of ``depth``.

        Examples
        --------
        >>> ladder = [Frequency(years, "annual-maximum") for years in (2, 10, 100)]
        >>> found_frequencies([75.0, 150.0], ladder, [60.0, 90.0, 130.0]).one((1,)).words
        "rarer than 1 in 100 a year (the table's end)"
        """
        estimate, commoner, rarer = (
            None if math.isnan(years) else Frequency(years, self.series)
            for years in (float(part[place]) for part in (self.estimate, self.commoner, self.rarer))
        )
        depth = float(self.depth[place])
        words = _words(depth, estimate, commoner, rarer, ends_table=bool(self.ends_table[place]))
        return FoundFrequency(depth, estimate, commoner, rarer, words)


def check_frequencies(frequencies: Sequence[Frequency]) -> str:
    """Return the series that frequencies are counted in, once they are found to rise in rarity within one.

    Raises
    ------
    DataError
        There are none; they are counted in several series; one is not rarer than the one before it.

    Examples
    --------
    >>> check_frequencies([Frequency(10, "annual-maximum"), Frequency(2, "annual-maximum")])
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: frequency AEP 0.5 (1 in 2): found after AEP 0.1 (1 in 10); expected a rarer one; put \
them in order, the most frequent first
    """
    problems = Problems()
    if not frequencies:
        problems.add(item="frequencies", found="none", expected="one at least")
    series = list(dict.fromkeys(frequency.series for frequency in frequencies))
    if len(series) > 1:
        problems.add(
            item="frequencies",
            found="return periods of both " + " and ".join(series) + " series",
            expected="all of one",
            remedy="bring them to one series first",
        )
    else:
        for before, frequency in itertools.pairwise(frequencies):
            if frequency.return_period <= before.return_period:
                problems.add(
                    item=f"frequency {frequency.label}",
                    found=f"after {before.label}",
                    expected="a rarer one",
                    remedy="put them in order, the most frequent first",
                )
    problems.raise_as(DataError)
    return series[0]


def found_frequency(depth: float, frequencies: Sequence[Frequency], depths: npt.ArrayLike) -> FoundFrequency:
    """Return how often a depth is exceeded, as a range between tabulated frequencies.

    Parameters
    ----------
    depth : float
        mm in one duration; NaN is not known.
    frequencies
        Of the table, rising in rarity, of one series.
    depths : array of float, shape (n_frequencies,)
        The table's depths in mm of that duration at ``frequencies``; NaN where it has none.

    Returns
    -------
    FoundFrequency
        Between two tabulated depths also an estimate, linear in depth between the neighbours in the Gumbel reduced
        variate. Beyond the ends there is none: a table says nothing there.

    Raises
    ------
    DataError
        Frequencies are none, of several series or out of order; the table's depths fall as they grow rarer; a depth is
        below 0 or infinite; shapes do not fit.

    Notes
    -----
    Where a table has the same depth for several frequencies, a storm of that depth has them all for its range, and the
    most frequent for its estimate, so that rarity is not overstated. Depths within a share of 1e-9 are the same.

    Examples
    --------
    >>> ladder = [Frequency(years, "annual-maximum") for years in (2, 10, 100)]
    >>> depths = [60.0, 90.0, 130.0]
    >>> found = found_frequency(78.05, ladder, depths)
    >>> round(found.estimate.return_period, 2), found.commoner.return_period, found.rarer.return_period
    (5.0, 2.0, 10.0)
    >>> found.words
    'between 1 in 2 and 1 in 10 a year, about 1 in 5'
    >>> for depth in (90.0, 59.0, 131.0, float("nan")):
    ...     print(found_frequency(depth, ladder, depths).words)
    1 in 10 a year
    more frequent than 1 in 2 a year (the table's most frequent)
    rarer than 1 in 100 a year (the table's end)
    not known: no depth of the storm
    """
    return found_frequencies(depth, frequencies, depths).one(())


def found_frequencies(
    depth: npt.ArrayLike, frequencies: Sequence[Frequency], depths: npt.ArrayLike
) -> FoundFrequencies:
    """Return how often each of many depths is exceeded.

    Parameters
    ----------
    depth : array of float, any shape
        mm; NaN is not known.
    frequencies
        Of the table, rising in rarity, of one series.
    depths : array of float, shape of ``depth`` + (n_frequencies,)
        The table's depths in mm for each of them, or one ladder (n_frequencies,) for all.

    Returns
    -------
    FoundFrequencies

    Raises
    ------
    DataError
        As :func:`found_frequency`.

    Examples
    --------
    >>> ladder = [Frequency(years, "annual-maximum") for years in (2, 10, 100)]
    >>> found = found_frequencies([78.05, 90.0, 150.0], ladder, [60.0, 90.0, 130.0])
    >>> found.estimate.round(2), found.commoner, found.rarer
    (array([ 5., 10., nan]), array([  2.,  10., 100.]), array([10., 10., nan]))
    """
    series = check_frequencies(frequencies)
    values = np.asarray(depth, dtype=np.float64)
    nodes = np.asarray(depths, dtype=np.float64)
    n_t = len(frequencies)
    _check(values, nodes, n_t)
    nodes = np.broadcast_to(nodes, (*values.shape, n_t))
    years = np.array([frequency.return_period for frequency in frequencies])
    variates = np.array([frequency.variate for frequency in frequencies])

    each = values[..., None]
    # Comparisons with NaN are false, so that frequencies without a depth are passed over.
    same = np.abs(nodes - each) <= _SAME * each
    below, above = (nodes < each) & ~same, (nodes > each) & ~same
    tabulated = same.any(axis=-1)
    inside = below.any(axis=-1) & above.any(axis=-1) & ~tabulated
    has = ~np.isnan(nodes)
    # The last below and the first above; of equal ones, the first and the last.
    lower = np.where(tabulated, same.argmax(axis=-1), n_t - 1 - below[..., ::-1].argmax(axis=-1))
    upper = np.where(tabulated, n_t - 1 - same[..., ::-1].argmax(axis=-1), above.argmax(axis=-1))
    commoner = np.where(tabulated | below.any(axis=-1), years[lower], np.nan)
    rarer = np.where(tabulated | above.any(axis=-1), years[upper], np.nan)

    low, high = (np.take_along_axis(nodes, k[..., None], axis=-1)[..., 0] for k in (lower, upper))
    share = np.divide(values - low, high - low, out=np.zeros(values.shape), where=inside)
    variate = variates[lower] + share * (variates[upper] - variates[lower])
    # Rounding must not put the estimate out of its range.
    between = np.clip(_years(variate, series), years[lower], np.maximum(years[lower], years[upper]))
    estimate = np.where(tabulated, commoner, np.where(inside, between, np.nan))

    last = years[n_t - 1 - has[..., ::-1].argmax(axis=-1)]
    return FoundFrequencies(
        depth=values,
        estimate=estimate,
        commoner=commoner,
        rarer=rarer,
        ends_table=has.any(axis=-1) & ((commoner == last) | (rarer == last)),
        series=series,
    )


def odds(frequency: Frequency, *, about: bool = False) -> str:
    """Return a frequency as it reads in a sentence.

    Parameters
    ----------
    frequency
        Its series decides the words.
    about
        With two digits only, for what was interpolated.

    Examples
    --------
    >>> odds(Frequency(100, "annual-maximum")), odds(Frequency(2.5, "partial-duration"))
    ('1 in 100', '2.5 years')
    >>> odds(Frequency(1234.5, "annual-maximum"), about=True)
    '1 in 1200'
    """
    years = frequency.return_period
    if about:
        years = round(years, 1 - math.floor(math.log10(years)))
    number = f"{years:.0f}" if years >= 1000 else f"{years:.4g}"
    if frequency.series == ANNUAL_MAXIMUM:
        return f"1 in {number}"
    return f"{number} year" + ("" if number == "1" else "s")


def _years(variate: Floats, series: str) -> Floats:
    """Return return periods of reduced variates: the way back from :attr:`Frequency.variate`."""
    if series == ANNUAL_MAXIMUM:
        return np.asarray(-1 / np.expm1(-np.exp(-variate)))
    return np.exp(variate)


def _check(values: Floats, nodes: Floats, n_t: int) -> None:
    problems = Problems()
    fitting = dict.fromkeys(((*values.shape, n_t), (n_t,)))
    if nodes.shape not in fitting:
        problems.add(
            item="the table's depths",
            found=f"shape {nodes.shape}",
            expected="shape " + " or ".join(map(str, fitting)) + ", a depth for every frequency",
        )
        problems.raise_as(DataError)
    for item, array in (("depth", values), ("the table's depth", nodes)):
        for wrong in array[np.isinf(array) | (array < 0)][:5]:
            problems.add(item=item, found=f"{wrong:g} mm", expected="0 or more, or NaN where it is not known")
    greatest = np.fmax.accumulate(nodes, axis=-1)
    falling = (nodes < greatest) & ~np.isnan(nodes)
    for place in np.argwhere(falling)[:5]:
        where = tuple(place)
        problems.add(
            item="the table's depths",
            found=f"{nodes[where]:g} mm after {greatest[where]:g} mm at a more frequent one",
            expected="depths that do not fall as they grow rarer",
            remedy="correct the table",
        )
    problems.raise_as(DataError)


def _words(
    depth: float, estimate: Frequency | None, commoner: Frequency | None, rarer: Frequency | None, *, ends_table: bool
) -> str:
    known = rarer if commoner is None else commoner
    if known is None:
        return "not known: no depth of the storm" if math.isnan(depth) else "not known: no depths of the table"
    unit = "a year" if known.series == ANNUAL_MAXIMUM else "(partial duration)"
    if commoner is None:
        return f"more frequent than {odds(known)} {unit} (the table's most frequent)"
    if rarer is None or estimate is None:
        return f"rarer than {odds(known)} {unit} (the table's end)"
    if commoner == rarer:
        return f"{odds(rarer)} {unit}" + (" (the table's end)" if ends_table else "")
    if estimate == commoner:
        return f"from {odds(commoner)} to {odds(rarer)} {unit}, which have the same depth"
    return f"between {odds(commoner)} and {odds(rarer)} {unit}, about {odds(estimate, about=True)}"

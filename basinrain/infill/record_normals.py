"""Normals from the record itself: every pair of gauges compared over the years that both have."""

from __future__ import annotations

import calendar
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.infill.spans import own_totals
from basinrain.notes import Note
from basinrain.rainfall import RainRecord

__all__ = ["FEWEST_YEARS", "STANDARD_YEARS", "NormalRatios", "normals_from_record"]

FEWEST_YEARS: Final = 10
"""Common years of a month that a pair of gauges needs."""

STANDARD_YEARS: Final = 30
"""Years of a standard normal (WMO-No. 1203)."""

_LISTED: Final = 3
_DAY: Final = np.timedelta64(86400, "s")


@dataclass(frozen=True, eq=False)
class NormalRatios:
    """Mean monthly precipitation of every gauge over the years that it has in common with every other.

    No single list of normals can do this: the years that A has with B are not those that it has with C.

    Parameters
    ----------
    gauges : tuple of str
        Gauge ids, the rows and the columns.
    years : array of int, shape (12, n_gauges, n_gauges)
        ``years[m, i, j]``: years in which both i and j have the whole month m + 1.
    means : array of float, shape (12, n_gauges, n_gauges)
        ``means[m, i, j]``: mean total of gauge i in mm over those years; NaN where there are too few.

    Examples
    --------
    See :func:`normals_from_record`.
    """

    gauges: tuple[str, ...]
    years: npt.NDArray[np.int64]
    means: npt.NDArray[np.float64]

    def of(self, network: GaugeNetwork, target: int, month: int | None) -> npt.NDArray[np.float64]:
        """Return the ratio of the target's normal to every gauge's, over their common years.

        Parameters
        ----------
        network : GaugeNetwork
            The gauges that these ratios belong to.
        target : int
            Position of the gauge to infill.
        month : int or None
            1 to 12.

        Returns
        -------
        array of float, shape (n_gauges,)
            NaN where there are too few common years, or one of the two means is 0.

        Raises
        ------
        DataError
            The ratios are another network's, or there is no month: normals from the record are monthly.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
        >>> means = np.tile([[30.0, 20.0], [40.0, 60.0]], (12, 1, 1))
        >>> ratios = NormalRatios(("A", "B"), np.full((12, 2, 2), 10), means)
        >>> ratios.of(network, 0, 7)  # A's 20 mm in the years of B over B's 40 mm
        array([1. , 0.5])
        """
        if self.gauges != network.ids:
            raise DataError(
                Problem(
                    item="normals from the record",
                    found="other gauges than the network's, or another order",
                    expected=", ".join(network.ids),
                    remedy="make them of the record in the network's order",
                )
            )
        if not month:
            raise DataError(
                Problem(
                    item="normals from the record",
                    found="a depth without a date",
                    expected="dates, since normals from the record are those of the months",
                    remedy="give normals in the file of gauges, or choose another infill method",
                )
            )
        mine, theirs = self.means[month - 1, target], self.means[month - 1, :, target]
        usable = (mine > 0) & (theirs > 0)
        return np.where(usable, mine / np.where(usable, theirs, 1.0), np.nan)


def normals_from_record(record: RainRecord, network: GaugeNetwork) -> tuple[NormalRatios, tuple[Note, ...]]:
    """Return normals from the record: by calendar month, over the years common to each pair of gauges.

    Parameters
    ----------
    record : RainRecord
        The whole record, with dates and steps of a day at most, or of calendar months; its columns in the network's
        order.
    network : GaugeNetwork
        The gauges.

    Returns
    -------
    ratios : NormalRatios
        A gauge's month counts where the record's steps are together as long as the month and the gauge has its own
        value at each; a step belongs to the month that holds its middle. A pair needs 10 common years of a month.
    notes : tuple of Note
        ``normals-from-short-record`` where no gauge has the 30 years of a standard normal (WMO-No. 1203; from memory)
        in every month, and ``few-common-years``, which names pairs with fewer than 10. Unequal periods need no
        remark, since no ratio mixes periods.

    Raises
    ------
    DataError
        The columns are not the network's gauges, totals have no dates, or steps are longer than a day and not calendar
        months.

    Examples
    --------
    Ten Julys: B has two thirds of A's rain in each, and misses no year.

    >>> ends = np.array([f"{year}-08-01" for year in range(2021, 2031)], dtype="datetime64[s]")
    >>> depths = np.outer(np.arange(1.0, 11.0), [30.0, 20.0])
    >>> record = RainRecord.from_depths(("A", "B"), ends - np.timedelta64(31, "D"), ends, depths, step="1mo")
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
    >>> ratios, notes = normals_from_record(record, network)
    >>> ratios.of(network, 0, 7), ratios.of(network, 0, 8)
    (array([1. , 1.5]), array([nan, nan]))
    >>> [note.code for note in notes]
    ['normals-from-short-record', 'few-common-years']
    """
    _check(record, network)
    month, totals = _month_totals(record)
    n = len(record.gauges)
    years, means = np.zeros((12, n, n), dtype=np.int64), np.full((12, n, n), np.nan)
    for m in range(12):
        mine = totals[month == m]
        here = ~np.isnan(mine)
        there = here.astype(float)
        years[m] = (there.T @ there).astype(np.int64)
        sums = np.where(here, mine, 0.0).T @ there
        means[m] = np.where(years[m] >= FEWEST_YEARS, sums / np.maximum(years[m], 1), np.nan)
    ratios = NormalRatios(record.gauges, years, means)
    return ratios, (*_short(years), *_few(record.gauges, years))


def _month_totals(record: RainRecord) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]:
    """Return the calendar month, 0 to 11, and every gauge's total, NaN where it is not whole, of the whole months."""
    held = _months_held(record)
    first = np.concatenate([[0], np.flatnonzero(held[1:] != held[:-1]) + 1])
    months = held[first]
    length = ((months + 1).astype("datetime64[s]") - months.astype("datetime64[s]")) / np.timedelta64(1, "s")
    totals, seconds = own_totals(record, first)
    whole = np.abs(seconds - length) < 0.5
    return months.astype(np.int64)[whole] % 12, totals[whole]


def _months_held(record: RainRecord) -> npt.NDArray[np.datetime64]:
    """Return the month that holds the middle of every step."""
    return (record.starts + (record.ends - record.starts) // 2).astype("datetime64[M]")


def _divides_no_month(record: RainRecord) -> bool:
    """Return whether a step is longer than a day and no calendar month, which may begin at the hour of a reading."""
    long = record.ends - record.starts > _DAY
    month = _months_held(record)
    off = record.starts - month.astype("datetime64[s]")
    late = record.ends - (month + 1).astype("datetime64[s]")
    return bool((long & ((off != late) | (np.abs(off) > _DAY))).any())


def _short(years: npt.NDArray[np.int64]) -> tuple[Note, ...]:
    own = years.diagonal(axis1=1, axis2=2).min(axis=0)
    if not len(own) or own.max() >= STANDARD_YEARS:
        return ()
    return (
        Note(
            code="normals-from-short-record",
            text=f"Normals are means of the record, in which no gauge has more than {own.max()} years of every month; "
            f"standard normals are means of {STANDARD_YEARS} years.",
        ),
    )


def _few(gauges: tuple[str, ...], years: npt.NDArray[np.int64]) -> tuple[Note, ...]:
    few = (years < FEWEST_YEARS) & ~np.eye(len(gauges), dtype=bool)
    pairs = [(int(i), int(j)) for i, j in np.argwhere(np.triu(few.any(axis=0)))]
    if not pairs:
        return ()
    named = sorted(((*sorted((gauges[i], gauges[j])), _months(few[:, i, j])) for i, j in pairs))
    listed = "; ".join(f"{one} and {other} ({months})" for one, other, months in named[:_LISTED])
    more = f"; and {len(named) - _LISTED} more pairs" if len(named) > _LISTED else ""
    return (
        Note(
            code="few-common-years",
            text=f"Gauges with fewer than {FEWEST_YEARS} common years of a month do not donate to each other in it by "
            f"a method that needs normals: {listed}{more}.",
        ),
    )


def _months(few: npt.NDArray[np.bool_]) -> str:
    if few.all():
        return "every month"
    return ", ".join(calendar.month_abbr[m + 1] for m in np.flatnonzero(few).tolist())


def _check(record: RainRecord, network: GaugeNetwork) -> None:
    problems = Problems()
    remedy = "give normals in the file of gauges, or choose another infill method"
    if record.gauges != network.ids:
        problems.add(
            item="rain record",
            found="columns that are not the network's gauges in their order",
            expected=", ".join(network.ids),
            remedy="bring them in order first",
        )
    if not len(record) or np.isnat(record.ends).any():
        problems.add(
            item="normals from the record", found="no dates", expected="a record of several years", remedy=remedy
        )
    elif _divides_no_month(record):
        problems.add(
            item="normals from the record",
            found=f"steps of {record.step}",
            expected="steps of a day at most, or of calendar months: normals are means of whole months",
            remedy=remedy,
        )
    problems.raise_as(DataError)

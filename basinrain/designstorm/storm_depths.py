"""A storm's greatest depths beside those of a table, and how rare they were found."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.found_frequency import FoundFrequency

__all__ = ["RarityRow", "StormDepths", "StormRarity"]

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True, eq=False, kw_only=True)
class StormDepths:
    """A storm's greatest depths, and the depths that a table has for the same places and durations.

    Parameters
    ----------
    names : tuple of str
        Basins or points of interest; or gauges.
    depth : array of float, shape (n_durations, n_names)
        Greatest depth in mm in windows that begin at any step; NaN where there is none.
    ends : array of datetime64, as ``depth``
        The end of that window; NaT where there is none.
    ladder : array of float, shape (n_names, n_durations, n_frequencies)
        The table's depths in mm: areal ones for basins, point ones for gauges. NaN where it has none.
    aligned : array of float, as ``depth``, optional
        Greatest depth in mm in windows tied to the clock; kept beside, and compared with nothing.
    """

    names: tuple[str, ...]
    depth: Floats
    ends: Times
    ladder: Floats
    aligned: Floats | None = None


@dataclass(frozen=True, eq=False, kw_only=True)
class RarityRow:
    """How rare a depth of one duration was at one place.

    Parameters
    ----------
    kind
        ``"areal"``: a mean over a basin against areal depths; ``"point"``: the wettest gauge against point depths.
    place
        The basin, or the gauge.
    minutes : float
        The duration.
    found : FoundFrequency
        The depth and how often it is exceeded.
    end : datetime64
        The end of the window of the greatest depth.
    aligned : float
        Greatest depth in mm in windows tied to the clock; NaN where it is not known.
    remark
        What a reader must know of this row; else empty.
    """

    kind: Literal["areal", "point"]
    place: str
    minutes: float
    found: FoundFrequency
    end: np.datetime64
    aligned: float
    remark: str


@dataclass(frozen=True, eq=False, kw_only=True)
class StormRarity:
    """How rare a storm was.

    Parameters
    ----------
    storm
        Its name.
    frequencies : tuple of Frequency
        Those of the table, rising in rarity.
    minutes : array of float, shape (n_durations,)
        All durations that were given.
    areal, gauges : StormDepths
        What was given; ``gauges`` None where there were none.
    rows : tuple of RarityRow
        One for every area and duration that can be compared; durations within areas.
    gauge_rows : tuple of RarityRow
        The wettest gauge of every duration that can be compared.
    rarest, rarest_at_gauge : tuple of RarityRow
        The rarest of either; several where the table cannot tell them apart.
    n_durations, n_areas, n_gauges : int
        How many were searched: those with a depth and a table to compare it with.
    left_out : tuple of str
        The durations that cannot be compared, and why.
    sentences : tuple of str
        What all this means, and what it does not.
    clamped : tuple of str
        Whole sentences: what was brought into the areal reduction's range for the depths compared with.
    """

    storm: str
    frequencies: tuple[Frequency, ...]
    minutes: Floats
    areal: StormDepths
    gauges: StormDepths | None
    rows: tuple[RarityRow, ...]
    gauge_rows: tuple[RarityRow, ...]
    rarest: tuple[RarityRow, ...]
    rarest_at_gauge: tuple[RarityRow, ...]
    n_durations: int
    n_areas: int
    n_gauges: int
    left_out: tuple[str, ...]
    sentences: tuple[str, ...]
    clamped: tuple[str, ...] = ()

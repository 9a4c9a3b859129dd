"""Areal reduction by a table of the user's own."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import Limits, area_words, duration_words
from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.errors import DataError, Problems

__all__ = ["TABLE", "ReductionTable", "tabulated"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class ReductionTable:
    """Areal reduction factors by area and duration.

    Parameters
    ----------
    areas : array of float, shape (n_areas,)
        m², rising. The first may be 0, with what the table says for it; else there is no factor below the first.
    minutes : array of float, shape (n_durations,)
        Durations in minutes, above 0, rising.
    factor : array of float, shape (n_areas, n_durations)
        Above 0 and at most 1; NaN where the table has no factor.
    source : str
        Where the table is from; not empty.

    Raises
    ------
    DataError
        A shape, an order or a value is not as said; all such problems together.

    Examples
    --------
    >>> table = ReductionTable(
    ...     areas=[1e7, 1e8], minutes=[60, 360], factor=[[0.90, 0.96], [0.80, 0.90]], source="a regional study"
    ... )
    >>> table.factor.shape
    (2, 2)
    >>> ReductionTable(areas=[1e7], minutes=[60, 360], factor=[[90, 96]], source="a regional study")
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: reduction table: 10 km², 1 h: found 90; expected a factor above 0 and at most 1; \
write percent as fractions
    reduction table: 10 km², 6 h: found 96; expected a factor above 0 and at most 1; write percent as fractions
    """

    areas: Floats
    minutes: Floats
    factor: Floats
    source: str

    def __post_init__(self) -> None:
        problems = Problems()
        for name in ("areas", "minutes", "factor"):
            object.__setattr__(self, name, np.array(getattr(self, name), dtype=float))
        item = "reduction table"
        for axis, values, least in (("areas", self.areas, "0 or more"), ("durations", self.minutes, "above 0")):
            if values.ndim != 1 or not values.size:
                problems.add(item=f"{item}: {axis}", found=f"an array of shape {values.shape}", expected="a row of them")
            elif not np.isfinite(values).all() or values[0] < 0 or (axis == "durations" and values[0] == 0):
                problems.add(item=f"{item}: {axis}", found=f"{values.tolist()}", expected=f"numbers, {least}")
            elif (np.diff(values) <= 0).any():
                problems.add(item=f"{item}: {axis}", found=f"{values.tolist()}", expected="each more than the one before")
        if not self.source.strip():
            problems.add(item=f"{item}: source", found="none", remedy="say where the table is from")
        if self.factor.shape != (shape := (self.areas.size, self.minutes.size)):
            problems.add(
                item=f"{item}: factors",
                found=f"{self.factor.shape[0] if self.factor.ndim else 0} rows, shape {self.factor.shape}",
                expected=f"shape {shape}: a row for every area, a column for every duration",
            )
        problems.raise_as(DataError)
        for a, d in np.argwhere(~np.isnan(self.factor) & ~((self.factor > 0) & (self.factor <= 1))):
            value = float(self.factor[a, d])
            problems.add(
                item=f"{item}: {area_words(self.areas[a])}, {duration_words(self.minutes[d])}",
                found=f"{value:g}",
                expected="a factor above 0 and at most 1",
                remedy="write percent as fractions" if 1 < value <= 100 else "correct it",
            )
        problems.raise_as(DataError)

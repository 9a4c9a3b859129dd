"""Areal reduction by a table of the user's own."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import Limits, area_words
from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.designstorm.measures import duration_text
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
                problems.add(
                    item=f"{item}: {axis}", found=f"an array of shape {values.shape}", expected="a row of them"
                )
            elif not np.isfinite(values).all() or values[0] < 0 or (axis == "durations" and values[0] == 0):
                problems.add(item=f"{item}: {axis}", found=f"{values.tolist()}", expected=f"numbers, {least}")
            elif (np.diff(values) <= 0).any():
                problems.add(
                    item=f"{item}: {axis}", found=f"{values.tolist()}", expected="each more than the one before"
                )
        if not self.source.strip():
            problems.add(item=f"{item}: source", found="none", remedy="say where the table is from")
        if self.factor.shape != (shape := (self.areas.size, self.minutes.size)):
            problems.add(
                item=f"{item}: factors",
                found=f"shape {self.factor.shape}",
                expected=f"shape {shape}: a row for every area, a column for every duration",
            )
        problems.raise_as(DataError)
        for a, d in np.argwhere(~np.isnan(self.factor) & ~((self.factor > 0) & (self.factor <= 1))):
            value = float(self.factor[a, d])
            problems.add(
                item=f"{item}: {area_words(self.areas[a])}, {duration_text(self.minutes[d])}",
                found=f"{value:g}",
                expected="a factor above 0 and at most 1",
                remedy="write percent as fractions" if 1 < value <= 100 else "correct it",
            )
        problems.raise_as(DataError)


def tabulated(area: npt.ArrayLike, minutes: npt.ArrayLike, *, table: ReductionTable) -> Floats:
    """Return the factor of a table, linear in the logarithms of area and duration.

    Parameters
    ----------
    area : array_like
        m².
    minutes : array_like
        Durations in minutes; broadcast with ``area``.
    table
        The factors.

    Returns
    -------
    array of float
        The broadcast shape. NaN outside the table, and where a factor that counts is missing.

    Notes
    -----
    Area 0 has no logarithm: between a first area of 0, where the table has one, and the next the factor is linear in
    the area itself. Below a first area above 0 there is no factor: nothing says that it is 1 at area 0.

    Examples
    --------
    >>> table = ReductionTable(
    ...     areas=[1e7, 1e9], minutes=[60, 240], factor=[[0.90, 0.96], [0.70, 0.80]], source="a regional study"
    ... )
    >>> tabulated(1e8, [60, 120, 240], table=table).round(3)  # 100 km² is midway from 10 to 1000, 2 h from 1 to 4
    array([0.8 , 0.84, 0.88])
    >>> tabulated([5e6, 1e7], 60, table=table)
    array([nan, 0.9])
    """
    area, minutes = np.broadcast_arrays(np.asarray(area, dtype=float), np.asarray(minutes, dtype=float))
    with np.errstate(divide="ignore"):
        row, upward = _place(np.log(table.areas), np.log(area))
    if table.areas[0] == 0 and table.areas.size > 1:
        upward = np.where(area < table.areas[1], area / table.areas[1], upward)
    column, onward = _place(np.log(table.minutes), np.log(minutes))
    factor = np.zeros(area.shape)
    for rows, row_share in ((row, 1 - upward), (row + 1, upward)):
        for columns, share in ((column, (1 - onward) * row_share), (column + 1, onward * row_share)):
            value = table.factor[np.minimum(rows, table.areas.size - 1), np.minimum(columns, table.minutes.size - 1)]
            # A missing factor does not count where its share is 0.
            factor += np.where(share == 0, 0.0, share * value)
    # Shares add up to 1 but for their last bits.
    capped: Floats = np.minimum(factor, 1.0)
    return capped


def _place(nodes: Floats, at: Floats) -> tuple[npt.NDArray[np.intp], Floats]:
    """Return the node below and how far on to the next every value is, from 0 to 1; NaN outside."""
    below = np.clip(np.searchsorted(nodes, at, side="right") - 1, 0, max(nodes.size - 2, 0))
    if nodes.size == 1:
        onward = np.where(at == nodes[0], 0.0, np.nan)
    else:
        with np.errstate(invalid="ignore"):
            onward = (at - nodes[below]) / (nodes[below + 1] - nodes[below])
    return below, np.where((onward >= 0) & (onward <= 1), onward, np.nan)


def _limits(*, table: ReductionTable) -> Limits:
    return Limits(
        minutes=(float(table.minutes[0]), float(table.minutes[-1])),
        smallest_area=float(table.areas[0]),
        largest_areas=((0.0, float(table.areas[-1])),),
    )


def _remarks(*, table: ReductionTable) -> tuple[str, ...]:
    return (f"The areal reduction factors are from a table given with the job: {table.source}.",)


TABLE = ArealReduction(
    name="table",
    title="Areal reduction by the given table",
    jurisdiction=(),
    region_words="wherever the table is for",
    factor=tabulated,
    limits=_limits,
    options=("table",),
    remarks=_remarks,
    source="the table's own; linear in the logarithms of area and duration",
)
"""Areal reduction by a :class:`ReductionTable`."""

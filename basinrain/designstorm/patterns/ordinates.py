"""The dimensionless cumulative curve of a pattern, a user's own or a published one."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problems

__all__ = ["Ordinates", "published_ordinates"]

Floats = npt.NDArray[np.float64]

_ITEM: Final = "ordinates of a temporal pattern"

_AT_THE_END: Final = {100.0: "declare percent = true", 0.01: "leave percent = true out"}
"""What to do about a curve that ends at this."""


@dataclass(frozen=True, eq=False)
class Ordinates:
    """A cumulative curve: what share of the depth has fallen after what share of the duration.

    Parameters
    ----------
    time : array of float, shape (n,)
        Shares of the duration, from 0 to 1, rising. Copied, and not to be written to.
    share : array of float, shape (n,)
        Shares of the total depth, from 0 to 1, nowhere falling. Copied, and not to be written to.
    minutes : float, optional
        The duration of the storm that it was taken from; None where it has none of its own.

    Raises
    ------
    DataError
        It is no such curve; everything that is wrong with it together, NaN and infinite numbers included.

    Examples
    --------
    Two thirds of the depth in the first half; between ordinates the curve is straight.

    >>> curve = Ordinates(time=[0.0, 0.5, 1.0], share=[0.0, 0.6, 1.0])
    >>> curve.at(np.array([0.25, 0.5, 0.75])).round(3)
    array([0.3, 0.6, 0.8])
    >>> Ordinates(time=[0, 50, 100], share=[0, 60, 100])
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: ordinates of a temporal pattern: found times that end at 100; expected 1; declare \
percent = true
    ordinates of a temporal pattern: found shares that end at 100; expected 1; declare percent = true
    """

    time: Floats
    share: Floats
    minutes: float | None = None

    def __post_init__(self) -> None:
        for name in ("time", "share"):
            values = np.array(getattr(self, name), dtype=np.float64)
            values.setflags(write=False)
            object.__setattr__(self, name, values)
        self._problems().raise_as(DataError)

    def _problems(self) -> Problems:
        problems = Problems()
        if self.time.ndim != 1 or self.time.shape != self.share.shape:
            problems.add(
                item=_ITEM,
                found=f"times of shape {self.time.shape} and shares of shape {self.share.shape}",
                expected="two columns of one length",
            )
            return problems
        if len(self.time) < 2:
            problems.add(
                item=_ITEM,
                found="one row" if len(self.time) else "no rows",
                expected="two at least, the first 0, 0 and the last 1, 1",
            )
            return problems
        for words, values in (("time", self.time), ("share", self.share)):
            for row in np.flatnonzero(~np.isfinite(values)):
                problems.add(
                    item=f"{_ITEM}, row {row + 1}", found=f"{words} {values[row]:g}", expected="a number from 0 to 1"
                )
            if values[0] != 0 and np.isfinite(values[0]):
                problems.add(
                    item=_ITEM, found=f"{words}s that begin at {values[0]:g}", expected="0", remedy="add the row 0, 0"
                )
            if values[-1] != 1 and np.isfinite(values[-1]):
                problems.add(
                    item=_ITEM,
                    found=f"{words}s that end at {values[-1]:g}",
                    expected="1",
                    remedy=_AT_THE_END.get(float(values[-1]), f"divide the {words}s by their last"),
                )
        with np.errstate(invalid="ignore"):
            stuck, fallen = np.diff(self.time) <= 0, np.diff(self.share) < 0
        for row in np.flatnonzero(stuck):
            problems.add(
                item=f"{_ITEM}, row {row + 2}",
                found=f"time {self.time[row + 1]:g} after {self.time[row]:g}",
                expected="a later one",
            )
        for row in np.flatnonzero(fallen):
            problems.add(
                item=f"{_ITEM}, row {row + 2}",
                found=f"share {self.share[row + 1]:g} after {self.share[row]:g}",
                expected="none smaller, since the shares are cumulative",
            )
        return problems

    def at(self, time: Floats) -> Floats:
        """Return the shares of the depth, as ``time``, that have fallen after shares of the duration from 0 to 1.

        Linear between ordinates.
        """
        return np.asarray(np.interp(time, self.time, self.share), dtype=np.float64)


@cache
def published_ordinates(table: str, column: str) -> Ordinates:
    """Return one column of a table that the package holds, scaled by its last row.

    Parameters
    ----------
    table
        Name of the table: ``"nrcs_6min"``, ``"nrcs_30min"``, ``"huff_point"`` or ``"huff_area"``.
    column
        Name of the column of shares; times are in the first one.

    Examples
    --------
    >>> published_ordinates("huff_point", "Q1").at(np.array([0.25, 0.5, 0.75]))
    array([0.6 , 0.82, 0.92])
    """
    text = (files(__package__) / "data" / f"{table}.csv").read_text(encoding="ascii")
    head, *rows = (line.split(",") for line in text.split())
    values = np.array(rows, dtype=np.float64)
    return Ordinates(values[:, 0] / values[-1, 0], values[:, head.index(column)] / values[-1, head.index(column)])

"""Windows of equal duration over a series of equal steps: where they lie, and the greatest sums in them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

__all__ = ["Windows", "greatest_sums"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_BLOCK_BYTES: Final = 1 << 26
_EQUAL: Final = 1 - 1e-12
"""Sums of the same depths in another order differ by less; they are ties, which the earliest window takes."""


@dataclass(frozen=True)
class Windows:
    """Windows of so many steps, one beginning every so many steps.

    Parameters
    ----------
    length
        Steps of a window, 1 or more.
    first
        The step at which the first of them begins.
    every
        Steps from the beginning of one to that of the next, 1 or more.

    Examples
    --------
    >>> pairs = Windows(length=2, first=1, every=2)
    >>> pairs.count(6), pairs.beginnings(6)
    (2, array([1, 3]))
    """

    length: int
    first: int = 0
    every: int = 1

    def count(self, n_steps: int) -> int:
        """Return how many lie whole in a series of ``n_steps``."""
        return max(0, (n_steps - self.length - self.first) // self.every + 1)

    def beginnings(self, n_steps: int) -> Ints:
        """Return the steps at which they begin in a series of ``n_steps``."""
        return self.first + np.arange(self.count(n_steps)) * self.every


def greatest_sums(
    values: Floats, windows: Sequence[Windows], edges: Sequence[Ints]
) -> tuple[list[Floats], list[Ints], list[Ints]]:
    """Return the greatest sum in each kind of windows, stretch by stretch.

    Parameters
    ----------
    values : array of float, shape (n_steps, n_columns)
        0 or more; NaN where it is missing. A window that holds one does not count.
    windows
        Kinds of windows.
    edges : sequence of array of int, shape (n_stretches + 1,)
        For each kind, how its windows are parted into stretches: from 0 to their count, never falling.

    Returns
    -------
    sums : list of array of float, shape (n_stretches, n_columns), one a kind
        NaN where no window counts.
    places : list of array of int, the same shape
        Which window it is, the earliest where several are equal to 1e-12; -1 where none counts.
    counted : list of array of int, the same shape
        How many windows count.

    Notes
    -----
    Sums of 2, 4, 8 ... steps come from doubling, others from these: no difference of running totals is taken.

    Examples
    --------
    >>> values = np.array([[1.0], [4.0], [4.0], [0.0], [np.nan], [2.0]])
    >>> sums, places, counted = greatest_sums(values, [Windows(2)], [np.array([0, 5])])
    >>> sums[0].item(), places[0].item(), counted[0].item()
    (8.0, 1, 3)
    """
    n, n_columns = values.shape
    shapes = [(len(borders) - 1, n_columns) for borders in edges]
    sums = [np.full(shape, np.nan) for shape in shapes]
    places = [np.full(shape, -1) for shape in shapes]
    counted = [np.zeros(shape, dtype=np.int64) for shape in shapes]
    # Kinds of one length one after the other, to add up once.
    order = sorted((k for k in range(len(windows)) if windows[k].count(n)), key=lambda k: windows[k].length)
    width = max(1, _BLOCK_BYTES // (8 * n))
    for left in range(0, n_columns if order else 0, width):
        # Time along memory: every pass below then runs within the processor's cache.
        block = np.ascontiguousarray(values[:, left : left + width].T)
        for column, series in enumerate(block, left):
            doubled = _doubled(series, windows[order[-1]].length)
            of_length, every_sum = 0, series
            for k in order:
                if windows[k].length != of_length:
                    of_length = windows[k].length
                    every_sum = _window_sums(doubled, of_length, n)
                taken = np.ascontiguousarray(every_sum[windows[k].first :: windows[k].every])
                _tops(taken, edges[k], sums[k][:, column], places[k][:, column], counted[k][:, column])
    return sums, places, counted


def _doubled(series: Floats, longest: int) -> list[Floats]:
    """Return sums of 1, 2, 4 ... steps from every step, as far as a window of ``longest`` steps needs them."""
    doubled = [series]
    while (half := 1 << (len(doubled) - 1)) * 2 <= longest:
        doubled.append(doubled[-1][:-half] + doubled[-1][half:])
    return doubled


def _window_sums(doubled: list[Floats], length: int, n: int) -> Floats:
    """Return the sums of ``length`` steps from every step that has so many; what is missing counts -1 and more.

    No depth is below 0, so a sum below 0 is one that is missing: comparisons then need no other care.
    """
    powers = [power for power in reversed(range(length.bit_length())) if length >> power & 1]
    sums = doubled[powers[0]][: n - length + 1]
    at = 1 << powers[0]
    for power in powers[1:]:
        sums = sums + doubled[power][at : at + n - length + 1]
        at += 1 << power
    missing = np.isnan(sums)
    return np.where(missing, -1.0, sums) if missing.any() else sums


def _tops(sums: Floats, edges: Ints, tops: Floats, places: Ints, counted: Ints) -> None:
    """Put in the greatest sum of every stretch, its place, and how many are not missing."""
    for k in np.flatnonzero(np.diff(edges)):
        stretch = sums[edges[k] : edges[k + 1]]
        top = stretch.max()
        if top >= 0:
            tops[k] = top
            places[k] = edges[k] + (stretch >= top * _EQUAL).argmax()
            counted[k] = np.count_nonzero(stretch >= 0)

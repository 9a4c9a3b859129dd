"""What gives series out some steps at a time: a store, or series that are computed when asked for."""

from __future__ import annotations

import mmap
from typing import Any, Final, Protocol

import numpy as np
import numpy.typing as npt

__all__ = ["Rows", "SeriesSource", "copied"]

_HELD: Final = 1 << 22
"""Values of a mapped file that are looked at together."""


class Rows(Protocol):
    """Values by step and basin of which a part at a time is asked for: an array, or one that is mapped from a file."""

    @property
    def shape(self) -> tuple[int, ...]:
        """Steps and basins."""

    def __getitem__(self, part: tuple[slice, slice], /) -> npt.NDArray[Any]:
        """Return the values of some steps and basins, each given as a slice without a stride."""


class SeriesSource(Protocol):
    """Basin-mean series of a record, each known by its gap policy and its averaging method."""

    @property
    def n_steps(self) -> int:
        """Steps of every series."""

    @property
    def series(self) -> tuple[tuple[str, str], ...]:
        """Policy and method of every series."""

    def depth(self, gaps: str, method: str, /) -> Rows:
        """Return the depths, mm, NaN where there is no number; shape (n_steps, n_basins)."""

    def observed_share(self, gaps: str, method: str, /) -> Rows:
        """Return the share of the weight on gauges that report, NaN where the depth is; shape (n_steps, n_basins)."""

    def flags(self, gaps: str, method: str, /) -> Rows:
        """Return sums of :class:`~basinrain.series.flags.Flag`; shape (n_steps, n_basins)."""


def copied(rows: Rows, steps: slice, basins: slice) -> npt.NDArray[Any]:
    """Return a copy of some steps and basins, and let go of what was mapped from a file to get it.

    Without that all of a file that is looked at part by part would count as memory of the process in the end.

    Examples
    --------
    >>> copied(np.arange(6.0).reshape(3, 2), slice(1, 9), slice(0, 1))
    array([[2.],
           [4.]])
    """
    base = getattr(rows, "base", None)
    if not isinstance(base, mmap.mmap) or not hasattr(base, "madvise"):
        return np.array(rows[steps, basins])
    first, stop, _ = steps.indices(rows.shape[0])
    size = max(_HELD // max(rows.shape[1], 1), 1)
    parts = []
    for at in range(first, stop, size):
        parts.append(np.array(rows[at : min(at + size, stop), basins]))
        base.madvise(mmap.MADV_DONTNEED)
    return np.concatenate(parts) if parts else np.array(rows[first:first, basins])

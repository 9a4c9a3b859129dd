"""What gives series out some steps at a time: a store, or series that are computed when asked for."""

from __future__ import annotations

from typing import Any, Protocol

import numpy.typing as npt

__all__ = ["Rows", "SeriesSource"]


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

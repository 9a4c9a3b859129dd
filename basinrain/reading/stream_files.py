"""Rainfall files that are read in parts: their times and gauges known, their depths still in the file."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.rainfall import Status
from basinrain.reading.blocks import Block
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthRules, Judged, number_depths
from basinrain.reading.long import depth_column
from basinrain.reading.netcdf import NetcdfRows
from basinrain.reading.parquet import ParquetRows
from basinrain.reading.wide import wide_cells

__all__ = ["LongFile", "NetcdfFile", "Presence", "Rows", "StreamFile", "WideFile"]


class Rows(Protocol):
    """The rows of a table in a file, read in pieces."""

    @property
    def columns(self) -> tuple[str, ...]:
        """The names of the columns."""

    @property
    def n_rows(self) -> int:
        """How many rows there are."""

    def tables(
        self, first: int, stop: int, *, only: Sequence[str] | None = None
    ) -> Iterator[tuple[int, DelimitedTable]]:
        """Yield rows in pieces, each with its first row; columns that are not asked for may be blank."""


@dataclass(frozen=True, eq=False)
class Presence:
    """At which of its times a file has cells of every gauge, blank or not.

    Parameters
    ----------
    first, last, count : arrays of int, shape (n_gauges,)
        The first and the last of the file's times, from 0, at which a gauge has a cell, and at how many it has one.
    holes
        The first few times without a cell between a gauge's first and last, by the gauge's column.
    """

    first: npt.NDArray[np.int64]
    last: npt.NDArray[np.int64]
    count: npt.NDArray[np.int64]
    holes: dict[int, tuple[int, ...]]

    @classmethod
    def whole(cls, n_times: int, n_gauges: int) -> Presence:
        """Return the presence in a file with a cell for every gauge and time."""
        ones = np.ones(n_gauges, dtype=np.int64)
        return cls(0 * ones, (n_times - 1) * ones, n_times * ones, {})

    def of(self, gauges: Sequence[int]) -> Presence:
        """Return the presence of some of the columns."""
        kept = list(gauges)
        holes = {k: self.holes[g] for k, g in enumerate(kept) if g in self.holes}
        return Presence(self.first[kept], self.last[kept], self.count[kept], holes)


class StreamFile(Protocol):
    """One file of a source."""

    @property
    def file(self) -> str:
        """The file, as the user is shown it."""

    @property
    def gauges(self) -> tuple[str, ...]:
        """The gauges of the file that are used."""

    @property
    def ends(self) -> npt.NDArray[np.datetime64]:
        """Interval ends in the source's clock, increasing."""

    @property
    def lines(self) -> npt.NDArray[np.int64]:
        """The line, or row from 1, that first has each time."""

    @property
    def presence(self) -> Presence:
        """Where there are cells."""

    def read(self, first: int, stop: int, problems: Problems) -> Block:
        """Return the depths of the times ``first`` to ``stop`` (exclusive); faulty cells are problems."""


@dataclass(frozen=True, eq=False)
class WideFile:
    """A wide table, text or Parquet; attributes as of :class:`StreamFile`."""

    file: str
    gauges: tuple[str, ...]
    ends: npt.NDArray[np.datetime64]
    lines: npt.NDArray[np.int64]
    rows: Rows
    time: str
    depths: DepthRules

    @property
    def presence(self) -> Presence:
        """A wide table has all cells."""
        return Presence.whole(len(self.ends), len(self.gauges))

    def read(self, first: int, stop: int, problems: Problems) -> Block:
        """Return the depths of some times."""
        depth, status = _blank(stop - first, len(self.gauges))
        judged: Judged = {}
        if isinstance(self.rows, ParquetRows) and self.rows.all_numbers(self.gauges):
            for row, values in self.rows.numbers(first, stop, self.gauges):
                at = slice(row - first, row - first + len(values))
                depth[at], status[at], faults = number_depths(values, self.depths)
                for flat, cell in faults:
                    step, g = divmod(flat, len(self.gauges))
                    problems.add(
                        item=f"gauge {self.gauges[g]}",
                        found=cell.found,
                        expected=cell.expected,
                        remedy=cell.remedy,
                        line=row + step + 1,
                        column=self.gauges[g],
                        gauge=self.gauges[g],
                        time=str(self.ends[row + step]),
                    )
        else:
            for row, table in self.rows.tables(first, stop, only=(self.time, *self.gauges)):
                at = slice(row - first, row - first + len(table.lines))
                depth[at], status[at] = wide_cells(table, self.gauges, self.time, self.depths, problems, judged=judged)
        return Block(self.file, self.gauges, self.ends[first:stop], self.lines[first:stop], depth, status, None, {})


@dataclass(frozen=True, eq=False)
class LongFile:
    """A long table in order of time, text or Parquet; other attributes as of :class:`StreamFile`.

    Parameters
    ----------
    first_rows : array of int, shape (n_times + 1,)
        The first row of every time, and the number of rows.
    columns
        The columns ``gauge`` and ``depth``.
    flag
        The column of marks, or None.
    """

    file: str
    gauges: tuple[str, ...]
    ends: npt.NDArray[np.datetime64]
    lines: npt.NDArray[np.int64]
    presence: Presence
    rows: Rows
    first_rows: npt.NDArray[np.int64]
    columns: dict[str, str]
    flag: str | None
    depths: DepthRules

    def read(self, first: int, stop: int, problems: Problems) -> Block:
        """Return the depths of some times."""
        depth, status = _blank(stop - first, len(self.gauges))
        present = np.zeros(depth.shape, dtype=bool)
        column = {gauge: g for g, gauge in enumerate(self.gauges)}
        only = [*self.columns.values(), *([self.flag] if self.flag else [])]
        for row, table in self.rows.tables(int(self.first_rows[first]), int(self.first_rows[stop]), only=only):
            gauges = table.frame[self.columns["gauge"]].map(column)
            used = table
            if gauges.isna().any():  # those left out
                kept = np.flatnonzero(gauges.notna())
                used = DelimitedTable(
                    table.file,
                    table.columns,
                    table.frame.iloc[kept].reset_index(drop=True),
                    table.lines[kept],
                    table.decimal,
                )
            else:
                kept = np.arange(len(table.lines))
            time = np.searchsorted(self.first_rows, row + kept, "right") - 1 - first
            at = (time, gauges.to_numpy()[kept].astype(np.int64))
            depth[at], status[at] = depth_column(used, self.depths, self.columns, self.flag, problems)
            present[at] = True
        return Block(self.file, self.gauges, self.ends[first:stop], self.lines[first:stop], depth, status, present, {})


@dataclass(frozen=True, eq=False)
class NetcdfFile:
    """A NetCDF file; attributes as of :class:`StreamFile`. ``kept`` are the places of its gauges that are used."""

    rows: NetcdfRows
    kept: npt.NDArray[np.int64]
    depths: DepthRules

    @classmethod
    def of(cls, rows: NetcdfRows, depths: DepthRules, exclude: Collection[str]) -> NetcdfFile:
        """Return the file without some gauges."""
        kept = [g for g, gauge in enumerate(rows.gauges) if gauge not in exclude]
        return cls(rows, np.array(kept, dtype=np.int64), depths)

    @property
    def file(self) -> str:
        """The file, as the user is shown it."""
        return str(self.rows.mark.path)

    @property
    def gauges(self) -> tuple[str, ...]:
        """The gauges that are used."""
        return tuple(self.rows.gauges[g] for g in self.kept)

    @property
    def ends(self) -> npt.NDArray[np.datetime64]:
        """Interval ends in the source's clock."""
        return self.rows.ends

    @property
    def lines(self) -> npt.NDArray[np.int64]:
        """The times counted from 1."""
        return np.arange(1, len(self.ends) + 1)

    @property
    def presence(self) -> Presence:
        """A NetCDF file has all cells."""
        return Presence.whole(len(self.ends), len(self.kept))

    def read(self, first: int, stop: int, problems: Problems) -> Block:
        """Return the depths of some times."""
        depth, status = self.rows.read(first, stop, self.depths, problems)
        if len(self.kept) < len(self.rows.gauges):
            depth, status = depth[:, self.kept], status[:, self.kept]
        lines = np.arange(first + 1, stop + 1)
        return Block(self.file, self.gauges, self.ends[first:stop], lines, depth, status, None, {})


def _blank(n: int, n_gauges: int) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
    return np.full((n, n_gauges), np.nan), np.full((n, n_gauges), Status.MISSING, dtype=np.uint8)

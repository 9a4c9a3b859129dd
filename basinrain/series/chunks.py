"""A record in chunks of whole rainfall days, which can be computed one by one, in any order, anywhere."""

from __future__ import annotations

from collections.abc import Callable
from copy import copy
from dataclasses import dataclass
from functools import cached_property
from typing import Final, Protocol, TypeVar

import numpy as np
import numpy.typing as npt

from basinrain.rainfall import KnownTotal, RainRecord

__all__ = ["Chunk", "ChunkSource", "LoadChunk", "RecordSource", "chunk_borders", "chunk_steps_within"]

Bools = npt.NDArray[np.bool_]
Ints = npt.NDArray[np.int64]

_T = TypeVar("_T", bound=np.generic)

Chunk = tuple[RainRecord, Bools | None]
"""Some steps of a record, and which of their gaps are longer than the limit, (n_steps, n_gauges); None: none is."""

LoadChunk = Callable[[], Chunk]
"""Gives a chunk where it is called: carries it, or reads it from files. It can be sent to another process."""

_PREPARED: Final = 384 << 20
"""Bytes of a process before it computes: the libraries, and what is remembered of the network between chunks."""
_PER_PAIR: Final = (8, 24)
"""Bytes for every pair of gauges, and for every pair of a gauge and a basin: the weights that all gauges have."""
_PER_VALUE: Final = 40
"""Bytes at the height of the work for every value of a chunk's record."""
_PER_BASIN: Final = (24, 13)
"""Bytes for every step and basin, and for every mean of them by a policy and a method: 8 + 4 + 1."""


class ChunkSource(Protocol):
    """Where the chunks of a record come from."""

    @property
    def n_steps(self) -> int:
        """Steps of the whole record."""

    @property
    def borders(self) -> Ints:
        """The first step of every chunk, then the number of steps: chunk k has ``borders[k]`` to ``borders[k + 1]``."""

    def task(self, k: int, /) -> LoadChunk:
        """Return what gives chunk ``k`` where it is called."""


def chunk_borders(n_steps: int, *, steps_per_day: int, chunk_steps: int, head: int = 0) -> Ints:
    """Return where the chunks of a record on a regular axis begin, each on a rainfall day.

    They depend on nothing but these numbers: chunks with other borders give results that differ in the last digit.

    Parameters
    ----------
    n_steps
        Steps of the record.
    steps_per_day
        Steps of a day; of as many days as they divide, where they do not divide one; 1 where they are a day or longer.
    chunk_steps
        How many steps a chunk may have. The whole days among them are taken, at least one day.
    head
        Steps of the first rainfall day, where the record begins within a day; they go with the first chunk.

    Returns
    -------
    array of int, shape (n_chunks + 1,)
        0 first, ``n_steps`` last; ``[0]`` for a record without steps.

    Raises
    ------
    ValueError
        A number is below 0, or a day or a chunk has no step.

    Examples
    --------
    >>> chunk_borders(100, steps_per_day=24, chunk_steps=50)
    array([  0,  48,  96, 100])
    >>> chunk_borders(100, steps_per_day=24, chunk_steps=50, head=6)  # begins at 18 h of a day
    array([  0,  30,  78, 100])
    >>> chunk_borders(100, steps_per_day=24, chunk_steps=5)
    array([  0,  24,  48,  72,  96, 100])
    >>> chunk_borders(0, steps_per_day=24, chunk_steps=50)
    array([0])
    """
    if min(n_steps, head) < 0 or min(steps_per_day, chunk_steps) < 1:
        message = f"{n_steps} steps, {head} at the head, {steps_per_day} a day and {chunk_steps} a chunk make no chunks"
        raise ValueError(message)
    days = max(chunk_steps // steps_per_day, 1)
    # A broken first day counts as a day.
    first = (head or steps_per_day) + (days - 1) * steps_per_day
    inner = np.arange(first, n_steps, days * steps_per_day)
    return np.concatenate([[0], inner, [n_steps] if n_steps else []]).astype(np.int64)


def chunk_steps_within(memory_bytes: float, n_gauges: int, n_basins: int, n_series: int) -> int:
    """Return how many steps a chunk may have for one process to stay within a bound of memory.

    Before it computes, a process holds 384 MiB (libraries, and what is remembered of the network) and the weights of
    all gauges. In a chunk each step then takes at most 40 bytes a gauge (the record as it is read, its completed copy,
    the gaps), and for every basin 24 bytes and 13 a series (depth 8, observed share 4, flags 1)::

        fixed = 384 MiB + 8 gauges^2 + 24 gauges basins
        steps = (memory - fixed) / (40 gauges + 24 basins + 13 basins series)

    A record that is in memory as a whole comes on top of it.

    Parameters
    ----------
    memory_bytes
        The bound for one process. What the operating system keeps of files that were read or written, which it gives
        back on demand, does not count.
    n_gauges, n_basins
        Of the whole network; the union counts as a basin.
    n_series
        Policies times averaging methods.

    Returns
    -------
    int
        At least 1, even where the bound is too small for that.

    Examples
    --------
    >>> chunk_steps_within(2 << 30, n_gauges=300, n_basins=200, n_series=3)
    70840
    >>> chunk_steps_within(2 << 30, n_gauges=2000, n_basins=1000, n_series=1)
    14229
    >>> chunk_steps_within(1, n_gauges=300, n_basins=200, n_series=3)
    1
    """
    fixed = _PREPARED + _PER_PAIR[0] * n_gauges**2 + _PER_PAIR[1] * n_gauges * n_basins
    per_step = _PER_VALUE * n_gauges + (_PER_BASIN[0] + _PER_BASIN[1] * n_series) * n_basins
    return max(int((memory_bytes - fixed) / max(per_step, 1)), 1)


@dataclass(frozen=True, eq=False)
class _Loaded:
    """A chunk that is at hand."""

    record: RainRecord
    long: Bools | None

    def __call__(self) -> Chunk:
        return self.record, self.long


@dataclass(frozen=True, eq=False)
class RecordSource:
    """The chunks of a record in memory.

    Parameters
    ----------
    record : RainRecord
        The whole record; it is neither copied nor changed.
    long : array of bool, shape (n_steps, n_gauges), or None
        Which gaps are longer than the limit; None: none is.
    borders : array of int, shape (n_chunks + 1,)
        As :func:`chunk_borders` returns them.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T12", "s") + np.arange(1, 5) * np.timedelta64(12, "h")
    >>> record = RainRecord.from_depths(("A",), ends - np.timedelta64(12, "h"), ends, [[1], [2], [3], [4]], step="12h")
    >>> source = RecordSource(record, None, chunk_borders(4, steps_per_day=2, chunk_steps=2, head=1))
    >>> [source.task(k)()[0].depth.ravel().tolist() for k in range(len(source.borders) - 1)]
    [[1.0], [2.0, 3.0], [4.0]]
    """

    record: RainRecord
    long: Bools | None
    borders: Ints

    @property
    def n_steps(self) -> int:
        """Steps of the whole record."""
        return len(self.record)

    def task(self, k: int, /) -> LoadChunk:
        """Return what gives chunk ``k``, which it carries.

        The chunk has the totals of several steps that reach into it, and no others.
        """
        first, stop = (int(border) for border in self.borders[k : k + 2])
        return _Loaded(self._part(first, stop), None if self.long is None else _rows(self.long, first, stop))

    @cached_property
    def _reach(self) -> tuple[npt.NDArray[np.datetime64], npt.NDArray[np.datetime64]]:
        """When the totals of several steps begin and end."""
        totals = self.record.totals
        return (
            np.array([total.start for total in totals], dtype="datetime64[s]"),
            np.array([total.end for total in totals], dtype="datetime64[s]"),
        )

    def _part(self, first: int, stop: int) -> RainRecord:
        whole = self.record
        # Copied, not made anew: values that were checked once are not checked again in every chunk.
        part = copy(whole)
        fields = {
            "starts": whole.starts[first:stop],
            "ends": whole.ends[first:stop],
            "depth": _rows(whole.depth, first, stop),
            "status": _rows(whole.status, first, stop),
            "labels": whole.labels[first:stop],
            "totals": self._totals(first, stop),
            "notes": (),
        }
        for name, value in fields.items():
            object.__setattr__(part, name, value)
        return part

    def _totals(self, first: int, stop: int) -> tuple[KnownTotal, ...]:
        if not self.record.totals or first == stop or np.isnat(self.record.ends[[first, stop - 1]]).any():
            return self.record.totals
        start, end = self._reach
        reaching = (end > self.record.starts[first]) & (start < self.record.ends[stop - 1])
        return tuple(self.record.totals[n] for n in np.flatnonzero(reaching))


def _rows(values: npt.NDArray[_T], first: int, stop: int) -> npt.NDArray[_T]:
    """Return rows step by step in memory, as they arrive in another process: products round by the order in memory."""
    return np.ascontiguousarray(values[first:stop])

"""The record of a series run: held whole, or read chunk by chunk."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.inputs import Inputs
from basinrain.rainfall import RainRecord, Status
from basinrain.series.chunks import ChunkSource, RecordSource, chunk_borders, chunk_steps_within
from basinrain.series.engine import SeriesSetup

__all__ = ["SeriesInputs", "borders_of", "held_inputs"]

Bools = npt.NDArray[np.bool_]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]

_DAY: Final = 86400
_GIB: Final = 1 << 30


@dataclass(frozen=True, eq=False, kw_only=True)
class SeriesInputs:
    """A job's inputs with the times of its record and a way to its chunks.

    Parameters
    ----------
    given
        Gauges, basins, plane and what was said of them. Its record has no steps where it is not held whole.
    starts, ends : array of datetime64[s], shape (n_steps,)
        Every step of the record is ``(start, end]``.
    chunks
        Given the borders, the chunks between them.
    absent, silent
        Given a first step and the one after the last: which gauges are not in service; which have a gap longer than is
        infilled. Shape (n, n_gauges).
    part
        Given a first step and the one after the last: their record.
    held
        The whole record, where it is in memory.
    """

    given: Inputs
    starts: Times
    ends: Times
    chunks: Callable[[Ints], ChunkSource]
    absent: Callable[[int, int], Bools]
    silent: Callable[[int, int], Bools]
    part: Callable[[int, int], RainRecord]
    held: RainRecord | None


def held_inputs(given: Inputs, longest_gap: float) -> SeriesInputs:
    """Return the inputs of a record that is in memory; ``longest_gap`` in days.

    Raises
    ------
    DataError
        The record is one of storm totals, or has no step, or no gauge that reports.
    """
    record, expected = given.record, "a record of steps with times"
    if record.labels or np.isnat(record.ends).any():
        found, remedy = "storm totals without times", "give a record in steps, or use 'basinrain storm'"
    elif not len(record):
        found, remedy = "no step", "give a record with rows"
    elif not record.reporting.any():
        found, expected = "no gauge with a value in its time of service", "a gauge that reports at some step"
        remedy = "correct the files, what counts as missing, or from and to of the gauges"
    else:
        long = longer_than(record, gap_mask(record), longest_gap)
        return SeriesInputs(
            given=given,
            starts=record.starts,
            ends=record.ends,
            chunks=lambda borders: RecordSource(record, long, borders),
            absent=lambda first, stop: record.status[first:stop] == Status.NOT_INSTALLED,
            silent=lambda first, stop: long[first:stop],
            part=record.window,
            held=record,
        )
    raise DataError(Problem(item="series", found=found, expected=expected, remedy=remedy))


def borders_of(inputs: SeriesInputs, setup: SeriesSetup, memory: float) -> Ints:
    """Return where chunks begin so that one process stays within ``memory`` GiB; see :func:`chunk_steps_within`."""
    begin = inputs.starts.astype(np.int64)
    length = max(int(np.median(inputs.ends.astype(np.int64) - begin)), 1)
    per_day, head = 1, 0
    if length < _DAY:
        # Of as many days as the steps divide, in which the borders of days then come back.
        per_day = math.lcm(length, _DAY) // length
        middle = int(begin[0] + length // 2 - inputs.given.record.day_phase) % _DAY
        head = -(-(_DAY - middle) // length)
    most = chunk_steps_within(
        memory * _GIB,
        n_gauges=len(setup.network),
        n_basins=len(setup.basins),
        n_series=len(setup.series),
    )
    return chunk_borders(len(begin), steps_per_day=per_day, chunk_steps=most, head=head)

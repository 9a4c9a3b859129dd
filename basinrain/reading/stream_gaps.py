"""Gaps of a record that is read in parts, followed across the borders of the parts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.notes import Note
from basinrain.rainfall import WITHOUT_DEPTH, Status
from basinrain.reading.merging import Unused, unused_values
from basinrain.reading.stream import RecordStream

__all__ = ["LongGaps", "long_gaps"]

_GAPS: Final = np.array(sorted(WITHOUT_DEPTH - {Status.NOT_INSTALLED}), dtype=np.uint8)
"""What a gauge in service without a depth has, as in :func:`basinrain.infill.gaps.gap_mask`."""


@dataclass(frozen=True, eq=False)
class LongGaps:
    """Where the gaps of a record are longer than a limit, one bit for every value.

    Parameters
    ----------
    packed : array of uint8, shape (n_steps, n_gauges / 8 rounded up)
        The bits, the first gauge's highest.
    n_gauges
        The number of columns.
    never
        The gauges that do not report at any step.
    notes
        ``value-out-of-service``, as :func:`basinrain.reading.bring_to_step` notes it of the whole record.
    first
        The record's step of the first row.

    Examples
    --------
    >>> gaps = LongGaps(np.packbits(np.array([[True, False], [False, False]]), axis=1), 2)
    >>> gaps.mask(0, 2)
    array([[ True, False],
           [False, False]])
    """

    packed: npt.NDArray[np.uint8]
    n_gauges: int
    never: tuple[str, ...] = ()
    notes: tuple[Note, ...] = ()
    first: int = 0

    def mask(self, first: int, stop: int) -> npt.NDArray[np.bool_]:
        """Return where gaps are long, shape (stop - first, n_gauges), in the record's steps ``first`` to ``stop``."""
        part = self.packed[first - self.first : stop - self.first]
        return np.unpackbits(part, axis=1, count=self.n_gauges).view(np.bool_)

    def part(self, first: int, stop: int) -> LongGaps:
        """Return the gaps of some steps alone, to be carried along with a task; ``mask`` counts as before."""
        return replace(self, packed=self.packed[first - self.first : stop - self.first].copy(), first=first)


def long_gaps(stream: RecordStream, days: float, borders: Sequence[int] | npt.NDArray[np.int64]) -> LongGaps:
    r"""Go through a record once, and return where a gauge's gaps last longer than ``days``.

    Parameters
    ----------
    stream
        The record.
    days
        The longest gap that is not a long one.
    borders
        The steps at which the parts to be read begin, and the number of steps. They decide how much is in memory, and
        nothing else.

    Returns
    -------
    LongGaps
        As :func:`basinrain.infill.gaps.longer_than` finds them in the whole record. An eighth of a byte for every step
        and gauge.

    Raises
    ------
    ReadError, DataError
        A part of the record cannot be read.

    Examples
    --------
    >>> import tempfile
    >>> from pathlib import Path
    >>> from basinrain.gauges import GaugeNetwork
    >>> from basinrain.reading.stream import open_stream
    >>> path = Path(tempfile.mkdtemp()) / "rain.csv"
    >>> _ = path.write_text("date,A,B\n2031-05-04,,1\n2031-05-05,,\n2031-05-06,0,2\n")
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 9.0], y=[0.0, 0.0], crs="local")
    >>> stream = open_stream([{"files": path, "unit": "mm", "interval": "1d"}], network)
    >>> long_gaps(stream, 1, [0, 1, 3]).mask(0, 3)
    array([[ True, False],
           [ True, False],
           [False, False]])
    """
    n_gauges = len(stream.gauges)
    starts, ends = stream.starts, stream.ends
    packed = np.zeros((len(stream), -(-n_gauges // 8)), dtype=np.uint8)
    begun = np.full(n_gauges, -1)  # the step at which a gauge's gap began that reaches the part's end
    reporting = np.zeros(n_gauges, dtype=bool)
    unused: dict[int, Unused] = {}
    limit = days * 86_400

    def is_long(begin: npt.NDArray[np.int64], end: npt.NDArray[np.int64]) -> npt.NDArray[np.bool_]:
        return np.asarray((ends[end - 1] - starts[begin]) / np.timedelta64(1, "s") > limit)

    for first, stop in pairwise(borders):
        record, found = stream.read_noting(int(first), int(stop))
        for gauge, steps, end in found:
            known = unused.get(gauge, Unused(gauge, 0, end))
            unused[gauge] = Unused(gauge, known.steps + steps, known.first)
        reporting |= record.reporting.any(axis=0)
        gaps = np.isin(record.status, _GAPS)
        ended = (begun >= 0) & ~gaps[0]
        _clear(packed, begun, np.flatnonzero(ended & ~is_long(begun, np.full(n_gauges, first))), int(first))
        begun[~gaps[0]] = -1

        edge = np.zeros((1, n_gauges), dtype=bool)
        change = np.diff(np.concatenate([edge, gaps, edge]).view(np.int8), axis=0)
        # Transposed, so that the k-th begin and the k-th end belong to one gap of one gauge.
        gauge_of, begin = np.nonzero(change.T == 1)
        end_of = np.nonzero(change.T == -1)[1]
        carried = (begin == 0) & (begun[gauge_of] >= 0)
        whole = np.where(carried, begun[gauge_of], begin + first)
        reaching = (end_of == len(record)) & (stop < len(stream))
        # What reaches into the next part is taken for long until it ends.
        short = ~reaching & ~is_long(whole, end_of + first)
        _clear(packed, begun, gauge_of[short & carried], int(first))
        level = np.zeros((len(record) + 1, n_gauges), dtype=np.int8)
        level[begin[~short], gauge_of[~short]] += 1
        level[end_of[~short], gauge_of[~short]] -= 1
        packed[first:stop] = np.packbits(level.cumsum(axis=0, dtype=np.int8)[:-1].view(np.bool_), axis=1)
        begun[:] = -1
        begun[gauge_of[reaching]] = whole[reaching]
    never = tuple(gauge for gauge, reports in zip(stream.gauges, reporting, strict=True) if not reports)
    ordered = [unused[gauge] for gauge in sorted(unused)]
    return LongGaps(packed, n_gauges, never, tuple(unused_values(stream.network, ordered)))


def _clear(
    packed: npt.NDArray[np.uint8], begun: npt.NDArray[np.int64], gauges: npt.NDArray[np.int64], stop: int
) -> None:
    """Take back, in place, gaps of gauges from where they began until ``stop``."""
    for gauge in gauges.tolist():
        packed[begun[gauge] : stop, gauge // 8] &= np.uint8(255 ^ (128 >> gauge % 8))

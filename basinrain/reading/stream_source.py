"""One rainfall source that is read in parts."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from basinrain.clocks import clock_seconds
from basinrain.errors import Problems, ReadError
from basinrain.intervals import Interval
from basinrain.rainfall import Status
from basinrain.reading.axis import interval_end, join_cells, positions, unit_of
from basinrain.reading.blocks import problems_of
from basinrain.reading.files import report_repeated
from basinrain.reading.grid import Source
from basinrain.reading.options import of_file
from basinrain.reading.source_rules import SourceRules
from basinrain.reading.stream_axis import regular_axis
from basinrain.reading.stream_files import StreamFile
from basinrain.reading.stream_survey import survey

__all__ = ["StreamSource", "survey_source"]


@dataclass(frozen=True, eq=False)
class StreamSource:
    """The files of a source, their times known and their depths unread; it holds no open file.

    Parameters
    ----------
    files
        The files.
    gauges
        Those of all files, without those left out.
    interval
        The step.
    zone
        The clock.
    first, n_steps
        The position of the first step's end on the source's axis, in seconds or months, and the number of steps.
    name
        What messages call the source.
    shift
        Seconds from its clock to the job's.
    """

    files: tuple[StreamFile, ...]
    gauges: tuple[str, ...]
    interval: Interval
    zone: str
    first: int
    n_steps: int
    name: str = ""
    shift: int = 0

    def in_clock(self, zone: str, name: str) -> StreamSource:
        """Return the source with a name, its times in the clock of ``zone``."""
        return replace(self, name=name, shift=clock_seconds(zone) - clock_seconds(self.zone) if zone else 0)

    def times(self, first: int, stop: int) -> tuple[npt.NDArray[np.datetime64], npt.NDArray[np.datetime64]]:
        """Return starts and ends of some steps, in the job's clock."""
        bounds = interval_end(self.first + unit_of(self.interval) * np.arange(first - 1, stop), self.interval)
        bounds = bounds + np.timedelta64(self.shift, "s")
        return bounds[:-1], bounds[1:]

    def axis(self) -> Source:
        """Return the times of all steps as a source without gauges."""
        starts, ends = self.times(0, self.n_steps)
        nothing = np.empty((self.n_steps, 0)), np.empty((self.n_steps, 0), dtype=np.uint8)
        return Source(self.name, self.interval, (), starts, ends, *nothing, ())

    def within(self, start: np.datetime64, end: np.datetime64) -> Source | None:
        """Return the steps whose intervals lie in ``(start, end]``, with their depths; None where there is none.

        Raises
        ------
        ReadError
            Cells that cannot be, a gauge and time in two files, a file that is gone or has changed; all together.
        """
        starts, ends = self.times(0, self.n_steps)
        first, stop = int(np.searchsorted(starts, start)), int(np.searchsorted(ends, end, "right"))
        if first >= stop:
            return None
        depth, status = self._read(first, stop)
        return Source(self.name, self.interval, self.gauges, starts[first:stop], ends[first:stop], depth, status, ())

    def _read(self, first: int, stop: int) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
        axis = self.first + unit_of(self.interval) * np.arange(first, stop)
        problems = Problems()
        blocks, steps = [], []
        for file in self.files:
            mine = positions(file.ends, self.interval)
            low, high = np.searchsorted(mine, [axis[0], axis[-1] + 1]).tolist()
            if low < high:
                with problems_of(file.file, problems) as here:
                    blocks.append(file.read(low, high, here))
                    steps.append(mine[low:high])
        problems.raise_as(ReadError)
        if not blocks:
            shape = (len(axis), len(self.gauges))
            return np.full(shape, np.nan), np.full(shape, Status.MISSING, dtype=np.uint8)
        if len(blocks) == 1 and blocks[0].gauges == self.gauges and len(steps[0]) == len(axis):
            return blocks[0].depth, blocks[0].status
        column = {gauge: g for g, gauge in enumerate(self.gauges)}
        depth, status, _ = join_cells(blocks, steps, axis, column, interval=self.interval, problems=problems)
        problems.raise_as(ReadError)
        return depth, status


def survey_source(rules: SourceRules, exclude: Collection[str]) -> StreamSource | None:
    """Go through the files of a source once.

    Parameters
    ----------
    rules
        How to understand them; the layout is wide or long.
    exclude
        Gauges that are left out.

    Returns
    -------
    StreamSource or None
        None where it has none but the gauges left out.

    Raises
    ------
    ReadError
        What is wrong with the files, all of it together, as far as the times and gauges tell.
    """
    if rules.stamps is None:
        raise ValueError("storm totals are not read in parts")
    problems = Problems()
    report_repeated(rules.paths, problems)
    problems.raise_as(ReadError)
    zone: str | None = None
    files: list[StreamFile] = []
    for path in rules.paths:
        with of_file(str(path)), problems_of(str(path), problems) as here:
            file, zone = survey(path, rules, rules.stamps, zone=zone, exclude=exclude, problems=here)
            if file is not None:
                files.append(file)
    problems.raise_as(ReadError)
    gauges = tuple(dict.fromkeys(gauge for file in files for gauge in file.gauges))
    if not gauges:
        return None
    first, n = regular_axis(files, rules.interval, gaps=rules.gaps)
    return StreamSource(tuple(files), gauges, rules.interval, zone or "", first, n)

"""Whether the files of a source, read in parts, make one regular axis without undeclared gaps."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, Literal, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems, ReadError
from basinrain.intervals import Interval
from basinrain.reading.axis import absent_steps, check_length, check_phase, positions, unit_of
from basinrain.reading.blocks import Block
from basinrain.reading.spacing import check_spacing
from basinrain.reading.stream_files import StreamFile

__all__ = ["regular_axis"]

_LISTED: Final = 3
_REMEDY: Final = "complete the file, or declare gaps = 'missing'"


def regular_axis(
    files: Sequence[StreamFile], interval: Interval, *, gaps: Literal["refuse", "missing"]
) -> tuple[int, int]:
    """Return the position of the first step of a source's axis, and how many steps it has.

    Parameters
    ----------
    files
        The source's files, in one clock.
    interval
        Its step.
    gaps
        Whether times that are absent between a gauge's first and last are refused.

    Raises
    ------
    ReadError
        Rows whose spacing is not the interval, times off the axis, undeclared gaps; all of a kind together, as
        :func:`basinrain.reading.axis.join_blocks` finds them.
    """
    problems = Problems()
    blocks = [_without_cells(file) for file in files]
    fitting = [block for block in blocks if check_spacing(block, interval, problems)]
    check_phase(fitting, interval, problems)
    problems.raise_as(ReadError)
    places = [positions(file.ends, interval) for file in files]
    times = np.unique(np.concatenate(places))
    if gaps == "refuse":
        _check_gaps(files, places, times, interval, problems)
    n = check_length(int(times[0]), int(times[-1]), interval, problems)
    problems.raise_as(ReadError)
    return int(times[0]), n


def _without_cells(file: StreamFile) -> Block:
    n = len(file.ends)
    return Block(file.file, (), file.ends, file.lines, np.empty((n, 0)), np.empty((n, 0), dtype=np.uint8), None, {})


class _Reach(NamedTuple):
    """Of one gauge: its column in each file that has it, its first and last position, and its number of cells."""

    columns: list[tuple[int, int]]
    first: int
    last: int
    cells: int


def _reaches(files: Sequence[StreamFile], places: Sequence[npt.NDArray[np.int64]]) -> dict[str, _Reach]:
    reaches: dict[str, _Reach] = {}
    for k, (file, place) in enumerate(zip(files, places, strict=True)):
        presence = file.presence
        bounds = zip(
            place[presence.first].tolist(), place[presence.last].tolist(), presence.count.tolist(), strict=True
        )
        for g, (gauge, (first, last, count)) in enumerate(zip(file.gauges, bounds, strict=True)):
            known = reaches.get(gauge, _Reach([], first, last, 0))
            reaches[gauge] = _Reach(
                [*known.columns, (k, g)], min(known.first, first), max(known.last, last), known.cells + count
            )
    return reaches


def _check_gaps(
    files: Sequence[StreamFile],
    places: Sequence[npt.NDArray[np.int64]],
    times: npt.NDArray[np.int64],
    interval: Interval,
    problems: Problems,
) -> None:
    unit = unit_of(interval)
    name = files[0].file if len(files) == 1 else ""
    reaches = _reaches(files, places)
    before = np.flatnonzero(np.diff(times) > unit)
    spans = np.unique([reach[1:3] for reach in reaches.values()], axis=0)
    # A gap between two files that share no gauge is nobody's gap.
    inside = [bool(((spans[:, 0] <= times[k]) & (spans[:, 1] > times[k])).any()) for k in before.tolist()]
    before = before[np.array(inside, dtype=bool)]
    if len(before):
        first = [(int(times[k]), int(times[k + 1])) for k in before[:_LISTED]]
        absent = [low + unit * j for low, high in first for j in range(1, 1 + _LISTED) if low + unit * j < high]
        count = int((np.diff(times)[before] // unit - 1).sum())
        line = 0
        if len(files) == 1:
            line = int(files[0].lines[np.searchsorted(places[0], times[before[0] + 1])])
        problems.add(
            item="time axis",
            found=absent_steps(np.array(absent), count, interval),
            expected="every step once",
            remedy=_REMEDY,
            file=name,
            line=line or None,
        )
    for gauge, reach in reaches.items():
        low, stop = np.searchsorted(times, [reach.first, reach.last + 1])
        # A gauge and time in two files is told when they are read.
        lacking = int(stop - low) - reach.cells
        if lacking > 0:
            where = times[low:stop][~_covered(files, places, times[low:stop], reach)]
            problems.add(
                item=f"gauge {gauge}",
                found=absent_steps(where, lacking, interval),
                expected="every step once between its first and last",
                remedy=_REMEDY,
                file=name,
                gauge=gauge,
            )


def _covered(
    files: Sequence[StreamFile],
    places: Sequence[npt.NDArray[np.int64]],
    times: npt.NDArray[np.int64],
    reach: _Reach,
) -> npt.NDArray[np.bool_]:
    """Return at which times a gauge has cells, as far as its first few holes are known."""
    covered = np.zeros(len(times), dtype=bool)
    for k, g in reach.columns:
        presence = files[k].presence
        mine = places[k][presence.first[g] : presence.last[g] + 1]
        holes = places[k][list(presence.holes.get(g, ()))]
        covered |= np.isin(times, np.setdiff1d(mine, holes))
    return covered

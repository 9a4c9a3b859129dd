"""The grid of steps that all sources of a job share."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from basinrain.errors import DataError, Problems
from basinrain.intervals import DAY, Interval, interval_of, parse_interval
from basinrain.reading.grid import Grid, Source, off_bounds, relation

__all__ = ["common_grid", "reading_hours"]


def common_grid(sources: Sequence[Source], common: str | None) -> Grid:
    """Return the grid of the common step, onto whose bounds all sources fit.

    Parameters
    ----------
    sources
        In one clock; only their intervals matter here.
    common
        The common step; the finest source's where None.

    Raises
    ------
    JobError
        The step is not understood.
    DataError
        A source has a step that neither divides the common one nor is a multiple of it, or intervals off its bounds.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01:00", "2031-05-04T02:00"], dtype="datetime64[s]")
    >>> nothing = np.empty((2, 0)), np.empty((2, 0), dtype=np.uint8)
    >>> source = Source("source 1", Interval("1h", 3600), (), ends - 3600, ends, *nothing, ())
    >>> common_grid([source], None)
    Grid(interval=Interval(label='1h', seconds=3600), phase=0)
    """
    step = parse_interval(common, item="[step] common") if common is not None else _finest(sources)
    grid = Grid(step, _phase(sources, step))
    _check_steps(sources, grid)
    return grid


def _finest(sources: Sequence[Source]) -> Interval:
    steps = [source.interval for source in sources if source.interval is not None]
    return min(steps, key=lambda step: step.seconds or np.inf)


def _phase(sources: Sequence[Source], step: Interval) -> int:
    length = step.seconds or DAY
    same = [source for source in sources if source.interval == step]
    if same:
        return int(same[0].ends[0].astype(np.int64)) % length
    hours = {hour for source in sources for hour in reading_hours(source)}
    return hours.pop() if length % DAY == 0 and len(hours) == 1 else 0


def reading_hours(source: Source) -> set[int]:
    """Return the second of the day at which a source of whole days is read; nothing for other sources."""
    if source.interval is None or not source.interval.whole_days:
        return set()
    return {int(source.ends[0].astype(np.int64)) % DAY}


def _check_steps(sources: Sequence[Source], grid: Grid) -> None:
    problems = Problems()
    step = grid.interval
    for source in sources:
        if source.interval is not None and not relation(source.interval, step):
            problems.add(
                item=source.name,
                found=f"steps of {source.interval.label} beside the common step {step.label}",
                expected="a common step that divides it or is a multiple of it",
                remedy=f"set [step] common to one that fits every source, such as '{_fitting(sources, 0)}'",
            )
            continue
        off = off_bounds(source, grid)
        if len(off):
            row = off[0]
            problems.add(
                item=source.name,
                found=f"an interval from {source.starts[row]} to {source.ends[row]}",
                expected=f"intervals that begin and end on bounds of the common step {step.label}, such as "
                f"{grid.bounds(grid.numbers(source.ends[row : row + 1])[0])[0]}",
                remedy=f"set [step] common = '{_fitting(sources, grid.phase)}', or correct the source's times",
                time=str(source.ends[row]),
            )
    problems.raise_as(DataError)


def _fitting(sources: Sequence[Source], phase: int) -> str:
    """Return the longest step, of a day at most, whose bounds all sources share."""
    seconds = DAY
    for source in sources:
        seconds = int(np.gcd(seconds, (source.interval.seconds if source.interval else None) or DAY))
        for times in (source.starts, source.ends):
            seconds = int(np.gcd.reduce(np.r_[seconds, np.abs(times.astype(np.int64) - phase)]))
    return interval_of(seconds).label if seconds % 60 == 0 else "1min"

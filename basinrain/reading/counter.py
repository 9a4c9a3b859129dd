"""Counters: gauges that report the depth since they were last emptied or restarted.

What fell in a step is the rise of the reading. A reading that falls is noise, a rollover or a reset, and nothing is
invented for what a reset hides.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem, Problems, ReadError
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.reading.blocks import DEPTH_NAMES, GAUGE_NAMES, Block
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthRules, greatest_depth
from basinrain.reading.long import read_long
from basinrain.reading.stamps import StampRules
from basinrain.reading.wide import read_wide

__all__ = ["CounterRules", "counter_depths", "read_counter"]

_LEAST: Final = 1e-6
"""mm; differences below it are of the arithmetic, not of the gauge."""

_RESET: Final = 0.5
"""A reset takes away at least this share of the reading."""

_DROPOUT: Final = 3
_LEAP: Final = 0.1
"""Low readings are faulty when they are so few, or the rise back is over this share of the greatest known depth."""

_OFTEN: Final = 0.25
_FEW: Final = 2
"""A counter that falls at more than this share of its readings, and more than a few times, is none, or a noisy one."""


@dataclass(frozen=True, kw_only=True)
class CounterRules:
    """What the readings of a counter can do beside rising.

    Parameters
    ----------
    rollover
        mm at which the counter starts again from 0; None: it does not.
    jitter
        mm by which a reading can fall without meaning, from noise or evaporation.
    reset_at_reading
        Whether the counter is only ever set to 0 just after a reading, as one of the rain since midnight is.

    Raises
    ------
    JobError
        The jitter is not below half the rollover value.
    """

    rollover: float | None = None
    jitter: float = 0.0
    reset_at_reading: bool = False

    def __post_init__(self) -> None:
        if self.rollover is not None and self.jitter >= self.rollover / 2:
            raise JobError(
                Problem(item="jitter", found="it as large as half of rollover or more", expected="a smaller jitter")
            )


def read_counter(
    table: DelimitedTable,
    depths: DepthRules,
    stamps: StampRules,
    *,
    columns: Mapping[str, str],
    zone: str | None,
    problems: Problems,
) -> tuple[Block | None, str | None]:
    """Read a table of readings, as they stand: a column of times and one for every gauge, or gauge, time and depth.

    Parameters
    ----------
    table
        The file's cells. It is long where it has a column of gauges and one of depths, or ``columns`` say so; else it
        is wide.
    depths, stamps
        How to understand them. A stamp is the time of the reading. A reading below 0 by no more than
        ``depths.least`` allows counts 0.
    columns
        Which column is ``gauge``, ``time``, ``depth``, ``flag``; else they are found by their names.
    zone
        The clock settled by earlier files; None when this is the first.
    problems
        Takes what is wrong with the file.

    Returns
    -------
    block, zone
        Readings in mm in place of depths; None where the file cannot be used at all.
    """
    long = not {"gauge", "depth", "flag"}.isdisjoint(columns) or all(
        find_column(table.columns, names, mapped=None, key=key, problems=problems) is not None
        for key, names in (("gauge", GAUGE_NAMES), ("depth", DEPTH_NAMES))
    )
    read = read_long if long else read_wide
    block, zone = read(table, depths, stamps, columns=columns, zone=zone, problems=problems)
    if block is None:
        return None, zone
    if block.spans:
        problems.add(
            item="the header",
            found="a column of steps, over which depths accumulate",
            expected="readings of a counter",
            remedy="correct layout, or remove the column",
        )
        return None, zone
    return replace(block, depth=np.maximum(block.depth, 0.0)), zone


def counter_depths(readings: RainRecord, rules: CounterRules, *, file: str = "") -> RainRecord:
    """Return the depths that fell between the readings of counters.

    Parameters
    ----------
    readings
        Readings in mm in place of depths, each at the end of its step. What is not known has no depth.
    rules
        Rollover and jitter.
    file
        The file that they come from, for messages; ``""`` for several.

    Returns
    -------
    RainRecord
        From the step that ends with the second reading; before a gauge's first reading and after its last it is
        missing. The rest of a gauge follows from its readings, one after another:

        - A rise is the depth since the reading before. Over missing readings it is a known total over their steps and
          its own, which have status ACCUMULATED; no rise over them means that all of them are zero.
        - A fall of no more than the jitter is no rain, and so is the rise back: depths count from the highest reading,
          so that their total is kept.
        - A greater fall is a rollover where there is one, the wrapped rise is less than half the rollover value and no
          more than has ever been measured in such a time. The wrapped rise is the depth.
        - Else a fall by at least half the reading is a reset, at an unknown time since the reading before: what fell
          in the meantime is not known, so that the steps since then are missing. The next depth counts from the new
          reading. With ``reset_at_reading`` the new reading is what fell since.
        - A fall that only undoes the last rise, or that the first rise after it makes good at once, is no reset: the
          readings between the two were faulty, and all steps from the first of the two to the second are missing.

        A depth is ESTIMATED or ADJUSTED where one of its two readings is.

    Raises
    ------
    ReadError
        Fewer than two readings in all; readings that only fall, fall too often, or fall by less than half without
        reaching 0, which a counter does not; readings above the rollover value; rises that have never been measured in
        such a time. All of them together.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T08:00:00") + np.arange(6) * np.timedelta64(3600, "s")
    >>> cells = [[12.0], [12.5], [np.nan], [14.0], [0.4], [0.9]]
    >>> readings = RainRecord.from_depths(("R07",), ends - np.timedelta64(3600, "s"), ends, cells, step="1h")
    >>> record = counter_depths(readings, CounterRules())
    >>> record.depth[:, 0], [Status(code).label for code in record.status[:, 0]]
    (array([0.5, nan, nan, nan, 0.5]), ['observed', 'accumulated', 'accumulated', 'missing', 'observed'])
    >>> record.totals[0].depth, str(record.totals[0].start), str(record.totals[0].end)
    (1.5, '2031-05-04T09:00:00', '2031-05-04T11:00:00')
    """
    problems = Problems(file=file)
    if len(readings) < 2:
        problems.add(
            item="the readings of the counter",
            found=f"readings at one time, {readings.ends[0]}" if len(readings) else "none",
            expected="readings at two times or more",
        )
    problems.raise_as(ReadError)
    shape = (len(readings) - 1, len(readings.gauges))
    depth, status = np.full(shape, np.nan), np.full(shape, Status.MISSING, dtype=np.uint8)
    totals: list[KnownTotal] = []
    for g in range(len(readings.gauges)):
        column = _Column(readings, g, np.flatnonzero(~np.isnan(readings.depth[:, g])))
        rises = _rises(column, rules, problems)
        totals += _put(column, rises, depth[:, g], status[:, g])
    problems.raise_as(ReadError)
    return replace(
        readings,
        starts=readings.starts[1:],
        ends=readings.ends[1:],
        depth=depth,
        status=status,
        totals=tuple(totals),
    )


@dataclass(frozen=True, eq=False)
class _Column:
    """One gauge's readings: the record, the gauge's place, and the rows that have a reading."""

    record: RainRecord
    place: int
    rows: npt.NDArray[np.int64]

    @property
    def gauge(self) -> str:
        return self.record.gauges[self.place]

    @property
    def values(self) -> npt.NDArray[np.float64]:
        return np.asarray(self.record.depth[self.rows, self.place])

    def hours(self, readings: npt.NDArray[np.int64]) -> npt.NDArray[np.float64]:
        """Return the hours from the reading before to each of these readings."""
        ends = self.record.ends[self.rows].astype(np.int64)
        return np.asarray((ends[readings] - ends[readings - 1]) / 3600.0)

    def report(self, problems: Problems, reading: int, *, found: str, expected: str, remedy: str) -> None:
        problems.add(
            item=f"gauge {self.gauge}",
            found=found,
            expected=expected,
            remedy=remedy,
            gauge=self.gauge,
            time=str(self.record.ends[self.rows[reading]]),
        )

    def said(self, reading: int) -> str:
        """Return a fall in words."""
        before, after = self.values[reading - 1 : reading + 1]
        return f"from {before:g} mm to {after:g} mm at {self.record.ends[self.rows[reading]]}"


def _rises(column: _Column, rules: CounterRules, problems: Problems) -> npt.NDArray[np.float64]:
    """Return the depth since the reading before, for every reading; NaN where it is not known."""
    values = column.values
    rises = np.full(len(values), np.nan)
    if rules.rollover is not None and (values > rules.rollover + _LEAST).any():
        first = int(np.argmax(values > rules.rollover + _LEAST))
        column.report(
            problems,
            first,
            found=f"a reading of {values[first]:g} mm at {column.record.ends[column.rows[first]]}",
            expected=f"none above rollover, {rules.rollover:g} mm",
            remedy="correct rollover, which is in the source's unit",
        )
        return rises
    start = 0
    resets: list[tuple[int, float]] = []
    noise: list[int] = []
    while start < len(values):
        stop, highest = _until_fall(values, start, rules.jitter)
        # Depths count from the highest reading so far.
        rises[start + 1 : stop] = np.diff(highest)
        if stop == len(values):
            break
        wrap = _wrapped(column, stop, float(highest[-1]), rules)
        if wrap is not None:
            rises[stop] = wrap
        elif highest[-1] - values[stop] >= _RESET * highest[-1]:
            resets.append((stop, float(highest[-1])))
        else:
            noise.append(stop)
        start = stop
    rises = np.round(rises, 9)
    _check_falls(column, rises, [reading for reading, _ in resets], noise, problems)
    for reading, before in resets:
        if rules.reset_at_reading:
            rises[reading] = round(float(values[reading]), 9)
            continue
        _drop_faulty(column, rises, reading, before=before, jitter=rules.jitter + _LEAST)
    _check_rises(column, rises, problems)
    return rises


def _until_fall(values: npt.NDArray[np.float64], start: int, jitter: float) -> tuple[int, npt.NDArray[np.float64]]:
    """Return the first reading that falls by more than the jitter, and the highest reading so far until then."""
    size = 256
    while True:
        part = values[start : start + size]
        highest = np.maximum.accumulate(part)
        falls = part < highest - jitter - _LEAST
        if falls.any():
            n = int(np.argmax(falls))
            return start + n, highest[:n]
        if start + size >= len(values):
            return len(values), highest
        size *= 2


def _wrapped(column: _Column, reading: int, before: float, rules: CounterRules) -> float | None:
    if rules.rollover is None:
        return None
    rise = rules.rollover - before + float(column.values[reading])
    most = float(greatest_depth(column.hours(np.array([reading])))[0])
    return max(0.0, rise) if rise < min(rules.rollover / 2, most) else None


def _drop_faulty(
    column: _Column, rises: npt.NDArray[np.float64], reading: int, *, before: float, jitter: float
) -> None:
    """Take out, in place, the rise and fall of readings that were faulty and not those of a reset."""
    values = column.values
    earlier = np.flatnonzero(rises[:reading] > 0)
    if len(earlier):
        rise = int(earlier[-1])
        undone = values[reading] >= values[rise - 1] - jitter
        # A fall to 0 undoes every first rise of the day: then only the reading just before it is in doubt.
        if undone and (values[reading] > jitter or rise == reading - 1):
            rises[rise:reading] = np.nan
    later = np.flatnonzero(rises[reading + 1 :] > 0)
    if len(later):
        rise = reading + 1 + int(later[0])
        leap = rises[rise] > _LEAP * greatest_depth(column.hours(np.array([rise])))[0]
        if values[rise] >= before - jitter and (leap or rise - reading <= _DROPOUT):
            rises[reading : rise + 1] = np.nan


def _check_falls(
    column: _Column,
    rises: npt.NDArray[np.float64],
    resets: list[int],
    noise: list[int],
    problems: Problems,
) -> None:
    falls = sorted(resets + noise)
    n = len(column.rows)
    if len(falls) >= _FEW and not (rises > 0).any():
        column.report(
            problems,
            falls[0],
            found=f"readings that only fall, {len(falls)} times, first {column.said(falls[0])}",
            expected="readings that rise with the rain",
            remedy="correct layout, or the column: a depth to water or a draining store is no counter",
        )
    elif noise or len(falls) > _FEW + _OFTEN * n:
        shown = noise[0] if noise else falls[0]
        greatest = max(float(column.values[k - 1] - column.values[k]) for k in (noise or falls))
        column.report(
            problems,
            shown,
            found=f"readings that fall {len(falls)} times among {n}, such as {column.said(shown)}",
            expected="falls within the jitter, to the start after a reset, or past rollover",
            remedy=f"declare jitter where they are noise (they fall by up to {greatest:g} mm), or rollover, or correct "
            "the readings",
        )


def _check_rises(column: _Column, rises: npt.NDArray[np.float64], problems: Problems) -> None:
    later = np.arange(1, len(rises))
    most = np.full(len(rises), np.inf)
    most[1:] = greatest_depth(column.hours(later))
    beyond = np.flatnonzero(rises > most)
    if len(beyond):
        first = int(beyond[0])
        more = f", and {len(beyond) - 1} more like it" if len(beyond) > 1 else ""
        column.report(
            problems,
            first,
            found=f"a rise of {rises[first]:g} mm until {column.record.ends[column.rows[first]]}{more}",
            expected=f"at most {most[first]:.0f} mm, which hardly ever fell in such a time",
            remedy="declare missing the readings that are none, or correct unit",
        )


def _put(
    column: _Column, rises: npt.NDArray[np.float64], depth: npt.NDArray[np.float64], status: npt.NDArray[np.uint8]
) -> list[KnownTotal]:
    """Write a gauge's depths and statuses into the steps between readings; return its totals over several steps."""
    rows, record = column.rows, column.record
    marks = record.status[rows, column.place]
    kind = np.where(rises > 0, Status.OBSERVED, Status.ZERO)
    for mark in (Status.ADJUSTED, Status.ESTIMATED):
        marked = marks == mark
        kind[1:][marked[1:] | marked[:-1]] = mark
    known = ~np.isnan(rises)
    single = known & (np.diff(rows, prepend=-1) == 1)
    depth[rows[single] - 1], status[rows[single] - 1] = rises[single], kind[single]
    totals = []
    for reading in np.flatnonzero(known & ~single):
        first, last = int(rows[reading - 1]), int(rows[reading])
        if rises[reading] == 0:
            depth[first:last], status[first:last] = 0.0, kind[reading]
            continue
        status[first:last] = Status.ACCUMULATED
        totals.append(KnownTotal(column.gauge, record.ends[first], record.ends[last], float(rises[reading])))
    return totals

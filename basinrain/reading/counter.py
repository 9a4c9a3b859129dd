"""Counters: gauges that report the depth since they were last emptied or restarted.

What fell in a step is the rise of the reading. A reading that falls is noise, a rollover or a reset, and nothing is
invented for what a reset hides.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from basinrain.clocks import clock_name
from basinrain.errors import JobError, Problem, Problems, ReadError
from basinrain.intervals import DAY, parse_interval
from basinrain.notes import Note
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.reading.blocks import DEPTH_NAMES, GAUGE_NAMES, Block
from basinrain.reading.columns import find_column
from basinrain.reading.counter_column import CounterColumn, counter_column
from basinrain.reading.counter_rises import depth_rises
from basinrain.reading.counter_rules import CounterRules
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthRules
from basinrain.reading.long import read_long
from basinrain.reading.stamps import StampRules
from basinrain.reading.wide import read_wide

__all__ = ["counter_depths", "read_counter"]


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
        Rollover, jitter, and when the counters are set to 0.
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
          reading.
        - Readings that leap away, by more than a tenth of what has ever fallen in such a time and 30 mm, and back at
          once are faulty. They count as missing: what fell meanwhile is a known total.
        - A smaller fall that only undoes the last rise, or that the first rise after it makes good at once, may be a
          reset or a faulty reading: all steps from the first of the two to the second are missing.

        With ``rules.reset`` every day begins anew: right after the reading of that time the counter is at 0, whether or
        not the next reading is lower, and whether or not there was one at that time. Where there was none, what fell
        between the last reading before and the reset is not known. Falls at any other time are judged as above.

        A depth is ESTIMATED or ADJUSTED where one of its two readings is. ``notes`` say what falls were taken for:
        ``counter-reset``, ``counter-rollover``, ``counter-doubtful``, ``counter-leap``.

    Raises
    ------
    JobError
        The time of the reset is none at which the counters are read.
    ReadError
        Fewer than two readings in all; readings that only fall, fall too often, fall to 0 after nearly every rise, or
        fall by less than half without reaching 0, which a counter does not; readings that go on rising where the
        counter is declared to be set to 0; readings above the rollover value; rises that have never been measured in
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
    _check_time(readings, rules, file)
    shape = (len(readings) - 1, len(readings.gauges))
    depth, status = np.full(shape, np.nan), np.full(shape, Status.MISSING, dtype=np.uint8)
    totals: list[KnownTotal] = []
    notes: list[Note] = []
    for g in range(len(readings.gauges)):
        column, rises = depth_rises(counter_column(readings, g, rules.reset), rules, problems, notes)
        totals += _put(column, rises, depth[:, g], status[:, g])
    problems.raise_as(ReadError)
    return replace(
        readings,
        starts=readings.starts[1:],
        ends=readings.ends[1:],
        depth=depth,
        status=status,
        totals=tuple(totals),
        notes=(*readings.notes, *notes),
    )


def _check_time(readings: RainRecord, rules: CounterRules, file: str) -> None:
    """Refuse a reset at a time at which no step ends: nothing would say what fell before it and what after."""
    if rules.reset is None:
        return
    step = parse_interval(readings.step)
    phase = int(readings.ends[0].astype(np.int64)) % DAY
    if step.seconds is None or DAY % step.seconds or (rules.reset - phase) % step.seconds:
        raise JobError(
            Problem(
                item="reset",
                found=f"'{clock_name(rules.reset)[1:]}'",
                expected=f"a time of day at which the counters are read, such as {clock_name(phase)[1:]}"
                if step.seconds is not None and DAY % step.seconds == 0
                else f"none, as readings of every {step.label} are not taken at the same times every day",
                remedy="correct it, or leave it out",
                file=file,
            )
        )


def _put(
    column: CounterColumn,
    rises: npt.NDArray[np.float64],
    depth: npt.NDArray[np.float64],
    status: npt.NDArray[np.uint8],
) -> list[KnownTotal]:
    """Write a gauge's depths and statuses into the steps between readings; return its totals over several steps."""
    rows, record = column.rows, column.record
    marks = np.where(column.anew, Status.ZERO, record.status[rows, column.place])
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

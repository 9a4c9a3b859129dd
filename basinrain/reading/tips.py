"""Logs of tipping-bucket gauges: the times of the tips become depths per step.

Silence is no rain, but only while the logger ran; a log cannot tell dry weather from a dead battery. So a gauge is
taken to have run from the first row of a file to its last, or over the period that the source declares, save after a
row that says that recording stopped, and over no silence of more than a year. Everything else is missing, not zero.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem, Problems
from basinrain.intervals import DAY, Interval
from basinrain.notes import Note
from basinrain.rainfall import Status
from basinrain.reading.axis import check_length
from basinrain.reading.blocks import Block, problems_of
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthRules
from basinrain.reading.options import of_file
from basinrain.reading.stamps import StampRules, read_stamps
from basinrain.reading.tip_logs import TipLog, join_logs, moment, read_logs

__all__ = ["TipRules", "read_tips"]

_LONGEST_SILENCE: Final = 366 * DAY
"""s; no rain for so long is presumed to be a clock or a logger that failed."""

_LISTED: Final = 3


@dataclass(frozen=True, kw_only=True)
class TipRules:
    """How the tips of a source are to be understood.

    Parameters
    ----------
    interval
        The step to which tips are summed; it divides the day.
    tip
        mm of one tip; None where a depth column says so.
    start, end
        The period ``(start, end]`` over which every logger of the source is known to have run, ISO 8601; None: from
        the gauge's first row, until its last.

    Raises
    ------
    JobError
        The step does not divide the day.
    """

    interval: Interval
    tip: float | None = None
    start: str | None = None
    end: str | None = None

    def __post_init__(self) -> None:
        if self.interval.seconds is None or DAY % self.interval.seconds:
            raise JobError(
                Problem(
                    item="interval",
                    found=f"'{self.interval.label}'",
                    expected="a step that divides the day, as layout is 'tips'",
                    remedy="sum tips to a short step, such as '5min'; [step] common can sum these further",
                )
            )


@dataclass(frozen=True, eq=False)
class _Steps:
    """Depth of one gauge over the steps from ``first``, numbered from 1970 by their ends; NaN where it is not known."""

    first: int
    depth: npt.NDArray[np.float64]


def read_tips(
    tables: list[DelimitedTable],
    depths: DepthRules,
    stamps: StampRules,
    rules: TipRules,
    *,
    columns: Mapping[str, str],
    problems: Problems,
    notes: list[Note],
) -> tuple[list[Block], str]:
    """Read the logs of a source: rows of gauge, time and depth, one a tip.

    A step is ``(start, end]``: a tip at 10:05:00 belongs to the step that ends at 10:05. A second may have several
    tips, and fractions of seconds count. A row of depth 0 is no rain; it shows that the logger ran then, as a daily
    test does. A row without a depth (a blank cell or a missing code) says that recording stopped: from there to the
    gauge's next row nothing is known, and steps that reach into that time are missing as a whole. The steps of a
    gauge's first and last row count as recorded; before and after them the gauge is missing, unless ``start`` and
    ``end`` say that its logger ran. So it is between the steps of the last row of a file and of the first one of the
    next, and between rows that stand more than 366 days apart, unless both ``start`` and ``end`` are declared.

    Parameters
    ----------
    tables
        The files' cells, emptied while reading. Files of one gauge are taken to follow on each other.
    depths, stamps, rules
        How to understand them.
    columns
        Which column is ``gauge``, ``time``, ``depth``; else they are found by their names. A file without a gauge
        column holds the gauge that the file is named for. A depth column is needed where ``rules`` have no tip, and
        refused where they have.
    problems
        Takes what is wrong with the files: rows of a gauge that are not in order of time, files of a gauge that overlap
        in time, every time of a gauge twice, rows outside the declared period.
    notes
        Takes ``log-gap`` and ``long-silence`` for what is missing between rows of a gauge, and ``run-not-declared``.

    Returns
    -------
    blocks, zone
        One block for all files, every step from the first to the last of all gauges; none where anything is wrong.

    Examples
    --------
    >>> import pandas as pd
    >>> from basinrain.reading.depths import depth_rules
    >>> five = Interval("5min", 300)
    >>> depths = depth_rules(unit="mm", interval=five, missing=[], trace=[], flags={}, accumulated=None)
    >>> times = ["2031-05-04 10:00:00", "2031-05-04 10:04:59", "2031-05-04 10:05:00", "2031-05-04 10:12:00"]
    >>> table = DelimitedTable("R07.csv", ("time",), pd.DataFrame({"time": times}), np.arange(2, 6), ".")
    >>> rules = TipRules(interval=five, tip=0.2)
    >>> [block], zone = read_tips(
    ...     [table], depths, StampRules(interval=five), rules, columns={}, problems=Problems(), notes=[]
    ... )
    >>> block.gauges, block.depth[:, 0], str(block.ends[0])
    (('R07',), array([0.2, 0.4, 0. , 0.2]), '2031-05-04T10:00:00')
    """
    zone: str | None = None
    logs: dict[str, list[TipLog]] = {}
    files = [table.file for table in tables]
    before = len(problems)
    while tables:
        table = tables.pop(0)  # let go of the text as soon as it is numbers
        with of_file(table.file), problems_of(table.file, problems) as here:
            read, zone = read_logs(table, depths, stamps, tip=rules.tip, columns=columns, zone=zone, problems=here)
            for gauge, log in read.items():
                logs.setdefault(gauge, []).append(log)
    if len(problems) > before:
        return [], zone or ""
    start, end = _period(rules, stamps, zone or "", files[0])
    joined = {gauge: join_logs(gauge, several, problems) for gauge, several in logs.items()}
    for gauge, log in joined.items():
        _check_period(gauge, log, start, end, problems)
    if len(problems) > before:
        return [], zone or ""
    step = rules.interval.seconds or DAY
    earliest = min(int(log.seconds[0]) for log in joined.values()) if start is None else start
    latest = max(int(log.seconds[-1]) for log in joined.values()) if end is None else end
    check_length(-(-earliest // step) * step, -(-latest // step) * step, rules.interval, problems)
    if len(problems) > before:
        return [], zone or ""
    steps = {gauge: _binned(log, rules, start, end) for gauge, log in joined.items()}
    if start is None or end is None:
        notes.append(_NOT_DECLARED)
        for gauge, log in joined.items():
            notes += _take_out_silence(gauge, log, steps[gauge], step)
    first = min(part.first for part in steps.values())
    last = max(part.first + len(part.depth) for part in steps.values()) - 1
    depth = np.full((last - first + 1, len(steps)), np.nan)
    for g, part in enumerate(steps.values()):
        depth[part.first - first : part.first - first + len(part.depth), g] = part.depth
    status = np.where(np.isnan(depth), Status.MISSING, np.where(depth > 0, Status.OBSERVED, Status.ZERO))
    ends = (np.arange(first, last + 1) * step).astype("datetime64[s]")
    file = files[0] if len(files) == 1 else ""
    lines = np.zeros(len(ends), dtype=np.int64)
    return [Block(file, tuple(steps), ends, lines, depth, status.astype(np.uint8), None, {})], zone or ""


_NOT_DECLARED: Final = Note(
    code="run-not-declared",
    text="Nothing says how long the loggers of tips ran before their first row and after their last. The steps of "
    "these rows count as recorded; at a longer common step they are missing. Give start and end where they are known.",
    level="info",
)


def _period(rules: TipRules, stamps: StampRules, zone: str, file: str) -> tuple[int | None, int | None]:
    """Return the declared bounds in seconds since 1970; they must be bounds of steps, in order."""
    problems = Problems(file=file)
    start = _bound("start", rules.start, stamps, zone, problems)
    end = _bound("end", rules.end, stamps, zone, problems)
    step = rules.interval.seconds or DAY
    for key, text, bound in (("start", rules.start, start), ("end", rules.end, end)):
        if bound is not None and bound % step:
            problems.add(
                item=key,
                found=f"'{text}'",
                expected=f"a bound of the steps of {rules.interval.label}, counted from midnight",
                remedy="take the next one at which the loggers ran",
            )
    if start is not None and end is not None and end <= start:
        problems.add(item="end", found=f"'{rules.end}'", expected=f"a time after start, '{rules.start}'")
    problems.raise_as(JobError)
    return start, end


def _bound(key: str, text: str | None, stamps: StampRules, zone: str, problems: Problems) -> int | None:
    if text is None:
        return None
    length = Interval("1mo", None) if re.fullmatch(r"\d{4}-\d{2}", text) else Interval("1d", DAY)
    bare = len(text) <= len("2031-05-04")
    rules = replace(stamps, interval=length if bare else Interval("1min", 60), time_format=None)
    ends, _, faults = read_stamps([text], rules, zone=zone)
    if faults:
        problems.add(item=key, found=faults[0].found, expected=faults[0].expected, remedy="correct it")
        return None
    if bare and key == "start":
        # A bare date or month names that whole day or month.
        return int(np.datetime64(text, "s").astype(np.int64))
    return int(ends[0].astype(np.int64))


def _check_period(gauge: str, log: TipLog, start: int | None, end: int | None, problems: Problems) -> None:
    out = np.zeros(len(log.seconds), dtype=bool)
    if start is not None:
        # A test at the very start is in order; a tip then would be of the step before.
        out |= (log.seconds < start) | ((log.seconds == start) & (log.depth > 0))
    if end is not None:
        out |= log.seconds > end
    rows = np.flatnonzero(out)
    if len(rows):
        begin = "its first row" if start is None else moment(start)
        problems.add(
            item=f"gauge {gauge}",
            found=f"{len(rows)} row{'s' if len(rows) > 1 else ''} outside the period, the first at "
            f"{moment(log.seconds[rows[0]])}",
            expected=f"rows after {begin}, until {'its last row' if end is None else moment(end)}, as declared",
            remedy="correct start and end, or the rows",
            file=log.file,
            line=int(log.lines[rows[0]]) if log.file else None,
            gauge=gauge,
            time=moment(log.seconds[rows[0]]),
        )


def _take_out_silence(gauge: str, log: TipLog, part: _Steps, step: int) -> list[Note]:
    """Make missing, in place, the steps between rows of which nothing shows that the logger ran."""
    number = -(-log.seconds // step)
    first_of_file = np.zeros(len(number), dtype=bool)
    first_of_file[log.joints] = True
    silence = np.diff(log.seconds, prepend=log.seconds[0])
    # The steps of both rows are known from these rows; where recording had stopped, the rest is missing already.
    between = (np.diff(number, prepend=number[0]) > 1) & ~np.isnan(np.r_[np.nan, log.depth[:-1]])
    long = between & (silence > _LONGEST_SILENCE)
    joint = between & first_of_file & ~long
    for row in np.flatnonzero(long | joint):
        part.depth[number[row - 1] + 1 - part.first : number[row] - part.first] = np.nan
    notes = []
    if joint.any():
        notes.append(
            Note(
                code="log-gap",
                text=f"Gauge {gauge}: nothing shows that the logger ran between its files, {_stretches(log, joint)}; "
                "this is missing, not dry. If it ran, give start and end.",
                gauge=gauge,
            )
        )
    if long.any():
        notes.append(
            Note(
                code="long-silence",
                text=f"Gauge {gauge}: rows that stand more than 366 days apart, {_stretches(log, long)}; so long a "
                "silence is missing, not dry. Remove a row whose clock was wrong; if the logger ran, give start and "
                "end.",
                gauge=gauge,
            )
        )
    return notes


def _stretches(log: TipLog, where: npt.NDArray[np.bool_]) -> str:
    rows = np.flatnonzero(where).tolist()
    listed = ", ".join(f"{moment(log.seconds[row - 1])} to {moment(log.seconds[row])}" for row in rows[:_LISTED])
    return listed + (f", and {len(rows) - _LISTED} more" if len(rows) > _LISTED else "")


def _binned(log: TipLog, rules: TipRules, start: int | None, end: int | None) -> _Steps:
    step = rules.interval.seconds or DAY
    number = -(-log.seconds // step)
    first = int(number[0]) if start is None else start // step + 1
    last = int(number[-1]) if end is None else end // step
    if last < first:
        return _Steps(first, np.array([np.nan]))  # one test at the very start of the period: no step is known
    stops = np.isnan(log.depth)
    fell = np.where(stops, 0.0, log.depth)
    place = np.maximum(number - first, 0)
    n = last - first + 1
    counts = np.bincount(place, minlength=n)
    summed = np.bincount(place, weights=fell, minlength=n) if rules.tip is None else rules.tip * counts
    depth = np.asarray(summed, dtype=np.float64)
    known = np.append(np.flatnonzero(~stops), len(stops))
    for row in np.flatnonzero(stops):
        following = known[np.searchsorted(known, row)]
        stop = last if following == len(stops) else int(number[following])
        depth[max(0, int(log.seconds[row]) // step + 1 - first) : stop - first + 1] = np.nan
    return _Steps(first, depth)

"""Logs of tipping-bucket gauges: the times of the tips become depths per step.

Silence is no rain, but only while the logger ran; a log cannot tell dry weather from a dead battery. So a gauge is
taken to have run from its first row to its last, or over the period that the source declares, save after a row that
says that recording stopped. Everything else is missing, not zero.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem, Problems
from basinrain.rainfall import Status
from basinrain.reading.axis import check_length
from basinrain.reading.blocks import Block, problems_of
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthRules
from basinrain.reading.intervals import DAY, Interval
from basinrain.reading.options import of_file
from basinrain.reading.stamps import StampRules, read_stamps
from basinrain.reading.tip_logs import TipLog, join_logs, moment, read_logs

__all__ = ["TipRules", "read_tips"]


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
) -> tuple[list[Block], str]:
    """Read the logs of a source: rows of gauge, time and depth, one a tip.

    A step is ``(start, end]``: a tip at 10:05:00 belongs to the step that ends at 10:05. A second may have several
    tips, and fractions of seconds count. A row of depth 0 is no rain; it shows that the logger ran then, as a daily
    test does. A row without a depth (a blank cell or a missing code) says that recording stopped: from there to the
    gauge's next row nothing is known, and steps that reach into that time are missing as a whole. The steps of a
    gauge's first and last row count as recorded; before and after them the gauge is missing, unless ``start`` and
    ``end`` say that its logger ran.

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
    >>> [block], zone = read_tips([table], depths, StampRules(interval=five), rules, columns={}, problems=Problems())
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

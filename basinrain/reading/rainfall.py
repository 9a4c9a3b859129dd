"""Rainfall files of any layout become a :class:`~basinrain.rainfall.RainRecord`."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Literal, Protocol

from basinrain.errors import JobError, Problems, ReadError
from basinrain.layouts import GHCN, GHCN_UNIT
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.reading.axis import join_blocks
from basinrain.reading.blocks import Block, problems_of
from basinrain.reading.choices import check_choices, check_numbers, reading_hour, source_interval, time_of_day
from basinrain.reading.clocks import parse_zone
from basinrain.reading.counter import counter_depths, read_counter
from basinrain.reading.counter_rules import CounterRules
from basinrain.reading.delimited import DelimitedTable, read_delimited
from basinrain.reading.depths import DepthRules, depth_rules
from basinrain.reading.files import report_repeated
from basinrain.reading.ghcn import read_ghcn
from basinrain.reading.ghcn_hours import ObservationHours
from basinrain.reading.long import read_long
from basinrain.reading.options import of_file, option_problems
from basinrain.reading.stamps import StampRules, read_stamps
from basinrain.reading.tips import TipRules, read_tips
from basinrain.reading.totals import read_totals
from basinrain.reading.wide import read_wide

__all__ = ["read_rainfall"]


def read_rainfall(
    files: str | Path | Sequence[str | Path],
    *,
    layout: Literal["wide", "long", "totals", "tips", "counter", "ghcn-dly", "ghcn-csv"],
    unit: str | None = None,
    interval: str | None = None,
    stamp: Literal["end", "start"] = "end",
    timezone: str | None = None,
    read_hour: str | int | None = None,
    date_means: Literal["calendar-day", "ends", "starts"] | None = None,
    missing: Sequence[str | float] = (),
    trace: Sequence[str] = ("T",),
    flags: Mapping[str, Sequence[str]] | None = None,
    accumulated: str | None = None,
    gaps: Literal["refuse", "missing"] = "refuse",
    time_format: str | None = None,
    tip: float | None = None,
    start: str | None = None,
    end: str | None = None,
    rollover: float | None = None,
    jitter: float = 0.0,
    reset: str | int | None = None,
    columns: Mapping[str, str] | None = None,
) -> RainRecord:
    r"""Read the files of one rainfall source.

    Parameters
    ----------
    files
        One path or several; several files are joined in time, in gauges, or both. No file may come twice.
    layout
        ``"wide"``: a column of times and a column for every gauge. ``"long"``: columns gauge, time, depth, and where
        there are such, flag and steps. ``"totals"``: columns gauge, depth, and where there is one, storm.
    unit
        Depth unit of the files, one of :data:`basinrain.units.DEPTH_UNITS`; never guessed.
    interval
        Step of the files: ``"5min"``, ``"1h"``, ``"1d"``, ``"1mo"``; needed except for totals.
    stamp
        Whether a stamp with a time of day ends or starts its interval.
    timezone
        ``"UTC"``, ``"+02:00"``, or an IANA name, whose standard time becomes the record's clock. Stamps that carry
        their own offset need none.
    read_hour
        When daily gauges are read, ``"08:00"``, in the record's clock; with ``date_means``, for bare dates.
    date_means
        ``"calendar-day"``; ``"ends"``: a date names the day that ends at the reading hour of that date; ``"starts"``:
        the day that starts then.
    missing
        Codes that mean missing, compared as text and as numbers. A blank cell is always missing.
    trace
        Marks of a trace, which counts 0.
    flags
        Marks by what they mean, one of :data:`basinrain.reading.depths.MARKED`; they stand in the flag column, or
        behind the number in its cell.
    accumulated
        The mark of a value that is the total of its own step and of the missing steps directly before it.
    gaps
        ``"missing"``: times absent from the files are missing values; else they are refused.
    time_format
        A strptime format; without it, stamps are ISO 8601.
    tip
        Depth of one tip in the unit; needed where tips have no depth column, and only then.
    start, end
        The period ``(start, end]`` over which all loggers of a source of tips ran, ISO 8601: there, silence is zero. A
        bare date or month names that whole day or month. None: from every gauge's first row, until its last. Without
        both, what lies between two files of a gauge is not known.
    rollover
        Reading, in the unit, at which a counter starts again from 0.
    jitter
        Depth, in the unit, by which a counter may fall without meaning.
    reset
        Time of day, ``"00:00"``, in the record's clock, at which a counter is set to 0 right after its reading, so that
        the next one is what fell since, lower or not; None: not known.
    columns
        Which column holds what, by ``time``, ``gauge``, ``depth``, ``flag``, ``steps``, ``storm``.

    Returns
    -------
    RainRecord
        On a regular axis without gaps; depth in mm. Its ``notes`` say what the falls of counters were taken for
        (``counter-reset``, ``counter-rollover``, ``counter-doubtful``, ``counter-leap``), where the log of a tipping
        bucket does not show that it ran (``log-gap``, ``long-silence``, ``run-not-declared``), and that the times of
        observation of a GHCN-Daily file are not those declared (``observation-hours``).

    Raises
    ------
    JobError
        The options cannot be; all such problems together.
    ReadError
        The files are not as the options say; all problems together, by file, line and column.

    Examples
    --------
    >>> import tempfile
    >>> file = Path(tempfile.mkdtemp()) / "rain.csv"
    >>> _ = file.write_text("time,W01,W02\n2031-05-04 08:00,0.1,T\n2031-05-04 09:00,,0.25E\n")
    >>> record = read_rainfall([file], layout="wide", unit="in", interval="1h", flags={"estimated": ["E"]})
    >>> record.depth
    array([[2.54, 0.  ],
           [ nan, 6.35]])
    >>> record.status, str(record.starts[0])
    (array([[0, 2],
           [3, 7]], dtype=uint8), '2031-05-04T07:00:00')
    """
    paths = [Path(files)] if isinstance(files, str | Path) else [Path(file) for file in files]
    # A job may have many sources; their first file tells them apart.
    first = str(paths[0]) if paths else ""
    problems = Problems(file=first)
    given: dict[str, object] = {
        "stamp": None if stamp == "end" else stamp,
        "date_means": date_means,
        "gaps": None if gaps == "refuse" else gaps,
        "unit": unit,
        "read_hour": read_hour,
        "missing": missing or None,
        "trace": None if tuple(trace) == ("T",) else trace,
        "flags": flags or None,
        "accumulated": accumulated,
        "time_format": time_format,
        "tip": tip,
        "start": start,
        "end": end,
        "rollover": rollover,
        "jitter": jitter or None,
        "reset": reset,
        "columns": columns or None,
    }
    check_choices(layout, given, problems)
    if not paths:
        problems.add(item="files", found="none", expected="at least one file")
    check_numbers(problems, above={"tip": tip, "rollover": rollover}, least={"jitter": jitter})
    step, hour, anew = None, None, None
    with option_problems(problems, file=first):
        step = source_interval(interval, layout)
    with option_problems(problems, file=first):
        hour = reading_hour(read_hour, date_means, step)
    with option_problems(problems, file=first):
        anew = None if reset is None else time_of_day(reset, item="reset")
    with option_problems(problems, file=first):
        _ = None if timezone is None else parse_zone(timezone)

    def rules_of_depths() -> DepthRules:
        return depth_rules(
            unit=GHCN_UNIT if layout in GHCN else unit or "",
            interval=None if layout == "counter" else step,  # a reading may be of any size
            missing=missing,
            trace=() if layout in {"tips", "counter"} else trace,
            flags=flags or {},
            accumulated=accumulated,
            least=-jitter if layout == "counter" else 0.0,
        )

    with option_problems(problems, file=first):
        rules_of_depths()
    problems.raise_as(JobError)
    depths = rules_of_depths()
    faults = Problems()
    report_repeated(paths, faults)
    faults.raise_as(ReadError)
    if step is None:
        tables = _tables(paths, faults)
        faults.raise_as(ReadError)
        return read_totals(tables, depths, columns=columns or {}, problems=faults)
    stamps = StampRules(
        interval=step,
        stamp=stamp,
        timezone=timezone,
        read_hour=hour,
        date_means=date_means or "calendar-day",
        time_format=time_format,
    )
    with of_file(first):
        tips = TipRules(interval=step, tip=_in_mm(tip, depths), start=start, end=end) if layout == "tips" else None
        counter = CounterRules(rollover=_in_mm(rollover, depths), jitter=jitter * depths.factor, reset=anew)
    notes: list[Note] = []
    if layout == "ghcn-dly" or layout == "ghcn-csv":  # noqa: PLR1714 - a type checker follows this, not a set
        blocks, zone = _read_ghcn(paths, layout, stamps, faults, notes)
    else:
        tables = _tables(paths, faults)
        if tips is not None:
            blocks, zone = read_tips(tables, depths, stamps, tips, columns=columns or {}, problems=faults, notes=notes)
        else:
            read = {"wide": read_wide, "long": read_long, "counter": read_counter}[layout]
            blocks, zone = _read_blocks(read, tables, depths, stamps, columns=columns or {}, problems=faults)
    faults.raise_as(ReadError)
    # The days that a GHCN-Daily file leaves out are missing, by its format.
    joined = join_blocks(blocks, step, zone=zone, gaps="missing" if layout in GHCN else gaps)
    record = replace(joined, notes=tuple(notes))
    if layout == "counter":
        with of_file(first):
            return counter_depths(record, counter, file=first if len(paths) == 1 else "")
    return record


class _Reader(Protocol):
    def __call__(
        self,
        table: DelimitedTable,
        depths: DepthRules,
        stamps: StampRules,
        *,
        columns: Mapping[str, str],
        zone: str | None,
        problems: Problems,
    ) -> tuple[Block | None, str | None]: ...


def _tables(paths: Sequence[Path], problems: Problems) -> list[DelimitedTable]:
    tables = []
    for path in paths:
        with problems_of(str(path), problems):
            tables.append(read_delimited(path))
    return tables


def _read_blocks(
    read: _Reader,
    tables: list[DelimitedTable],
    depths: DepthRules,
    stamps: StampRules,
    *,
    columns: Mapping[str, str],
    problems: Problems,
) -> tuple[list[Block], str]:
    zone: str | None = None
    blocks = []
    while tables:
        table = tables.pop(0)  # let go of the text as soon as it is numbers
        with of_file(table.file), problems_of(table.file, problems) as here:
            block, zone = read(table, depths, stamps, columns=columns, zone=zone, problems=here)
            if block is not None:
                blocks.append(block)
    return blocks, zone or ""


def _read_ghcn(
    paths: Sequence[Path],
    layout: Literal["ghcn-dly", "ghcn-csv"],
    stamps: StampRules,
    problems: Problems,
    notes: list[Note],
) -> tuple[list[Block], str]:
    hours = ObservationHours()
    read = [read_ghcn(path, layout=layout, stamps=stamps, problems=problems, hours=hours) for path in paths]
    notes += hours.notes(stamps)
    blocks = [block for block in read if block is not None]
    # Dates have no clock of their own, so that the declared one is the record's.
    days = [str(block.ends[0])[:10] for block in blocks]
    return blocks, read_stamps(days[:1], stamps).zone


def _in_mm(depth: float | None, rules: DepthRules) -> float | None:
    return None if depth is None else depth * rules.factor

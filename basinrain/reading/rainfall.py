"""Rainfall files of any layout become a :class:`~basinrain.rainfall.RainRecord`."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Final, Literal, Protocol

from basinrain.errors import Problems, ReadError
from basinrain.layouts import GHCN, file_format
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.reading.axis import join_blocks
from basinrain.reading.blocks import Block, problems_of
from basinrain.reading.counter import counter_depths, read_counter
from basinrain.reading.delimited import DelimitedTable, read_delimited
from basinrain.reading.depths import DepthRules
from basinrain.reading.files import report_repeated
from basinrain.reading.ghcn import read_ghcn
from basinrain.reading.ghcn_hours import ObservationHours
from basinrain.reading.long import read_long
from basinrain.reading.netcdf import read_netcdf
from basinrain.reading.options import of_file
from basinrain.reading.parquet import read_parquet
from basinrain.reading.source_rules import SourceRules, source_rules
from basinrain.reading.stamps import StampRules, read_stamps
from basinrain.reading.tips import read_tips
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
        One path or several; several files are joined in time, in gauges, or both. No file may come twice. By their
        suffix they are Parquet (``.parquet``, ``.pq``), NetCDF (``.nc``, ``.nc4``), or delimited text.
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
        Which column, or variable of a NetCDF file, holds what, by ``time``, ``gauge``, ``depth``, ``flag``, ``steps``,
        ``storm``.

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
        The files are not as the options say; all problems together, by file, line and column. In a Parquet file, and
        along the time of a NetCDF file, rows are counted from 1 in place of lines.

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
    rules = source_rules(
        files,
        layout=layout,
        unit=unit,
        interval=interval,
        stamp=stamp,
        timezone=timezone,
        read_hour=read_hour,
        date_means=date_means,
        missing=missing,
        trace=trace,
        flags=flags,
        accumulated=accumulated,
        gaps=gaps,
        time_format=time_format,
        tip=tip,
        start=start,
        end=end,
        rollover=rollover,
        jitter=jitter,
        reset=reset,
        columns=columns,
    )
    faults = Problems()
    report_repeated(rules.paths, faults)
    faults.raise_as(ReadError)
    if rules.stamps is None:
        tables = _tables(rules, faults)
        faults.raise_as(ReadError)
        return read_totals(tables, rules.depths, columns=rules.columns, problems=faults)
    notes: list[Note] = []
    if layout == "ghcn-dly" or layout == "ghcn-csv":  # noqa: PLR1714 - a type checker follows this, not a set
        blocks, zone = _read_ghcn(rules.paths, layout, rules.stamps, faults, notes)
    elif rules.tips is not None:
        blocks, zone = read_tips(
            _tables(rules, faults),
            rules.depths,
            rules.stamps,
            rules.tips,
            columns=rules.columns,
            problems=faults,
            notes=notes,
        )
    else:
        blocks, zone = _read_blocks(rules, rules.stamps, faults)
    faults.raise_as(ReadError)
    # The days that a GHCN-Daily file leaves out are missing, by its format.
    joined = join_blocks(blocks, rules.interval, zone=zone, gaps="missing" if layout in GHCN else gaps)
    record = replace(joined, notes=tuple(notes))
    if rules.counter is not None:
        with of_file(str(rules.paths[0])):
            return counter_depths(record, rules.counter, file=str(rules.paths[0]) if len(rules.paths) == 1 else "")
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


_READERS: Final[Mapping[str, _Reader]] = {"wide": read_wide, "long": read_long, "counter": read_counter}


def _tables(rules: SourceRules, problems: Problems) -> list[DelimitedTable]:
    tables = []
    for path in rules.paths:
        with problems_of(str(path), problems):
            tables.append(read_delimited(path))
    return tables


def _read_blocks(rules: SourceRules, stamps: StampRules, problems: Problems) -> tuple[list[Block], str]:
    """Read the files one after the other, so that the text of one is gone before that of the next comes."""
    zone: str | None = None
    blocks = []
    for path in rules.paths:
        with of_file(str(path)), problems_of(str(path), problems) as here:
            if file_format(path.name) == "netcdf":
                block, zone = read_netcdf(path, rules.depths, stamps, columns=rules.columns, zone=zone, problems=here)
            else:
                block, zone = _READERS[rules.layout](
                    _table(path, rules), rules.depths, stamps, columns=rules.columns, zone=zone, problems=here
                )
            if block is not None:
                blocks.append(block)
    return blocks, zone or ""


def _table(path: Path, rules: SourceRules) -> DelimitedTable:
    if file_format(path.name) == "parquet":
        return read_parquet(path, layout=rules.layout, columns=rules.columns)
    return read_delimited(path)


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

"""Rainfall files: wide, long and totals-only tables become a :class:`~basinrain.rainfall.RainRecord`."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Final, Literal

from basinrain.errors import JobError, Problem, Problems, ReadError, nearest_name
from basinrain.rainfall import RainRecord
from basinrain.reading.axis import join_blocks
from basinrain.reading.blocks import Block, problems_of
from basinrain.reading.clocks import parse_zone
from basinrain.reading.delimited import DelimitedTable, read_delimited
from basinrain.reading.depths import DepthRules, depth_rules
from basinrain.reading.intervals import FORMS, Interval, parse_interval
from basinrain.reading.long import read_long
from basinrain.reading.options import option_problems
from basinrain.reading.stamps import StampRules
from basinrain.reading.totals import read_totals
from basinrain.reading.wide import read_wide

__all__ = ["read_rainfall"]

_COLUMNS: Final = {
    "wide": ("time",),
    "long": ("gauge", "time", "depth", "flag", "steps"),
    "totals": ("gauge", "depth", "storm", "flag"),
}
_CHOICES: Final = {
    "layout": tuple(_COLUMNS),
    "stamp": ("end", "start"),
    "date_means": ("calendar-day", "ends", "starts"),
    "gaps": ("refuse", "missing"),
}
_HOUR: Final = re.compile(r"(?P<hour>[01]?[0-9]|2[0-3])(?::(?P<minute>[0-5][0-9]))?")


def read_rainfall(
    files: str | Path | Sequence[str | Path],
    *,
    layout: Literal["wide", "long", "totals"],
    unit: str,
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
    columns: Mapping[str, str] | None = None,
) -> RainRecord:
    r"""Read the files of one rainfall source.

    Parameters
    ----------
    files
        One path or several; several files are joined in time, in gauges, or both.
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
    columns
        Which column holds what, by ``time``, ``gauge``, ``depth``, ``flag``, ``steps``, ``storm``.

    Returns
    -------
    RainRecord
        On a regular axis without gaps; depth in mm.

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
    named = columns or {}
    # A job may have many sources; their first file tells them apart.
    first = str(paths[0]) if paths else ""
    problems = Problems(file=first)
    _check_choices(layout=layout, stamp=stamp, date_means=date_means, gaps=gaps, columns=named, problems=problems)
    if not paths:
        problems.add(item="files", found="none", expected="at least one file")
    step, hour = None, None
    with option_problems(problems, file=first):
        step = _interval(interval, layout)
    with option_problems(problems, file=first):
        hour = _read_hour(read_hour, date_means, step)
    with option_problems(problems, file=first):
        _ = None if timezone is None else parse_zone(timezone)
    with option_problems(problems, file=first):
        depths = depth_rules(
            unit=unit, interval=step, missing=missing, trace=trace, flags=flags or {}, accumulated=accumulated
        )
    problems.raise_as(JobError)
    faults = Problems()
    tables = []
    for path in paths:
        with problems_of(str(path), faults):
            tables.append(read_delimited(path))
    if step is None:
        faults.raise_as(ReadError)
        return read_totals(tables, depths, columns=named, problems=faults)
    stamps = StampRules(
        interval=step,
        stamp=stamp,
        timezone=timezone,
        read_hour=hour,
        date_means=date_means or "calendar-day",
        time_format=time_format,
    )
    blocks, zone = _read_blocks(tables, depths, stamps, layout=layout, columns=named, problems=faults)
    faults.raise_as(ReadError)
    return join_blocks(blocks, step, zone=zone, gaps=gaps)


def _read_blocks(
    tables: list[DelimitedTable],
    depths: DepthRules,
    stamps: StampRules,
    *,
    layout: str,
    columns: Mapping[str, str],
    problems: Problems,
) -> tuple[list[Block], str]:
    read = read_wide if layout == "wide" else read_long
    zone: str | None = None
    blocks = []
    while tables:
        table = tables.pop(0)  # let go of the text as soon as it is numbers
        options = Problems()
        with option_problems(options, file=table.file), problems_of(table.file, problems) as here:
            block, zone = read(table, depths, stamps, columns=columns, zone=zone, problems=here)
            if block is not None:
                blocks.append(block)
        options.raise_as(JobError)
    return blocks, zone or ""


def _check_choices(
    *,
    layout: str,
    stamp: str,
    date_means: str | None,
    gaps: str,
    columns: Mapping[str, str],
    problems: Problems,
) -> None:
    for key, given in (("layout", layout), ("stamp", stamp), ("date_means", date_means), ("gaps", gaps)):
        if given is not None and given not in _CHOICES[key]:
            problems.add(
                item=key,
                found=f"'{given}'",
                expected="one of: " + ", ".join(_CHOICES[key]),
                remedy=nearest_name(given, _CHOICES[key]),
            )
    accepted = _COLUMNS.get(layout)
    for key in columns if accepted else ():
        if accepted and key not in accepted:
            problems.add(
                item="columns",
                found=f"'{key}'",
                expected=f"for layout '{layout}' one of: " + ", ".join(accepted),
                remedy=nearest_name(key, accepted),
            )


def _interval(interval: str | None, layout: str) -> Interval | None:
    if layout == "totals":
        if interval is None:
            return None
        problem = Problem(
            item="interval", found=f"'{interval}'", expected="none for storm totals", remedy="leave it out"
        )
        raise JobError(problem)
    if interval is None:
        raise JobError(Problem(item="interval", found="none", expected=FORMS, remedy="declare the files' step"))
    return parse_interval(interval)


def _read_hour(hour: str | int | None, date_means: str | None, step: Interval | None) -> int | None:
    """Return the reading hour in seconds after midnight."""
    if date_means in {"ends", "starts"} and hour is None:
        raise JobError(
            Problem(
                item="read_hour",
                found=f"none beside date_means = '{date_means}'",
                expected="the hour at which the day begins and ends",
                remedy="declare it: read_hour = '08:00'",
            )
        )
    if hour is None:
        return None
    if date_means not in {"ends", "starts"}:
        raise JobError(
            Problem(
                item="date_means",
                found=f"{'none' if date_means is None else repr(date_means)} beside read_hour",
                expected="'ends' (a date names the 24 hours that end at that hour of that date) or 'starts'",
                remedy="declare date_means, or leave out read_hour",
            )
        )
    if step is not None and not step.whole_days:
        raise JobError(
            Problem(
                item="read_hour",
                found=f"it beside the interval {step.label}",
                expected="it with daily values only",
                remedy="leave it out",
            )
        )
    match = _HOUR.fullmatch(str(hour).strip())
    if not match:
        raise JobError(
            Problem(item="read_hour", found=f"'{hour}'", expected="a time of day, such as '08:00' or 8", remedy="")
        )
    return int(match["hour"]) * 3600 + int(match["minute"] or 0) * 60

"""GHCN-Daily files: the fixed-width station files and the CSV files by station.

The formats are those of the Global Historical Climatology Network - Daily of NOAA (Menne et al. 2012, An overview of
the Global Historical Climatology Network-Daily Database, J. Atmos. Oceanic Technol. 29, 897-910, and the format
description that goes with the data).
"""

from __future__ import annotations

from pathlib import Path
from typing import Literal

from basinrain.errors import Problem, Problems, ReadError
from basinrain.reading.blocks import Block
from basinrain.reading.files import read_bytes
from basinrain.reading.ghcn_csv import csv_cells
from basinrain.reading.ghcn_days import block_of_days
from basinrain.reading.ghcn_dly import dly_cells
from basinrain.reading.ghcn_hours import ObservationHours
from basinrain.reading.stamps import StampRules

__all__ = ["read_ghcn"]


def read_ghcn(
    path: Path,
    *,
    layout: Literal["ghcn-dly", "ghcn-csv"],
    stamps: StampRules,
    problems: Problems,
    hours: ObservationHours | None = None,
) -> Block | None:
    r"""Read the precipitation of one GHCN-Daily file.

    Read are PRCP, and MDPR with DAPR; every other element is left out. Values are tenths of mm, and -9999 is missing. A
    value with a quality flag failed a check of the source: it is REJECTED and has no depth. Measurement flag T is a
    trace, P a zero that the source presumes; B and D are plain values.

    MDPR is a total over the DAPR days that end with its own. Without DAPR it is taken to be over the missing days
    directly before it and its own, when these are 2 to 31 days that follow a day with a value; else how long it rained
    into the gauge is not known, and the value is REJECTED, as it is when its DAPR has a quality flag. Values of single
    days inside such a period, or beside MDPR on its own day, are problems, unless they are rejected themselves: then
    the total holds.

    Parameters
    ----------
    path
        The file, not compressed. It may hold several stations; their ids become the gauges.
    layout
        ``"ghcn-dly"``: a line of 269 characters for every station, month and element. Blanks that are missing at the
        end of a line are added, as long as the line reaches the value of the month's last day. ``"ghcn-csv"``: a row
        for every value (id, YYYYMMDD, element, value, three flags, time of observation), with or without a header that
        begins with ``ID``.
    stamps
        Says what a date names, as for other daily values: the calendar day, or with ``read_hour`` the 24 hours that end
        or start at that hour. The times of observation in a CSV file are not used.
    problems
        Takes what is wrong with the file, all of it.

    Returns
    -------
    Block or None
        Every day from the first with a value to the last, days without one missing; None where anything is wrong. The
        clock is that of ``read_stamps`` for any bare date, as dates have no zone of their own.

    Examples
    --------
    >>> import tempfile
    >>> from basinrain.intervals import DAY, Interval
    >>> path = Path(tempfile.mkdtemp()) / "orx.csv"
    >>> _ = path.write_text("ORX00000001,20310504,PRCP,15,,,X,\nORX00000001,20310506,PRCP,0,T,,X,0700\n")
    >>> rules = StampRules(interval=Interval("1d", DAY))
    >>> block = read_ghcn(path, layout="ghcn-csv", stamps=rules, problems=Problems())
    >>> block.gauges, block.depth[:, 0], str(block.ends[0])
    (('ORX00000001',), array([1.5, nan, 0. ]), '2031-05-05T00:00:00')
    """
    file = str(path)
    here = Problems(file=file)
    try:
        content = _content(path, file)
        cells = dly_cells(content, here) if layout == "ghcn-dly" else csv_cells(content, here)
        if hours is not None:
            hours.add(cells)
        return block_of_days(cells, file=file, stamps=stamps, problems=here)
    except ReadError as error:
        problems.extend(error)
    return None


def _content(path: Path, file: str) -> bytes:
    content = read_bytes(path, expected="values of stations")
    if content.startswith(b"\x1f\x8b") or b"\0" in content:
        raise ReadError(
            Problem(
                item="the file",
                found="compressed content" if content.startswith(b"\x1f\x8b") else "binary content",
                expected="text",
                remedy="unpack it" if content.startswith(b"\x1f\x8b") else "",
                file=file,
            )
        )
    return content.removeprefix(b"\xef\xbb\xbf")

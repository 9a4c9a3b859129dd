"""GHCN-Daily files by station as CSV: a row for every value."""

from __future__ import annotations

import csv
import datetime as dt
import io
import re
from collections.abc import Callable
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problems
from basinrain.reading.ghcn_days import ELEMENTS, YEARS, DayCells, LineFault, is_element, report_lines
from basinrain.reading.interrupts import interrupts_seen

__all__ = ["csv_cells"]

_COLUMNS: Final = ("station", "date", "element", "value", "mflag", "qflag", "sflag", "time of observation")
_READ: Final = ("station", "date", "value", "mflag", "qflag", "time of observation")
_WANTED: Final = {name.encode(): place for place, name in enumerate(ELEMENTS)}
_EPOCH: Final = dt.date(1970, 1, 1).toordinal()
_REMEDY: Final = "check that the file is a CSV file of GHCN-Daily by station, and correct the row"


def csv_cells(content: bytes, problems: Problems) -> DayCells:
    r"""Return the precipitation of a CSV file by station, a cell for every row.

    A row is id, YYYYMMDD, element, value, measurement, quality and source flag, and time of observation.

    Parameters
    ----------
    content
        The file. A first row that begins with ``ID`` is a header, and left out.
    problems
        Takes rows that are no such rows, cells that cannot be read, and values that come twice.

    Returns
    -------
    DayCells
        The cells that can be used.

    Examples
    --------
    >>> cells = csv_cells(b"ORX00000001,20310504,PRCP,15,,,X,0700\nORX00000001,20310504,TMAX,224,,,X,\n", Problems())
    >>> cells.gauges, cells.value, str(cells.day.astype("datetime64[D]")[0])
    (('ORX00000001',), array([15]), '2031-05-04')
    """
    rows, numbers, element = _rows(content, problems)
    with interrupts_seen():
        frame = pd.read_csv(
            io.BytesIO(b"\n".join(rows) or b"," * (len(_COLUMNS) - 1)),
            header=None,
            names=list(_COLUMNS),
            usecols=list(_READ),
            dtype=str,
            na_filter=False,
            quoting=csv.QUOTE_NONE,
            encoding="latin-1",
        ).iloc[: len(rows)]
    sound = np.ones(len(rows), dtype=bool)

    def column(name: str, read: Callable[[str], int | None], expected: str) -> npt.NDArray[np.int64]:
        """Read every different text of a column once."""
        codes, found = pd.factorize(frame[name])
        texts = [str(text) for text in found]
        values = [read(text.strip()) for text in texts]
        wrong = np.array([value is None for value in values], dtype=bool)[codes]
        for row in np.flatnonzero(wrong).tolist():
            problems.add(
                item=f"the {name}",
                found=f"'{texts[codes[row]]}'",
                expected=expected,
                remedy="correct the row",
                line=int(numbers[row]),
            )
        sound[wrong] = False
        return np.array([value or 0 for value in values], dtype=np.int64)[codes]

    names: dict[str, int] = {}
    gauge = column("station", lambda text: _station(text, names), "an id of 11 characters")
    day = column("date", _day, f"a date as YYYYMMDD, of {YEARS[0]} to {YEARS[1]}")
    value = column("value", _whole, "a whole number")
    mflag = column("mflag", _flag, "one character or none")
    qflag = column("qflag", _flag, "one character or none")
    codes, found = pd.factorize(frame["time of observation"])
    observed = np.array([_seconds(str(text).strip()) for text in found], dtype=np.int64)[codes]
    ids = tuple(names)
    key = (gauge * len(ELEMENTS) + element) * (YEARS[1] * 366) + day
    twice = sound & pd.Series(np.where(sound, key, -1 - np.arange(len(key)))).duplicated().to_numpy()
    for row in np.flatnonzero(twice).tolist():
        first = int(np.flatnonzero(sound & (key == key[row]))[0])
        date = str(np.datetime64(int(day[row]), "D"))
        problems.add(
            item=f"gauge {ids[gauge[row]]}",
            found=f"{ELEMENTS[element[row]]} of {date}, as in line {numbers[first]}",
            expected="each day once for a station and element",
            remedy="remove one of the rows",
            line=int(numbers[row]),
            gauge=ids[gauge[row]],
            time=date,
        )
    kept = np.flatnonzero(sound & ~twice)
    return DayCells(
        gauges=ids,
        gauge=gauge[kept],
        day=day[kept],
        element=element[kept],
        value=value[kept],
        mflag=mflag[kept].astype(np.uint8),
        qflag=qflag[kept].astype(np.uint8),
        line=numbers[kept],
        observed=observed[kept],
    )


def _rows(content: bytes, problems: Problems) -> tuple[list[bytes], npt.NDArray[np.int64], npt.NDArray[np.uint8]]:
    """Return the rows of the wanted elements, their lines and elements; every row must be one of the format."""
    rows, numbers, wanted = [], [], []
    faults: list[LineFault] = []
    n_rows = 0
    for number, raw in enumerate(content.split(b"\n"), 1):
        line = raw.rstrip()
        if not line or (number == 1 and line.startswith(b"ID,")):
            continue
        n_rows += 1
        cells = line.count(b",") + 1
        element = line.split(b",", 3)[2] if cells == len(_COLUMNS) else b""
        if element in _WANTED:
            rows.append(line)
            numbers.append(number)
            wanted.append(_WANTED[element])
        elif cells != len(_COLUMNS):
            found = f"{cells} cell{'s' if cells > 1 else ''}"
            faults.append(LineFault(number, found, f"{len(_COLUMNS)}: {', '.join(_COLUMNS)}", _REMEDY))
        elif not is_element(element):
            found = f"element '{element.decode('latin-1')}'"
            faults.append(LineFault(number, found, "four capital letters or figures", _REMEDY))
    report_lines("a row", faults, n_rows, problems)
    return rows, np.array(numbers, dtype=np.int64), np.array(wanted, dtype=np.uint8)


def _station(text: str, names: dict[str, int]) -> int | None:
    return names.setdefault(text, len(names)) if re.fullmatch(r"\S{11}", text) else None


def _day(text: str) -> int | None:
    if not re.fullmatch(r"[0-9]{8}", text) or not YEARS[0] <= int(text[:4]) <= YEARS[1]:
        return None
    try:
        return dt.date(int(text[:4]), int(text[4:6]), int(text[6:])).toordinal() - _EPOCH
    except ValueError:
        return None


def _seconds(text: str) -> int:
    """Return a time of observation in seconds after midnight; -1 where there is none, as no value rests on it."""
    match = re.fullmatch(r"([01][0-9]|2[0-4])([0-5][0-9])", text)
    return int(match[1]) * 3600 + int(match[2]) * 60 if match else -1


def _whole(text: str) -> int | None:
    return int(text) if re.fullmatch(r"-?[0-9]{1,6}", text) else None


def _flag(text: str) -> int | None:
    return ord(text or " ") if len(text) < 2 else None

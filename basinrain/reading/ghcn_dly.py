"""GHCN-Daily station files of fixed width: a line for every station, month and element."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.reading.ghcn_days import ELEMENTS, MISSING, YEARS, DayCells, LineFault, is_element, report_lines

__all__ = ["dly_cells"]

_LENGTH: Final = 269
_HEAD: Final = 21
_DAYS: Final = 31
_SLOT: Final = 8
_VALUE: Final = 5
_WANTED: Final = {name.encode(): place for place, name in enumerate(ELEMENTS)}
_FORM: Final = "station in columns 1-11, year in 12-15, month in 16-17, element in 18-21"

# The kinds of characters of a number, in the order in which they may follow each other; 0 is any other.
_MINUS, _FIGURE = 2, 3
_KIND: Final = np.zeros(256, dtype=np.uint8)
_KIND[[ord(" "), ord("-")]] = 1, _MINUS
_KIND[ord("0") : ord("9") + 1] = _FIGURE
_DIGIT: Final = np.zeros(256, dtype=np.int64)
_DIGIT[ord("0") : ord("9") + 1] = np.arange(10)


class _Month(NamedTuple):
    """Its first day, since 1970-01-01, and how many days it has."""

    start: int
    days: int


@dataclass
class _Lines:
    """The lines that are read: text, number in the file, station, element and month."""

    text: list[bytes] = field(default_factory=list)
    number: list[int] = field(default_factory=list)
    gauge: list[int] = field(default_factory=list)
    element: list[int] = field(default_factory=list)
    month: list[_Month] = field(default_factory=list)


def dly_cells(content: bytes, problems: Problems) -> DayCells:
    """Return the precipitation of a ``.dly`` file, a cell for every day that its months have.

    Columns 1 to 11 hold the station's id, 12 to 15 the year, 16 and 17 the month, 18 to 21 the element; then follow 31
    times a value of 5 characters and its measurement, quality and source flag.

    Parameters
    ----------
    content
        The file.
    problems
        Takes lines that are no such lines, months that come twice, values that are no numbers, and values of days that
        their month has not.

    Returns
    -------
    DayCells
        The cells that can be used.

    Examples
    --------
    >>> slots = ["   15  X", "    0T X"] + ["-9999   "] * 29
    >>> cells = dly_cells(("ORX00000001203105PRCP" + "".join(slots)).encode(), Problems())
    >>> cells.gauges, cells.value[:3], cells.mflag[:3].tobytes()
    (('ORX00000001',), array([   15,     0, -9999]), b' T ')
    """
    gauges: dict[bytes, int] = {}
    lines = _lines(content, gauges, problems)
    # The line is padded with NUL to its full length.
    text = np.array(lines.text, dtype=f"S{_LENGTH}").view(np.uint8).reshape(-1, _LENGTH)
    slots = text[:, _HEAD:].reshape(-1, _DAYS, _SLOT)
    value, bad = _integers(slots[:, :, :_VALUE])
    flags = slots[:, :, _VALUE : _VALUE + 2]
    mflag, qflag = np.moveaxis(np.where(flags == 0, np.uint8(ord(" ")), flags), 2, 0)
    start = np.array([month.start for month in lines.month], dtype=np.int64)[:, None]
    length = np.array([month.days for month in lines.month], dtype=np.int64)[:, None]
    place = np.arange(_DAYS)
    exists = place < length
    ids = [name.decode("latin-1") for name in gauges]
    number = np.array(lines.number, dtype=np.int64)

    def report(wrong: npt.NDArray[np.bool_], expected: str, remedy: str) -> None:
        for row, k in np.argwhere(wrong).tolist():
            gauge, cell = ids[lines.gauge[row]], slots[row, k, :_VALUE].tobytes().decode("latin-1").strip("\0 ")
            problems.add(
                item=f"gauge {gauge}: {ELEMENTS[lines.element[row]]} of day {k + 1}",
                found=f"'{cell}'",
                expected=expected,
                remedy=remedy,
                line=lines.number[row],
                gauge=gauge,
            )

    report(exists & bad, f"a whole number, at the right of columns of 5; {MISSING} where missing", "correct the value")
    blank = (slots[:, :, :_VALUE] == ord(" ")) | (slots[:, :, :_VALUE] == 0)
    report(
        ~exists & ~blank.all(axis=2) & (bad | (value != MISSING)),
        f"{MISSING}, as the month has not so many days",
        "correct the month or the value",
    )
    row, k = np.nonzero(exists & ~bad)
    return DayCells(
        gauges=tuple(ids),
        gauge=np.array(lines.gauge, dtype=np.int64)[row],
        day=(start + place)[row, k],
        element=np.array(lines.element, dtype=np.uint8)[row],
        value=value[row, k],
        mflag=mflag[row, k],
        qflag=qflag[row, k],
        line=number[row],
    )


def _lines(content: bytes, gauges: dict[bytes, int], problems: Problems) -> _Lines:
    """Return the lines of the wanted elements; every line, wanted or not, must be one of the format."""
    lines = _Lines()
    months: dict[bytes, _Month | None] = {}
    first: dict[bytes, int] = {}
    faults: list[LineFault] = []
    n_lines = 0
    for number, raw in enumerate(content.split(b"\n"), 1):
        line = raw.rstrip()
        if not line:
            continue
        n_lines += 1
        name, when, element = line[:11], line[11:17], line[17:_HEAD]
        if when not in months:
            months[when] = _month(when)
        month = months[when]
        if month is None or b" " in name or not is_element(element):
            found = f"'{line[:_HEAD].decode('latin-1')}'"
            faults.append(LineFault(number, found, _FORM, "check that the file is a .dly file, and correct the line"))
        elif not _is_whole(line, month.days):
            found = f"{len(line)} characters"
            faults.append(
                LineFault(number, found, f"{_LENGTH}", "restore the line; only blanks at its end may be missing")
            )
        elif element in _WANTED:
            head = line[:_HEAD]
            if first.setdefault(head, number) != number:
                _report_twice(head, number, first[head], problems)
                continue
            lines.text.append(line)
            lines.number.append(number)
            lines.gauge.append(gauges.setdefault(name, len(gauges)))
            lines.element.append(_WANTED[element])
            lines.month.append(month)
    report_lines("a line", faults, n_lines, problems)
    return lines


def _is_whole(line: bytes, days: int) -> bool:
    """Return whether a line has lost no more than blanks.

    A value has a source flag at least, so that a line which lost its blanks ends with a value or with all its flags.
    """
    reaches = _HEAD + (days - 1) * _SLOT + _VALUE <= len(line) <= _LENGTH
    return reaches and (len(line) - _HEAD) % _SLOT in {0, _VALUE}


def _report_twice(head: bytes, number: int, first: int, problems: Problems) -> None:
    text = head.decode("latin-1")
    problems.add(
        item=f"gauge {text[:11]}",
        found=f"{text[17:]} of {text[11:15]}-{text[15:17]}, as in line {first}",
        expected="each month once for a station and element",
        remedy="remove one of the lines",
        line=number,
        gauge=text[:11],
    )


def _month(text: bytes) -> _Month | None:
    if not re.fullmatch(rb"[0-9]{4}(0[1-9]|1[0-2])", text) or not YEARS[0] <= int(text[:4]) <= YEARS[1]:
        return None
    month = np.datetime64(f"{text[:4].decode()}-{text[4:].decode()}", "M")
    start = int(month.astype("datetime64[D]").astype(np.int64))
    return _Month(start, int((month + 1).astype("datetime64[D]").astype(np.int64)) - start)


def _integers(text: npt.NDArray[np.uint8]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.bool_]]:
    """Return the numbers in the characters of the last axis, and where these are none: blanks, a sign, then digits."""
    kind = _KIND[text]
    minus = kind == _MINUS
    value = np.zeros(text.shape[:-1], dtype=np.int64)
    for k in range(text.shape[-1]):
        # What is no digit counts 0: before the digits it changes nothing, and elsewhere there is no number.
        value = 10 * value + _DIGIT[text[..., k]]
    bad = (kind[..., -1] != _FIGURE) | (kind[..., 1:] < kind[..., :-1]).any(axis=-1) | (kind == 0).any(axis=-1)
    bad |= minus.sum(axis=-1) > 1
    return np.where(minus.any(axis=-1), -value, value), bad

"""Depth cells: what the text of a cell says, with its mark, in mm and as a status.

Depths repeat, so that every different text of a file is judged once.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import Any, Final, NamedTuple, TypeAlias

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import JobError, Problems, unknown
from basinrain.intervals import DAY, Interval
from basinrain.rainfall import Status
from basinrain.reading.columns import numbers
from basinrain.reading.delimited import DelimitedTable
from basinrain.units import depth_factor

__all__ = ["MARKED", "DepthCells", "DepthRules", "Fault", "Judged", "depth_rules", "greatest_depth", "number_depths"]

MARKED: Final[Mapping[str, Status]] = MappingProxyType(
    {
        "observed": Status.OBSERVED,
        "estimated": Status.ESTIMATED,
        "adjusted": Status.ADJUSTED,
        "rejected": Status.REJECTED,
        "missing": Status.MISSING,
        "trace": Status.TRACE,
        "presumed-zero": Status.PRESUMED_ZERO,
        "accumulated": Status.ACCUMULATED,
    }
)
"""What a quality mark of a file can be declared to mean."""

_MEND: Final = "correct the cell or its mark"
_CODES: Final = frozenset({99.99, 999.0, 999.9, 999.99, 9999.0, 9999.9, 9999.99, 99999.0, 99999.9})
_NEGATIVE_CODES: Final = frozenset({9.0, 9.9, 99.0, 99.9, 88.0, 888.0, 6999.0, 32768.0}) | _CODES
_EXPECTED: Final = "a depth of 0 or more"


class Fault(NamedTuple):
    """What is wrong with a cell, in the words of a problem."""

    found: str
    expected: str
    remedy: str


class _Cell(NamedTuple):
    depth: float
    status: Status
    fault: Fault | None = None


Judged: TypeAlias = dict[tuple[str, str], _Cell]
"""Texts and marks of cells, and what they are."""

_MISSING: Final = _Cell(np.nan, Status.MISSING)


@dataclass(frozen=True)
class DepthRules:
    """How the depth cells of a source are to be understood.

    Parameters
    ----------
    unit
        The declared depth unit.
    factor
        mm in one unit.
    missing_texts, missing_numbers
        Declared missing codes, as written and as numbers.
    marks
        What every declared mark means.
    implausible
        mm from which a value that is a usual missing code is not taken for rain.
    least
        mm, 0 or less; what is below is refused.
    """

    unit: str
    factor: float
    missing_texts: frozenset[str]
    missing_numbers: frozenset[float]
    marks: Mapping[str, Status]
    implausible: float
    least: float = 0.0


def depth_rules(
    *,
    unit: str,
    interval: Interval | None,
    missing: Sequence[str | float],
    trace: Sequence[str],
    flags: Mapping[str, Sequence[str]],
    accumulated: str | None,
    least: float = 0.0,
) -> DepthRules:
    """Return the rules of a source, its options checked.

    Parameters
    ----------
    unit
        One of :data:`basinrain.units.DEPTH_UNITS`.
    interval
        The source's step; None for storm totals.
    missing
        Missing codes.
    trace
        Marks of a trace.
    flags
        Marks by what they mean, one of :data:`MARKED`.
    accumulated
        The mark of an accumulated value.
    least
        The least value that is one, 0 or less, in the unit.

    Raises
    ------
    JobError
        A unit or meaning is not known, or a mark has two meanings.

    Examples
    --------
    >>> rules = depth_rules(
    ...     unit="in", interval=None, missing=["-999", "M"], trace=["T"], flags={"estimated": ["E"]}, accumulated=None
    ... )
    >>> rules.factor, sorted(rules.missing_numbers), rules.marks["E"].label
    (25.4, [-999.0], 'estimated')
    """
    problems = Problems()
    factor = np.nan
    try:
        factor = depth_factor(unit)
    except JobError as error:
        problems.extend(error)
    declared: list[tuple[str, Status]] = [(mark, Status.TRACE) for mark in trace]
    if accumulated is not None:
        declared.append((accumulated, Status.ACCUMULATED))
    for meaning, given in flags.items():
        if meaning not in MARKED:
            problems.include(unknown("flags", meaning, MARKED))
            continue
        declared.extend((mark, MARKED[meaning]) for mark in given)
    marks: dict[str, Status] = {}
    for mark, status in declared:
        stripped = str(mark).strip()
        if not stripped:
            problems.add(item="flags", found="an empty mark", expected="a letter or word that stands in the file")
        elif marks.setdefault(stripped, status) is not status:
            problems.add(
                item="flags",
                found=f"mark '{stripped}' for '{marks[stripped].label}' and '{status.label}'",
                expected="one meaning for every mark",
            )
    problems.raise_as(JobError)
    texts = frozenset(str(code).strip() for code in missing)
    return DepthRules(
        unit=unit,
        factor=factor,
        missing_texts=texts,
        missing_numbers=frozenset(filter(np.isfinite, map(_number, texts))),
        marks=marks,
        implausible=_implausible(interval),
        least=least * factor,
    )


def _number(text: str) -> float:
    try:
        return float(text)
    except ValueError:
        return np.nan


def greatest_depth(hours: npt.ArrayLike) -> npt.NDArray[np.float64]:
    """Return depths in mm that have hardly ever fallen in so many hours.

    491 mm times the hours to the power 0.452 is the envelope of the world's record rainfalls (WMO-No. 1045, from
    memory).

    Examples
    --------
    >>> greatest_depth([0.25, 1.0]).round()
    array([262., 491.])
    """
    return np.asarray(491.0 * np.asarray(hours, dtype=float) ** 0.452)


def _implausible(interval: Interval | None) -> float:
    """Return a depth that has hardly ever fallen in so short a time.

    Up to a day, 999 mm is already beyond nearly every gauge. A storm total is held against a month.
    """
    if interval is None or interval.seconds is None:
        return float(greatest_depth(30 * 24))
    envelope = float(greatest_depth(interval.seconds / 3600))
    return min(envelope, 999.0) if interval.seconds <= DAY else envelope


class DepthCells:
    """Reads the depth cells of one file; remembers every text that it has judged.

    Parameters
    ----------
    table
        The file's cells, or some of its rows.
    rules
        How to understand them.
    judged
        What was judged in other rows of the file; it takes what is judged here.

    Examples
    --------
    >>> rules = depth_rules(
    ...     unit="mm", interval=None, missing=[], trace=["T"], flags={"estimated": ["E"]}, accumulated=None
    ... )
    >>> frame = pd.DataFrame({"W01": ["1.5", "", "0", "T", "2.5E", "wet"]})
    >>> cells = DepthCells(DelimitedTable("rain.csv", ("W01",), frame, np.arange(2, 8), "."), rules)
    >>> depth, status, faults = cells.column("W01")
    >>> depth, [Status(code).label for code in status]
    (array([1.5, nan, 0. , 0. , 2.5, nan]), ['observed', 'missing', 'zero', 'trace', 'estimated', 'missing'])
    >>> faults[0][0], faults[0][1].found
    (5, "'wet'")
    """

    def __init__(self, table: DelimitedTable, rules: DepthRules, *, judged: Judged | None = None) -> None:
        self._table = table
        self._rules = rules
        self._judged: Judged = {} if judged is None else judged
        # The longest mark first: "EE" is not "E" after an E. A figure behind a number belongs to the number.
        self._suffixes = sorted((m for m in rules.marks if not m[0].isdigit()), key=lambda mark: (-len(mark), mark))

    def column(
        self, column: str, *, flag: str | None = None
    ) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8], list[tuple[int, Fault]]]:
        """Return the depths and statuses of a column, and its faulty cells by row.

        Parameters
        ----------
        column
            The column of depths.
        flag
            The column of marks; without it a mark may follow the number in its cell.

        Returns
        -------
        depth : array of float, shape (n_rows,)
            mm; NaN where there is none.
        status : array of uint8, shape (n_rows,)
            An accumulated total keeps its depth beside status ACCUMULATED.
        faults : list of (row, Fault)
        """
        cells_of = self._table.frame[column]
        if pd.api.types.is_numeric_dtype(cells_of):
            return number_depths(
                cells_of.to_numpy(), self._rules, marks=None if flag is None else self._table.frame[flag]
            )
        codes, texts = pd.factorize(cells_of)
        keys = [(str(text), "") for text in texts]
        if flag is not None:
            flag_codes, marks = pd.factorize(self._table.frame[flag])
            pairs, codes = np.unique(codes * len(marks) + flag_codes, return_inverse=True)
            keys = [(str(texts[pair // len(marks)]), str(marks[pair % len(marks)])) for pair in pairs]
        self._judge([key for key in keys if key not in self._judged], suffixed=flag is None)
        cells = [self._judged[key] for key in keys]
        faulty = np.array([cell.fault is not None for cell in cells], dtype=bool)
        faults: list[tuple[int, Fault]] = []
        if faulty.any():
            rows = np.flatnonzero(faulty[codes])
            faults = [(int(row), fault) for row in rows if (fault := cells[codes[row]].fault) is not None]
        depth = np.array([cell.depth for cell in cells])
        status = np.array([cell.status for cell in cells], dtype=np.uint8)
        return depth[codes], status[codes], faults

    def _judge(self, keys: list[tuple[str, str]], *, suffixed: bool) -> None:
        if not keys:
            return
        parts = [self._split(text) if suffixed else (text, mark) for text, mark in keys]
        frame = pd.DataFrame({"depth": pd.Series([text for text, _ in parts], dtype=str)})
        values, bad = numbers(replace(self._table, columns=("depth",), frame=frame), "depth")
        for key, (text, mark), value, wrong in zip(keys, parts, values.tolist(), bad.tolist(), strict=True):
            self._judged[key] = self._cell(text, mark, value, wrong=wrong)

    def _split(self, text: str) -> tuple[str, str]:
        if text in self._rules.missing_texts:
            return text, ""
        mark = next((mark for mark in self._suffixes if text.endswith(mark)), "")
        return text.removesuffix(mark).rstrip(), mark

    def _cell(self, text: str, mark: str, value: float, *, wrong: bool) -> _Cell:
        rules = self._rules
        if text in rules.missing_texts or value in rules.missing_numbers:
            text, value, wrong = "", np.nan, False
        elif not mark and rules.marks.get(text) is Status.TRACE:
            return _Cell(0.0, Status.TRACE)
        if mark and mark not in rules.marks:
            known = ", ".join(rules.marks) or "none is declared"
            return _fault(f"mark '{mark}'", f"a declared mark ({known})", "declare what it means in flags")
        meaning = rules.marks.get(mark, Status.OBSERVED)
        if meaning is Status.REJECTED:
            return _Cell(np.nan, Status.REJECTED)
        if meaning is Status.MISSING:
            return _MISSING
        if wrong:
            remedy = "correct the cell, or declare its mark in flags" if text[:1].isdigit() else "correct the cell"
            return _fault(f"'{text}'", _EXPECTED, f"{remedy}, or declare it in missing")
        if value < 0 and value * rules.factor >= rules.least:
            return _Cell(value * rules.factor, meaning)
        if value < 0 or value in _CODES:
            code = (-value if value < 0 else value) in _NEGATIVE_CODES
            if value < 0 and not code:
                return _fault(f"'{text}'", _EXPECTED, "correct the cell, or declare it in missing")
            if value < 0 or value * rules.factor >= rules.implausible:
                return _fault(
                    f"'{text}'", f"{_EXPECTED}; it looks like a missing code", f"if it is one, add '{text}' to missing"
                )
        return _marked(text, mark, meaning, value * rules.factor)


def number_depths(
    values: npt.NDArray[Any], rules: DepthRules, *, marks: pd.Series[str] | None = None
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8], list[tuple[int, Fault]]]:
    """Return depths and statuses of numbers as of cells with the same text; and the faulty ones by flat position.

    Parameters
    ----------
    values : array of numbers, any shape
        In the rules' unit; NaN is missing. Codes are compared in the numbers' own precision.
    rules
        How to understand them.
    marks : series of text, shape (n_values,), or None
        The mark of each value, ``""`` for none.

    Returns
    -------
    depth, status, faults
        As of :meth:`DepthCells.column`, in the shape of ``values``; faults by flat position.

    Examples
    --------
    >>> rules = depth_rules(unit="in", interval=None, missing=[-9], trace=[], flags={}, accumulated=None)
    >>> number_depths(np.array([[1.0, 0.0], [np.nan, -9.0]]), rules)
    (array([[25.4,  0. ],
           [ nan,  nan]]), array([[0, 1],
           [3, 3]], dtype=uint8), [])
    """
    depth = np.asarray(values, dtype=np.float64) * rules.factor
    status = (depth == 0).astype(np.uint8)  # ZERO, else OBSERVED
    status[np.isnan(depth)] = Status.MISSING
    # What may be no plain depth is judged by its text; comparing is much cheaper than membership.
    doubtful = (depth < 0) | np.isinf(depth)
    likely = np.flatnonzero(values >= min(_CODES))
    if len(likely):
        doubtful.flat[likely] |= np.isin(values.flat[likely], np.array(sorted(_CODES)).astype(values.dtype))
    for code in {*rules.missing_numbers, *filter(np.isfinite, map(_number, rules.marks))}:
        doubtful |= values == np.array(code).astype(values.dtype)
    if marks is not None:
        doubtful |= (marks != "").to_numpy()
    rows = np.flatnonzero(doubtful)
    if not len(rows):
        return depth, status, []
    kinds, codes = np.unique(values.flat[rows], return_inverse=True)
    shown = np.array(["" if np.isnan(v) else np.format_float_positional(v, trim="-") for v in kinds], dtype=object)
    frame = pd.DataFrame({"depth": pd.Series(shown[codes], dtype=str)})
    # Without marks of their own, numbers must not be split into number and mark.
    frame["mark"] = "" if marks is None else marks.to_numpy()[rows]
    table = DelimitedTable("", ("depth", "mark"), frame, rows, ".")
    depth.flat[rows], status.flat[rows], faults = DepthCells(table, rules).column("depth", flag="mark")
    return depth, status, [(int(rows[row]), fault) for row, fault in faults]


def _marked(text: str, mark: str, meaning: Status, depth: float) -> _Cell:
    blank = np.isnan(depth)
    if meaning in {Status.TRACE, Status.PRESUMED_ZERO}:
        if depth > 0:
            return _fault(f"'{text}' marked '{mark}', {meaning.label}", "no depth, or 0", _MEND)
        return _Cell(0.0, meaning)
    if blank and meaning is Status.ACCUMULATED:
        return _fault(f"a blank cell marked '{mark}'", "the accumulated depth", _MEND)
    if blank:
        return _MISSING
    if meaning is Status.OBSERVED and depth == 0:
        return _Cell(0.0, Status.ZERO)
    return _Cell(depth, meaning)


def _fault(found: str, expected: str, remedy: str) -> _Cell:
    return _Cell(np.nan, Status.MISSING, Fault(found, expected, remedy))

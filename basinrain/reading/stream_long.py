"""One pass over a long rainfall file whose rows stand in order of time."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Sequence
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.errors import Problems, ReadError
from basinrain.reading.axis import positions, unit_of
from basinrain.reading.blocks import DEPTH_NAMES, FLAG_NAMES, GAUGE_NAMES, STEPS_NAMES, TIME_NAMES
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.long import report_blank, required_columns
from basinrain.reading.source_rules import SourceRules
from basinrain.reading.spacing import check_gauge_spacing
from basinrain.reading.stamps import StampRules
from basinrain.reading.stream_files import LongFile, Presence, Rows, StreamFile
from basinrain.reading.stream_times import read_texts

__all__ = ["LongPass"]

_LISTED: Final = 3


class LongPass:
    """Takes the rows of a long file part by part, and remembers what its reading needs.

    Parameters
    ----------
    file
        The file, as the user is shown it.
    rules, stamps
        How to understand it.
    zone
        The clock settled by earlier files; None when this is the first.
    problems
        Takes what is wrong with times and gauges.
    """

    def __init__(self, file: str, rules: SourceRules, stamps: StampRules, zone: str | None, problems: Problems) -> None:
        self._file, self._rules, self._stamps, self._zone, self._problems = file, rules, stamps, zone, problems
        self._before = len(problems)
        self._columns: dict[str, str] | None = None
        self._flag: str | None = None
        self._steps: str | None = None
        self._ends: list[npt.NDArray[np.datetime64]] = []
        self._lines: list[npt.NDArray[np.int64]] = []
        self._first_rows: list[npt.NDArray[np.int64]] = []
        self._n_rows = self._n_times = 0
        self._last = np.array(["NaT"], dtype="datetime64[s]")
        self._code: dict[str, int] = {}
        # Of every gauge: the time (counted, and on the axis) and the line of its latest row, its first time, its rows,
        # and how many of its spacings are one step.
        self._latest, self._at, self._line, self._first, self._count, self._close = (
            np.empty(0, dtype=np.int64) for _ in range(6)
        )
        self._spacings: dict[int, Counter[int]] = {}
        self._holes: dict[int, list[int]] = {}

    def columns_in(self, columns: Sequence[str]) -> list[str]:
        """Find the columns, unless they are known, and return those that the pass needs.

        Raises
        ------
        ReadError
            A column is not there.
        """
        if self._columns is None:
            table = DelimitedTable(self._file, tuple(columns), pd.DataFrame(), np.empty(0, dtype=np.int64), ".")
            named, problems = self._rules.columns, Problems(file=self._file)
            needed = required_columns(
                table, {"gauge": GAUGE_NAMES, "time": TIME_NAMES, "depth": DEPTH_NAMES}, named, problems
            )
            self._flag, self._steps = (
                find_column(columns, names, mapped=named.get(key), key=key, problems=problems)
                for key, names in (("flag", FLAG_NAMES), ("steps", STEPS_NAMES))
            )
            problems.raise_as(ReadError)
            self._columns = needed or {}
        return [self._columns["gauge"], self._columns["time"], *([self._steps] if self._steps else [])]

    def add(self, table: DelimitedTable) -> None:
        """Take the next rows.

        Raises
        ------
        ReadError
            Their times go backwards: nothing can be said of the rows that follow.
        """
        if self._columns is None or not len(table.lines):
            return
        gauge, time = self._columns["gauge"], self._columns["time"]
        codes, stamps = pd.factorize(table.frame[time])
        firsts = np.unique(codes, return_index=True)[1]
        ends, self._zone, right = read_texts(
            [str(stamp) for stamp in stamps],
            lambda row: int(table.lines[firsts[row]]),
            self._stamps,
            zone=self._zone,
            column=time,
            problems=self._problems,
        )
        report_blank(table, gauge, "gauge", self._problems)
        self._refuse_steps(table)
        if right:
            rows = ends[codes]
            self._check_order(rows, table)
            self._note(rows, table)

    def finish(self, rows: Rows, exclude: Collection[str]) -> tuple[StreamFile | None, str | None]:
        """Return the file, or None where there are problems, and the clock."""
        interval = self._stamps.interval
        names = list(self._code)
        if len(self._problems) == self._before:
            for g, gauge in enumerate(names):
                other = self._spacings.get(g)
                if other and gauge not in exclude:
                    lengths = np.array([unit_of(interval), *other], dtype=np.int64)
                    spacings = np.repeat(lengths, [int(self._close[g]), *other.values()])
                    check_gauge_spacing(gauge, spacings, interval, self._file, self._problems)
        if len(self._problems) > self._before or self._columns is None:
            return None, self._zone
        kept = [g for g, gauge in enumerate(names) if gauge not in exclude]
        holes = {g: tuple(times) for g, times in self._holes.items()}
        presence = Presence(self._first, self._latest, self._count, holes).of(kept)
        return (
            LongFile(
                self._file,
                tuple(names[g] for g in kept),
                np.concatenate(self._ends),
                np.concatenate(self._lines),
                presence,
                rows,
                np.r_[np.concatenate(self._first_rows), self._n_rows],
                {key: self._columns[key] for key in ("gauge", "depth")},
                self._flag,
                self._rules.depths,
            ),
            self._zone,
        )

    def _refuse_steps(self, table: DelimitedTable) -> None:
        if self._steps is None:
            return
        values, bad = numbers(table, self._steps)
        for row in np.flatnonzero(bad | ~(np.isnan(values) | (values == 1))):
            self._problems.add(
                item=f"column {self._steps}",
                found=f"'{table.frame[self._steps].iloc[row]}'",
                expected="1 or nothing where a record is read in parts, as a value cannot reach over their borders",
                remedy="give more [series] memory, so that the record is read whole",
                line=int(table.lines[row]),
            )

    def _check_order(self, rows: npt.NDArray[np.datetime64], table: DelimitedTable) -> None:
        back = np.flatnonzero(np.diff(np.r_[self._last, rows]) < np.timedelta64(0, "s"))
        if not len(back):
            return
        row = int(back[0])
        self._problems.add(
            item=f"column {self._columns['time'] if self._columns else ''}",
            found=f"'{rows[row]}' after a later time",
            expected="rows in order of time, where a record is read in parts",
            remedy="sort the rows by time, or give the file in the wide layout",
            line=int(table.lines[row]),
            time=str(rows[row]),
        )
        self._problems.raise_as(ReadError)

    def _note(self, rows: npt.NDArray[np.datetime64], table: DelimitedTable) -> None:
        """Remember new times, and which gauges have rows at them."""
        new = np.r_[self._last, rows[:-1]] != rows
        counted = self._n_times - 1 + np.cumsum(new)
        self._ends.append(rows[new])
        self._lines.append(table.lines[new])
        self._first_rows.append(self._n_rows + np.flatnonzero(new))
        self._last = rows[-1:]
        self._n_rows, self._n_times = self._n_rows + len(rows), self._n_times + int(new.sum())

        codes = self._codes(table)
        order = np.argsort(codes, kind="stable")
        g, at = codes[order], counted[order]
        place, line = positions(rows, self._stamps.interval)[order], table.lines[order]
        begins = np.r_[True, np.diff(g) != 0]
        before = np.where(begins, self._latest[g], np.r_[0, at[:-1]])
        known = before >= 0
        self._report_twice(
            g, np.where(begins, self._line[g], np.r_[0, line[:-1]]), line, known & (before == at), rows[order]
        )
        self._first[g[~known]] = at[~known]
        for k in np.flatnonzero(known & (at - before > 1)):
            holes = self._holes.setdefault(int(g[k]), [])
            holes += range(int(before[k]) + 1, min(int(at[k]), int(before[k]) + 1 + _LISTED - len(holes)))
        spacing = place - np.where(begins, self._at[g], np.r_[0, place[:-1]])
        close = known & (spacing == unit_of(self._stamps.interval))
        self._close += np.bincount(g[close], minlength=len(self._close))
        pairs, counts = np.unique(np.column_stack([g, spacing])[known & ~close], axis=0, return_counts=True)
        for (gauge, length), count in zip(pairs.tolist(), counts.tolist(), strict=True):
            self._spacings.setdefault(gauge, Counter())[length] += count
        self._count += np.bincount(g, minlength=len(self._count))
        ending = np.r_[begins[1:], True]
        self._latest[g[ending]], self._at[g[ending]], self._line[g[ending]] = at[ending], place[ending], line[ending]

    def _codes(self, table: DelimitedTable) -> npt.NDArray[np.int64]:
        """Return the gauges of rows by number, new ones added."""
        codes, names = pd.factorize(table.frame[self._columns["gauge"] if self._columns else ""])
        for name in names:
            self._code.setdefault(str(name), len(self._code))
        more = len(self._code) - len(self._latest)
        if more:
            self._latest = np.r_[self._latest, np.full(more, -1)]
            self._at, self._line, self._first, self._count, self._close = (
                np.r_[values, np.zeros(more, dtype=np.int64)]
                for values in (self._at, self._line, self._first, self._count, self._close)
            )
        return np.array([self._code[str(name)] for name in names], dtype=np.int64)[codes]

    def _report_twice(
        self,
        gauges: npt.NDArray[np.int64],
        before: npt.NDArray[np.int64],
        lines: npt.NDArray[np.int64],
        twice: npt.NDArray[np.bool_],
        rows: npt.NDArray[np.datetime64],
    ) -> None:
        names = list(self._code)
        for k in np.flatnonzero(twice):
            gauge = names[gauges[k]]
            self._problems.add(
                item=f"gauge {gauge}",
                found=f"'{rows[k]}', as in line {before[k]}",
                expected="each time once for a gauge",
                remedy="remove one of the rows",
                line=int(lines[k]),
                gauge=gauge,
                time=str(rows[k]),
            )

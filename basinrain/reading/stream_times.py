"""The times of a file that is gone through once, row after row."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.reading.order import check_order
from basinrain.reading.stamps import StampRules, read_stamps

__all__ = ["TimeColumn", "read_texts"]

_TOGETHER: Final = 500_000
"""So many stamps are read together; their text is let go of after that."""


def read_texts(
    texts: list[str],
    line_of: Callable[[int], int],
    rules: StampRules,
    *,
    zone: str | None,
    column: str,
    problems: Problems,
) -> tuple[npt.NDArray[np.datetime64], str, bool]:
    """Return the interval ends of stamps, the clock, and whether all are right; the others are problems."""
    ends, clock, faults = read_stamps(texts, rules, zone=zone)
    for fault in faults:
        problems.add(
            item=f"column {column}",
            found=fault.found,
            expected=fault.expected,
            remedy=fault.remedy,
            line=line_of(fault.row),
            time=texts[fault.row],
        )
    return ends, clock, not faults


class TimeColumn:
    """Takes the stamps of a wide file part by part, and checks their order.

    Parameters
    ----------
    column
        The column's name.
    rules
        How to understand them.
    zone
        The clock settled by earlier files; None when this is the first.
    problems
        Takes stamps that are faulty or out of order.

    Examples
    --------
    >>> from basinrain.intervals import Interval
    >>> times = TimeColumn("time", StampRules(interval=Interval("1d", 86400)), None, Problems())
    >>> times.add(["2031-05-04"], np.array([2]))
    >>> times.add(["2031-05-05"], np.array([3]))
    >>> times.finish()
    (array(['2031-05-05T00:00:00', '2031-05-06T00:00:00'],
          dtype='datetime64[s]'), array([2, 3]), '')
    """

    def __init__(self, column: str, rules: StampRules, zone: str | None, problems: Problems) -> None:
        self._column = column
        self._rules = rules
        self._zone = zone
        self._problems = problems
        self._texts: list[str] = []
        self._ends: list[npt.NDArray[np.datetime64]] = []
        self._lines: list[npt.NDArray[np.int64]] = []
        self._n = 0

    def add(self, texts: list[str], lines: npt.NDArray[np.int64]) -> None:
        """Take the stamps of the next rows, and the lines on which they stand."""
        self._texts += texts
        self._lines.append(lines)
        if len(self._texts) >= _TOGETHER:
            self._settle()

    def finish(self) -> tuple[npt.NDArray[np.datetime64], npt.NDArray[np.int64], str | None]:
        """Return the interval ends of all rows (NaT where faulty), their lines, and the clock."""
        self._settle()
        return np.concatenate(self._ends), np.concatenate(self._lines), self._zone

    def _settle(self) -> None:
        if not self._texts:
            return
        texts, lines = self._texts, np.concatenate(self._lines)
        mine = lines[self._n :]
        ends, self._zone, _ = read_texts(
            texts,
            lambda row: int(mine[row]),
            self._rules,
            zone=self._zone,
            column=self._column,
            problems=self._problems,
        )
        before = self._ends[-1][-1:] if self._ends else ends[:0]
        k = len(before)
        check_order(
            np.concatenate([before, ends]),
            lambda row: texts[row - k] if row >= k else str(before[row]),
            lines[self._n - k :],
            item=f"column {self._column}",
            problems=self._problems,
        )
        self._ends.append(ends)
        self._lines = [lines]
        self._n = len(lines)
        self._texts = []

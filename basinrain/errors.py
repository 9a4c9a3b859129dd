"""What can go wrong, as one small tree.

::

    BasinRainError              every expected failure; carries Problems
    ├── JobError                the job file (or a call) asks for something that cannot be
    │   └── SettingError        a change to the job, ``--set`` on the command line, cannot be made
    ├── ReadError               a file cannot be read as the job says it should be
    ├── DataError               values were read, but they cannot be used together
    ├── MethodError             a method has no answer for this network, basin or storm
    └── WriteError              results cannot be written where they should go

An error holds every problem found in its input, not just the first one. A :class:`Problem` says which item it is about,
what was found, what was expected and what to do, and prints as one line.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass, replace
from functools import partial
from typing import Any

__all__ = [
    "BasinRainError",
    "DataError",
    "JobError",
    "MethodError",
    "Problem",
    "Problems",
    "ReadError",
    "SettingError",
    "WriteError",
    "nearest_name",
    "unknown",
]


@dataclass(frozen=True, kw_only=True)
class Problem:
    """One thing that is wrong with an input.

    Parameters
    ----------
    item
        What the problem is about, in the user's words: ``"gauge W03"``, ``"[infill] method"``.
    found, expected, remedy
        What was found, what would have been accepted, and what to do about it.
    file, line, column
        Where it stands, as far as known. ``line`` counts from 1; ``column`` is a column's name.
    gauge, basin, time
        The gauge, basin or time concerned, for programs that sort problems.

    Examples
    --------
    >>> print(
    ...     Problem(
    ...         item="gauge W03",
    ...         found="'abc'",
    ...         expected="a depth of 0 or more",
    ...         remedy="correct the cell",
    ...         file="rain.csv",
    ...         line=14,
    ...         column="W03",
    ...     )
    ... )
    rain.csv:14: column W03: gauge W03: found 'abc'; expected a depth of 0 or more; correct the cell
    """

    item: str
    found: str
    expected: str = ""
    remedy: str = ""
    file: str = ""
    line: int | None = None
    column: str = ""
    gauge: str = ""
    basin: str = ""
    time: str = ""

    def __str__(self) -> str:
        place = self.file
        if self.line is not None:
            place = f"{place}:{self.line}" if place else f"line {self.line}"
        parts = [place, f"column {self.column}" if self.column else "", self.item]
        head = ": ".join(part for part in parts if part)
        tail = "; ".join(
            part
            for part in (
                f"found {self.found}" if self.found else "",
                f"expected {self.expected}" if self.expected else "",
                self.remedy if self.remedy != self.expected else "",
            )
            if part
        )
        # One problem is one line, whatever a file's cell held.
        return " ".join(f"{head}: {tail}".split())


class BasinRainError(Exception):
    """Root of every expected failure.

    Parameters
    ----------
    problems
        One problem or several; printed one a line.
    unlisted
        How many more there are that are not listed word for word.

    Examples
    --------
    >>> raise_me = DataError(Problem(item="gauge A", found="two positions"), unlisted=7)
    >>> print(raise_me)
    gauge A: found two positions
    7 more problems: found but not listed
    """

    def __init__(self, problems: Problem | Iterable[Problem], *, unlisted: int = 0) -> None:
        self.problems: tuple[Problem, ...] = (problems,) if isinstance(problems, Problem) else tuple(problems)
        self.unlisted = unlisted
        lines = [str(problem) for problem in self.problems]
        if unlisted:
            lines.append(f"{unlisted} more {'problem' if unlisted == 1 else 'problems'}: found but not listed")
        super().__init__("\n".join(lines))

    def __reduce__(self) -> tuple[Any, ...]:
        # By its problems and not by its text, so that it arrives whole from another process.
        return partial(type(self), unlisted=self.unlisted), (self.problems,)


class JobError(BasinRainError):
    """The job asks for something that cannot be."""


class SettingError(JobError):
    """A change to the job cannot be made; on the command line that is wrong usage."""


class ReadError(BasinRainError):
    """A file cannot be read as the job says it should be."""


class DataError(BasinRainError):
    """Values were read, but they cannot be used together."""


class MethodError(BasinRainError):
    """A method has no answer for this network, basin or storm."""


class WriteError(BasinRainError):
    """Results cannot be written where they should go."""


class Problems:
    """Collects the problems of one input, then raises them together.

    At most ``limit`` problems are kept word for word; the rest are counted, so that a file with a wrong column does not
    print a hundred thousand lines.

    Examples
    --------
    >>> problems = Problems(file="gauges.csv")
    >>> problems.add(item="gauge A", found="no latitude", line=2)
    >>> len(problems)
    1
    >>> problems.raise_as(ReadError)
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: gauges.csv:2: gauge A: found no latitude
    """

    def __init__(self, *, file: str = "", limit: int = 50) -> None:
        self._file = file
        self._limit = limit
        self._kept: list[Problem] = []
        self._count = 0

    def __len__(self) -> int:
        return self._count

    def add(
        self,
        *,
        item: str,
        found: str,
        expected: str = "",
        remedy: str = "",
        line: int | None = None,
        column: str = "",
        gauge: str = "",
        basin: str = "",
        time: str = "",
        file: str | None = None,
    ) -> None:
        """Record one problem; the fields are those of :class:`Problem`, ``file`` by default the collector's."""
        self._count += 1
        if len(self._kept) < self._limit:
            self._kept.append(
                Problem(
                    item=item,
                    found=found,
                    expected=expected,
                    remedy=remedy,
                    file=self._file if file is None else file,
                    line=line,
                    column=column,
                    gauge=gauge,
                    basin=basin,
                    time=time,
                )
            )

    def include(self, problem: Problem) -> None:
        """Record a problem that is made already; where it names no file, the collector's is meant."""
        self._count += 1
        if len(self._kept) < self._limit:
            self._kept.append(problem if problem.file else replace(problem, file=self._file))

    def check_known(self, item: str, found: object, known: Iterable[str]) -> None:
        """Record a name that is none of those known, as :func:`unknown` says it; do nothing where it is one.

        Examples
        --------
        >>> problems = Problems(file="depths.csv")
        >>> problems.check_known("layout", "wide", ["long", "wide"])
        >>> problems.check_known("layout", "width", ["long", "wide"])
        >>> problems.raise_as(JobError)
        Traceback (most recent call last):
            ...
        basinrain.errors.JobError: depths.csv: layout: found 'width'; expected one of: long, wide; did you mean 'wide'?
        """
        accepted = list(known)
        if found not in accepted:
            self.include(unknown(item, found, accepted))

    def extend(self, error: BasinRainError) -> None:
        """Take over the problems of an error, those that it does not list included."""
        self._count += len(error.problems) + error.unlisted
        self._kept += error.problems[: self._limit - len(self._kept)]

    def raise_as(self, kind: type[BasinRainError]) -> None:
        """Raise all of them as one error of ``kind``; do nothing when there are none."""
        if self._count:
            raise kind(self._kept, unlisted=self._count - len(self._kept))


def nearest_name(name: str, known: Iterable[str]) -> str:
    """Return the advice that names what may have been meant.

    Parameters
    ----------
    name
        What was given.
    known
        What is accepted.

    Returns
    -------
    str
        ``"did you mean 'thiessen'?"`` where one known name is close, else ``"one of: ..."``.

    Examples
    --------
    >>> nearest_name("theissen", ["arithmetic", "thiessen", "idw"])
    "did you mean 'thiessen'?"
    >>> nearest_name("zzz", ["mm", "in"])
    'one of: mm, in'
    >>> nearest_name("zzz", [])
    'nothing is accepted here'
    """
    names = list(known)
    if not names:
        return "nothing is accepted here"
    close = difflib.get_close_matches(name.lower(), [n.lower() for n in names], n=1, cutoff=0.6)
    if close:
        meant = next(n for n in names if n.lower() == close[0])
        return f"did you mean '{meant}'?"
    return "one of: " + ", ".join(names)


def unknown(item: str, found: object, known: Iterable[str], *, line: int | None = None) -> Problem:
    """Return the problem of a name that is none of those known.

    Parameters
    ----------
    item
        What the name is for, in the user's words.
    found
        What was given; no text at all is no known name either.
    known
        What is accepted.
    line
        The line of its file, where that is known.

    Examples
    --------
    >>> print(unknown("averaging method", "theissen", ["arithmetic", "thiessen", "idw"]))
    averaging method: found 'theissen'; expected one of: arithmetic, thiessen, idw; did you mean 'thiessen'?
    >>> print(unknown("unit", "zzz", ["mm", "in"]))
    unit: found 'zzz'; expected one of: mm, in
    """
    names = list(known)
    return Problem(
        item=item,
        found=f"'{found}'",
        expected="one of: " + ", ".join(names),
        remedy=nearest_name(str(found), names),
        line=line,
    )

"""Problems of options, with the file or files that the options are for."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace

from basinrain.errors import JobError, Problems

__all__ = ["of_file", "of_source", "option_problems"]


@contextmanager
def option_problems(problems: Problems, *, file: str = "", item: str = "") -> Iterator[None]:
    """Collect what is wrong with an option instead of raising it.

    Parameters
    ----------
    problems
        Takes the problems of a JobError.
    file, item
        The file that the option is for, and what messages call the option, where the problem itself does not say or
        says it too generally.

    Examples
    --------
    >>> from basinrain.units import length_factor
    >>> problems = Problems()
    >>> with option_problems(problems, file="gauges.csv", item="[gauges] length_unit"):
    ...     length_factor("us_ft")
    >>> problems.raise_as(JobError)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: gauges.csv: [gauges] length_unit: found 'us_ft'; expected one of: m, km, ft, us-ft, mi; \
did you mean 'us-ft'?
    """
    try:
        yield
    except JobError as error:
        told = [replace(problem, file=problem.file or file, item=item or problem.item) for problem in error.problems]
        problems.extend(JobError(told, unlisted=error.unlisted))


@contextmanager
def of_file(file: str) -> Iterator[None]:
    """Name the file in an option's problem that does not name one.

    Examples
    --------
    >>> from basinrain.units import length_factor
    >>> with of_file("gauges.csv"):
    ...     length_factor("us_ft")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: gauges.csv: length unit: found 'us_ft'; expected one of: m, km, ft, us-ft, mi; \
did you mean 'us-ft'?
    """
    problems = Problems()
    with option_problems(problems, file=file):
        yield
    problems.raise_as(JobError)


@contextmanager
def of_source(number: int, name: str) -> Iterator[None]:
    """Name the table of the job in an option's problem, in place of the file that was read with the option.

    Parameters
    ----------
    number
        The ``[[rainfall]]`` table, from 1.
    name
        Its file, as the job names it.

    Examples
    --------
    >>> from basinrain.errors import Problem
    >>> with of_source(2, "daily.csv"):
    ...     raise JobError(Problem(item="read_hour", found="'25'", expected="a time of day", file="/jobs/daily.csv"))
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [[rainfall]] no. 2 (daily.csv) read_hour: found '25'; expected a time of day
    """
    try:
        yield
    except JobError as error:
        head = f"[[rainfall]] no. {number} ({name})"
        told = [replace(problem, file="", item=f"{head} {problem.item}") for problem in error.problems]
        raise JobError(told, unlisted=error.unlisted) from None

"""Problems of one file among several."""

from __future__ import annotations

from pathlib import Path

import pytest

from basinrain.errors import Problems, ReadError
from basinrain.reading.blocks import problems_of
from basinrain.reading.delimited import read_delimited


def test_problems_are_handed_on_with_their_file() -> None:
    """What a file's reading collects, and what stops it, both reach the collector with the file's name."""
    problems = Problems()
    with problems_of("one.csv", problems) as here:
        here.add(item="time", found="'noon'", line=2)
    with problems_of("two.csv", problems):
        read_delimited(Path("no_such_file.csv"))
    with pytest.raises(
        ReadError, match=r"(?s)^one.csv:2: time: found 'noon'\nno_such_file.csv: the file: found nothing"
    ):
        problems.raise_as(ReadError)


def test_other_errors_pass() -> None:
    """An error that is no problem of the file is not swallowed."""
    with pytest.raises(ZeroDivisionError, match="by zero"), problems_of("one.csv", Problems()):
        raise ZeroDivisionError("by zero")

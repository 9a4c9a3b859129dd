"""The tables of docs/frequency.md beside the simulation that made them."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from benchmarks.frequency_spread import TRUTHS, covers, lines_of, plain_cover, spreads, truth_of

TEXT = (Path(__file__).parents[2] / "docs" / "frequency.md").read_text(encoding="utf-8")


def rows_of(heading: str) -> list[list[str]]:
    """Return the cells of the rows below the heading that has these words."""
    lines = TEXT.split(heading)[1].split("\n\n")[0].splitlines()[2:]
    return [[cell.strip() for cell in line.strip("|").split("|")] for line in lines]


def assert_rows(found: list[str], told: list[list[str]], *, within: float) -> None:
    """Make sure that rows have the same words and lengths, and numbers no further apart than that."""
    rows = [[cell.strip() for cell in line.strip("|").split("|")] for line in found]
    assert [row[:3] for row in rows] == [row[:3] for row in told]
    ours, theirs = (np.array([row[3:] for row in table], dtype=float) for table in (rows, told))
    np.testing.assert_allclose(theirs, ours, atol=within)


def test_spreads_are_those_told() -> None:
    """Every row of the spread of 100-year depths is what the script finds, to the rounding of one percent."""
    assert_rows(lines_of(spreads()), rows_of("root mean square error, % |"), within=1.01)


def test_truths_are_those_told() -> None:
    """The true 100-year depths in the text are those of the distributions drawn from."""
    for shape in TRUTHS.values():
        assert f"{truth_of(shape)[1]:.1f} mm" in TEXT


@pytest.mark.benchmark
def test_plain_resampling_is_as_told() -> None:
    """How often resampling the maxima themselves holds the truth is what the script finds."""
    assert f"held the true 100-year depth {plain_cover():.0f} times in 100" in TEXT


@pytest.mark.benchmark
def test_covers_are_those_told() -> None:
    """Every row of the table of intervals is what the script finds."""
    assert_rows(lines_of(covers()), rows_of("median width, % of truth |"), within=1.01)

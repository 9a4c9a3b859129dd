"""Depth cells."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from basinrain.errors import JobError
from basinrain.intervals import parse_interval
from basinrain.rainfall import Status
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.depths import DepthCells, DepthRules, depth_rules
from basinrain.units import DEPTH_UNITS


def rules(unit: str = "mm", interval: str | None = "1h", **options: Any) -> DepthRules:  # noqa: ANN401 - any rule
    given_options: dict[str, Any] = {"missing": (), "trace": ("T",), "flags": {}, "accumulated": None} | options
    return depth_rules(unit=unit, interval=None if interval is None else parse_interval(interval), **given_options)


def cell(text: str, mark: str | None = None, **options: Any) -> tuple[float, str, str]:  # noqa: ANN401
    """Return depth, status and complaint of one cell, with its mark in a column of its own where there is one."""
    frame = pd.DataFrame({"depth": pd.Series([text], dtype=str), "flag": pd.Series([mark or ""], dtype=str)})
    table = DelimitedTable("rain.csv", ("depth", "flag"), frame, np.array([2]), ".")
    reader = DepthCells(table, rules(**options))
    depth, status, faults = reader.column("depth", flag=None if mark is None else "flag")
    return float(depth[0]), Status(status[0]).label, " ".join(part for _, fault in faults for part in fault[:2])


def same(depth: float) -> Any:  # noqa: ANN401 - pytest's approximation
    return pytest.approx(depth, nan_ok=True)


MARKS = {
    "estimated": ["E"],
    "rejected": ["R"],
    "missing": ["M"],
    "presumed-zero": ["P"],
    "adjusted": ["EE"],
    "observed": ["g"],
}


@pytest.mark.parametrize(
    ("text", "depth", "status"),
    [
        ("1.5", 1.5, "observed"),
        ("0", 0.0, "zero"),
        ("0.00", 0.0, "zero"),
        ("", np.nan, "missing"),
        ("T", 0.0, "trace"),
        ("0.0T", 0.0, "trace"),
        ("-999", np.nan, "missing"),
        ("-999.00", np.nan, "missing"),
        ("n/a", np.nan, "missing"),
        ("2.5E", 2.5, "estimated"),
        ("2.5 E", 2.5, "estimated"),
        ("2.5EE", 2.5, "adjusted"),
        ("0E", 0.0, "estimated"),
        ("E", np.nan, "missing"),
        ("2.5R", np.nan, "rejected"),
        ("R", np.nan, "rejected"),
        ("M", np.nan, "missing"),
        ("P", 0.0, "presumed zero"),
        ("0g", 0.0, "zero"),
        ("1e1", 10.0, "observed"),
        ("99.99", 99.99, "observed"),
    ],
)
def test_cells(text: str, depth: float, status: str) -> None:
    """Every kind of cell has its depth and status; blank and declared codes are missing, never zero."""
    assert cell(text, missing=[-999, "n/a"], flags=MARKS) == (same(depth), status, "")


@pytest.mark.parametrize(
    ("text", "mark", "depth", "status"),
    [
        ("2.5", "", 2.5, "observed"),
        ("2.5", "E", 2.5, "estimated"),
        ("", "P", 0.0, "presumed zero"),
        ("2.5", "R", np.nan, "rejected"),
        ("7", "M", np.nan, "missing"),
        ("7", "A", 7.0, "accumulated"),
        ("0", "T", 0.0, "trace"),
        ("T", "", 0.0, "trace"),
    ],
)
def test_cells_with_a_mark_beside(text: str, mark: str, depth: float, status: str) -> None:
    """A mark in a column of its own means the same as one behind the number."""
    found = cell(text, mark, flags=MARKS, accumulated="A")
    assert found == (same(depth), status, "")


@pytest.mark.parametrize(
    ("text", "complaint"),
    [
        ("wet", "'wet' a depth of 0 or more"),
        ("inf", "'inf' a depth of 0 or more"),
        ("nan", "'nan' a depth of 0 or more"),
        ("1,5", "'1,5' a depth of 0 or more"),
        ("2.5X", "'2.5X' a depth of 0 or more"),
        ("-0.2", "'-0.2' a depth of 0 or more"),
        ("-9", "'-9' a depth of 0 or more; it looks like a missing code"),
        ("-99", "'-99' a depth of 0 or more; it looks like a missing code"),
        ("-999", "'-999' a depth of 0 or more; it looks like a missing code"),
        ("-9999.0", "'-9999.0' a depth of 0 or more; it looks like a missing code"),
        ("9999", "'9999' a depth of 0 or more; it looks like a missing code"),
        ("999.9", "'999.9' a depth of 0 or more; it looks like a missing code"),
        ("5P", "'5' marked 'P', presumed zero no depth, or 0"),
        ("5T", "'5' marked 'T', trace no depth, or 0"),
        ("A", "a blank cell marked 'A' the accumulated depth"),
    ],
)
def test_faulty_cells(text: str, complaint: str) -> None:
    """Text, infinite and negative numbers and undeclared codes are faults; nothing is made of them."""
    assert cell(text, flags={"presumed-zero": ["P"]}, accumulated="A") == (
        same(np.nan),
        "missing",
        complaint,
    )


@pytest.mark.parametrize(
    ("text", "unit", "interval", "refused"),
    [
        ("99.99", "in", "1h", True),  # 2540 mm in an hour
        ("99.99", "mm", "1h", False),
        ("99.99", "mm", "1min", True),
        ("99.99", "in", "1mo", False),
        ("999.9", "mm", "1d", True),
        ("999.9", "mm", "1mo", False),
        ("9999", "0.1 mm", "1d", True),  # 999.9 mm
        ("9999", "0.01 in", "1d", True),
        ("9999", "mm", "1mo", True),
        ("9999", "0.1 mm", None, False),
        ("99999", "mm", None, True),
    ],
)
def test_large_codes_are_refused_where_implausible(text: str, unit: str, interval: str | None, refused: bool) -> None:  # noqa: FBT001
    """A value that is a usual missing code is refused only where no such rain falls in the interval."""
    assert bool(cell(text, unit=unit, interval=interval)[2]) is refused


def test_undeclared_mark() -> None:
    """A mark that is not declared is a fault that lists the declared ones."""
    assert cell("1", "Z", flags={"estimated": ["E"]})[2] == "mark 'Z' a declared mark (T, E)"
    assert cell("1", "Z", trace=())[2] == "mark 'Z' a declared mark (none is declared)"


def test_rules_that_cannot_be() -> None:
    """Unknown meanings and units, marks with two meanings and empty marks are refused together."""
    with pytest.raises(JobError) as caught:
        rules("inch", flags={"estimate": ["E"], "trace": ["S"], "rejected": ["S", ""]})
    assert str(caught.value).splitlines() == [
        (
            "depth unit: found 'inch'; expected one of: mm, cm, m, in, 0.1 mm, 0.01 mm, 0.1 in, 0.01 in, 0.001 in, "
            "kg m-2; did you mean 'in'?"
        ),
        (
            "flags: found 'estimate'; expected one of: observed, estimated, adjusted, rejected, missing, trace, "
            "presumed-zero, accumulated; did you mean 'estimated'?"
        ),
        "flags: found mark 'S' for 'trace' and 'rejected'; expected one meaning for every mark",
        "flags: found an empty mark; expected a letter or word that stands in the file",
    ]


@settings(deadline=None)
@given(st.floats(0, 50), st.sampled_from(sorted(DEPTH_UNITS)))
def test_units_round_trip(mm: float, unit: str) -> None:
    """A depth written in any unit is read as the same mm."""
    assert cell(repr(mm / DEPTH_UNITS[unit]), unit=unit)[0] == pytest.approx(mm, rel=1e-12, abs=1e-300)


@given(
    values=st.lists(
        st.one_of(
            st.integers(-20, 20000).map(lambda n: n / 10), st.sampled_from([np.nan, np.inf, -9999.0, 99999.0, 0.05])
        ),
        min_size=1,
    ),
    marks=st.booleans(),
)
def test_numbers_are_judged_as_their_text(values: list[float], marks: bool) -> None:  # noqa: FBT001 - drawn
    """A number gives the depth, status and fault of a cell with the same text, with marks beside it or without."""
    rules = depth_rules(
        unit="in", interval=None, missing=[-1.5, "7"], trace=["0.05"], flags={"estimated": ["E"], "rejected": ["X"]},
        accumulated=None,
    )  # fmt: skip
    texts = ["" if np.isnan(value) else np.format_float_positional(value, trim="-") for value in values]
    flags = [("", "E", "X")[k % 3] for k in range(len(values))]
    frame = pd.DataFrame({"text": texts, "number": np.array(values), "flag": flags})
    table = DelimitedTable("rain.csv", ("text", "number", "flag"), frame, np.arange(2, len(frame) + 2), ".")
    flag = "flag" if marks else None
    expected = DepthCells(table, rules).column("text", flag=flag)
    found = DepthCells(table, rules).column("number", flag=flag)
    np.testing.assert_array_equal(found[0], expected[0])
    np.testing.assert_array_equal(found[1], expected[1])
    assert found[2] == expected[2]

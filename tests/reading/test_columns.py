"""Columns by name, and numbers in them."""

import hypothesis.strategies as st
import numpy as np
import pandas as pd
import pytest
from hypothesis import given

from basinrain.errors import Problems, ReadError
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import DelimitedTable


@given(st.lists(st.floats(allow_nan=False, allow_infinity=False), min_size=1))
def test_numbers_are_read_to_the_last_bit(values: list[float]) -> None:
    """A number's shortest text gives that number back."""
    frame = pd.DataFrame({"x": [repr(value) for value in values]}, dtype=str)
    got, bad = numbers(DelimitedTable("t.csv", ("x",), frame, np.arange(len(values)), "."), "x")
    np.testing.assert_array_equal(got, values)
    assert not bad.any()


@pytest.mark.parametrize(
    "text", ["inf", "-Infinity", "nan", "NaN", "1_000", "0x10", "1,000", "1e999", "T", "1 2", "٣", "--1"]
)
def test_odd_texts_are_no_numbers(text: str) -> None:
    """What another reader might take for a number is reported, not read."""
    got, bad = numbers(DelimitedTable("t.csv", ("x",), pd.DataFrame({"x": [text, ""]}), np.arange(2), "."), "x")
    assert np.isnan(got).all()
    assert bad.tolist() == [True, False]


@pytest.mark.parametrize(
    ("columns", "mapped", "column"),
    [
        (["Gauge ID", "x"], None, "Gauge ID"),
        (["station", "gauge.id"], None, "gauge.id"),
        (["STATION", "x"], None, "STATION"),
        (["Id", "gauge_id"], "Id", "Id"),
        (["Id", "gauge_id"], "ID", "Id"),
        (["id", "ID"], "ID", "ID"),
        (["name"], None, None),
    ],
)
def test_columns_are_found_by_trade_name_or_mapping(columns: list[str], mapped: str | None, column: str | None) -> None:
    """The mapped column wins, then the first trade name in their order; capitals and word breaks do not matter."""
    problems = Problems()
    assert find_column(columns, ["gauge_id", "station"], mapped=mapped, key="id", problems=problems) == column
    assert len(problems) == 0


def test_a_mapped_column_that_is_not_there_is_never_replaced() -> None:
    """A slip in the mapping is a problem, though a trade name would fit."""
    problems = Problems(file="gauges.csv")
    assert find_column(["id", "gauge"], ["id"], mapped="gage", key="id", problems=problems) is None
    with pytest.raises(
        ReadError,
        match=r"^gauges.csv: columns.id: found no column 'gage'; expected a column of the file; did you mean 'gauge'\?",
    ):
        problems.raise_as(ReadError)

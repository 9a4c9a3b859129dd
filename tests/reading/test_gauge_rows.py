"""Rows of a gauge table in messages."""

import numpy as np
import pandas as pd
import pytest

from basinrain.errors import Problems, ReadError
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.gauge_rows import GaugeRows


@pytest.mark.parametrize(
    ("vector", "place"), [(False, "g.csv:7: column z: gauge A"), (True, "g.csv: column z: feature 7: gauge A")]
)
def test_a_row_is_told_by_line_or_feature(vector: bool, place: str) -> None:  # noqa: FBT001 - a case of the table
    """Tables have lines, vector files numbered features."""
    table = DelimitedTable("g.csv", ("z",), pd.DataFrame({"z": ["high", "", "3"]}), np.array([7, 8, 9]), ".")
    rows = GaugeRows(table, vector=vector, ids=("A", "B", ""), problems=Problems(file="g.csv"))
    np.testing.assert_array_equal(rows.numbers("z"), [np.nan, np.nan, 3.0])
    with pytest.raises(ReadError, match=rf"^{place}: found 'high'; expected a number; correct the cell$"):
        rows.problems.raise_as(ReadError)


def test_blank_cells_where_a_number_is_needed() -> None:
    """A blank cell is a problem only where it may not be blank; a row without an id is told all the same."""
    table = DelimitedTable("g.csv", ("z",), pd.DataFrame({"z": [""]}), np.array([7]), ".")
    rows = GaugeRows(table, vector=False, ids=("",), problems=Problems(file="g.csv"))
    rows.numbers("z", blank=False)
    with pytest.raises(ReadError, match=r"^g\.csv:7: column z: a gauge: found nothing; expected a number;"):
        rows.problems.raise_as(ReadError)

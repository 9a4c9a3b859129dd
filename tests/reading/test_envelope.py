"""A region's greatest depths: units and durations, and everything that can be wrong with such a table."""

from __future__ import annotations

from pathlib import Path

import pytest

from basinrain.errors import ReadError
from basinrain.reading import read_envelope


def test_durations_and_units_are_brought_together(tmp_path: Path) -> None:
    """Rows in any order and unit: hours and mm, a month as its longest."""
    path = tmp_path / "greatest.csv"
    path.write_text("unit;duration;depth\nmm;1mo;900\nin;1h;4\nmm;15min;60\n", encoding="utf-8")
    assert read_envelope(path) == ((0.25, 60.0), (1.0, 101.6), (744.0, 900.0))


def test_every_wrong_cell_is_listed(tmp_path: Path) -> None:
    """Duration, unit, depth and repetition, each with its line."""
    path = tmp_path / "greatest.csv"
    path.write_text(
        "duration,depth,unit\n1 hour,90,mm\n1h,-3,mm\n1d,300,inch\n2d,400,mm\n2d,410,mm\n3d,100,mm\n", encoding="utf-8"
    )
    with pytest.raises(ReadError) as caught:
        read_envelope(path)
    lines = str(caught.value).replace(f"{path}", "F").splitlines()
    assert [line.partition("; expected")[0] for line in lines] == [
        "F:2: duration: found '1 hour'",
        "F:3: depth: found '-3'",
        "F:4: unit: found 'inch'",
        "F:6: duration: found '2d' twice",
        "F: depth: found 100 mm in 72 h, below 400 mm in 48 h",
    ]


def test_a_column_that_is_missing_is_named(tmp_path: Path) -> None:
    """The three columns are needed."""
    path = tmp_path / "greatest.csv"
    path.write_text("duration,depth\n1h,90\n", encoding="utf-8")
    with pytest.raises(ReadError, match="the header: found no column 'unit'; expected columns duration, depth and"):
        read_envelope(path)


def test_a_table_without_rows_is_refused(tmp_path: Path) -> None:
    """An envelope that says nothing is a slip."""
    path = tmp_path / "greatest.csv"
    path.write_text("duration,depth,unit\n", encoding="utf-8")
    with pytest.raises(ReadError, match="found a header and nothing below it"):
        read_envelope(path)

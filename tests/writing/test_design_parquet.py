"""The Parquet file is typed, has its unit, and gives every number back to the libraries that read it."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from small_hyetographs import drawn_content, two_steps

from basinrain.writing import design_parquet
from basinrain.writing.design_csv import COLUMNS, write_csv
from basinrain.writing.design_parquet import write_parquet


@pytest.mark.parametrize(("held", "groups"), [(1 << 18, 1), (130, 7), (1, 16)])
def test_pyarrow_reads_every_number(tmp_path: Path, held: int, groups: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """A group of rows holds whole hyetographs; the probability of a partial duration series is null."""
    monkeypatch.setattr(design_parquet, "_HELD", held)
    content = drawn_content(depth_unit="in")
    write_parquet(tmp_path, content)
    assert pq.ParquetFile(tmp_path / "design_hyetographs.parquet").num_row_groups == groups
    table = pq.read_table(tmp_path / "design_hyetographs.parquet")
    at = 0
    for one in content.hyetographs:
        rows = table.slice(at, one.depth.size)
        at += one.depth.size
        depth = content.depth(one)
        np.testing.assert_array_equal(rows["depth"].to_numpy(), depth.ravel())
        np.testing.assert_array_equal(rows["cumulative"].to_numpy(), np.cumsum(depth, axis=1).ravel())
        assert rows["basin"].to_pylist() == [basin for basin in one.basins for _ in range(one.n_steps)]
        assert rows["elapsed_min"].to_pylist() == one.elapsed.tolist() * len(one.basins)
        np.testing.assert_array_equal(rows["time"].to_numpy()[: one.n_steps], content.ends(one.elapsed))
        aep = one.frequency.written_aep
        facts = (
            one.point,
            None if np.isnan(aep) else aep,
            one.frequency.written_years,
            one.frequency.series,
            one.duration,
        )
        columns = ("point", "aep", "return_period", "return_period_in", "duration", "pattern", "depth_unit")
        assert {tuple(row.values()) for row in rows.select(columns).to_pylist()} == {(*facts, one.pattern, "in")}
    assert at == len(table)


def test_pandas_reads_what_it_reads_from_the_csv_file(tmp_path: Path) -> None:
    """Column by column, the same words and the same numbers."""
    content = drawn_content()
    write_parquet(tmp_path, content)
    write_csv(tmp_path, content)
    parquet = pd.read_parquet(tmp_path / "design_hyetographs.parquet")
    # To the last bit whatever way pandas parses numbers.
    exact = dict.fromkeys(("depth", "cumulative", "aep", "return_period"), lambda text: float(text or "nan"))
    table = pd.read_csv(tmp_path / "design_hyetographs.csv", parse_dates=["time"], converters=exact)
    assert tuple(parquet.columns) == tuple(table.columns) == COLUMNS
    for name in COLUMNS:
        assert parquet[name].astype(table[name].dtype).equals(table[name]), name


def test_columns_are_typed_and_say_their_unit(tmp_path: Path) -> None:
    """Unit, caution, source and basins stand in the schema, so that no file of their own is needed."""
    write_parquet(tmp_path, drawn_content())
    schema = pq.read_schema(tmp_path / "design_hyetographs.parquet")
    kinds = [schema.field(name).type for name in ("aep", "elapsed_min", "time", "depth", "cumulative")]
    assert kinds == [pa.float64(), pa.int32(), pa.timestamp("ms"), pa.float64(), pa.float64()]
    words = ("point", "return_period_in", "duration", "pattern", "basin", "depth_unit")
    assert all(pa.types.is_dictionary(schema.field(name).type) for name in words)
    units = {name: schema.field(name).metadata[b"unit"] for name in ("aep", "return_period", "elapsed_min", "depth")}
    assert units == {"aep": b"1", "return_period": b"year", "elapsed_min": b"min", "depth": b"mm"}
    facts = {key: schema.metadata[key] for key in (b"job", b"comment", b"point_depths", b"source", b"start")}
    assert list(facts.values()) == [
        b"Alder Fork",
        b"For use by a qualified hydrologist.",
        b"an invented table, 2031",
        b"basinrain 0.1.0",
        b"2031-05-04T06:00",
    ]
    assert json.loads(schema.metadata[b"basins"])["Mill"] == {"name": "Mühle", "area_m2": 4e5}


def test_without_a_start_there_are_no_times(tmp_path: Path) -> None:
    """Elapsed minutes only, and nothing said of a start."""
    write_parquet(tmp_path, two_steps())
    schema = pq.read_schema(tmp_path / "design_hyetographs.parquet")
    assert "time" not in schema.names
    assert b"start" not in schema.metadata
    assert pq.read_table(tmp_path / "design_hyetographs.parquet")["elapsed_min"].to_pylist() == [60, 120, 60, 120]

"""The Parquet file is typed, has its unit, and gives every number back to the libraries that read it."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from small_series import BASINS, SERIES, small_content

from basinrain.series.flags import flag_words
from basinrain.writing import series_parquet
from basinrain.writing.series_parquet import write_parquet


@pytest.mark.parametrize(("held", "groups"), [(1 << 20, 2), (80, 6), (1, 100)])
def test_pyarrow_reads_every_number(tmp_path: Path, held: int, groups: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """A group of rows is a block of steps of one series; what is missing is null."""
    monkeypatch.setattr(series_parquet, "_HELD", held)
    content = small_content(depth_unit="in")
    write_parquet(tmp_path, content)
    assert pq.ParquetFile(tmp_path / "series.parquet").num_row_groups == groups
    table = pq.read_table(tmp_path / "series.parquet")
    for number, one in enumerate(SERIES):
        block = content.block(*one, slice(0, 50))
        rows = table.slice(number * 200, 200)
        assert rows["depth"].null_count == np.isnan(block.depth).sum() > 0
        np.testing.assert_array_equal(rows["depth"].to_numpy(), block.depth.ravel())
        np.testing.assert_array_equal(rows["observed_share"].to_numpy(), block.observed_share.ravel())
        assert rows["flags"].to_pylist() == [flag_words(code) for code in block.flags.ravel().tolist()]
        assert rows["basin"].to_pylist() == list(BASINS) * 50
        assert set(zip(rows["gaps"].to_pylist(), rows["method"].to_pylist(), strict=True)) == {one}
        assert set(rows["depth_unit"].to_pylist()) == {"in"}


def test_pandas_reads_every_number(tmp_path: Path) -> None:
    """Times are instants of the record's clock: the first hour at +02:00 ends at 23:00 UTC of the day before."""
    content = small_content()
    write_parquet(tmp_path, content)
    frame = pd.read_parquet(tmp_path / "series.parquet")
    assert frame["time"][0] == pd.Timestamp("2031-05-04T01:00+02:00")
    assert str(frame["time"].dt.tz) == "UTC+02:00"
    times = pd.DatetimeIndex(content.ends).tz_localize("+02:00")
    for gaps, method in SERIES:
        own = frame[(frame["gaps"] == gaps) & (frame["method"] == method)]
        wide = own.pivot_table(index="time", columns="basin", values="depth", dropna=False, observed=True)
        assert (wide.index == times).all()
        np.testing.assert_array_equal(wide[list(BASINS)].to_numpy(), content.source.depth(gaps, method))


def test_columns_are_typed_and_say_their_unit(tmp_path: Path) -> None:
    """Unit, caution and basins stand in the schema, so that no file of their own is needed."""
    write_parquet(tmp_path, small_content())
    schema = pq.read_schema(tmp_path / "series.parquet")
    assert schema.names == ["basin", "method", "gaps", "time", "depth", "depth_unit", "observed_share", "flags"]
    kinds = [schema.field(name).type for name in ("time", "depth", "observed_share")]
    assert kinds == [pa.timestamp("ms", tz="+02:00"), pa.float64(), pa.float32()]
    assert all(pa.types.is_dictionary(schema.field(name).type) for name in ("basin", "method", "gaps", "flags"))
    assert schema.field("depth").metadata[b"unit"] == b"mm"
    assert schema.metadata[b"comment"] == b"For use by a qualified hydrologist."
    assert (schema.metadata[b"depth_unit"], schema.metadata[b"zone"]) == (b"mm", b"+02:00")
    assert json.loads(schema.metadata[b"basins"])["Mill"] == {"name": "Mühle", "area_m2": 4e5}


def test_a_clock_that_is_not_known_is_not_made_up(tmp_path: Path) -> None:
    """Times without a zone are local times, and the schema says so."""
    content = small_content(zone="", names=())
    write_parquet(tmp_path, content)
    schema = pq.read_schema(tmp_path / "series.parquet")
    assert schema.field("time").type == pa.timestamp("ms")
    assert schema.metadata[b"zone"] == b"the record's clock, not known"
    assert pd.read_parquet(tmp_path / "series.parquet")["time"][0] == pd.Timestamp("2031-05-04T01:00")

"""Every basin has a file with its series side by side, and an index says which."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from small_series import SERIES, small_content

from basinrain.series.flags import flag_words
from basinrain.writing import series_basin_csv
from basinrain.writing.series_basin_csv import write_basin_csv
from basinrain.writing.series_content import series_name


def read(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize(("held", "opened"), [(1 << 17, 128), (30, 3), (1, 1)])
def test_every_number_is_read_back(tmp_path: Path, held: int, opened: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """To the last bit, however many rows and files are in work at a time."""
    monkeypatch.setattr(series_basin_csv, "_HELD", held)
    monkeypatch.setattr(series_basin_csv, "_OPEN", opened)
    content = small_content()
    write_basin_csv(tmp_path, content)
    index = read(tmp_path / "hyetographs" / "index.csv")
    assert [row["basin"] for row in index] == list(content.basins)
    files = {path.name for path in (tmp_path / "hyetographs").iterdir()}
    assert files == {row["file"] for row in index} | {"index.csv"}
    for at, entry in enumerate(index):
        rows = read(tmp_path / "hyetographs" / entry["file"])
        assert [row["time"] for row in rows] == content.time_texts(slice(0, 50))
        assert {row["depth_unit"] for row in rows} == {"mm"}
        for gaps, method in SERIES:
            name, block = series_name(gaps, method), content.block(gaps, method, slice(0, 50), slice(at, at + 1))
            depth = np.array([float(row[f"depth_{name}"] or "nan") for row in rows])
            np.testing.assert_array_equal(depth, block.depth[:, 0])
            share = np.array([row[f"observed_share_{name}"] or "nan" for row in rows], dtype=np.float32)
            np.testing.assert_array_equal(share, block.observed_share[:, 0])
            assert [row[f"flags_{name}"] for row in rows] == [flag_words(code) for code in block.flags[:, 0].tolist()]


def test_the_index_tells_the_basins(tmp_path: Path) -> None:
    """Names and areas as the job gives them; an id that no file can be called after has another file's name."""
    basins = ("index", "INDEX.csv", "a/b", "union")
    write_basin_csv(tmp_path, small_content(basins=basins, area_unit="km2"))
    table = pd.read_csv(tmp_path / "hyetographs" / "index.csv", keep_default_na=False)
    assert table["file"].tolist() == ["index-2.csv", "INDEX.csv.csv", "a_b.csv", "union.csv"]
    assert table["name"].tolist() == ['the "old" one', "", "Mühle", ""]
    assert table["area"].tolist() == [1.5, 2.25, 0.4, 4.15]
    assert set(table["area_unit"]) == {"km2"}

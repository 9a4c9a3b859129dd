"""Design hyetographs go to all formats that a job names, and are the same each time."""

from __future__ import annotations

import hashlib
import importlib.util
import time
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from small_hyetographs import drawn_content, two_steps

from basinrain.errors import JobError, WriteError
from basinrain.writing.design_files import WRITERS, check_design_formats, write_design_files
from basinrain.writing.series_files import FORMATS

FILES = ["design_hyetographs.csv", "design_hyetographs.nc", "design_hyetographs.parquet", "hyetographs"]


def test_formats_are_those_of_series() -> None:
    """The same words, and so the same libraries and extras."""
    assert list(WRITERS) == list(FORMATS)


def test_all_formats_at_once(tmp_path: Path) -> None:
    """The names of what was made come back, in order, whatever order they were asked for in."""
    assert write_design_files(tmp_path, two_steps(), formats=[*list(WRITERS)[::-1], "csv"]) == FILES
    assert sorted(path.name for path in tmp_path.iterdir()) == FILES


def test_the_same_hyetographs_give_the_same_bytes(tmp_path: Path) -> None:
    """Nothing of the time of writing goes into any file."""
    made = []
    for name in ("one", "two"):
        (tmp_path / name).mkdir()
        write_design_files(tmp_path / name, drawn_content(), formats=list(WRITERS))
        files = sorted(path for path in (tmp_path / name).rglob("*") if path.is_file())
        made.append(
            {str(path.relative_to(tmp_path / name)): hashlib.sha256(path.read_bytes()).hexdigest() for path in files}
        )
        time.sleep(1.1)
    assert made[0] == made[1]
    assert len(made[0]) == 3 + 1 + 8


def test_formats_say_the_same(tmp_path: Path) -> None:
    """The depths of one basin have the same digits in CSV, Parquet, NetCDF and the file of their own."""
    import xarray as xr

    write_design_files(tmp_path, drawn_content(depth_unit="in"), formats=list(WRITERS))
    table = pd.read_csv(tmp_path / FILES[0], converters={"depth": float})
    np.testing.assert_array_equal(table["depth"], pd.read_parquet(tmp_path / FILES[2])["depth"])
    own = table.query("point == 'bridge' and aep == 0.01 and duration == '6h' and basin == 'Mill'")
    depth = own[own["pattern"] == "late, peak"]["depth"].to_numpy()
    assert len(depth) == 36
    file = pd.read_csv(tmp_path / FILES[3] / "bridge_Mill_6h.csv", dtype=str)
    np.testing.assert_array_equal(file["depth_aep_0.01_late, peak"].map(float), depth)
    with xr.open_dataset(tmp_path / FILES[1], decode_timedelta=False) as data:
        case = (data["point"] == "bridge") & (data["aep"] == 0.01) & (data["duration"] == 360)
        case &= data["pattern"] == "late, peak"
        np.testing.assert_array_equal(data["depth"][case.to_numpy(), :, 2].to_numpy(), depth[None])


def test_formats_that_do_not_exist_are_named_together() -> None:
    """With the nearest that does, in the words of the job."""
    message = r"(?s)\[design\] formats: found 'tsv'.*one of: csv, csv-per-basin.*'netcfd'.*did you mean 'netcdf'"
    with pytest.raises(JobError, match=message):
        check_design_formats(["tsv", "csv", "netcfd"])


@pytest.mark.parametrize(("word", "library"), [("parquet", "pyarrow"), ("netcdf", "netCDF4")])
def test_a_library_that_is_not_there(tmp_path: Path, word: str, library: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """The message names the extra that brings it, before any file is begun."""
    there = importlib.util.find_spec
    monkeypatch.setattr(
        "basinrain.writing.series_files.find_spec", lambda name: None if name == library else there(name)
    )
    message = rf"\[design\] formats: found '{word}', and no {library} to write it with; expected the extra basinrain\["
    with pytest.raises(JobError, match=message):
        write_design_files(tmp_path, two_steps(), formats=["csv", word])
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("word", list(WRITERS))
def test_a_folder_that_is_gone(tmp_path: Path, word: str) -> None:
    """One clear line for each format."""
    name, _ = WRITERS[word]
    with pytest.raises(WriteError, match=rf"^{name}: cannot be written: found .*; expected a folder with room"):
        write_design_files(tmp_path / "gone", two_steps(), formats=[word])

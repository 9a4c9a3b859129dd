"""Every point, basin and duration has a file, frequencies and patterns side by side, and an index says which."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from small_hyetographs import COMMON, drawn_content, hyetograph, two_steps

from basinrain.errors import WriteError
from basinrain.writing.design_basin_csv import write_basin_csv
from basinrain.writing.design_content import column_word


def read(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_files_that_can_be_read_at_a_glance(tmp_path: Path) -> None:
    """A storm that is rare beside one that is not, in inches: 25.4 and 12.7 mm are 1 and 0.5 in."""
    first = two_steps().hyetographs[0]
    second = hyetograph([[12.7, 0.0], [0.0, 25.4]], basins=first.basins, frequency=COMMON, pattern="late, peak")
    write_basin_csv(tmp_path, two_steps(hyetographs=(first, second)))
    folder = tmp_path / "hyetographs"
    assert sorted(path.name for path in folder.iterdir()) == ["bridge_a_b_2h.csv", "bridge_west_2h.csv", "index.csv"]
    assert (folder / "index.csv").read_bytes().decode() == (
        "point,basin,duration,name,area,area_unit,file\n"
        "bridge,west,2h,,1.0,km2,bridge_west_2h.csv\n"
        'bridge,"a,b",2h,,2.0,km2,bridge_a_b_2h.csv\n'
    )
    assert (folder / "bridge_west_2h.csv").read_bytes().decode() == (
        'elapsed_min,depth_unit,depth_aep_0.01_nrcs-type-ii,"depth_return_period_2_late, peak"\n'
        "60,in,1.0,0.5\n"
        "120,in,0.5,0.0\n"
    )


def test_every_number_is_read_back(tmp_path: Path) -> None:
    """To the last bit, with times where the storm has a start."""
    content = drawn_content()
    write_basin_csv(tmp_path, content)
    folder = tmp_path / "hyetographs"
    index = {(row["point"], row["basin"], row["duration"]): row for row in read(folder / "index.csv")}
    assert {path.name for path in folder.iterdir()} == {row["file"] for row in index.values()} | {"index.csv"}
    assert len(index) == 8
    for (point, _), hyetographs in content.by_storm().items():
        for at, basin in enumerate(hyetographs[0].basins):
            rows = read(folder / index[point, basin, hyetographs[0].duration]["file"])
            assert [row["time"] for row in rows] == content.time_texts(hyetographs[0].elapsed)
            assert [int(row["elapsed_min"]) for row in rows] == hyetographs[0].elapsed.tolist()
            assert {row["depth_unit"] for row in rows} == {"mm"}
            for one in hyetographs:
                column = [float(row[f"depth_{column_word(one)}"]) for row in rows]
                np.testing.assert_array_equal(column, one.depth[:, at])


def test_the_index_tells_the_basins(tmp_path: Path) -> None:
    """Names and areas as the job gives them; ids that would share a file's name do not."""
    content = drawn_content(area_unit="ha")
    write_basin_csv(tmp_path, content)
    rows = read(tmp_path / "hyetographs" / "index.csv")
    assert [row["file"] for row in rows][:3] == [
        "bridge_Mill_1h.csv",
        "bridge_upper_east_1h.csv",
        "bridge_Upper__west_1h.csv",
    ]
    assert [(row["name"], row["area"], row["area_unit"]) for row in rows][:3] == [
        ("Mühle", "40.0", "ha"),
        ("", "225.0", "ha"),
        ('the "old" one', "150.0", "ha"),
    ]
    alike = tuple(hyetograph([[1.0]], basins=(basin,), point=point) for point, basin in (("a_b", "c"), ("a", "b_c")))
    (tmp_path / "alike").mkdir()
    write_basin_csv(tmp_path / "alike", two_steps(hyetographs=alike, basins=("c", "b_c")))
    assert [row["file"] for row in read(tmp_path / "alike" / "hyetographs" / "index.csv")] == [
        "a_b_c_1h.csv",
        "a_b_c_1h-2.csv",
    ]


def test_a_folder_that_is_there_is_not_written_into(tmp_path: Path) -> None:
    """Files of another run never stand beside these."""
    (tmp_path / "hyetographs").mkdir()
    with pytest.raises(WriteError, match=r"^hyetographs: cannot be written: found file exists; expected a folder"):
        write_basin_csv(tmp_path, two_steps())

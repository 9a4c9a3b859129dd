"""Where the values of a table of depths stand."""

from __future__ import annotations

from pathlib import Path

import pytest
from rainfiles import written

from basinrain.errors import Problems, ReadError
from basinrain.reading.delimited import read_delimited
from basinrain.reading.design_cells import PROBABILITIES, DesignCells, long_cells, wide_cells


def long(folder: Path, header: str, *, kind: str = "aep", unit: str = "mm", **columns: str) -> DesignCells | None:
    """Return the cells of a long table with this header; durations are in hours."""
    row = ",".join("1" for _ in header.split(","))
    table = read_delimited(written(folder, f"{header}\n{row}\n", "depths.csv"))
    problems = Problems(file="depths.csv")
    cells = long_cells(table, unit=unit, probability=kind, duration_unit="h", columns=columns, problems=problems)
    problems.raise_as(ReadError)
    return cells


@pytest.mark.parametrize(
    ("header", "probability", "unit"),
    [
        ("Site,Duration,AEP,Depth", "aep", "mm"),
        ("station id,duration_h,AEP (%),depth_mm", "aep-percent", "mm"),
        ("name,dur,T,Intensity", "return-period", "mm/h"),
        ("point,Storm Duration,Return-Period,intensity_in/h", "return-period", "in/h"),
    ],
)
def test_trade_names(tmp_path: Path, header: str, probability: str, unit: str) -> None:
    """Names common in the trade are found, in whatever spelling."""
    cells = long(tmp_path, header, kind=probability, unit=unit)
    assert cells is not None
    assert [cells.point, cells.duration, cells.probability, cells.depth] == header.split(",")


@pytest.mark.parametrize(
    ("header", "message"),
    [
        ("point,duration_min,aep,depth", "no column for the duration among"),
        ("point,duration,return_period,depth", "no column for the probability among"),
        ("point,duration,aep,depth_in", "no column for the depth among"),
        ("point,duration,aep,intensity", "no column for the depth among"),
    ],
)
def test_names_that_say_something_else(tmp_path: Path, header: str, message: str) -> None:
    """A column whose name says another unit or quantity than was declared is not taken."""
    with pytest.raises(ReadError, match=message) as caught:
        long(tmp_path, header)
    assert len(caught.value.problems) == 1


def test_named_columns(tmp_path: Path) -> None:
    """A column that is named is used; one that is not there is a problem."""
    header = "a,b,c,d"
    cells = long(tmp_path, header, point="a", duration="b", probability="c", depth="d")
    assert cells is not None
    assert (cells.point, cells.duration, cells.probability, cells.depth) == ("a", "b", "c", "d")
    with pytest.raises(ReadError, match=r"columns\.point: found no column 'e'"):
        long(tmp_path, header, point="e", duration="b", probability="c", depth="d")


def test_a_point_is_not_needed(tmp_path: Path) -> None:
    """All values may be of one point, in every way to state a frequency."""
    for probability, name in zip(PROBABILITIES, ("aep", "aep", "t"), strict=True):
        cells = long(tmp_path, f"duration,{name},depth", kind=probability)
        assert cells is not None
        assert cells.point is None


def test_wide(tmp_path: Path) -> None:
    """Every cell of a wide table becomes a row with its duration, its heading and its line."""
    table = read_delimited(written(tmp_path, "d;10;100\n1h;1,5;2\n\n2h;2;3,5\n", "depths.csv"))
    cells = wide_cells(table, columns={}, problems=Problems())
    assert cells is not None
    assert cells.wide
    assert cells.table.frame[[cells.duration, cells.probability, cells.depth]].to_numpy().tolist() == [
        ["1h", "10", "1,5"],
        ["1h", "100", "2"],
        ["2h", "10", "2"],
        ["2h", "100", "3,5"],
    ]
    assert cells.table.lines.tolist() == [2, 2, 4, 4]
    assert cells.table.decimal == ","


def test_wide_with_the_durations_elsewhere(tmp_path: Path) -> None:
    """The column of durations is the first one, or the one that is named."""
    table = read_delimited(written(tmp_path, "10,length\n1,1h\n", "depths.csv"))
    cells = wide_cells(table, columns={"duration": "length"}, problems=Problems())
    assert cells is not None
    assert cells.table.frame.to_numpy().tolist() == [["1h", "10", "1"]]


@pytest.mark.parametrize(
    ("columns", "message"),
    [
        ({"duration": "x"}, r"columns\.duration: found no column 'x'"),
        ({}, r"the header: found only the column 'duration'; expected a column for every frequency as well"),
    ],
)
def test_wide_without_its_columns(tmp_path: Path, columns: dict[str, str], message: str) -> None:
    """A table without durations or without frequencies is refused."""
    table = read_delimited(written(tmp_path, "duration\n1h\n", "depths.csv"))
    problems = Problems()
    assert wide_cells(table, columns=columns, problems=problems) is None
    with pytest.raises(ReadError, match=message):
        problems.raise_as(ReadError)

"""Positions that a long table repeats."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from rainfiles import written

from basinrain.errors import Problems, ReadError
from basinrain.reading.delimited import read_delimited
from basinrain.reading.point_positions import each_of, read_positions


def positions(
    folder: Path, text: str, *, crs: str | None = None, **columns: str
) -> tuple[npt.NDArray[np.float64], str]:
    """Return the positions of the points of a table with the column ``id``."""
    table = read_delimited(written(folder, text, "depths.csv"))
    ids = table.frame["id"].tolist()
    points = list(dict.fromkeys(ids))
    codes = np.array([points.index(point) for point in ids])
    problems = Problems(file="depths.csv")
    found = read_positions(table, codes, points, columns=columns, crs=crs, problems=problems)
    problems.raise_as(ReadError)
    return found


def test_positions_of_points(tmp_path: Path) -> None:
    """A position may stand in any of a point's rows, in several, or in none."""
    found, crs = positions(tmp_path, "id,lon,lat\nA,,\nB,9.5,47\nA,9,46\nB,9.5,47.0\nC,,\n")
    np.testing.assert_array_equal(found, [[9.0, 46.0], [9.5, 47.0], [np.nan, np.nan]])
    assert crs == "EPSG:4326"


def test_x_and_y(tmp_path: Path) -> None:
    """Columns of x and y are in the declared system; longitude and latitude beside them are passed over."""
    text = "id,lon,lat,x,y\nA,9,46,500,600\n"
    for crs in ("local", "EPSG:32632"):
        found, used = positions(tmp_path, text, crs=crs)
        np.testing.assert_array_equal(found, [[500.0, 600.0]])
        assert used == crs
    found, used = positions(tmp_path, text, crs="EPSG:4269")
    np.testing.assert_array_equal(found, [[9.0, 46.0]])
    assert used == "EPSG:4269"


def test_named_columns(tmp_path: Path) -> None:
    """Columns that are named are used, whatever they are called."""
    found, crs = positions(tmp_path, "id,here,up\nA,9,46\n", lon="here", lat="up")
    assert (found.tolist(), crs) == ([[9.0, 46.0]], "EPSG:4326")


@pytest.mark.parametrize("text", ["id,depth\nA,1\n", "id,lon,lat\nA,,\n"])
def test_no_positions(tmp_path: Path, text: str) -> None:
    """Without columns, or without a coordinate in them, points have no positions and no system."""
    found, crs = positions(tmp_path, text)
    assert np.isnan(found).all()
    assert crs == ""


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("id,lon,lat\nA,9,46\nA,9,47\nA,9,48\n", (r"^depths\.csv:3: point A: found position \(9, 47\), and \(9, 46\) "
                                                r"on line 2; expected one position for a point; correct one")),
        ("id,lon,lat\nA,9,\n", r"^depths\.csv:2: column lat: point A: found nothing; expected a coordinate; cor"),
        ("id,lon,lat\nA,east,46\n", r"^depths\.csv:2: column lon: point A: found 'east'; expected a coordinate; "),
        ("id,lon,lat\nA,46,109\n", (r"^depths\.csv:2: point A: found longitude 46 and latitude 109; expected degrees "
                                  r"that a place can have; longitude and latitude look swapped$")),
        ("id,lon\nA,9\n", r"^depths\.csv: the points' positions: found no column for lat beside 'lon'; expected lon"),
        ("id,y\nA,9\n", None),
        ("id,x,y\nA,9,46\n", r"^depths\.csv: the coordinates: found no CRS; expected their coordinate reference"),
    ],
)  # fmt: skip
def test_positions_that_cannot_be(tmp_path: Path, text: str, message: str | None) -> None:
    """Each fault is one line; a lone column that may be anything is none."""
    if message is None:
        assert np.isnan(positions(tmp_path, text)[0]).all()
        return
    with pytest.raises(ReadError, match=message) as caught:
        positions(tmp_path, text)
    assert len(caught.value.problems) == 1


def test_named_column_that_is_not_there(tmp_path: Path) -> None:
    """A column that is named and not there is one line, with the nearest."""
    with pytest.raises(
        ReadError, match=r"^depths\.csv: columns\.x: found no column 'eastin'; .* did you mean"
    ) as caught:
        positions(tmp_path, "id,easting,northing\nA,9,46\n", crs="local", x="eastin")
    assert len(caught.value.problems) == 1


def test_each_of_many_rows() -> None:
    """Fifty rows are given to be listed, the others counted."""
    problems = Problems()
    assert list(each_of(np.arange(3), problems)) == [0, 1, 2]
    assert len(problems) == 0
    assert len(list(each_of(np.arange(60), problems))) == 50
    assert len(problems) == 10

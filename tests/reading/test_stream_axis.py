"""Files of a source that are read in parts make one axis; gaps and overlaps between them."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from streamfiles import hours, network_of, write

from basinrain.errors import ReadError
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step
from basinrain.reading.stream import open_stream


def _files(folder: Path, form: str, *parts: tuple[str, int, int]) -> dict[str, Any]:
    """Return a source of several files, each of some gauges from an hour of the day until another."""
    sources = [
        write(folder, form, hours(stop - first, f"2031-05-04T{first:02d}:00:00"), list(gauges),
              np.ones((stop - first, len(gauges))), name=f"{k}_")
        for k, (gauges, first, stop) in enumerate(parts)
    ]  # fmt: skip
    return {**sources[0], "files": [source["files"][0] for source in sources]}


@pytest.mark.parametrize("form", ["wide text", "long text", "wide Parquet", "NetCDF"])
@pytest.mark.parametrize(
    ("parts", "message"),
    [
        ([("AB", 1, 4), ("AB", 5, 7)], r"time axis: found no row for 1 of the 1h steps, ending at 2031-05-04T04:00"),
        ([("AB", 1, 3), ("A", 3, 5), ("AB", 5, 7)],
         r"gauge B: found no rows for 2 of the 1h steps, ending at 2031-05-04T03:00:00, 2031-05-04T04:00:00; expected"),
        ([("AB", 1, 4), ("B", 3, 7)], r"gauge B: found the 1h that ends at 2031-05-04T03:00:00, which .*0_rain"),
    ],
)  # fmt: skip
def test_gaps_and_overlaps(tmp_path: Path, form: str, parts: list[tuple[str, int, int]], message: str) -> None:
    """A gap between files that hold a gauge, and a gauge and time in two files, are refused by both readers."""
    source = _files(tmp_path, form, *parts)
    with pytest.raises(ReadError, match=message):
        read_rainfall(**source)
    with pytest.raises(ReadError, match=message):
        open_stream([source], network_of("A", "B")).read(0, 9)


@pytest.mark.parametrize("form", ["wide text", "long text", "wide Parquet", "NetCDF"])
@pytest.mark.parametrize(
    ("parts", "gaps"),
    [
        ([("A", 1, 4), ("B", 6, 9)], "refuse"),
        ([("A", 1, 9), ("B", 3, 5), ("B", 5, 7)], "refuse"),
        ([("AB", 1, 4), ("AB", 7, 9)], "missing"),
        ([("AB", 6, 9), ("AB", 1, 4)], "missing"),
    ],
)
def test_files_that_make_an_axis(tmp_path: Path, form: str, parts: list[tuple[str, int, int]], gaps: str) -> None:
    """A gap between files that share no gauge is nobody's; declared ones are missing; files come in any order."""
    source = {**_files(tmp_path, form, *parts), "gaps": gaps}
    expected, _ = bring_to_step([read_rainfall(**source)], network_of("A", "B"))
    stream = open_stream([source], network_of("A", "B"))
    assert len(stream) == len(expected)
    for first in range(0, len(stream), 3):
        part = stream.read(first, first + 3)
        np.testing.assert_array_equal(part.depth, expected.depth[first : first + 3])
        np.testing.assert_array_equal(part.status, expected.status[first : first + 3])


def test_an_axis_that_is_too_long(tmp_path: Path) -> None:
    """A year that was mistyped is refused before anything of its length is made."""
    one = write(tmp_path, "wide text", hours(3), "A", np.ones((3, 1)), name="1_")
    two = write(tmp_path, "wide text", hours(3, "9931-05-04T01:00:00"), "A", np.ones((3, 1)), name="2_")
    source = {**one, "files": [*one["files"], *two["files"]], "gaps": "missing"}
    with pytest.raises(
        ReadError, match=r"time axis: found 69\d+ steps of 1h from .* to 9931-.*; expected at most 200000"
    ):
        open_stream([source], network_of("A"))

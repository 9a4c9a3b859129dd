"""A table of areal reduction factors of the user's own: its two layouts, and every way in which a file is none."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from basinrain.designstorm.areal_reduction import areal_reduction
from basinrain.errors import JobError, ReadError
from basinrain.reading.reduction_table import read_reduction_table

WIDE = "duration,10,100,1000\n1h,0.9,0.75,0.5\n6h,0.96,0.9,0.8\n"
LONG = "area,duration,factor\n100,6h,0.9\n10,6h,0.96\n10,60min,0.9\n1000,1 h,0.5\n100,1h,0.75\n1000,6h,0.8\n"


def table(tmp_path: Path, text: str) -> Path:
    path = tmp_path / "factors.csv"
    path.write_text(text, encoding="utf-8")
    return path


def problems_of(path: Path) -> list[str]:
    with pytest.raises(ReadError) as caught:
        read_reduction_table(path, area_unit="km2", source="invented")
    return str(caught.value).replace(str(path), "F").splitlines()


@pytest.mark.parametrize(
    "text", [WIDE, LONG, WIDE.replace(",", ";").replace(".", ","), LONG.replace("area,", "Area km2,")]
)
def test_both_layouts_say_the_same(tmp_path: Path, text: str) -> None:
    """Durations down and areas across, or a row for every factor in any order; decimal points or commas."""
    found = read_reduction_table(table(tmp_path, text), area_unit="km2", source="a study")
    assert found.areas.tolist() == [1e7, 1e8, 1e9]
    assert found.minutes.tolist() == [60.0, 360.0]
    assert found.factor.tolist() == [[0.9, 0.96], [0.75, 0.9], [0.5, 0.8]]
    assert found.source == "a study"


def test_areas_in_square_miles(tmp_path: Path) -> None:
    """A heading of 10 mi² is 10 x 1609.344² m²."""
    found = read_reduction_table(table(tmp_path, WIDE), area_unit="mi2", source="a study")
    assert found.areas[0] == pytest.approx(10 * 1609.344**2)


def test_the_method_takes_the_table(tmp_path: Path) -> None:
    """At its own areas and durations the reduction is that of the file."""
    found = read_reduction_table(table(tmp_path, WIDE), area_unit="km2", source="a study")
    reduced = areal_reduction("table").reduce(1e8, np.array([60.0, 360.0]), table=found)
    assert reduced.factor == pytest.approx(np.array([0.75, 0.9]))


def test_unit_and_source_are_needed(tmp_path: Path) -> None:
    """The unit of the areas is never guessed, and factors without a source cannot be defended."""
    with pytest.raises(JobError) as caught:
        read_reduction_table(table(tmp_path, WIDE), area_unit="sqmi", source=" ")
    assert str(caught.value).replace(f"{tmp_path}/", "").splitlines() == [
        ("factors.csv: [design.areal_reduction] area_unit: found 'sqmi'; expected one of: m2, km2, ha, ft2, acre, mi2"),
        "factors.csv: [design.areal_reduction] source: found nothing; expected where the factors of the file are from",
    ]


@pytest.mark.parametrize(
    "header", ["area,factor\n10,0.9\n", "duration,factor\n1h,0.9\n", "duration,area\n1h,10\n", "duration\n1h\n"]
)
def test_columns_that_are_missing(tmp_path: Path, header: str) -> None:
    """Neither layout: the columns that are there are named beside what is needed."""
    names = header.partition("\n")[0].replace(",", ", ")
    assert problems_of(table(tmp_path, header)) == [
        (
            f"F: the header: found {names}; expected columns area, duration and factor, or duration and a column for "
            "every area"
        )
    ]


def test_cells_that_cannot_be(tmp_path: Path) -> None:
    """Areas, durations and factors of the long layout, each with its line."""
    path = table(tmp_path, "area,duration,factor\nten,1h,0.9\n-5,1h,0.9\n10,60,95\n10,6h,0\n10,1d,\n10,2d,1.5\n")
    assert problems_of(path) == [
        (
            "F:4: column duration: a duration: found '60' without a unit; expected a number with min, h or d: 15min, "
            "1h, 2d; write the unit"
        ),
        "F:2: column area: a row: found 'ten'; expected an area, 0 or more; correct the cell",
        "F:3: column area: a row: found '-5'; expected an area, 0 or more; correct the cell",
        ("F:4: column factor: a row: found '95'; expected a factor above 0 and at most 1; write percent as fractions"),
        "F:5: column factor: a row: found '0'; expected a factor above 0 and at most 1; correct the cell",
        "F:6: column factor: a row: found nothing; expected a factor above 0 and at most 1; correct the cell",
        "F:7: column factor: a row: found '1.5'; expected a factor above 0 and at most 1; correct the cell",
    ]


def test_headings_that_are_no_areas(tmp_path: Path) -> None:
    """In the wide layout every other heading is an area."""
    assert problems_of(table(tmp_path, "duration,10 km2,100\n1h,0.9,0.8\n")) == [
        (
            "F: the header: found '10 km2'; expected columns area, duration and factor, or an area over every column "
            "but the duration's"
        )
    ]


def test_gaps_repetitions_and_factors_that_rise(tmp_path: Path) -> None:
    """A complete table is needed, every factor once, none greater over a larger area."""
    path = table(tmp_path, "area,duration,factor\n10,1h,0.9\n100,1h,0.95\n10,6h,0.96\n10,360min,0.97\n")
    assert problems_of(path) == [
        "F:5: column factor: 10 km2, 6 h: found a factor of 0.97 after one of 0.96; expected one; remove one",
        "F: 100 km2, 6 h: found no factor; expected one for every area and duration; add it",
        (
            "F: 100 km2, 1 h: found a factor of 0.95, above 0.9 of 10 km2; expected a factor that does not rise with "
            "area; correct one of them"
        ),
    ]

"""Huff's distributions against their published ordinates, and which of the two tables is taken.

Sources and how far each figure was seen in print: tests/data/published/README.md.
"""

from __future__ import annotations

import csv
import re
from pathlib import Path

import numpy as np
import pytest
from pattern_cases import pattern_case

from basinrain.designstorm.patterns import pattern
from basinrain.designstorm.patterns.huff import huff
from basinrain.errors import JobError, MethodError
from basinrain.units import area_factor

FOLDER = Path(__file__).parents[2] / "data" / "published"
MI2 = area_factor("mi2")
QUARTILES = (1, 2, 3, 4)
USUAL = {1: 360, 2: 720, 3: 1440, 4: 2880}
"""A duration in minutes for which each quartile is commonly used."""


def read(name: str, column: str) -> list[int]:
    with (FOLDER / name).open(encoding="utf-8", newline="") as file:
        return [int(row[column]) for row in csv.DictReader(file)]


@pytest.mark.parametrize("quartile", QUARTILES)
@pytest.mark.parametrize(
    ("area", "file"), [(5 * MI2, "huff_point_median.csv"), (200 * MI2, "huff_area_median_from_memory.csv")]
)
def test_every_twentieth_of_the_duration_has_the_published_percentage(quartile: int, area: float, file: str) -> None:
    """Huff and Angel (1992) for a point, from memory for 50 to 400 mi²: 21 whole percentages of 100 mm."""
    depth = huff(pattern_case(1200, 60, total=100, area=area), quartile=quartile).depth
    np.testing.assert_allclose(np.cumsum(depth), read(file, f"Q{quartile}")[1:], rtol=0, atol=1e-10)


@pytest.mark.parametrize(
    ("quartile", "quarters"), [(1, [60, 22, 10, 8]), (2, [22, 48, 21, 9]), (3, [15, 23, 47, 15]), (4, [13, 15, 23, 49])]
)
def test_quarters_of_a_point_storm(quartile: int, quarters: list[int]) -> None:
    """Quarters of 100 mm by the point medians: 60/22/10/8, 22/48/21/9, 15/23/47/15, 13/15/23/49."""
    depth = huff(pattern_case(USUAL[quartile], USUAL[quartile] // 4, total=100), quartile=quartile).depth
    np.testing.assert_allclose(depth, quarters, rtol=0, atol=1e-10)


@pytest.mark.parametrize("basis", ["point", "area"])
@pytest.mark.parametrize("quartile", QUARTILES)
def test_most_falls_in_the_quarter_that_names_the_quartile(quartile: int, basis: str) -> None:
    """That is what a quartile is, in both tables."""
    depth = huff(pattern_case(1440, 360), quartile=quartile, basis=basis).depth
    assert int(depth.argmax()) == quartile - 1


@pytest.mark.parametrize("quartile", QUARTILES)
def test_the_area_chooses_the_table(quartile: int) -> None:
    """To 10 mi² it is the point's, from 50 to 400 mi² the area's, both limits included, in mi² or in km²."""

    def taken(area: float, basis: str | None = None) -> list[float]:
        shaped = huff(pattern_case(1440, 72, area=area), quartile=quartile, basis=basis)
        return [float(depth) for depth in shaped.depth]

    point, areal = taken(5 * MI2, "point"), taken(200 * MI2, "area")
    assert point != areal
    for area in (1.0, 10 * MI2, 10 * 2.589988110336 * 1e6):
        assert taken(area) == point
    for area in (50 * MI2, 50 * 2.589988110336 * 1e6, 400 * MI2, 400 * 2.589988110336 * 1e6):
        assert taken(area) == areal


@pytest.mark.parametrize("area", [10.1, 30, 49.9, 401])
def test_an_area_in_neither_table_must_state_which(area: float) -> None:
    """Between 10 and 50 mi² and above 400 it is refused, and goes with either table when that is stated."""
    case = pattern_case(1440, 72, area=area * MI2)
    said = (
        f"pattern huff-3: found an area of {area:g} mi² ({area * MI2 / 1e6:.6g} km²); expected up to 10 mi² (25.9 km²)"
    )
    with pytest.raises(MethodError, match="^" + re.escape(said) + '.*state basis = "point" or "area"$'):
        huff(case, quartile=3)
    for basis, words in (("point", "up to 10 mi² (25.9 km²)"), ("area", "50 to 400 mi² (129.5 to 1036 km²)")):
        remarks = huff(case, quartile=3, basis=basis).remarks
        assert remarks[-1] == (
            f"The Huff quartile 3 distribution used is published for areas of {words}; the area here is {area:g} mi² "
            f"({area * MI2 / 1e6:.6g} km²)."
        )


def test_a_table_stated_for_its_own_area_has_no_remark_on_it() -> None:
    """The point's at 5 mi² says nothing; the area's at 5 mi² says where it comes from, and that it is out of range."""
    assert huff(pattern_case(1440, 72), quartile=3, basis="point").remarks == ()
    remarks = huff(pattern_case(1440, 72, area=5 * MI2), quartile=3, basis="area").remarks
    assert [remark.split(";")[0] for remark in remarks] == [
        "The Huff quartile 3 distribution of 50 to 400 mi² is from memory",
        "The Huff quartile 3 distribution used is published for areas of 50 to 400 mi² (129.5 to 1036 km²)",
    ]


def test_every_result_of_the_table_from_memory_says_so() -> None:
    """Within its range too."""
    remarks = huff(pattern_case(1440, 72, area=100 * MI2), quartile=3).remarks
    assert remarks == (
        "The Huff quartile 3 distribution of 50 to 400 mi² is from memory; check it against the source.",
    )
    assert "from memory" in pattern("huff-3").evidence


@pytest.mark.parametrize(
    ("minutes", "usual"), [(60, 1), (360, 1), (380, 2), (720, 2), (740, 3), (1440, 3), (1460, 4), (5760, 4)]
)
def test_a_duration_that_another_quartile_is_used_for_is_told(minutes: int, usual: int) -> None:
    """To 6 h the first, to 12 h the second, to 24 h the third, above that the fourth: common practice (Bulletin 75)."""
    case = pattern_case(minutes, minutes // 20)
    assert huff(case, quartile=usual).remarks == ()
    for quartile in set(QUARTILES) - {usual}:
        (remark,) = huff(case, quartile=quartile).remarks
        assert f"is commonly given Huff quartile {usual}, not {quartile} (" in remark


def test_steps_between_two_ordinates_are_told() -> None:
    """Ordinates of 24 h are 72 min apart; steps of 24 min come in equal threes with a remark."""
    shaped = huff(pattern_case(1440, 24), quartile=3)
    threes = shaped.depth.reshape(-1, 3)
    np.testing.assert_allclose(threes, threes[:, :1].repeat(3, axis=1), rtol=0, atol=1e-12)
    (remark,) = shaped.remarks
    assert remark == (
        "The ordinates of Huff quartile 3 are 72 minutes apart, so that steps of 24 min between two of them get equal "
        "depths."
    )


def test_what_cannot_be_is_refused() -> None:
    """An unknown basis; area and step at fault in one error."""
    with pytest.raises(
        JobError, match=re.escape("[[design.pattern]] basis: found 'pont'; expected one of: point, area")
    ):
        huff(pattern_case(), quartile=1, basis="pont")
    with pytest.raises(MethodError, match="an area of 20 mi²") as caught:
        huff(pattern_case(360, 7, area=20 * MI2), quartile=1)
    assert {problem.item for problem in caught.value.problems} == {"pattern huff-1", "[design] step"}

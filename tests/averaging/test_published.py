"""Published worked examples: Thiessen polygons, area-weighted sums, isohyetal and arithmetic means.

Sources and how far each figure was seen in print: tests/data/published/README.md.
"""

from __future__ import annotations

import csv
from fractions import Fraction
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import KM, basins_of, gauges_at

from basinrain.averaging import arithmetic_weights, thiessen_cells, thiessen_pieces, thiessen_weights
from basinrain.gauges import GaugeNetwork
from basinrain.weights import WeightTable

FOLDER = Path(__file__).parents[1] / "data" / "published"
Array = npt.NDArray[np.float64]


def read(name: str) -> dict[str, dict[str, str]]:
    with (FOLDER / name).open(encoding="utf-8", newline="") as file:
        return {row["case"]: row for row in csv.DictReader(file)}


GEOMETRY = read("thiessen_geometry_cases.csv")
AREAS = read("thiessen_area_cases.csv")
ISOHYETS = read("isohyetal_cases.csv")


def numbers(text: str) -> Array:
    return np.array([float(Fraction(part)) for part in text.split(";")])


def network_of(row: dict[str, str], unit: float = KM) -> GaugeNetwork:
    places = row["gauges_xy"].split(" (")[0].split(";")
    return gauges_at(*((float(x), float(y)) for x, y in (place.split(",") for place in places)), unit=unit)


def circle() -> shapely.Geometry:
    """Return the catchment of radius 50 about (100, 100), drawn with 20,000 sides: its area is short by 1.6e-8."""
    turn = np.arange(20_000) * 2 * np.pi / 20_000
    return shapely.Polygon(100.0 + 50.0 * np.column_stack((np.cos(turn), np.sin(turn))))


def mean(weights: Array, values: Array) -> float:
    """Return one basin's mean as the package takes it: through a weight table."""
    gauges = tuple(str(k) for k in range(len(values)))
    return float(WeightTable("given", ("all",), gauges, weights[None, :]).apply(values)[0])


@pytest.mark.parametrize("case", ["subramanya_circle_4", "subramanya_circle_5"])
def test_circular_catchment_against_its_closed_form(case: str) -> None:
    """Subramanya, Engineering Hydrology, ex. 2.6: areas and mean to 1e-6; station 1, outside, holds 9.634 km²."""
    row = GEOMETRY[case]
    pieces = thiessen_pieces(network_of(row), basins_of(KM, catchment=circle()))
    np.testing.assert_allclose(pieces.area / KM**2, numbers(row["exact_areas"]), rtol=1e-6)
    table = thiessen_weights(network_of(row), basins_of(KM, catchment=circle()))
    assert table.apply(numbers(row["values"]))[0] == pytest.approx(float(row["exact_mean"]), rel=1e-6)


def test_the_closed_form_of_the_circle() -> None:
    """The exact areas in the table are those of sectors and segments: a quarter circle, a cap, and what is left."""
    r = 50.0
    x = (-13.125 + np.sqrt(13.125**2 + 4 * 1.5625 * (r**2 - 8.75**2))) / 3.125
    third = r**2 * np.arctan2(x, 8.75 + 0.75 * x) - 8.75 * x
    fifth = np.pi * r**2 / 4
    second = fourth = (np.pi * r**2 - third - fifth) / 2
    d = 110 / np.sqrt(5)
    first = r**2 * np.arccos(d / r) - d * np.sqrt(r**2 - d**2)
    four = numbers(GEOMETRY["subramanya_circle_4"]["exact_areas"])
    five = numbers(GEOMETRY["subramanya_circle_5"]["exact_areas"])
    np.testing.assert_allclose(four, [second, third, fourth, fifth], atol=5e-7)
    np.testing.assert_allclose(five, [first, second - first, third, fourth, fifth], atol=5e-7)
    assert first == pytest.approx(9.633749, abs=5e-7)


def test_circular_catchment_against_the_printed_areas() -> None:
    """The book measured its areas on a drawing: 2141, 1609, 2141, 1963 km² to 3 %, its mean of 121.84 cm to 0.3 cm."""
    row = GEOMETRY["subramanya_circle_4"]
    printed_areas, printed_mean = row["published"].removeprefix("areas ").split(" -> ")
    pieces = thiessen_pieces(network_of(row), basins_of(KM, catchment=circle()))
    np.testing.assert_allclose(numbers(printed_areas), pieces.area / KM**2, rtol=0.03)
    table = thiessen_weights(network_of(row), basins_of(KM, catchment=circle()))
    assert table.apply(numbers(row["values"]))[0] == pytest.approx(float(printed_mean), abs=0.3)


def test_arithmetic_mean_of_the_circular_catchment() -> None:
    """All five gauges have 112.82 cm, the four inside 119.775 cm (derived from the same data)."""
    row = GEOMETRY["subramanya_circle_5"]
    catchment = basins_of(KM, catchment=circle())
    inside = arithmetic_weights(network_of(row), catchment)
    everyone = arithmetic_weights(network_of(row), catchment, gauges="all")
    assert inside.apply(numbers(row["values"]))[0] == pytest.approx(119.775, abs=1e-9)
    assert everyone.apply(numbers(row["values"]))[0] == pytest.approx(112.82, abs=1e-9)


def test_rectangle_with_triple_points() -> None:
    """Chow, Maidment & Mays 1988, problem 3.4.4: areas as exact fractions to 1e-9, the printed corners to .005."""
    row = GEOMETRY["chow_3_4_4_rectangle"]
    rectangle = basins_of(rectangle=shapely.box(0, 0, 14, 13))
    network = network_of(row, unit=1.0)
    pieces = thiessen_pieces(network, rectangle)
    np.testing.assert_allclose(pieces.area, numbers(row["exact_areas"]), rtol=1e-9)
    table = thiessen_weights(network, rectangle)
    assert table.apply(numbers(row["values"]))[0] == pytest.approx(float(row["exact_mean"]), rel=1e-9)
    assert arithmetic_weights(network, rectangle).apply(numbers(row["values"]))[0] == pytest.approx(1.0025, abs=1e-9)
    corners = np.unique(shapely.get_coordinates(thiessen_cells(network)).round(9), axis=0)
    for point in ((5.87, 6.57), (8.65, 6.26)):
        assert np.abs(corners - point).max(axis=1).min() < 0.005
    third = shapely.get_coordinates(pieces.polygon[2])
    printed = np.array([(10, 13), (14, 13), (14, 2.25), (8.65, 6.26)])
    assert len(third) == 5
    assert max(np.abs(third - point).max(axis=1).min() for point in printed) < 0.005


@pytest.mark.parametrize(
    ("case", "printed", "tolerance"), [("chow_1988_fig3_4_3", 31.1, 0.05), ("linsley_1982", 2.84, 0.02)]
)
def test_area_weighted_sums(case: str, printed: float, tolerance: float) -> None:
    """Chow et al. 1988, fig. 3.4.3, and Linsley, Kohler & Paulhus (from memory; every product rounded in print)."""
    row = AREAS[case]
    areas, values = numbers(row["areas"]), numbers(row["values"])
    assert row["published"].startswith(str(printed))
    assert mean(areas / areas.sum(), values) == pytest.approx(float(row["mean"]), abs=5e-7)
    assert mean(areas / areas.sum(), values) == pytest.approx(printed, abs=tolerance)


@pytest.mark.parametrize(
    ("case", "inside", "printed", "tolerance"),
    [("chow_1988_fig3_4_3", [1, 2, 3, 4], 35.0, 1e-9), ("linsley_1982", [1, 2, 3, 5, 6, 7], 3.09, 0.005)],
)
def test_arithmetic_means_of_the_same_basins(case: str, inside: list[int], printed: float, tolerance: float) -> None:
    """The same examples' arithmetic means over the gauges inside: 35.0 of four, 3.09 of six (from memory)."""
    values = numbers(AREAS[case]["values"])
    weights = np.zeros(len(values))
    weights[inside] = 1 / len(inside)
    assert mean(weights, values) == pytest.approx(printed, abs=tolerance)


@pytest.mark.parametrize(
    ("case", "printed", "tolerance"),
    [("subramanya_isohyetal", 8.84, 0.005), ("chow_isohyetal", 27.9, 0.05), ("punmia_4_5_isohyetal", 69.7, 0.05)],
)
def test_isohyetal_means(case: str, printed: float, tolerance: float) -> None:
    """Depth between isohyets times the area between them: Subramanya, Chow et al. (from memory) and Punmia, ex. 4.5."""
    row = ISOHYETS[case]
    kind, depths = row["isohyet_bounds_or_means"].split(" ")
    values = numbers(depths) if kind == "means" else (numbers(depths)[1:] + numbers(depths)[:-1]) / 2
    areas = numbers(row["areas"])
    assert row["published"].startswith(str(printed))
    assert mean(areas / areas.sum(), values) == pytest.approx(float(row["mean"]), abs=5e-7)
    assert mean(areas / areas.sum(), values) == pytest.approx(printed, abs=tolerance)


@pytest.mark.parametrize(
    ("case", "printed", "tolerance"), [("punmia_4_5_arith", 70.3, 0.05), ("dingman_9_gauges", 74.67, 0.01)]
)
def test_arithmetic_means(case: str, printed: float, tolerance: float) -> None:
    """Punmia, ex. 4.5, nine gauges; Dingman, the six inside (the printed 59.56 of all nine is no mean of them)."""
    row = ISOHYETS[case]
    values = numbers(row["isohyet_bounds_or_means"].removeprefix("inside: ").split(" ")[0])
    assert mean(np.full(len(values), 1 / len(values)), values) == pytest.approx(float(row["mean"]), abs=5e-7)
    assert mean(np.full(len(values), 1 / len(values)), values) == pytest.approx(printed, abs=tolerance)

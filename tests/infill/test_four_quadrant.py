"""Four quadrants."""

from __future__ import annotations

import numpy as np
import pyproj
import pytest

from basinrain.gauges import GaugeNetwork
from basinrain.infill import four_quadrant_weights
from basinrain.infill.four_quadrant import quadrants_from

# Around T in km: two gauges north-east (A nearer), one south-east, two south-west (D and E tie), none north-west.
PLACES = {"T": (0, 0), "A": (1, 1), "B": (2, 2), "C": (2, -2), "E": (-1, -3), "D": (-3, -1)}
NETWORK = GaugeNetwork(
    ids=tuple(PLACES),
    x=np.array([x for x, _ in PLACES.values()]) * 1e3,
    y=np.array([y for _, y in PLACES.values()]) * 1e3,
    crs="local",
)


def weights(*silent: str, **options: float) -> dict[str, float]:
    reporting = np.array([gauge not in silent for gauge in NETWORK.ids])
    found = four_quadrant_weights(NETWORK, 0, reporting, **options)  # type: ignore[arg-type]
    return {gauge: float(w) for gauge, w in zip(NETWORK.ids, found, strict=True) if w}


def test_one_gauge_of_each_quadrant() -> None:
    """Squared distances A 2, C 8, D 10 km² (E ties with D, whose id comes first): 1/2 : 1/8 : 1/10 = 20 : 5 : 4."""
    assert weights() == pytest.approx({"A": 20 / 29, "C": 5 / 29, "D": 4 / 29})


def test_the_next_of_the_quadrant_steps_in() -> None:
    """With A silent B, 8 km² away, speaks for the north-east: 5 : 5 : 4; with D silent E does."""
    assert weights("A") == pytest.approx({"B": 5 / 14, "C": 5 / 14, "D": 4 / 14})
    assert weights("D") == pytest.approx({"A": 20 / 29, "C": 5 / 29, "E": 4 / 29})


def test_an_empty_quadrant_stays_empty() -> None:
    """B does not stand in for the silent C: 1/2 : 1/10 = 5 : 1."""
    assert weights("C") == pytest.approx({"A": 5 / 6, "D": 1 / 6})


def test_min_donors_counts_quadrants() -> None:
    """A and B report in one quadrant: too few by default; three quadrants are not four."""
    assert weights("C", "D", "E") == {}
    assert weights("C", "D", "E", min_donors=1) == {"A": 1.0}
    assert weights(min_donors=4) == {}


def test_radius() -> None:
    """Within 3 km are A, B and C: 1/2 : 1/8."""
    assert weights(radius=3e3) == pytest.approx({"A": 0.8, "C": 0.2})


@pytest.mark.parametrize("turn", range(4))
def test_a_quadrant_holds_its_first_edge_clockwise(turn: int) -> None:
    """Due north is north-east, and a hair to the west of it is north-west; likewise at every quarter."""
    x, y = np.array([0.0, 0.0, -1.0, 1.0]), np.array([0.0, 1e6, 1e6, 1e6])
    for _ in range(turn):
        x, y = y, -x
    network = GaugeNetwork(ids=("T", "on", "before", "after"), x=x, y=y, crs="local")
    assert quadrants_from(network, 0)[1:].tolist() == [turn, (turn - 1) % 4, turn]


@pytest.mark.parametrize("off", [-1e-10, 0.0, 1e-10])
@pytest.mark.parametrize(("east", "north", "quadrant"), [(0, 5e3, 0), (5e3, 0, 1), (0, -5e3, 2), (-5e3, 0, 3)])
def test_rounding_does_not_move_a_gauge_off_the_axis(east: float, north: float, quadrant: int, off: float) -> None:
    """A ten-thousandth of a micrometre beside the axis, as it comes from coordinates far from the origin, is on it."""
    network = GaugeNetwork(
        ids=("T", "G"),
        x=np.array([0.0, east + off * (north != 0)]),
        y=np.array([0.0, north + off * (east != 0)]),
        crs="local",
    )
    assert quadrants_from(network, 0)[1] == quadrant


def test_on_the_map_quadrants_go_by_the_geodesic() -> None:
    """On one parallel of the north the other gauge lies a little north of east: north-east, though due east is not."""
    network = GaugeNetwork(
        ids=("T", "E", "N", "W"),
        x=np.array([9.0, 9.5, 9.0, 8.5]),
        y=np.array([60.0, 60.0, 60.2, 60.0]),
        crs="EPSG:4326",
    )
    assert 89 < pyproj.Geod(ellps="WGS84").inv(9.0, 60.0, 9.5, 60.0)[0] < 90
    assert quadrants_from(network, 0)[1:].tolist() == [0, 0, 3]


def test_many_cases_at_once() -> None:
    """A table of cases gives what each gives by itself."""
    cases = np.random.default_rng(3).random((3, 40, 6)) < 0.6
    found = four_quadrant_weights(NETWORK, 0, cases)
    assert found.shape == cases.shape
    for index in np.ndindex(3, 40):
        assert np.array_equal(found[index], four_quadrant_weights(NETWORK, 0, cases[index]))

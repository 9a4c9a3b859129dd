"""The arithmetic mean: which gauges take part."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from drawn import KM, basins_of, gauges_at

from basinrain.averaging import arithmetic_weights
from basinrain.errors import DataError, JobError

SQUARE = shapely.box(0, 0, 10, 10)


def test_gauges_inside_count_the_same() -> None:
    """Two of three gauges are inside: (10 + 30) / 2 = 20 mm."""
    table = arithmetic_weights(gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM), basins_of(KM, square=SQUARE))
    assert table.weights.tolist() == [[0.5, 0.5, 0.0]]
    assert table.apply(np.array([10.0, 30.0, np.nan])).tolist() == [20.0]


def test_the_boundary_is_inside_to_a_millimetre() -> None:
    """On a side, on a corner and 0.9 mm outside is inside; 1.1 mm outside is not."""
    network = gauges_at((0, 5), (10, 10), (5, -0.0009), (5, 10.0011))
    assert arithmetic_weights(network, basins_of(square=SQUARE)).weights[0, :3] == pytest.approx(1 / 3)
    assert arithmetic_weights(network, basins_of(square=SQUARE)).weights[0, 3] == 0.0


def test_a_gauge_in_a_hole_is_outside() -> None:
    """A gauge in the hole of a basin does not count for it, but for the basin that fills the hole."""
    hole = shapely.box(4, 4, 6, 6)
    weights = arithmetic_weights(gauges_at((1, 1), (5, 5)), basins_of(ring=SQUARE - hole, pond=hole)).weights
    assert weights.tolist() == [[1.0, 0.0], [0.0, 1.0]]


def test_all_gauges() -> None:
    """With "all", gauges count wherever they stand, the present ones only."""
    network = gauges_at((2.5, 5), (7.5, 5), (900, 5))
    table = arithmetic_weights(network, basins_of(square=SQUARE), [True, False, True], gauges="all")
    assert table.weights.tolist() == [[0.5, 0.0, 0.5]]


def test_gauges_within_a_buffer() -> None:
    """A buffer of 1 m takes the gauge at exactly 1 m, also round a corner, and none at 1.1 m."""
    network = gauges_at((11, 5), (10 + 0.6, 10 + 0.8), (-1.1, 5))
    table = arithmetic_weights(network, basins_of(square=SQUARE), gauges={"buffer": 1.0})
    assert table.weights.tolist() == [[0.5, 0.5, 0.0]]


def test_none_inside_is_no_number() -> None:
    """Where no present gauge is inside there is no number, and nothing counts as covered; other basins are answered."""
    basins = basins_of(here=SQUARE, there=shapely.box(20, 0, 30, 10))
    table = arithmetic_weights(gauges_at((5, 5), (25, 5)), basins, [True, False])
    np.testing.assert_array_equal(table.weights, [[1.0, 0.0], [np.nan, np.nan]])
    assert table.covered.tolist() == [1.0, 0.0]
    assert table.answered.tolist() == [True, False]


@pytest.mark.parametrize(
    ("gauges", "message"),
    [
        ("insde", "found 'insde'; expected 'inside', 'all' or { buffer = length }; did you mean 'inside'"),
        ({"buffer": -1.0}, "found {'buffer': -1.0}; .*give the buffer as a length of 0 or more"),
        ({"buffer": True}, "give the buffer as a length of 0 or more"),
        ({"bufer": 1.0}, "found {'bufer': 1.0}; .*correct gauges"),
    ],
)
def test_other_choices_are_refused(gauges: object, message: str) -> None:
    """What is neither inside, all nor a buffer is refused with what would be accepted."""
    with pytest.raises(JobError, match=message):
        arithmetic_weights(gauges_at((5, 5)), basins_of(square=SQUARE), gauges=gauges)  # type: ignore[arg-type]


def test_planes_must_agree() -> None:
    """Gauges and basins in two systems are refused."""
    network = gauges_at((5, 5)).subset([True])
    basins = basins_of(square=SQUARE)
    elsewhere = type(basins)(ids=basins.ids, polygons=basins.polygons, crs="EPSG:3035")
    with pytest.raises(DataError, match="found 'local' for the gauges and 'EPSG:3035' for the basins"):
        arithmetic_weights(network, elsewhere)

"""What every averaging method asks for: one plane, a mask of the right length, areas that add up."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from drawn import KM, basins_of, gauges_at

from basinrain.averaging.inputs import presence, require_one_plane, union_is_sum
from basinrain.basins import Basins
from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork

SQUARE = shapely.box(0, 0, 10, 10)


def in_systems(gauges: str, basins: str) -> tuple[GaugeNetwork, Basins]:
    return GaugeNetwork(ids=("A",), x=np.array([5.0]), y=np.array([5.0]), crs=gauges), Basins(
        ids=("square",), polygons=np.array([SQUARE]), crs=basins
    )


@pytest.mark.parametrize("crs", ["local", "EPSG:3035", "EPSG:32633"])
def test_one_plane_is_accepted(crs: str) -> None:
    """Gauges and basins in one plane, local or on the map, pass without a word; the same pair apart does not."""
    require_one_plane(*in_systems(crs, crs))
    with pytest.raises(DataError, match="expected the same plane for both"):
        require_one_plane(*in_systems(crs, "EPSG:3857"))


@pytest.mark.parametrize(
    ("gauges", "basins", "message"),
    [
        ("local", "EPSG:3035", "found 'local' for the gauges and 'EPSG:3035' for the basins; .*one plane with to_crs"),
        ("EPSG:4326", "EPSG:3035", "found 'EPSG:4326' for the gauges and 'EPSG:3035' for the basins"),
        ("EPSG:4326", "EPSG:4326", "found 'EPSG:4326', which is in degrees; expected a plane, in metres"),
    ],
)
def test_two_systems_or_degrees_are_refused(gauges: str, basins: str, message: str) -> None:
    """Both systems are shown, and what to do; areas in degrees are no areas."""
    with pytest.raises(DataError, match=message):
        require_one_plane(*in_systems(gauges, basins))


def test_all_gauges_are_present_where_none_is_named() -> None:
    """No mask is all; a list or an array of truths is that mask."""
    network = gauges_at((1, 1), (2, 2), (3, 3))
    assert presence(network, None).tolist() == [True, True, True]
    for given in ([True, False, True], np.array([1, 0, 1])):
        mask = presence(network, given)
        assert (mask.dtype, mask.tolist()) == (np.dtype(bool), [True, False, True])


@pytest.mark.parametrize("given", [[True], [True] * 4, np.ones((1, 3), dtype=bool)])
def test_a_mask_of_another_length_is_refused(given: list[bool]) -> None:
    """One value a gauge, neither fewer nor more nor in rows."""
    with pytest.raises(DataError, match=r"found a mask of shape .*; expected \(3,\), one value a gauge"):
        presence(gauges_at((1, 1), (2, 2), (3, 3)), given)


def test_areas_add_up_where_basins_lie_side_by_side() -> None:
    """Two halves of a square and two apart add up to their union, in metres and in kilometres."""
    for unit in (1.0, KM):
        halves = basins_of(unit, west=shapely.box(0, 0, 5, 10), east=shapely.box(5, 0, 10, 10))
        apart = basins_of(unit, west=SQUARE, far=shapely.box(50, 0, 60, 10))
        assert union_is_sum(halves.with_union())
        assert union_is_sum(apart.with_union())


def test_areas_do_not_add_up_where_basins_overlap() -> None:
    """Nested basins, and basins that share a strip of a hundred-thousandth of their width, count some ground twice."""
    assert not union_is_sum(basins_of(whole=SQUARE, part=shapely.box(0, 0, 5, 5)).with_union())
    lapped = basins_of(west=shapely.box(0, 0, 5.0001, 10), east=shapely.box(5, 0, 10, 10))
    assert not union_is_sum(lapped.with_union())


def test_without_a_row_for_the_union_there_is_nothing_to_add_up() -> None:
    """Basins without that row, one basin alone, and a basin that only bears its name are not a sum."""
    assert not union_is_sum(basins_of(west=shapely.box(0, 0, 5, 10), east=shapely.box(5, 0, 10, 10)))
    assert not union_is_sum(basins_of(west=SQUARE).with_union())
    assert not union_is_sum(basins_of(union=SQUARE))

"""Basins as values: areas, union, and what is refused."""

from dataclasses import replace

import numpy as np
import pytest
import shapely
import strategies
from hypothesis import given
from hypothesis import strategies as st

from basinrain.basins import UNION, Basins
from basinrain.errors import DataError

WEST, EAST = shapely.box(0, 0, 5, 10), shapely.box(5, 0, 10, 10)


def basins(*polygons: shapely.Geometry | None, ids: str = "abcdefgh", crs: str = "local") -> Basins:
    """Return basins a, b ..."""
    return Basins(ids=tuple(ids[: len(polygons)]), polygons=np.array(polygons, dtype=object), crs=crs)


def test_areas_and_union_of_two_halves() -> None:
    """Two halves of 50 make a union of 100 within the box of both."""
    both = basins(WEST, EAST)
    assert both.areas.tolist() == [50, 50]
    assert both.union.equals(shapely.box(0, 0, 10, 10))
    np.testing.assert_array_equal(both.bounds, (0, 0, 10, 10))
    assert np.isnan(both.official_areas).all()


def test_overlaps_count_once_in_the_union() -> None:
    """Nested and overlapping basins keep their own areas; the union has each place once."""
    nested = basins(shapely.box(0, 0, 10, 10), shapely.box(2, 2, 4, 4), shapely.box(8, 0, 12, 10)).with_union()
    assert nested.areas.tolist() == [100, 4, 40, 120]


def test_the_union_is_one_more_row() -> None:
    """The row of the union comes last, has no official area, and is added once."""
    rows = replace(basins(WEST, EAST), official_areas=np.array([49.0, 51.0])).with_union()
    assert rows.ids == ("a", "b", UNION)
    np.testing.assert_array_equal(rows.official_areas, [49, 51, np.nan])
    assert rows.with_union() is rows


def test_a_basin_alone_is_its_own_union() -> None:
    """One basin gets no second row."""
    alone = basins(WEST)
    assert alone.with_union() is alone


@given(strategies.divided_basins())
def test_adjoining_basins_add_up(parts: Basins) -> None:
    """The union of adjoining basins has the sum of their areas."""
    whole = parts.with_union() if len(parts) > 1 else parts
    np.testing.assert_allclose(whole.areas[-1], parts.areas.sum(), rtol=1e-9)


@given(st.floats(-100, 100), st.floats(-80, 70))
def test_areas_are_those_of_the_ground(lon: float, lat: float) -> None:
    """On an equal-area plane, two halves of a box of degrees add up to the box, wherever it is."""
    halves = shapely.box(lon, lat, lon + 0.5, lat + 1), shapely.box(lon + 0.5, lat, lon + 1, lat + 1)
    moved = basins(*halves, crs="EPSG:4326").to_crs("EPSG:6933")
    whole = basins(shapely.box(lon, lat, lon + 1, lat + 1), crs="EPSG:4326").to_crs("EPSG:6933")
    assert moved.crs == "EPSG:6933"
    np.testing.assert_allclose(moved.areas.sum(), whole.areas[0], rtol=1e-9)
    np.testing.assert_allclose(moved.areas[0], moved.areas[1], rtol=1e-9)


def test_the_same_system_keeps_the_polygons() -> None:
    """Nothing is reprojected into the system that the polygons are in."""
    there = basins(WEST, crs="EPSG:5070").to_crs("epsg:5070")
    assert there.polygons[0] is WEST


def test_all_that_is_wrong_is_told_together() -> None:
    """Repeated ids, nothing, emptiness, a line's width and a bow-tie are named in one error."""
    bow_tie = shapely.Polygon([(0, 0), (4, 4), (4, 0), (0, 8)])
    with pytest.raises(
        DataError,
        match=r"^basin a: found the id twice; expected each id once\n"
        r"basin b: found a polygon that encloses no area; expected a polygon with an area; correct or remove it\n"
        r"basin c: found a polygon that encloses no area; expected a polygon with an area; correct or remove it\n"
        r"basin d: found a polygon that encloses no area; expected a polygon with an area; correct or remove it\n"
        r"basin e: found Self-intersection\[.*\]; expected a polygon that does not cross itself; correct it$",
    ):
        basins(
            WEST,
            EAST,
            None,
            shapely.Polygon(),
            shapely.Polygon([(0, 0), (1, 1), (2, 2)]),
            bow_tie,
            ids="aabcde",
        )


def test_one_polygon_a_basin() -> None:
    """Arrays of another length are refused."""
    with pytest.raises(
        DataError,
        match=r"^polygons: found 1 values; expected 2, one a basin\n"
        r"official_areas: found 1 values; expected 2, one a basin$",
    ):
        replace(basins(WEST), ids=("a", "b"))
    with pytest.raises(DataError, match=r"^official_areas: found 2 values; expected 1, one a basin$"):
        replace(basins(WEST), official_areas=np.array([1.0, 2.0]))

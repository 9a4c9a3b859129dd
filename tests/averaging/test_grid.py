"""The grid of a run: where it lies, and what it holds."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from drawn import KM, basins_of
from hypothesis import given, settings
from strategies import any_basins

from basinrain.averaging import grid as grids
from basinrain.averaging import make_grid
from basinrain.basins import Basins
from basinrain.errors import JobError, MethodError


def test_cells_are_laid_from_the_south_west_corner_of_all_basins() -> None:
    """The first corner is that of the common box; centres go row by row, northward; cells in no basin are left out."""
    grid = make_grid(basins_of(KM, low=shapely.box(3, 1, 5, 2), high=shapely.box(1, 2, 3, 4)), 1000.0)
    assert grid.origin == (1000.0, 1000.0)
    assert (grid.centres / KM).tolist() == [[3.5, 1.5], [4.5, 1.5], [1.5, 2.5], [2.5, 2.5], [1.5, 3.5], [2.5, 3.5]]
    assert grid.shares.toarray().tolist() == [[1, 1, 0, 0, 0, 0], [0, 0, 1, 1, 1, 1]]


def test_the_union_of_basins_apart_is_the_sum_of_their_rows() -> None:
    """Two basins that share a cell: the union's share of it is the sum of theirs."""
    halves = basins_of(west=shapely.box(0, 0, 1.5, 1), east=shapely.box(1.5, 0, 3, 1)).with_union()
    np.testing.assert_allclose(
        make_grid(halves, 1.0).shares.toarray(), [[1.0, 0.5, 0.0], [0.0, 0.5, 1.0], [1.0, 1.0, 1.0]]
    )


def test_the_union_of_overlapping_basins_is_cut_by_itself() -> None:
    """Two boxes that overlap in a quarter of a cell: the union counts that quarter once."""
    lapped = basins_of(low=shapely.box(0, 0, 1.25, 1), high=shapely.box(1, 0, 2, 1)).with_union()
    np.testing.assert_allclose(make_grid(lapped, 1.0).shares.toarray(), [[1.0, 0.25], [0.0, 1.0], [1.0, 1.0]])


@settings(max_examples=60, deadline=None)
@given(basins=any_basins())
def test_cells_hold_the_basins_areas(basins: Basins) -> None:
    """Shares times the cell's area sum to every basin's area, to 1e-9."""
    grid = make_grid(basins, 431.0)
    np.testing.assert_allclose(grid.shares.sum(axis=1) * 431.0**2, basins.areas, rtol=1e-9)
    assert grid.shares.data.min() > 0
    assert grid.shares.data.max() <= 1 + 1e-12


def test_a_cell_larger_than_everything() -> None:
    """A cell of 100 km over a basin of 1 km² is one cell that is a ten-thousandth inside."""
    grid = make_grid(basins_of(KM, small=shapely.box(0, 0, 1, 1)), 100 * KM)
    assert grid.n_cells == 1
    assert grid.shares.toarray() == pytest.approx(1e-4)


def test_the_median_area_leaves_the_union_out() -> None:
    """Of 1, 2 and 10 km² the median is 2, with and without their union of 13; a basin alone is its own."""
    three = basins_of(KM, a=shapely.box(0, 0, 1, 1), b=shapely.box(1, 0, 3, 1), c=shapely.box(3, 0, 13, 1))
    assert [grids.median_area(b) for b in (three, three.with_union())] == [2e6, 2e6]
    assert grids.median_area(basins_of(KM, a=shapely.box(0, 0, 1, 1))) == 1e6


def test_no_length_and_too_many_cells_are_refused() -> None:
    """A cell must be a length above 0; over 2,000,000 cells are refused before or after they are counted."""
    square = basins_of(KM, square=shapely.box(0, 0, 10, 10))
    for cell in (0.0, -1.0, float("inf")):
        with pytest.raises(JobError, match=r"idw cell: found .*; expected a length above 0; correct cell"):
            make_grid(square, cell)
    with pytest.raises(
        MethodError, match="idw grid of 2 m: found at least 25,000,000 cells; expected at most 2,000,000"
    ):
        make_grid(square, 2.0)
    two = basins_of(KM, one=shapely.box(0, 0, 10, 10), other=shapely.box(10, 0, 20, 10))
    with pytest.raises(MethodError, match=r"idw grid of 8 m: found over 2,000,000 cells; .*; give a larger cell"):
        make_grid(two, 8.0)

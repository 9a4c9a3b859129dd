"""Exact shares of grid cells, beside the intersection of every cell with the polygon."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from strategies import any_basins

from basinrain.averaging import coverage
from basinrain.averaging.coverage import cell_shares
from basinrain.basins import Basins
from basinrain.errors import MethodError


def dense(polygon: shapely.Geometry, origin: tuple[float, float], cell: float) -> npt.NDArray[np.float64]:
    """Return the shares as a table of rows by columns."""
    found = cell_shares(np.array([polygon], dtype=object), ("it",), origin, cell)
    table = np.zeros((int(found.row.max()) + 1, int(found.column.max()) + 1))
    table[found.row, found.column] = found.share
    return table


def test_rectangle_by_hand() -> None:
    """A box from (0.25, 0.5) to (3.5, 2.25): columns .75, 1, 1, .5 by rows .5, 1, .25."""
    np.testing.assert_allclose(
        dense(shapely.box(0.25, 0.5, 3.5, 2.25), (0.0, 0.0), 1.0),
        np.outer([0.5, 1.0, 0.25], [0.75, 1.0, 1.0, 0.5]),
        rtol=1e-12,
    )


def test_sides_on_grid_lines_touch_no_cell_beyond() -> None:
    """A box drawn along grid lines holds its own cells whole and no others, whichever way it is drawn."""
    for ccw in (True, False):
        shares = dense(shapely.box(2, 1, 5, 3, ccw=ccw), (0.0, 0.0), 1.0)
        assert shares.shape == (3, 5)
        np.testing.assert_array_equal(shares[1:, 2:], np.ones((2, 3)))
        assert shares.sum() == 6.0


def test_holes_and_parts() -> None:
    """A hole takes its share away, parts of one basin add up in a cell that both reach."""
    holed = shapely.box(0, 0, 3, 3) - shapely.box(0.5, 1, 2, 2)
    np.testing.assert_allclose(
        dense(holed, (0.0, 0.0), 1.0), [[1.0, 1.0, 1.0], [0.5, 0.0, 1.0], [1.0, 1.0, 1.0]], atol=1e-12
    )
    two = shapely.MultiPolygon([shapely.box(0, 0, 0.25, 1), shapely.box(0.75, 0, 1.5, 1)])
    np.testing.assert_allclose(dense(two, (0.0, 0.0), 1.0), [[0.5, 0.5]], rtol=1e-12)


@settings(max_examples=100, deadline=None)
@given(basins=any_basins(), cell=st.sampled_from([97.0, 250.0, 731.0, 2000.0, 30000.0]))
def test_equals_the_intersection_with_every_cell(basins: Basins, cell: float) -> None:
    """Every share is the area of cell and polygon together, by GEOS, over the cell's."""
    west, south, east, north = basins.bounds
    found = cell_shares(basins.polygons, basins.ids, (west, south), cell)
    table = np.zeros((len(basins), int((north - south) // cell) + 2, int((east - west) // cell) + 2))
    table[found.polygon, found.row, found.column] = found.share
    # Every seventh cell of a fine grid is enough to look at.
    step = 1 if table.size < 20_000 else 7
    table = table[:, ::step, ::step]
    rows, columns = np.meshgrid(np.arange(table.shape[1]) * step, np.arange(table.shape[2]) * step, indexing="ij")
    x, y = west + columns * cell, south + rows * cell
    boxes = shapely.box(x, y, x + cell, y + cell)
    for k, polygon in enumerate(basins.polygons):
        exact = shapely.area(shapely.intersection(boxes, shapely.set_precision(polygon, 0.0))) / cell**2
        np.testing.assert_allclose(table[k], exact, atol=1e-9)


def test_far_from_the_origin_of_the_plane() -> None:
    """With a false northing of 10,000 km the shares are the same."""
    triangle = shapely.Polygon([(0, 0), (7000, 1000), (2000, 9000)])
    there = shapely.transform(triangle, lambda xy: xy + np.array([5e5, 1e7]))
    np.testing.assert_allclose(dense(there, (5e5, 1e7), 500.0), dense(triangle, (0.0, 0.0), 500.0), atol=1e-9)


def test_shares_that_do_not_hold_the_area_are_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    """If boundary went missing, the basin is named: nothing wrong is passed on."""
    whole = coverage._stretches

    def torn(*args: object) -> object:
        parts = whole(*args)  # type: ignore[arg-type]
        return parts._replace(fall=parts.fall * 0.5)

    monkeypatch.setattr(coverage, "_stretches", torn)
    with pytest.raises(MethodError, match="basin it: found grid cells that hold 2 m² of it; expected its 4 m²"):
        dense(shapely.box(0, 0, 2, 2), (0.0, 0.0), 1.0)

"""Shares of basins in the cells of a raster: drawn basins, other ways to find them, and the laws they keep."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from rasterio.features import rasterize
from rasterio.transform import Affine
from shapely.geometry.base import BaseGeometry

from basinrain import ground
from basinrain.averaging.coverage import cell_shares
from basinrain.basins import Basins
from basinrain.designstorm.cell_weights import CellGrid, CellWeights, cell_weights
from basinrain.errors import DataError

PLANE = "+proj=laea +lat_0=40 +lon_0=-105 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs"


def square_grid(n_rows: int, n_columns: int, *, cell: float = 1000.0, crs: str = "local") -> CellGrid:
    return CellGrid(
        n_rows=n_rows,
        n_columns=n_columns,
        origin=(0.0, n_rows * cell),
        across=(cell, 0.0),
        down=(0.0, -cell),
        crs=crs,
    )


def basins_of(*polygons: BaseGeometry, crs: str = "local") -> Basins:
    ids = tuple("ABCDEFG"[: len(polygons)])
    return Basins(ids=ids, polygons=np.array(polygons, dtype=object), crs=crs)


def by_cell(found: CellWeights, basin: int = 0) -> dict[str, float]:
    weights = found.table.weights[basin]
    return {cell: float(weight) for cell, weight in zip(found.ids, weights, strict=True) if weight}


def star(middle: tuple[float, float], radius: float, *, n: int = 400) -> shapely.Polygon:
    angle = np.linspace(0, 2 * np.pi, n, endpoint=False)
    reach = radius * (1 + 0.3 * np.sin(5 * angle))
    return shapely.Polygon(np.column_stack([middle[0] + reach * np.cos(angle), middle[1] + reach * np.sin(angle)]))


def test_a_drawn_triangle() -> None:
    """A triangle over half of 2 x 2 cells: a whole cell of its 2 km², and half a cell twice."""
    found = cell_weights(basins_of(shapely.Polygon([(0, 0), (2000, 0), (0, 2000)])), square_grid(2, 2))
    assert by_cell(found) == pytest.approx({"row 2 column 1": 1 / 2, "row 1 column 1": 1 / 4, "row 2 column 2": 1 / 4})
    assert found.block == (slice(0, 2), slice(0, 2))


def test_a_hole_and_two_parts() -> None:
    """A basin of 3 km² around a lake of 1 km² and an island basin of 1 km² elsewhere: quarters of what is left."""
    around = shapely.box(0, 0, 2000, 2000) - shapely.box(1000, 1000, 2000, 2000)
    apart = around | shapely.box(3000, 0, 4000, 1000)
    found = cell_weights(basins_of(apart), square_grid(2, 4))
    cells = ["row 1 column 1", "row 2 column 1", "row 2 column 2", "row 2 column 4"]
    assert by_cell(found) == pytest.approx(dict.fromkeys(cells, 1 / 4))


def test_cells_that_only_touch_a_basin_have_no_share() -> None:
    """A basin that is one cell has that cell alone, not its eight neighbours; one inside a cell likewise."""
    grid = square_grid(3, 3)
    whole, inside = shapely.box(1000, 1000, 2000, 2000), shapely.box(1200, 1300, 1400, 1900)
    found = cell_weights(basins_of(whole, inside), grid)
    assert found.ids == ("row 2 column 2",)
    assert found.table.weights.tolist() == [[1.0], [1.0]]


def test_a_raster_that_stands_on_its_side() -> None:
    """Rows that run north and columns that run east are counted as the raster counts them."""
    grid = CellGrid(n_rows=2, n_columns=3, origin=(0.0, 0.0), across=(0.0, 10.0), down=(10.0, 0.0), crs="local")
    found = cell_weights(basins_of(shapely.box(10, 15, 20, 30)), grid)
    assert by_cell(found) == pytest.approx({"row 2 column 2": 1 / 3, "row 2 column 3": 2 / 3})
    assert grid.bounds == (0.0, 0.0, 20.0, 30.0)
    assert grid.centres(found.rows, found.columns).tolist() == [[15.0, 15.0], [15.0, 25.0]]


def test_a_raster_turned_by_45_degrees() -> None:
    """Around the corner of four diamonds a square has a quarter in each."""
    grid = CellGrid(n_rows=2, n_columns=2, origin=(0.0, 20.0), across=(10.0, -10.0), down=(-10.0, -10.0), crs="local")
    assert by_cell(cell_weights(basins_of(shapely.box(-3, -3, 3, 3)), grid)) == pytest.approx(
        {f"row {r} column {c}": 1 / 4 for r in (1, 2) for c in (1, 2)}
    )


def test_many_tiles_agree_with_the_exact_shares_of_squares() -> None:
    """On square cells the shares are those found from the boundary alone, without any polygon of a cell."""
    n = 150
    polygons = [star((70e3, 80e3), 50e3), star((90e3, 60e3), 30e3) - star((90e3, 60e3), 10e3)]
    found = cell_weights(basins_of(*polygons), square_grid(n, n))
    shares = cell_shares(np.array(polygons), ("A", "B"), (0.0, 0.0), 1000.0)
    expected = np.zeros((2, n, n))
    expected[shares.polygon, n - 1 - shares.row, shares.column] = shares.share * 1e6
    expected /= shapely.area(polygons)[:, None, None]
    weights = np.zeros_like(expected)
    weights[:, found.rows, found.columns] = found.table.weights
    np.testing.assert_allclose(weights, expected, rtol=0, atol=1e-12)


def test_shares_agree_with_rasterized_points() -> None:
    """A million points laid over a basin, burnt by GDAL's own scan lines, count the same shares of every cell."""
    fine, n = 100, 12
    polygon = star((6100, 5800), 4000)
    found = cell_weights(basins_of(polygon), square_grid(n, n))
    move = Affine(1000 / fine, 0, 0, 0, -1000 / fine, n * 1000)
    hit = rasterize([polygon], out_shape=(n * fine, n * fine), transform=move)
    counted = hit.reshape(n, fine, n, fine).sum(axis=(1, 3)) / hit.sum()
    weights = np.zeros((n, n))
    weights[found.rows, found.columns] = found.table.weights[0]
    np.testing.assert_allclose(weights, counted, atol=2e-5)


def test_degrees_agree_with_points_in_the_plane() -> None:
    """Points evenly laid in the equal-area plane and counted in cells of longitude and latitude give their shares."""
    grid = CellGrid(
        n_rows=40, n_columns=40, origin=(-106.0, 41.0), across=(0.05, 0.0), down=(0.0, -0.05), crs="EPSG:4326"
    )
    polygon = star((500.0, -800.0), 12e3)
    found = cell_weights(basins_of(polygon, crs=PLANE), grid)
    x, y = (v.ravel() for v in np.meshgrid(np.arange(-17e3, 17e3, 25.0), np.arange(-17e3, 17e3, 25.0)))
    inside = shapely.contains_xy(polygon, x, y)
    lon, lat = ground.transform(x[inside], y[inside], PLANE, "EPSG:4326")
    counted = np.zeros((40, 40))
    np.add.at(counted, (np.floor((41 - lat) / 0.05).astype(int), np.floor((lon + 106) / 0.05).astype(int)), 1)
    weights = np.zeros((40, 40))
    weights[found.rows, found.columns] = found.table.weights[0]
    np.testing.assert_allclose(weights, counted / counted.sum(), atol=5e-4)


def test_cells_of_degrees_count_by_their_area() -> None:
    """Of a basin that is two cells of a column, the northern has less, as the cosine of latitude says."""
    grid = CellGrid(n_rows=2, n_columns=1, origin=(-105.0, 61.0), across=(1.0, 0.0), down=(0.0, -1.0), crs="EPSG:4326")
    plane = "+proj=laea +lat_0=60 +lon_0=-104.5 +datum=WGS84 +units=m +no_defs"
    polygon = ground.project(np.array([shapely.box(-105, 59, -104, 61)]), "EPSG:4326", plane)[0]
    found = cell_weights(basins_of(polygon, crs=plane), grid)
    # On a sphere; the ellipsoid moves the third digit of the difference.
    north = np.diff(np.sin(np.radians([60, 61])))[0] / np.diff(np.sin(np.radians([59, 61])))[0]
    assert found.table.weights[0] == pytest.approx([north, 1 - north], abs=1e-4)


corners = st.floats(50.0, 6950.0)


@st.composite
def drawn(draw: st.DrawFn) -> BaseGeometry:
    points = draw(st.lists(st.tuples(corners, corners), min_size=3, max_size=9, unique=True))
    hull = shapely.convex_hull(shapely.MultiPoint(points))
    return hull if hull.geom_type == "Polygon" and hull.area > 1e4 else shapely.box(1000, 1000, 3500, 2500)


@settings(max_examples=60, deadline=None)
@given(drawn(), st.floats(-1.0, 1.0))
def test_shares_are_a_partition(polygon: BaseGeometry, depth: float) -> None:
    """Shares are not negative and sum to 1: constant rain returns the constant."""
    weights = cell_weights(basins_of(polygon), square_grid(7, 7)).table.weights
    assert (weights >= 0).all()
    assert (weights @ np.full(weights.shape[1], depth))[0] == pytest.approx(depth, rel=1e-12)


@settings(max_examples=30, deadline=None)
@given(drawn(), st.floats(500.0, 6500.0))
def test_parts_add_up_by_area_to_the_whole(polygon: BaseGeometry, cut: float) -> None:
    """Two parts of a basin, weighted by their areas, have the shares of the whole."""
    parts = [polygon & shapely.box(0, 0, cut, 7000), polygon & shapely.box(cut, 0, 7000, 7000)]
    parts = [part for part in parts if part.area > 1.0]
    basins = basins_of(*parts, polygon)
    weights = cell_weights(basins, square_grid(7, 7)).table.weights
    areas = basins.areas[:-1]
    np.testing.assert_allclose(areas @ weights[:-1] / areas.sum(), weights[-1], atol=1e-8)


def errors_of(basins: Basins, grid: CellGrid) -> list[str]:
    with pytest.raises(DataError) as caught:
        cell_weights(basins, grid)
    return str(caught.value).splitlines()


def test_basins_that_reach_beyond_the_raster_are_named() -> None:
    """Each with the part outside, be it a hundredth, all of it, or a basin far from the raster; one inside is not."""
    grid = square_grid(2, 2)
    found = errors_of(
        basins_of(
            shapely.box(0, 0, 1000, 1000), shapely.box(0, 1000, 1000, 2010.101010101), shapely.box(9e6, 0, 9.1e6, 1e5)
        ),
        grid,
    )
    tail = (
        "of its area outside the raster, which has 2 rows and 2 columns from x 0 to 2000 and y 0 to 2000 in local; "
        "expected a raster that covers it; use rasters that reach beyond the basins, or correct crs"
    )
    assert found == [f"basin B: found 1 % {tail}", f"basin C: found 100 % {tail}"]


def test_a_raster_elsewhere_on_the_globe() -> None:
    """Where no cell is near a basin, all of it is outside, also where the raster's system cannot show the basin."""
    far = CellGrid(n_rows=9, n_columns=9, origin=(120.0, -10.0), across=(1.0, 0.0), down=(0.0, -1.0), crs="EPSG:4326")
    lost = CellGrid(
        n_rows=9,
        n_columns=9,
        origin=(0.0, 0.0),
        across=(1.0, 0.0),
        down=(0.0, -1.0),
        crs="+proj=ortho +lat_0=-40 +lon_0=75 +datum=WGS84",
    )
    for grid in (far, lost):
        assert errors_of(basins_of(star((0, 0), 1e4), crs=PLANE), grid)[0].startswith(
            "basin A: found 100 % of its area outside the raster"
        )


@pytest.mark.parametrize(
    ("basins_crs", "grid_crs", "expected"),
    [
        (
            "EPSG:4326",
            "EPSG:4326",
            (
                "coordinate reference system of the basins: found 'EPSG:4326', which is in degrees; expected a plane, "
                "in metres; bring the basins into one with to_crs"
            ),
        ),
        (
            "local",
            "EPSG:4326",
            (
                "coordinate reference systems: found 'EPSG:4326' for the raster and 'local' for the basins; expected "
                "both 'local', or both on the map; give the rasters crs = \"local\" where their corners are metres of "
                "the site grid"
            ),
        ),
        (
            PLANE,
            "local",
            (
                f"coordinate reference systems: found 'local' for the raster and '{PLANE}' for the basins; expected "
                "both 'local', or both on the map; give the rasters' own crs"
            ),
        ),
    ],
)
def test_systems_that_cannot_be_brought_together(basins_crs: str, grid_crs: str, expected: str) -> None:
    """Degrees are no plane, and a site grid has no place on the map."""
    assert errors_of(basins_of(shapely.box(0, 0, 1, 1), crs=basins_crs), square_grid(2, 2, crs=grid_crs)) == [expected]


def test_far_too_many_cells_are_refused() -> None:
    """A raster of 3 m over 10 km would take minutes and gigabytes."""
    found = errors_of(basins_of(shapely.box(10, 10, 9990, 9990)), square_grid(3334, 3334, cell=3.0))
    assert found == [
        (
            "the raster: found 11,082,241 cells in the box around the basins; expected at most 4,000,000; take a "
            "coarser raster, or fewer basins at a time"
        )
    ]


def centres(grid: CellGrid) -> npt.NDArray[np.float64]:
    rows, columns = (v.ravel() for v in np.meshgrid(np.arange(grid.n_rows), np.arange(grid.n_columns), indexing="ij"))
    return grid.centres(rows, columns)


def test_a_plane_of_rain_gives_its_value_at_the_middle() -> None:
    """Depths that rise evenly across a square average to the depth at its middle, wherever the cells' borders lie."""
    grid = square_grid(9, 9)
    found = cell_weights(basins_of(shapely.box(1500, 2500, 6500, 7500)), grid)
    x, y = centres(grid).T
    depth = (10 + x / 1000 + 2 * y / 1000)[found.rows * 9 + found.columns]
    assert found.table.apply(depth)[0] == pytest.approx(10 + 4 + 2 * 5, rel=1e-12)

"""Rasters of depths over basins: the cells and their means by hand, and everything that can be wrong with a set."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest
import shapely
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from rasterfiles import write_asc, write_tiff
from rasterio.transform import Affine

from basinrain.basins import Basins
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.point_depths import PointDepths
from basinrain.errors import DataError, JobError, ReadError
from basinrain.reading.depth_rasters import RasterFile, read_depth_rasters
from basinrain.weights import WeightTable

TWO, TEN = (Frequency(years, "annual-maximum") for years in (2.0, 10.0))
LABELS = {TWO: "AEP 0.5 (1 in 2)", TEN: "AEP 0.1 (1 in 10)"}
# A basin of 3 km² over three cells and two halves of a grid of 2 x 3 cells of 1 km:
#     1 | 2 | 3
#     4 | 5 | 6     all of 1, 2 and half of 4, 5
L_SHAPE = shapely.Polygon([(0, 500), (2000, 500), (2000, 2000), (0, 2000)])
WEIGHTS = {"row 1 column 1": 1 / 3, "row 1 column 2": 1 / 3, "row 2 column 1": 1 / 6, "row 2 column 2": 1 / 6}


def basins_of(*polygons: shapely.Polygon, crs: str = "local") -> Basins:
    return Basins(ids=tuple("ABC"[: len(polygons)]), polygons=np.array(polygons, dtype=object), crs=crs)


def read(
    files: Sequence[RasterFile],
    basins: Basins | None = None,
    *,
    unit: str = "mm",
    crs: str | None = "local",
) -> tuple[PointDepths, WeightTable]:
    return read_depth_rasters(files, basins or basins_of(L_SHAPE), unit=unit, crs=crs, source="invented", date="2031")


def four(folder: Path, tables: Sequence[Sequence[Sequence[object]]]) -> list[RasterFile]:
    """Rasters of 1 h and 4 h, each at two and at ten years."""
    axes = [(minutes, frequency) for minutes in (60.0, 240.0) for frequency in (TWO, TEN)]
    return [
        RasterFile(write_asc(folder / f"{k}.asc", table), *axis)
        for k, (table, axis) in enumerate(zip(tables, axes, strict=True))
    ]


PLAIN = (
    [[30, 36, 1], [42, 48, 1]],
    [[50, 56, 1], [62, 68, 1]],
    [[60, 66, 1], [72, 78, 1]],
    [[90, 96, 1], [102, 108, 1]],
)


def problems_of(files: Sequence[RasterFile], folder: Path, **options: str | Basins) -> list[str]:
    with pytest.raises(ReadError) as caught:
        read(files, **options)  # type: ignore[arg-type]
    return str(caught.value).replace(str(folder), ".").splitlines()


def test_cells_and_means_by_hand(tmp_path: Path) -> None:
    """Cells that hold part of the basin become points; their weighted sums are its means."""
    depths, weights = read(four(tmp_path, PLAIN))
    assert dict(zip(weights.gauges, weights.weights[0].tolist(), strict=True)) == pytest.approx(WEIGHTS)
    assert depths.points == weights.gauges == tuple(WEIGHTS)
    assert depths.durations.tolist() == [60.0, 240.0]
    assert depths.return_periods.tolist() == [2.0, 10.0]
    assert depths.depth[0].tolist() == [[30.0, 50.0], [60.0, 90.0]]
    assert depths.depth[3].tolist() == [[48.0, 68.0], [78.0, 108.0]]
    assert depths.positions.tolist() == [[500.0, 1500.0], [1500.0, 1500.0], [500.0, 500.0], [1500.0, 500.0]]
    assert (depths.series, depths.source, depths.date, depths.crs) == ("annual-maximum", "invented", "2031", "local")
    # (30 + 36) / 3 + (42 + 48) / 6 = 37 and (50 + 56) / 3 + (62 + 68) / 6 = 57.
    assert weights.weights @ depths.depth[:, 0, :] == pytest.approx(np.array([[37.0, 57.0]]))


def test_the_order_of_the_files_does_not_matter(tmp_path: Path) -> None:
    """Durations and frequencies are put in order."""
    files = four(tmp_path, PLAIN)
    expected, given_back = read(files)[0], read(files[::-1])[0]
    np.testing.assert_array_equal(given_back.depth, expected.depth)


@pytest.mark.parametrize(
    ("unit", "factor"),
    [("in", 25.4), ("0.001 in", 0.0254), ("mm/h", 4.0), ("in/h", 4 * 25.4)],
)
def test_units(tmp_path: Path, unit: str, factor: float) -> None:
    """A value of 4 h in another unit is so many mm; per hour it is an intensity."""
    path = write_asc(tmp_path / "a.asc", [[500, 600]])
    depths, _ = read([RasterFile(path, 240.0, TWO)], basins_of(shapely.box(0, 0, 2000, 1000)), unit=unit)
    assert depths.depth[:, 0, 0] == pytest.approx(np.array([500, 600]) * factor)


def test_geotiff_and_ascii_grid_in_degrees(tmp_path: Path) -> None:
    """Both formats give the same cells over basins in the plane; depths that rise evenly average to the middle's."""
    plane = "+proj=laea +lat_0=40 +lon_0=-105 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs"
    basins = basins_of(shapely.box(-9000, -9000, 9000, 9000), shapely.box(1000, 0, 1400, 300), crs=plane)
    # Hundredths of a degree around 105 W, 40 N: 50 mm, and 2 mm more for every cell eastward.
    values = np.tile(50.0 + 2.0 * np.arange(40), (40, 1))
    found = []
    for suffix in (".asc", ".tif"):
        path = tmp_path / f"a{suffix}"
        if suffix == ".asc":
            write_asc(path, values, west=-105.2, south=39.8, cell=0.01, crs="EPSG:4326")
        else:
            write_tiff(path, values, transform=Affine(0.01, 0.0, -105.2, 0.0, -0.01, 40.2), crs="EPSG:4326")
        found.append(read([RasterFile(path, 60.0, TWO)], basins, crs=None))
    (depths, weights), (others, other_weights) = found
    assert depths.points == others.points
    np.testing.assert_allclose(weights.weights, other_weights.weights, atol=1e-12)
    # 20 cells west of the middle: 50 + 2 x 20, less half a cell. The second basin is in cells 22 (from 0) alone.
    np.testing.assert_allclose(weights.weights @ depths.depth[:, 0, 0], [89.0, 92.0], atol=0.01)
    assert depths.crs == "EPSG:4326"


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.floats(1.0, 500.0), st.floats(0.0, 1000.0), st.floats(1.0, 1990.0))
def test_constant_rasters_return_the_constant(tmp_path: Path, depth: float, west: float, width: float) -> None:
    """Whatever part of the cells a basin holds."""
    path = write_asc(tmp_path / "a.asc", np.full((3, 3), depth))
    basins = basins_of(shapely.box(west, west / 2, west + width, west / 2 + 1234.5))
    depths, weights = read([RasterFile(path, 60.0, TWO)], basins)
    assert (weights.weights @ depths.depth[:, 0, 0])[0] == pytest.approx(depth, rel=1e-12)


def test_what_is_asked_for_is_checked_first(tmp_path: Path) -> None:
    """Unit, system, durations and series, all together, before any file is opened."""
    absent = tmp_path / "absent.asc"
    files = [
        RasterFile(absent, 0.0, TWO),
        RasterFile(absent, float("nan"), Frequency(2.0, "partial-duration")),
    ]
    with pytest.raises(JobError) as caught:
        read(files, unit="inch", crs="EPSG:1")
    assert [line.partition("; expected")[0] for line in str(caught.value).splitlines()] == [
        "[design.depths] unit: found 'inch'",
        "[design.depths] crs: found 'EPSG:1'",
        "[[design.depths.raster]] duration: found 0 minutes",
        "[[design.depths.raster]] duration: found nan minutes",
        "[[design.depths.raster]]: found frequencies of both annual-maximum and partial-duration",
    ]
    with pytest.raises(JobError, match=r"\[\[design.depths.raster\]\]: found none; expected a raster for every"):
        read([])


def test_every_duration_has_every_frequency_once(tmp_path: Path) -> None:
    """What is missing and what stands twice is named by duration and frequency."""
    a, b, c = (RasterFile(tmp_path / f"{name}.asc", 60.0, TWO) for name in "abc")
    with pytest.raises(JobError) as caught:
        read([a, b, RasterFile(c.path, 360.0, TEN)])
    assert str(caught.value).replace(str(tmp_path), ".").splitlines() == [
        f"[[design.depths.raster]] of 1 h, {LABELS[TWO]}: found two: ./a.asc and ./b.asc; expected one; remove one",
        *(
            f"[[design.depths.raster]] of {words}: found none; expected a raster for every duration at every "
            "frequency; add it"
            for words in (f"1 h, {LABELS[TEN]}", f"6 h, {LABELS[TWO]}")
        ),
    ]


def test_rasters_lie_on_one_grid(tmp_path: Path) -> None:
    """Another shape, another place or another system is named with both grids; a file that is none stands beside."""
    files = four(tmp_path, PLAIN)
    write_asc(files[1].path, [[50, 56], [62, 68]])
    write_asc(files[2].path, PLAIN[2], west=500.0)
    files[3].path.unlink()
    first = (
        "expected that of ./0.asc: 2 rows and 3 columns from x 0 to 3000 and y 0 to 2000 in local; bring all rasters"
    )
    assert problems_of(files, tmp_path) == [
        "./3.asc: the file: found nothing of that name; expected a file; correct the path",
        (
            "./1.asc: the raster's shape: found 2 rows and 2 columns from x 0 to 2000 and y 0 to 2000 in local; "
            f"{first} to one grid"
        ),
        (
            "./2.asc: the raster's position: found 2 rows and 3 columns from x 500 to 3500 and y 0 to 2000 in local; "
            f"{first} to one grid"
        ),
    ]
    files = four(tmp_path, PLAIN)
    for file, crs in zip(files, ("EPSG:26913", "EPSG:26913", "EPSG:32613", "EPSG:26913"), strict=True):
        write_asc(file.path, PLAIN[0], crs=crs)
    assert problems_of(files, tmp_path, basins=basins_of(L_SHAPE, crs="EPSG:26913"), crs=None) == [  # type: ignore[arg-type]
        (
            "./2.asc: the raster's coordinate system: found 2 rows and 3 columns from x 0 to 3000 and y 0 to 2000 in "
            "EPSG:32613 (WGS 84 / UTM zone 13N); expected that of ./0.asc: 2 rows and 3 columns from x 0 to 3000 and y "
            "0 to 2000 in EPSG:26913 (NAD83 / UTM zone 13N); bring all rasters to one grid"
        )
    ]


def test_rounding_in_a_header_is_no_other_grid(tmp_path: Path) -> None:
    """A cell of 1000 m written with a millionth more is the same cell."""
    files = four(tmp_path, PLAIN)
    write_asc(files[3].path, PLAIN[3], cell=1000.000001)
    assert read(files)[0].depth.shape == (4, 2, 2)


def test_no_data_under_a_basin_is_refused(tmp_path: Path) -> None:
    """Basin, raster and share are named, for every raster; cells beside the basins may have none."""
    files = four(tmp_path, PLAIN)
    write_asc(files[0].path, [[-9999, 36, -9999], [42, 48, -9999]])
    write_asc(files[3].path, [[90, 96, 1], [102, -9999, 1]])
    found = problems_of(files, tmp_path, basins=basins_of(L_SHAPE, shapely.box(1100, 600, 1900, 900)))
    tail = "expected depths over the whole of it; use rasters that cover the basin; no data is not zero"
    assert found == [
        f"./0.asc: the raster of 1 h, {LABELS[TWO]}: found no data over 33.3 % of basin A; {tail}",
        f"./3.asc: the raster of 4 h, {LABELS[TEN]}: found no data over 16.7 % of basin A; {tail}",
        f"./3.asc: the raster of 4 h, {LABELS[TEN]}: found no data over 100 % of basin B; {tail}",
    ]


def test_a_sliver_without_data_is_left_out(tmp_path: Path) -> None:
    """A basin with a ten-millionth of its area in such a cell has the depths of its other cells, whole."""
    path = write_asc(tmp_path / "a.asc", [[30, -9999]])
    depths, weights = read([RasterFile(path, 60.0, TWO)], basins_of(shapely.box(0, 0, 1000.0001, 1000)))
    assert depths.points == ("row 1 column 1",)
    assert weights.weights.tolist() == [[1.0]]
    with pytest.raises(ReadError, match=r"found no data over 0\.001 % of basin A"):
        read([RasterFile(path, 60.0, TWO)], basins_of(shapely.box(0, 0, 1000.01, 1000)))


def test_values_that_are_no_depths(tmp_path: Path) -> None:
    """Zeros and codes below zero are refused with their number, file by file, with files that cannot be read."""
    files = four(tmp_path, PLAIN)
    write_asc(files[0].path, [[-999, 36, 1], [0, 48, 1]])
    write_asc(files[2].path, [[60, "x", 1], [0, 48, 1]])
    assert problems_of(files, tmp_path, unit="in") == [
        (
            f"./0.asc: the raster of 1 h, {LABELS[TWO]}: found 2 cells without a depth, such as row 1 column 1 with "
            "-999 in; expected depths above 0; correct the raster, or mark such cells as without data"
        ),
        "./2.asc:7: the raster: found 'x'; expected numbers with a decimal point",
    ]


def test_depths_out_of_order_are_summed_up(tmp_path: Path) -> None:
    """One line for each kind of fault, with the number of cells and the worst of them."""
    files = four(tmp_path, PLAIN)
    # A fifth less than at 2 years in one cell; 1 % and 2 % less than in 1 h in two; in 4 h thrice as intense in one.
    write_asc(files[1].path, [[24, 56, 1], [62, 68, 1]])
    write_asc(files[2].path, [[60, 36 * 0.99, 1], [42 * 0.98, 78, 1]])
    write_asc(files[3].path, [[288, 96, 1], [102, 108, 1]])
    tail = "correct the rasters, or leave out a duration or frequency"
    assert problems_of(files, tmp_path) == [
        (
            "./2.asc: the rasters: found 2 cells of 4 with less depth in a longer duration, the worst row 2 column 1 "
            f"at 4 h, {LABELS[TWO]}: 41.16 mm (10.29 mm/h), 2 % less than the 42 mm (42 mm/h) of 1 h; expected depths "
            f"that do not fall with duration; {tail}"
        ),
        (
            "./1.asc: the rasters: found 1 cell of 4 with less depth at a rarer frequency, the worst row 1 column 1 at "
            f"1 h, {LABELS[TEN]}: 24 mm (24 mm/h), 20 % less than the 30 mm (30 mm/h) of {LABELS[TWO]}; expected "
            f"depths that do not fall with rarity; {tail}"
        ),
        (
            "./3.asc: the rasters: found 1 cell of 4 with more intensity in a longer duration, the worst row 1 column "
            f"1 at 4 h, {LABELS[TEN]}: 288 mm (72 mm/h), 200 % more than the 24 mm (24 mm/h) of 1 h; expected "
            f"intensities that do not rise with duration; {tail}"
        ),
    ]


def test_what_the_table_of_depths_accepts_is_accepted(tmp_path: Path) -> None:
    """Equal depths in two durations, at two frequencies, and equal intensities are no fault."""
    files = four(tmp_path, [[[30, 30, 1], [30, 30, 1]]] * 2 + [[[30, 120, 1], [30, 120, 1]]] * 2)
    assert read(files)[0].depth[:, 1, 1].tolist() == [30.0, 120.0, 30.0, 120.0]


def test_a_basin_must_be_covered(tmp_path: Path) -> None:
    """A basin that reaches over the grid's edge is refused, and a site grid has no place on the map."""
    files = four(tmp_path, PLAIN)
    with pytest.raises(DataError, match=r"^basin A: found 25 % of its area outside the raster, which has 2 rows"):
        read(files, basins_of(shapely.box(-500, 0, 1500, 1000)))
    with pytest.raises(DataError, match="found 'EPSG:26913' for the raster and 'local' for the basins"):
        read(files, crs="EPSG:26913")


def test_source_and_date_are_needed(tmp_path: Path) -> None:
    """Depths without a source cannot be defended."""
    with pytest.raises(DataError, match=r"source: found nothing.*\ndate: found nothing"):
        read_depth_rasters(four(tmp_path, PLAIN), basins_of(L_SHAPE), unit="mm", crs="local", source="", date=" ")

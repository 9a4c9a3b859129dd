"""Raster files: what their headers and values may look like, checked with GDAL's own reader, and what is refused."""

from __future__ import annotations

import sys
import tracemalloc
from pathlib import Path

import numpy as np
import pytest
import rasterio
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from rasterfiles import write_asc, write_tiff
from rasterio.transform import Affine

from basinrain import ground
from basinrain.errors import JobError, ReadError
from basinrain.reading.raster_files import read_cells, read_grid

HEAD = "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 50\ncellsize 10\n"
ALL = slice(0, 2), slice(0, 3)


def asc(tmp_path: Path, text: str) -> Path:
    path = tmp_path / "depth.asc"
    path.write_text(text, encoding="utf-8")
    return path


def read_whole(path: Path, crs: str | None) -> None:
    read_grid(path, crs=crs)
    read_cells(path, *ALL)


def refused(path: Path, *, crs: str | None = "local") -> list[str]:
    with pytest.raises(ReadError) as caught:
        read_whole(path, crs)
    return str(caught.value).replace(str(path.parent), ".").splitlines()


def test_corner_and_values(tmp_path: Path) -> None:
    """The lower left corner is the lower left corner, and the first line the northernmost."""
    path = asc(tmp_path, HEAD + "1 2 3\n4 5 6\n")
    grid = read_grid(path, crs="local")
    assert grid.bounds == (100.0, 50.0, 130.0, 70.0)
    assert grid.centres(np.array([0]), np.array([2])).tolist() == [[125.0, 65.0]]
    assert read_cells(path, *ALL).tolist() == [[1.0, 2.0, 3.0], [4.0, 5.0, 6.0]]
    assert read_cells(path, slice(1, 2), slice(1, 3)).tolist() == [[5.0, 6.0]]


def test_a_header_in_other_words(tmp_path: Path) -> None:
    """Centres in place of corners, capitals, another order, a byte-order mark, Windows line ends, blank lines."""
    text = "\ufeffNROWS 2\r\nNCOLS 3\r\nYLLCENTER 55\r\nXLLCENTER  105\r\nCellSize 1e1\r\n1 2 3\r\n\r\n 4 5\t6 \r\n\r\n"
    path = tmp_path / "DEPTH.ASC"
    path.write_bytes(text.encode())
    assert read_grid(path, crs="local") == read_grid(asc(tmp_path, HEAD + "1 2 3\n4 5 6\n"), crs="local")
    assert read_cells(path, *ALL).tolist() == [[1.0, 2.0, 3.0], [4.0, 5.0, 6.0]]


@pytest.mark.parametrize(
    ("said", "cells"),
    [("NODATA_value -99.9\n", "-99.90"), ("", "-9999"), ("nodata_value nan\n", "NaN"), ("NODATA_VALUE 0\n", "0.0")],
)
def test_no_data_is_nan(tmp_path: Path, said: str, cells: str) -> None:
    """What the header names as no data, -9999 where it names nothing, and NaN; it is never a number."""
    found = read_cells(asc(tmp_path, f"{HEAD}{said}1 {cells} 3\n4 5 {cells}\n"), *ALL)
    np.testing.assert_array_equal(found, [[1, np.nan, 3], [4, 5, np.nan]])


def test_rows_broken_into_lines(tmp_path: Path) -> None:
    """Values may run on over lines as they like, since the header says how many stand in a row."""
    for text in ("1 2\n3 4\n5 6\n", "1 2 3 4 5 6\n", "1\n2\n3\n4\n5\n6\n"):
        assert read_cells(asc(tmp_path, HEAD + text), slice(0, 2), slice(1, 3)).tolist() == [[2.0, 3.0], [5.0, 6.0]]


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.data())
def test_gdal_reads_the_same(tmp_path: Path, data: st.DataObject) -> None:
    """GDAL's own reader of ESRI ASCII grids finds the same values in every window, in the same place."""
    shape = data.draw(st.tuples(st.integers(1, 6), st.integers(1, 6)))
    values = data.draw(st.lists(st.integers(-9999, 9999), min_size=36, max_size=36))
    table = np.array(values)[: shape[0] * shape[1]].reshape(shape) / 8
    table[0, 0] = -9999
    path = write_asc(tmp_path / "depth.asc", table, west=-105.25, south=39.5, cell=0.125, crs="EPSG:4269")
    first = data.draw(st.integers(0, shape[0] - 1)), data.draw(st.integers(0, shape[1] - 1))
    window = slice(first[0], shape[0]), slice(first[1], shape[1])
    with rasterio.open(path, driver="AAIGrid") as file:
        expected = file.read(1, masked=True).astype(float).filled(np.nan)
        grid = read_grid(path)
        assert (grid.n_rows, grid.n_columns) == file.shape
        assert grid.bounds == tuple(file.bounds)
        assert ground.same_crs(grid.crs, file.crs.to_wkt())
    np.testing.assert_allclose(read_cells(path, *window), expected[window], rtol=1e-6)


def test_only_the_window_is_kept(tmp_path: Path) -> None:
    """A file of 16 MB takes less than 1 MB of memory where a few cells are wanted, in either format."""
    n = 2000
    path = tmp_path / "depth.asc"
    line = "12.5 " * n + "\n"
    path.write_text(f"ncols {n}\nnrows {n}\nxllcorner 0\nyllcorner 0\ncellsize 1\n" + line * n, encoding="ascii")
    tiff = write_tiff(tmp_path / "depth.tif", np.full((n, n), 12.5))
    for file in (path, tiff):
        tracemalloc.start()
        assert read_cells(file, slice(990, 1000), slice(5, 15)).tolist() == [[12.5] * 10] * 10
        assert tracemalloc.get_traced_memory()[1] < 1e6
        tracemalloc.stop()


def test_the_system_of_an_ascii_grid(tmp_path: Path) -> None:
    """It stands beside the file, by its code where it has one; what the user says wins; one of the two is needed."""
    path = write_asc(tmp_path / "depth.asc", [[1, 2, 3], [4, 5, 6]], crs="EPSG:26913")
    assert read_grid(path).crs == "EPSG:26913"
    assert read_grid(path, crs="EPSG:32613").crs == "EPSG:32613"
    path.with_suffix(".prj").write_text(
        'GEOGCS["GCS_North_American_1983",DATUM["D_North_American_1983",SPHEROID["GRS_1980",6378137.0,298.257222101]],'
        'PRIMEM["Greenwich",0.0],UNIT["Degree",0.0174532925199433]]',
        encoding="ascii",
    )
    assert read_grid(path).crs == "EPSG:4269"
    path.with_suffix(".prj").write_text("Projection GEOGRAPHIC\nDatum NAD83\nUnits DD\n", encoding="ascii")
    assert refused(path, crs=None) == [
        (
            "./depth.prj: the raster: found a coordinate reference system that cannot be read; expected a map's system "
            'as WKT; give crs = "EPSG:..."'
        )
    ]
    path.with_suffix(".prj").unlink()
    assert refused(path, crs=None) == [
        (
            "./depth.asc: the raster: found no CRS; expected its coordinate reference system, in the file or a .prj "
            'beside it; give crs = "EPSG:...", or crs = "local" for a site grid'
        )
    ]
    with pytest.raises(JobError, match="coordinate reference system: found 'EPSG:1'; expected 'local', or a map's"):
        read_grid(path, crs="EPSG:1")


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("", ["./depth.asc: the file: found nothing in it; expected an ESRI ASCII grid"]),
        (" \n", ["./depth.asc: the raster: found no text in it; expected an ESRI ASCII grid, as its suffix says"]),
        ("\0\1", ["./depth.asc: the raster: found no text in it; expected an ESRI ASCII grid, as its suffix says"]),
        (
            "1 2 3\n",
            [
                f"./depth.asc: the header: found no {words.split()[0]}; expected {words} with a number; an ESRI ASCII "
                "grid begins with them"
                for words in ("ncols", "nrows", "xllcorner or xllcenter", "yllcorner or yllcenter", "cellsize")
            ],
        ),
        (
            HEAD.replace("100\n", "100\nxllcenter 105\n") + "1 2 3\n4 5 6\n",
            [
                (
                    "./depth.asc: the header: found xllcorner and xllcenter; expected xllcorner or xllcenter with a "
                    "number; an ESRI ASCII grid begins with them"
                )
            ],
        ),
        (
            "ncols 2.5\nnrows 0\nxllcorner x\nyllcorner inf\ncellsize -10\nnodata_value none\n1\n",
            [
                "./depth.asc:1: the header: found 'ncols 2.5'; expected a whole number above 0",
                "./depth.asc:2: the header: found 'nrows 0'; expected a whole number above 0",
                "./depth.asc:3: the header: found 'xllcorner x'; expected a number",
                "./depth.asc:4: the header: found 'yllcorner inf'; expected a number",
                "./depth.asc:5: the header: found 'cellsize -10'; expected a length above 0",
                "./depth.asc:6: the header: found 'nodata_value none'; expected a number",
            ],
        ),
        (
            HEAD + "cellsize 10\nnodatavalue -1\n",
            [
                "./depth.asc:6: the header: found cellsize twice; expected it once",
                (
                    "./depth.asc:7: the header: found 'nodatavalue -1'; expected a key of an ESRI ASCII grid; did you "
                    "mean 'nodata_value'?"
                ),
            ],
        ),
        (
            HEAD + "1 2\n4 5 6 7\n",
            [
                "./depth.asc:6: the raster: found 2 values in a row; expected 3, as ncols says",
                "./depth.asc:7: the raster: found 4 values in a row; expected 3, as ncols says",
            ],
        ),
        (
            HEAD + "1 2 3\n4 5\n",
            ["./depth.asc:7: the raster: found 2 values in a row; expected 3, as ncols says"],
        ),
        (
            HEAD + "1 2 3\n",
            [
                (
                    "./depth.asc: the raster: found 3 values; expected 6: 2 rows of 3, as the header says; copy the "
                    "file again, or correct its header"
                )
            ],
        ),
        (
            HEAD + "1 2,5 x\n4 inf 6\n",
            [
                "./depth.asc:6: the raster: found '2,5'; expected numbers with a decimal point",
                "./depth.asc:7: the raster: found 'inf'; expected numbers with a decimal point",
            ],
        ),
        (
            HEAD + "1 2\n3 4 5\n-\n",
            ["./depth.asc:8: the raster: found '-'; expected numbers with a decimal point"],
        ),
    ],
)
def test_an_ascii_grid_that_is_none(tmp_path: Path, text: str, expected: list[str]) -> None:
    """Everything that is wrong with a header, and values that are no numbers or of another count, with their lines."""
    assert refused(asc(tmp_path, text)) == expected


def test_a_geotiff(tmp_path: Path) -> None:
    """Position, system, window, no data, and whole numbers with a scale and an offset."""
    values = np.array([[100, 200, -1], [400, 500, 600]], dtype=np.int16)
    path = write_tiff(tmp_path / "depth.TIFF", values, nodata=-1, scale=0.1, offset=2.0)
    grid = read_grid(path)
    assert (grid.crs, grid.bounds) == ("EPSG:32613", (0.0, 0.0, 3000.0, 2000.0))
    np.testing.assert_allclose(read_cells(path, slice(0, 2), slice(1, 3)), [[22.0, np.nan], [52.0, 62.0]])
    assert read_grid(path, crs="local").crs == "local"


def test_a_geotiff_that_is_turned(tmp_path: Path) -> None:
    """Rows and columns may run in any direction."""
    move = Affine(8.0, 6.0, 500.0, 6.0, -8.0, 700.0)
    grid = read_grid(write_tiff(tmp_path / "depth.tif", np.ones((4, 5)), transform=move))
    # Two columns of (8, 6) and three rows of (6, -8) from (500, 700).
    assert grid.at([3.0], [2.0]).tolist() == [[534.0, 688.0]]


def test_geotiffs_that_cannot_be_read(tmp_path: Path) -> None:
    """Another format under the suffix, several bands, no place, no system, a file cut short."""
    assert refused(write_tiff(tmp_path / "depth.tif", np.ones((2, 3)), bands=3)) == [
        (
            "./depth.tif: the raster: found 3 bands; expected one, of one duration and frequency; write each band to a "
            "file of its own"
        )
    ]
    assert refused(write_tiff(tmp_path / "depth.tif", np.ones((2, 3)), crs=None), crs=None) == [
        (
            "./depth.tif: the raster: found no CRS; expected its coordinate reference system, in the file or a .prj "
            'beside it; give crs = "EPSG:...", or crs = "local" for a site grid'
        )
    ]
    path = tmp_path / "depth.tif"
    with pytest.warns(rasterio.errors.NotGeoreferencedWarning):
        write_tiff(path, np.ones((2, 3)), transform=Affine.identity(), crs=None)
    assert refused(path) == [
        "./depth.tif: the raster: found a raster without a position on the map; expected a GeoTIFF with one"
    ]
    path.write_text(HEAD, encoding="ascii")
    assert refused(path) == ["./depth.tif: the raster: found no TIFF file; expected a GeoTIFF, as its suffix says"]
    path.write_bytes(b"II*\0" + b"\xff" * 40)
    assert refused(path)[0].startswith("./depth.tif: the raster: found that it is damaged (")
    path.unlink()
    write_tiff(path, np.random.default_rng(1).random((200, 200)))
    path.write_bytes(path.read_bytes()[:200_000])
    grid = read_grid(path)
    with pytest.raises(ReadError, match=r"depth\.tif: the raster: found that it is damaged \(.*\); copy it again"):
        read_cells(path, slice(0, grid.n_rows), slice(0, grid.n_columns))


def test_without_rasterio_the_extra_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A GeoTIFF needs the extra, an ASCII grid does not."""
    path = write_tiff(tmp_path / "depth.tif", np.ones((2, 3)))
    monkeypatch.setitem(sys.modules, "rasterio", None)
    assert refused(path) == [
        (
            "./depth.tif: the raster: found a GeoTIFF, and rasterio is not installed, which reads it; install "
            "basinrain[raster]"
        )
    ]
    with pytest.raises(ReadError, match="rasterio is not installed"):
        read_cells(path, *ALL)
    assert read_cells(asc(tmp_path, HEAD + "1 2 3\n4 5 6\n"), *ALL).sum() == 21


def test_other_suffixes_and_missing_files(tmp_path: Path) -> None:
    """The suffix says the format; a file that is not there is said to be so."""
    for name, words in (("depth.nc", "the suffix '.nc'"), ("depth", "no suffix")):
        assert refused(tmp_path / name) == [
            f"./{name}: the raster: found {words}; expected an ESRI ASCII grid (.asc) or a GeoTIFF (.tif)"
        ]
    for name in ("depth.asc", "depth.tif"):
        assert refused(tmp_path / name) == [
            f"./{name}: the file: found nothing of that name; expected a file; correct the path"
        ]

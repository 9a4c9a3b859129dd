"""Rasters as files, for the tests that read them."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import numpy.typing as npt
import rasterio
from rasterio.transform import Affine


def write_asc(
    path: Path,
    values: Sequence[Sequence[object]] | npt.NDArray[np.generic],
    *,
    west: float = 0.0,
    south: float = 0.0,
    cell: float = 1000.0,
    crs: str = "",
) -> Path:
    """Write an ESRI ASCII grid, and a .prj beside it where there is a system."""
    rows = [" ".join(str(value) for value in row) for row in values]
    head = f"ncols {len(values[0])}\nnrows {len(values)}\nxllcorner {west!r}\nyllcorner {south!r}\ncellsize {cell!r}\n"
    path.write_text(f"{head}NODATA_value -9999\n" + "\n".join(rows) + "\n", encoding="ascii")
    if crs:
        path.with_suffix(".prj").write_text(rasterio.crs.CRS.from_user_input(crs).to_wkt(), encoding="ascii")
    return path


def write_tiff(
    path: Path,
    values: npt.ArrayLike,
    *,
    transform: Affine | None = None,
    crs: str | None = "EPSG:32613",
    scale: float = 1.0,
    offset: float = 0.0,
    bands: int = 1,
    nodata: float | None = None,
) -> Path:
    """Write a GeoTIFF, by default of cells of 1000 m over x and y from 0."""
    array = np.asarray(values)
    move = transform or Affine(1000.0, 0.0, 0.0, 0.0, -1000.0, 1000.0 * array.shape[0])
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        height=array.shape[0],
        width=array.shape[1],
        count=bands,
        dtype=array.dtype,
        crs=crs,
        transform=move,
        nodata=nodata,
    ) as file:
        for band in range(1, bands + 1):
            file.write(array, band)
        if (scale, offset) != (1.0, 0.0):
            file.scales, file.offsets = [scale] * bands, [offset] * bands
    return path

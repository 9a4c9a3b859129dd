"""Raster files: ESRI ASCII grids and GeoTIFF, of which only the needed rows and columns are kept in memory."""

from __future__ import annotations

import math
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt
import pyproj

from basinrain import ground
from basinrain.designstorm.cell_weights import CellGrid
from basinrain.errors import JobError, Problem, Problems, ReadError, nearest_name
from basinrain.reading.files import read_bytes

__all__ = ["read_cells", "read_grid"]

Floats = npt.NDArray[np.float64]

_TIFF: Final = (b"II*\0", b"MM\0*", b"II+\0", b"MM\0+")
"""How a TIFF begins, and one with 64-bit offsets."""

_KEYS: Final = ("ncols", "nrows", "xllcorner", "xllcenter", "yllcorner", "yllcenter", "cellsize", "nodata_value")
_NO_DATA: Final = -9999.0
"""What stands for no value where the header of an ASCII grid does not say (common practice)."""


@dataclass(frozen=True)
class _AsciiHeader:
    """What an ASCII grid says of itself, and on how many lines."""

    lines: int
    n_rows: int
    n_columns: int
    west: float
    south: float
    cell: float
    no_data: float


def read_grid(path: Path, *, crs: str | None = None) -> CellGrid:
    r"""Return how the cells of a raster file lie, its values unread.

    Parameters
    ----------
    path
        An ESRI ASCII grid (``.asc``; its coordinate system stands in a ``.prj`` beside it) or a GeoTIFF (``.tif``,
        ``.tiff``; needs the extra ``raster``).
    crs
        The coordinate system, ``"local"`` for metres of a site grid; wins over what the file says.

    Raises
    ------
    JobError
        ``crs`` is not known.
    ReadError
        The file is missing or no such raster; it has several bands, no position or no coordinate system; rasterio is
        not installed.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "depth.asc"
    >>> _ = path.write_text("ncols 3\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 500\n1 2 3\n4 5 6\n")
    >>> print(read_grid(path, crs="local"))
    2 rows and 3 columns from x 0 to 1500 and y 0 to 1000 in local
    >>> read_cells(path, slice(0, 2), slice(1, 3))
    array([[2., 3.],
           [5., 6.]])
    """
    if crs is not None:
        ground.parse_crs(crs)
    if _is_ascii(path):
        header = _ascii_header(path)
        return CellGrid(
            n_rows=header.n_rows,
            n_columns=header.n_columns,
            origin=(header.west, header.south + header.n_rows * header.cell),
            across=(header.cell, 0.0),
            down=(0.0, -header.cell),
            crs=crs if crs is not None else _beside(path),
        )
    with _tiff(path) as file:
        move = file.transform
        if move.is_identity:
            raise ReadError(
                _problem(path, found="a raster without a position on the map", expected="a GeoTIFF with one")
            )
        return CellGrid(
            n_rows=file.height,
            n_columns=file.width,
            origin=(move.c, move.f),
            across=(move.a, move.d),
            down=(move.b, move.e),
            crs=crs if crs is not None else _named(file.crs.to_wkt() if file.crs else "", path),
        )


def read_cells(path: Path, rows: slice, columns: slice) -> Floats:
    """Return the values of some rows and columns of a raster file.

    Parameters
    ----------
    path
        A file that :func:`read_grid` reads.
    rows, columns
        Counted from 0, from the first line and from the first value of a line, with ends inside the raster.

    Returns
    -------
    array of float, shape (n_rows, n_columns)
        NaN where the file has no data. A GeoTIFF's scale and offset are applied.

    Raises
    ------
    ReadError
        As :func:`read_grid`; the file has more or fewer values than its header says, or one that is no number.
    """
    if _is_ascii(path):
        return _ascii_cells(path, _ascii_header(path), rows, columns)
    with _tiff(path) as file:
        from rasterio.windows import Window

        try:
            read = file.read(1, window=Window.from_slices(rows, columns), masked=True)
        except OSError as error:
            raise ReadError(_problem(path, found=f"that it is damaged ({error})", remedy="copy it again")) from None
        values = np.ma.filled(read.astype(float), np.nan) * file.scales[0] + file.offsets[0]
        return np.asarray(values, dtype=float)


def _is_ascii(path: Path) -> bool:
    suffix = path.suffix.lower()
    if suffix not in {".asc", ".tif", ".tiff"}:
        raise ReadError(
            _problem(
                path,
                found=f"the suffix '{path.suffix}'" if suffix else "no suffix",
                expected="an ESRI ASCII grid (.asc) or a GeoTIFF (.tif)",
            )
        )
    return suffix == ".asc"


def _problem(path: Path, *, found: str, expected: str = "", remedy: str = "", line: int | None = None) -> Problem:
    return Problem(item="the raster", found=found, expected=expected, remedy=remedy, file=str(path), line=line)


# --- coordinate systems


def _beside(path: Path) -> str:
    """Return the coordinate system that the .prj beside an ASCII grid names."""
    beside = next((p for p in (path.with_suffix(".prj"), path.with_suffix(".PRJ")) if p.is_file()), None)
    if beside is None:
        return _named("", path)
    return _named(read_bytes(beside, expected="a coordinate system").decode("utf-8-sig", errors="replace"), beside)


def _named(text: str, path: Path) -> str:
    """Return a system by its code where it has one."""
    if not text.strip():
        raise ReadError(
            Problem(
                item="the raster",
                found="no CRS",
                expected="its coordinate reference system, in the file or a .prj beside it",
                remedy='give crs = "EPSG:...", or crs = "local" for a site grid',
                file=str(path),
            )
        )
    try:
        parsed = pyproj.CRS.from_user_input(text)
        if parsed.is_compound:
            parsed = parsed.sub_crs_list[0]
        # Made two-dimensional for no reason, a system loses its code.
        parsed = parsed.to_2d() if len(parsed.axis_info) > 2 else parsed
        authority = parsed.to_authority(min_confidence=100)
        return ground.parse_crs(":".join(authority) if authority else parsed.to_wkt())
    except (pyproj.exceptions.CRSError, JobError):
        raise ReadError(
            Problem(
                item="the raster",
                found="a coordinate reference system that cannot be read",
                expected="a map's system as WKT",
                remedy='give crs = "EPSG:..."',
                file=str(path),
            )
        ) from None


# --- ESRI ASCII grid


def _ascii_header(path: Path) -> _AsciiHeader:
    start = read_bytes(path, size=4096, expected="an ESRI ASCII grid")
    if not start.decode("utf-8-sig", errors="replace").split()[:1] or b"\0" in start:
        raise ReadError(_problem(path, found="no text in it", expected="an ESRI ASCII grid, as its suffix says"))
    problems = Problems(file=str(path))
    said: dict[str, float] = {}
    lines = 0
    with path.open("rb") as file:
        for line in islice(file, len(_KEYS)):
            words = line.decode("utf-8-sig", errors="replace").split()
            if not words or not words[0][0].isalpha() or words[0].lower() == "nan":
                break
            lines += 1
            _take(words, said, lines, problems)
    for needed in (("ncols",), ("nrows",), ("xllcorner", "xllcenter"), ("yllcorner", "yllcenter"), ("cellsize",)):
        if len(given := [key for key in needed if key in said]) != 1:
            problems.add(
                item="the header",
                found=" and ".join(given) if given else f"no {needed[0]}",
                expected=" or ".join(needed) + " with a number",
                remedy="an ESRI ASCII grid begins with them",
            )
    problems.raise_as(ReadError)
    cell = said["cellsize"]
    return _AsciiHeader(
        lines=lines,
        n_rows=int(said["nrows"]),
        n_columns=int(said["ncols"]),
        west=said["xllcorner"] if "xllcorner" in said else said["xllcenter"] - cell / 2,
        south=said["yllcorner"] if "yllcorner" in said else said["yllcenter"] - cell / 2,
        cell=cell,
        no_data=said.get("nodata_value", _NO_DATA),
    )


def _take(words: list[str], said: dict[str, float], line: int, problems: Problems) -> None:
    """Put a line of the header with what is said, or report what is wrong with it."""
    key = words[0].lower()
    text = " ".join(words)
    shown = f"'{text[:60]}'"
    try:
        value = float(words[1]) if len(words) == 2 else math.nan
    except ValueError:
        value = math.nan
    if key not in _KEYS:
        problems.add(
            item="the header",
            found=shown,
            expected="a key of an ESRI ASCII grid",
            line=line,
            remedy=nearest_name(key, _KEYS),
        )
    elif key in said:
        problems.add(item="the header", found=f"{key} twice", expected="it once", line=line)
    elif key == "nodata_value":
        if len(words) != 2 or (math.isnan(value) and words[1].lower() != "nan"):
            problems.add(item="the header", found=shown, expected="a number", line=line)
        said[key] = value
    else:
        said[key] = value
        count, length = key in {"ncols", "nrows"}, key == "cellsize"
        if not math.isfinite(value) or (count and value % 1) or ((count or length) and value <= 0):
            expected = "a whole number above 0" if count else "a length above 0" if length else "a number"
            problems.add(item="the header", found=shown, expected=expected, line=line)


def _ascii_cells(path: Path, header: _AsciiHeader, rows: slice, columns: slice) -> Floats:
    """Return a window; its lines alone are split where every line holds a row, as nearly all files have it."""
    kept: list[tuple[int, bytes]] = []
    n_lines, last = 0, (0, b"")
    with path.open("rb") as file:
        for number, line in enumerate(islice(file, header.lines, None), start=header.lines + 1):
            if not line.isspace():
                if rows.start <= n_lines < rows.stop:
                    kept.append((number, line))
                n_lines, last = n_lines + 1, (number, line)
    if n_lines == header.n_rows:
        # A file that was cut off has less in its last line, which the window need not reach.
        further = [] if kept[-1:] == [last] else [last]
        values = _rows(path, header, kept + further, columns)[: len(kept)]
    else:
        values = _wrapped(path, header, rows, columns)
    return np.where(values == header.no_data, np.nan, values)


def _rows(path: Path, header: _AsciiHeader, lines: list[tuple[int, bytes]], columns: slice) -> Floats:
    problems = Problems(file=str(path))
    values = np.full((len(lines), columns.stop - columns.start), np.nan)
    for row, (number, line) in enumerate(lines):
        cells = line.split()
        if len(cells) == header.n_columns:
            values[row] = _numbers(cells[columns], number, problems)
        else:
            problems.add(
                item="the raster",
                found=f"{len(cells)} values in a row",
                expected=f"{header.n_columns}, as ncols says",
                line=number,
            )
    problems.raise_as(ReadError)
    return values


def _wrapped(path: Path, header: _AsciiHeader, rows: slice, columns: slice) -> Floats:
    """Return a window of values that are broken into lines anyhow."""
    problems = Problems(file=str(path))
    values = np.full((rows.stop - rows.start, columns.stop - columns.start), np.nan)
    n = 0
    with path.open("rb") as file:
        for number, line in enumerate(islice(file, header.lines, None), start=header.lines + 1):
            cells = line.split()
            row, column = np.divmod(np.arange(n, n + len(cells)), header.n_columns)
            n += len(cells)
            inside = (row >= rows.start) & (row < rows.stop) & (column >= columns.start) & (column < columns.stop)
            if inside.any():
                chosen = [cells[k] for k in np.flatnonzero(inside)]
                values[row[inside] - rows.start, column[inside] - columns.start] = _numbers(chosen, number, problems)
    if n != (whole := header.n_rows * header.n_columns):
        problems.add(
            item="the raster",
            found=f"{n} values",
            expected=f"{whole}: {header.n_rows} rows of {header.n_columns}, as the header says",
            remedy="copy the file again, or correct its header",
        )
    problems.raise_as(ReadError)
    return values


def _numbers(cells: list[bytes], line: int, problems: Problems) -> Floats:
    try:
        values = np.array(cells, dtype=np.bytes_).astype(float)
    except ValueError:
        values = np.array([_number(cell) for cell in cells])
    wrong = np.isinf(values)
    for k in np.flatnonzero(wrong)[:1]:
        shown = cells[k].decode("utf-8", errors="replace")[:40]
        problems.add(item="the raster", found=f"'{shown}'", expected="numbers with a decimal point", line=line)
    return values


def _number(cell: bytes) -> float:
    """Return a number; infinity for what is none."""
    try:
        return float(cell)
    except ValueError:
        return math.inf


# --- GeoTIFF


@contextmanager
def _tiff(path: Path) -> Iterator[Any]:
    """Open a GeoTIFF of one band; what is wrong with it is one line."""
    try:
        import rasterio
    except ImportError:
        raise ReadError(
            _problem(
                path,
                found="a GeoTIFF, and rasterio is not installed, which reads it",
                remedy="install basinrain[raster]",
            )
        ) from None
    if not read_bytes(path, size=4, expected="a GeoTIFF").startswith(_TIFF):
        raise ReadError(_problem(path, found="no TIFF file", expected="a GeoTIFF, as its suffix says"))
    with warnings.catch_warnings():
        # A file without a position is refused by its caller.
        warnings.simplefilter("ignore", rasterio.errors.NotGeoreferencedWarning)
        try:
            # Of all the formats that the library knows, some of which name places on the network, this one only.
            file = rasterio.open(path, driver="GTiff")
        except rasterio.errors.RasterioIOError as error:
            raise ReadError(_problem(path, found=f"that it is damaged ({error})", remedy="copy it again")) from None
        with file:
            if file.count != 1:
                raise ReadError(
                    _problem(
                        path,
                        found=f"{file.count} bands",
                        expected="one, of one duration and frequency",
                        remedy="write each band to a file of its own",
                    )
                )
            yield file

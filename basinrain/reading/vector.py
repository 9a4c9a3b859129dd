"""Vector files (GeoJSON, GeoPackage, Shapefile and what else GDAL reads).

Attributes come as text, as the cells of a delimited file do, and geometries in two dimensions.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt
import pandas as pd
import pyogrio
import pyproj
import shapely

from basinrain import ground
from basinrain.errors import Problem, Problems, ReadError, nearest_name
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.files import read_bytes

__all__ = ["VectorTable", "add_no_crs", "read_vector", "settled_crs"]

_WHOLE: Final = 2.0**53


@dataclass(frozen=True, eq=False)
class VectorTable:
    """The features of one layer.

    Parameters
    ----------
    cells : DelimitedTable
        The attributes as text, a null as ``""``, a whole number without a decimal point; ``lines`` are the features'
        numbers from 1.
    geometry : array of shapely geometries or None, shape (n_features,)
        In x, y; without height or measure.
    crs : str or None
        The coordinate system that the file names; None where it names none.
    assumed : bool
        Whether ``crs`` is longitude and latitude only because GeoJSON means that where nothing else is said.
    """

    cells: DelimitedTable
    geometry: npt.NDArray[np.object_]
    crs: str | None
    assumed: bool


def read_vector(path: Path, *, layer: str | None = None) -> VectorTable:
    """Read one layer of a vector file.

    Parameters
    ----------
    path
        The file; a folder only where it is a file geodatabase (``.gdb``).
    layer
        The layer's name; needed where the file has several.

    Returns
    -------
    VectorTable

    Raises
    ------
    ReadError
        The file is missing, a folder, unreadable, empty or no vector file; it has several layers and none is named; the
        named one is not there; it has no features.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "basins.geojson"
    >>> _ = path.write_text(
    ...     '{"type": "Feature", "properties": {"code": 17},'
    ...     ' "geometry": {"type": "Polygon", "coordinates": [[[8, 47], [9, 47], [9, 48], [8, 47]]]}}'
    ... )
    >>> table = read_vector(path)
    >>> table.crs, table.assumed, table.cells.frame["code"].tolist(), str(table.geometry[0])
    ('EPSG:4326', True, ['17'], 'POLYGON ((8 47, 9 47, 9 48, 8 47))')
    """
    file = str(path)
    if not (path.is_dir() and path.suffix.lower() == ".gdb"):
        read_bytes(path, size=1, expected="features")
    try:
        with warnings.catch_warnings():
            # GDAL warns of what is checked below, and of measures, which are not used.
            warnings.simplefilter("ignore")
            name = _layer(path, layer, file)
            meta, _, wkb, fields = pyogrio.raw.read(path, layer=name, force_2d=True)
            driver = pyogrio.read_info(path, layer=name)["driver"]
            geometry = shapely.from_wkb([] if wkb is None else wkb, on_invalid="ignore")
    except (RuntimeError, ValueError) as error:
        reason = str(error).splitlines()[0] if str(error) else type(error).__name__
        raise ReadError(
            Problem(
                item="the file",
                found=f"that it cannot be read as a vector file ({reason.removeprefix(file).strip(': ')})",
                expected="GeoJSON, GeoPackage, Shapefile or another format that GDAL reads",
                file=file,
            )
        ) from None
    if not len(geometry):
        raise ReadError(Problem(item="the file", found="no features in it", expected="features", file=file))
    columns = tuple(str(column) for column in meta["fields"])
    frame = pd.DataFrame(dict(zip(columns, (_texts(values) for values in fields), strict=True)), dtype=str)
    crs = _named(meta["crs"])
    return VectorTable(
        cells=DelimitedTable(file, columns, frame, np.arange(1, len(geometry) + 1), "."),
        geometry=np.asarray(geometry, dtype=object),
        crs=crs,
        assumed=driver == "GeoJSON" and crs == ground.LONLAT,
    )


def settled_crs(table: VectorTable, crs: str | None, problems: Problems) -> str:
    """Return the coordinate system to take a file's coordinates in: the given one, else the file's own.

    Parameters
    ----------
    table
    crs
        What the user says, a system that is known; it wins over what the file says.
    problems
        Takes the problem of a file without a coordinate system.

    Returns
    -------
    str
        ``""`` where there is none.
    """
    if crs is not None:
        return crs
    if table.crs is None:
        add_no_crs(problems)
        return ""
    return table.crs


def add_no_crs(problems: Problems) -> None:
    """Record that coordinates come without a reference system."""
    problems.add(
        item="the coordinates",
        found="no CRS",
        expected="their coordinate reference system",
        remedy='give crs = "EPSG:...", or crs = "local" for a site grid',
    )


def _layer(path: Path, layer: str | None, file: str) -> str:
    names = [str(name) for name, _ in pyogrio.list_layers(path)]
    if layer in names:
        return str(layer)
    if layer is not None:
        raise ReadError(
            Problem(
                item="layer",
                found=f"no layer '{layer}'",
                expected="a layer of the file",
                remedy=nearest_name(layer, names),
                file=file,
            )
        )
    if len(names) != 1:
        raise ReadError(
            Problem(
                item="layer",
                found=f"{len(names)} layers" + (f" ({', '.join(names)})" if names else ""),
                expected="one",
                remedy="name one with layer" if names else "",
                file=file,
            )
        )
    return names[0]


def _named(crs: str | None) -> str | None:
    """Return the horizontal system, by its code where it has one; None where the file says that it is undefined."""
    if not crs:
        return None
    parsed = pyproj.CRS.from_user_input(crs)
    if parsed.name.lower().startswith("undefined"):
        return None
    if parsed.is_compound:
        parsed = parsed.sub_crs_list[0]
    parsed = parsed.to_2d()
    authority = parsed.to_authority(min_confidence=100)
    return ":".join(authority) if authority else parsed.to_wkt()


def _texts(values: npt.NDArray[np.generic]) -> list[str]:
    """Return the text of attribute values, a null as ""."""

    def text(value: object) -> str:
        # Whole numbers beside a null arrive as floats.
        if isinstance(value, float) and value.is_integer() and abs(value) < _WHOLE:
            return str(int(value))
        return str(value).strip()

    null = pd.isna(values)
    if values.dtype.kind == "M":
        if values.dtype != np.dtype("datetime64[D]"):
            values = values.astype("datetime64[s]")
        return ["" if absent else str(value) for value, absent in zip(values, null, strict=True)]
    return ["" if absent else text(value) for value, absent in zip(values.tolist(), null, strict=True)]

"""Reading a gauge network from a table of text or from the points of a vector file."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt
import shapely

from basinrain import ground
from basinrain.errors import JobError, Problems, ReadError, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable, read_delimited
from basinrain.reading.gauge_rows import GaugeRows
from basinrain.reading.normals import MONTHS, normal_columns, read_normals
from basinrain.reading.options import option_problems
from basinrain.reading.service import service_times
from basinrain.reading.vector import VectorTable, add_no_crs, read_vector, settled_crs
from basinrain.units import depth_factor, length_factor

__all__ = ["read_gauges"]

_TEXT_SUFFIXES: Final = frozenset({".csv", ".tsv", ".txt", ".dat"})

# Common practice in station lists. A unit in a name counts only where it is the declared one.
_TRADE_NAMES: Final = MappingProxyType(
    {
        "id": "id gauge gauge_id gauge_no gage gage_id station station_id station_no site site_id site_no code",
        "name": "name gauge_name gage_name station_name site_name",
        "lon": "lon longitude long lng",
        "lat": "lat latitude",
        "x": "x easting east x_coord",
        "y": "y northing north y_coord",
        "elevation": "elevation elev altitude alt elevation_{length} elev_{length} altitude_{length}",
        "normal": "normal normal_annual annual_normal map normal_{depth} normal_annual_{depth} annual_normal_{depth}",
        "from": "from opened open start start_date from_date begin",
        "to": "to closed close end end_date to_date",
    }
)


def read_gauges(
    path: str | Path,
    *,
    crs: str | None = None,
    length_unit: str = "m",
    elevation_unit: str = "m",
    normal_unit: str = "mm",
    normal_period: str = "",
    columns: Mapping[str, str | Sequence[str]] | None = None,
    exclude: Sequence[str] = (),
    layer: str | None = None,
) -> GaugeNetwork:
    r"""Read a gauge network.

    Parameters
    ----------
    path
        Delimited text (``.csv``, ``.tsv``, ``.txt``, ``.dat``), or points in a vector file (GeoJSON, GeoPackage,
        Shapefile and others).
    crs
        The positions' coordinate system, or ``"local"`` for a flat site grid. Needed for columns of x and y; columns of
        longitude and latitude are EPSG:4326, and a vector file has its own, unless this says otherwise. Where a text
        file has both pairs, x and y are taken with a projected or local ``crs``, else longitude and latitude.
    length_unit
        Unit of local coordinates.
    elevation_unit, normal_unit
        Units of the elevations and the normals.
    normal_period
        The years of the normals: ``"1991-2020"``.
    columns
        The column of each of ``id``, ``name``, ``lon``, ``lat``, ``x``, ``y``, ``elevation``, ``normal`` (of the year),
        ``normals`` (a list of twelve, January first), ``from`` and ``to`` (in service); those not named are found by
        the names common in the trade.
    exclude
        Ids of gauges to leave out.
    layer
        The layer of a vector file.

    Returns
    -------
    GaugeNetwork
        In the file's order. Elevations in m and normals in mm, NaN where blank; ids as they are written. A gauge is in
        service from the start of the day (month, year) named in ``from`` to the end of the one named in ``to``.

    Raises
    ------
    ReadError
        With all problems of the file: no id or position columns, no coordinate system, blank or repeated ids, cells
        that are not numbers or dates, degrees that no place has, negative normals, excluded ids that are not there.
    JobError
        ``columns`` has a key that is not known, or ``crs`` or a unit is not known.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "gauges.csv"
    >>> _ = path.write_text("station,lon,lat,elev_m,to\n0501,-105.0,39.7,1600,\n0502,-105.2,39.9,,2031-06-30\n")
    >>> network = read_gauges(path)
    >>> network.ids, network.crs, network.elevation.tolist(), [str(time) for time in network.closed]
    (('0501', '0502'), 'EPSG:4326', [1600.0, nan], ['NaT', '2031-07-01T00:00:00'])
    """
    path = Path(path)
    mapped = _checked_mapping(columns or {})
    factors = dict.fromkeys(("length", "elevation", "normal"), np.nan)
    faults = Problems()
    with option_problems(faults, file=str(path), item="[gauges] length_unit"):
        factors["length"] = length_factor(length_unit)
    with option_problems(faults, file=str(path), item="[gauges] elevation_unit"):
        factors["elevation"] = length_factor(elevation_unit)
    with option_problems(faults, file=str(path), item="[gauges] normal_unit"):
        factors["normal"] = depth_factor(normal_unit)
    with option_problems(faults, file=str(path), item="[gauges] crs"):
        _ = None if crs is None else ground.parse_crs(crs)
    faults.raise_as(JobError)

    vector = None if path.suffix.lower() in _TEXT_SUFFIXES else read_vector(path, layer=layer)
    table = read_delimited(path) if vector is None else vector.cells
    problems = Problems(file=table.file)
    units = {"length": elevation_unit, "depth": normal_unit}

    def column(key: str) -> str | None:
        named = mapped.get(key)
        wanted = _TRADE_NAMES[key].format(**units).lower().split()
        return find_column(
            table.columns, wanted, mapped=None if named is None else str(named), key=key, problems=problems
        )

    found = {key: column(key) for key in _TRADE_NAMES}
    normal_cells = normal_columns(table.columns, mapped, found["normal"], problems)
    id_column = found["id"]
    if id_column is None:
        if "id" not in mapped:
            problems.add(
                item="the gauges' ids",
                found="no column for them among " + ", ".join(table.columns) if table.columns else "no columns",
                expected="a column such as id, gauge or station",
                remedy='name it with columns = { id = "..." }',
            )
        problems.raise_as(ReadError)
    assert id_column is not None  # noqa: S101 - the problem above has been raised

    rows, geometry = _kept(table, id_column, exclude, vector, problems)
    if vector is None:
        x, y, used_crs, x_column, y_column = _columns_xy(rows, found, mapped, crs)
    else:
        x, y, used_crs = _points_xy(rows, geometry, vector, crs)
        x_column = y_column = ""
    if used_crs and ground.is_geographic(used_crs):
        _check_degrees(rows, x, y, x_column, y_column)
    scale = factors["length"] if used_crs == ground.LOCAL else 1.0
    elevation = rows.numbers(found["elevation"]) * factors["elevation"] if found["elevation"] else np.empty(0)
    normals = read_normals(rows, normal_cells, factors["normal"])
    names = tuple(rows.table.frame[found["name"]]) if found["name"] else rows.ids
    opened, closed = service_times(rows, found["from"], found["to"])
    problems.raise_as(ReadError)
    return GaugeNetwork(
        ids=rows.ids,
        x=x * scale,
        y=y * scale,
        crs=used_crs,
        names=tuple(name or gauge for name, gauge in zip(names, rows.ids, strict=True)),
        elevation=elevation,
        normals=normals,
        normal_period=normal_period,
        opened=opened,
        closed=closed,
    )


def _checked_mapping(columns: Mapping[str, str | Sequence[str]]) -> dict[str, str | tuple[str, ...]]:
    problems = Problems()
    known = [*_TRADE_NAMES, "normals"]
    mapped: dict[str, str | tuple[str, ...]] = {}
    for key, value in columns.items():
        if key not in known:
            problems.add(
                item="[gauges] columns", found=f"'{key}'", expected="a known key", remedy=nearest_name(key, known)
            )
        elif key == "normals":
            if isinstance(value, str) or len(value) != len(MONTHS):
                problems.add(
                    item="[gauges] columns.normals",
                    found=f"'{value}'" if isinstance(value, str) else f"{len(value)} columns",
                    expected="a list of 12 columns, January first",
                )
            mapped[key] = tuple(value)
        elif isinstance(value, str):
            mapped[key] = value
        else:
            problems.add(item=f"[gauges] columns.{key}", found=f"{list(value)}", expected="the name of one column")
    problems.raise_as(JobError)
    return mapped


def _kept(
    table: DelimitedTable, id_column: str, exclude: Sequence[str], vector: VectorTable | None, problems: Problems
) -> tuple[GaugeRows, npt.NDArray[np.object_]]:
    """Return the rows without the excluded gauges, their ids checked."""
    all_ids = table.frame[id_column].tolist()
    for gauge in dict.fromkeys(exclude):
        if gauge not in all_ids:
            problems.add(
                item="exclude",
                found=f"'{gauge}', which is not in the file",
                expected="ids of gauges",
                remedy=nearest_name(gauge, dict.fromkeys(name for name in all_ids if name)),
                gauge=gauge,
            )
    left = np.asarray([row for row, gauge in enumerate(all_ids) if gauge not in set(exclude)], dtype=np.intp)
    kept = DelimitedTable(
        table.file, table.columns, table.frame.iloc[left].reset_index(drop=True), table.lines[left], table.decimal
    )
    rows = GaugeRows(kept, vector is not None, tuple(kept.frame[id_column]), problems)
    if not len(left):
        problems.add(item="the gauges", found="none left after exclude", expected="at least one")
    first: dict[str, int] = {}
    place = "feature" if vector is not None else "line"
    for row, gauge in enumerate(rows.ids):
        if not gauge:
            rows.add(row, column=id_column, found="a blank id", expected="an id for every gauge")
        elif gauge in first:
            rows.add(
                row,
                column=id_column,
                found=f"the id again, first on {place} {rows.table.lines[first[gauge]]}",
                expected="each gauge once",
                remedy="rename or remove one of them",
            )
        else:
            first[gauge] = row
    return rows, np.empty(0, dtype=object) if vector is None else vector.geometry[left]


def _columns_xy(
    rows: GaugeRows, found: Mapping[str, str | None], mapped: Mapping[str, object], crs: str | None
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64], str, str, str]:
    """Return x, y, their coordinate system and their columns; empty where that is a problem."""
    nothing = np.empty(0)
    lonlat, xy = (found["lon"], found["lat"]), (found["x"], found["y"])
    planar = (crs is not None and not ground.is_geographic(crs)) or bool({"x", "y"} & set(mapped))
    if planar or (not all(lonlat) and all(xy)):
        pair, keys = xy, ("x", "y")
    else:
        pair, keys = lonlat, ("lon", "lat")
    if not any((*lonlat, *xy)):
        rows.problems.add(
            item="the gauges' positions",
            found="no columns for them among " + ", ".join(rows.table.columns),
            expected="columns such as lon and lat, or x and y",
            remedy='name them with columns = { lon = "...", lat = "..." } or { x = "...", y = "..." }',
        )
        return nothing, nothing, "", "", ""
    for key, name in zip(keys, pair, strict=True):
        if name is None and key not in mapped:
            rows.problems.add(
                item="the gauges' positions",
                found=f"no column for {key} among " + ", ".join(rows.table.columns),
                expected=" and ".join(keys) + (f", since crs is '{crs}'" if crs is not None else ""),
                remedy=f'name it with columns = {{ {key} = "..." }}',
            )
    if crs is None and keys == ("x", "y"):
        add_no_crs(rows.problems)
    x, y = (rows.numbers(name, blank=False) if name else nothing for name in pair)
    return x, y, crs or (ground.LONLAT if keys == ("lon", "lat") else ""), pair[0] or "", pair[1] or ""


def _points_xy(
    rows: GaugeRows, geometry: npt.NDArray[np.object_], vector: VectorTable, crs: str | None
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64], str]:
    points = geometry.copy()
    # Some formats write every point as a collection of one.
    lone = (shapely.get_type_id(points) == shapely.GeometryType.MULTIPOINT) & (shapely.get_num_geometries(points) == 1)
    points[lone] = shapely.get_geometry(points[lone], 0)
    is_point = (shapely.get_type_id(points) == shapely.GeometryType.POINT) & ~shapely.is_empty(points)
    for row in np.flatnonzero(~is_point):
        found = "no geometry" if points[row] is None or points[row].is_empty else f"a {points[row].geom_type}"
        rows.add(int(row), column="", found=found, expected="a point")
    x, y = shapely.get_x(points), shapely.get_y(points)
    for row in np.flatnonzero(is_point & ~(np.isfinite(x) & np.isfinite(y))):
        rows.add(int(row), column="", found=f"position ({x[row]}, {y[row]})", expected="two finite coordinates")
    return x, y, settled_crs(vector, crs, rows.problems)


def _check_degrees(
    rows: GaugeRows, x: npt.NDArray[np.float64], y: npt.NDArray[np.float64], x_column: str, y_column: str
) -> None:
    if len(x) != len(y):
        return
    with np.errstate(invalid="ignore"):
        outside = (np.abs(x) > 180) | (np.abs(y) > 90)
    for row in np.flatnonzero(outside):
        rows.add(
            int(row),
            column=y_column if abs(x[row]) <= 180 else x_column,
            found=f"longitude {x[row]:.10g} and latitude {y[row]:.10g}",
            expected="degrees that a place can have",
            remedy=ground.degree_fault(float(x[row]), float(y[row])),
        )

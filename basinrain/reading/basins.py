"""Reading basins: polygons of a vector file, repaired where that changes nothing and refused where it would."""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path
from typing import Final, Literal

import numpy as np
import numpy.typing as npt
import shapely

from basinrain import ground
from basinrain.basins import UNION, Basins
from basinrain.errors import JobError, Problems, ReadError, unknown
from basinrain.notes import Note
from basinrain.reading.columns import find_column, numbers
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.options import option_problems
from basinrain.reading.vector import VectorTable, read_vector, settled_crs
from basinrain.units import area_factor, length_factor

__all__ = ["read_basins"]

_REPAIR_CHANGE: Final = 1e-4
_REPEATED: Final = ("refuse", "merge")
_POLYGONS: Final = (shapely.GeometryType.POLYGON, shapely.GeometryType.MULTIPOLYGON)


def read_basins(
    path: str | Path,
    *,
    layer: str | None = None,
    id: str | None = None,  # noqa: A002 - the job file's word
    repeated: Literal["refuse", "merge"] = "refuse",
    crs: str | None = None,
    length_unit: str = "m",
    area: str | None = None,
    area_unit: str = "km2",
    lowest: str | None = None,
    highest: str | None = None,
    elevation_unit: str = "m",
) -> tuple[Basins, tuple[Note, ...]]:
    """Read basins from a vector file.

    Parameters
    ----------
    path
        GeoJSON, GeoPackage, Shapefile or another vector file that GDAL reads; heights are dropped.
    layer
        The layer's name, where the file has several.
    id
        The column of the basins' ids; without it they are numbered from 1 in the file's order.
    repeated
        What an id on several polygons means: a mistake (``"refuse"``), or parts of one basin (``"merge"``).
    crs
        The coordinate system, or ``"local"``, instead of the one that the file names.
    length_unit
        Unit of local coordinates.
    area, area_unit
        The column of official areas, and its unit. Merged polygons keep an area on which all agree, else have the sum.
    lowest, highest, elevation_unit
        The columns of each basin's lowest and highest ground, and their unit.

    Returns
    -------
    Basins
        In the file's coordinate system.
    tuple of Note
        A ``basin-repaired`` for every polygon that crossed or touched itself and was repaired.

    Raises
    ------
    ReadError
        With all problems of the file: no coordinate system or one that the coordinates do not fit, no such column, ids
        blank, repeated or ``"union"``, geometries missing, empty, without area or not polygons, polygons that a repair
        would change by 0.01 % of their area or more, official areas or elevations that are no numbers.
    JobError
        ``repeated``, ``crs`` or a unit is not known.

    Notes
    -----
    A polygon is repaired only when three measures of its area agree: the one by the shoelace formula of its rings,
    which counts the lobes of a figure-eight against each other, and those of two repairs that rest on different rules
    (what the rings enclose; what an odd number of their lines encloses).

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "basins.geojson"
    >>> _ = path.write_text(
    ...     '{"type": "Feature", "properties": {"code": "upper"},'
    ...     ' "geometry": {"type": "Polygon", "coordinates": [[[0, 0], [2, 0], [2, 1], [0, 1], [0, 0]]]}}'
    ... )
    >>> basins, notes = read_basins(path, id="code", crs="local", length_unit="km")
    >>> basins.ids, basins.areas, notes
    (('upper',), array([2000000.]), ())
    """
    file = str(path)
    length = area_in_m2 = height = np.nan
    faults = Problems(file=file)
    if repeated not in _REPEATED:
        faults.include(unknown("[basins] repeated", repeated, _REPEATED))
    with option_problems(faults, file=file, item="[basins] length_unit"):
        length = length_factor(length_unit)
    with option_problems(faults, file=file, item="[basins] area_unit"):
        area_in_m2 = area_factor(area_unit)
    with option_problems(faults, file=file, item="[basins] elevation_unit"):
        height = length_factor(elevation_unit)
    with option_problems(faults, file=file, item="[basins] crs"):
        _ = None if crs is None else ground.parse_crs(crs)
    faults.raise_as(JobError)
    table = read_vector(Path(path), layer=layer)
    cells = table.cells
    problems = Problems(file=cells.file)
    used_crs = settled_crs(table, crs, problems)
    ids = _ids(cells, id, problems)
    names = [f"feature {number}" + (f", basin {basin}" if id else "") for number, basin in enumerate(ids, 1)]
    official = _column_values(cells, area, "area", names, problems) * area_in_m2
    low = _column_values(cells, lowest, "lowest", names, problems) * height
    high = _column_values(cells, highest, "highest", names, problems) * height

    polygons = _polygons(table, names, problems)
    if used_crs == ground.LOCAL:
        polygons = shapely.transform(polygons, lambda xy: xy * length)
    elif used_crs and ground.is_geographic(used_crs):
        polygons = _in_degrees(polygons, table, names, problems, crs_given=crs is not None)
    notes = _repair(polygons, ids, names, problems)
    if id is not None:
        _check_repeated(ids, repeated, problems)
    problems.raise_as(ReadError)
    if len(set(ids)) < len(ids):
        ids, polygons, official, low, high = _merged(ids, polygons, official, low, high)
    basins = Basins(
        ids=tuple(ids),
        polygons=polygons,
        crs=used_crs,
        official_areas=official,
        elevations=np.column_stack([low, high]),
    )
    return basins, tuple(notes)


def _column(cells: DelimitedTable, name: str, key: str, problems: Problems) -> str | None:
    return find_column(cells.columns, (), mapped=name, key=key, problems=problems)


def _ids(cells: DelimitedTable, column: str | None, problems: Problems) -> list[str]:
    numbered = [str(number) for number in range(1, len(cells.lines) + 1)]
    if column is None or (named := _column(cells, column, "id", problems)) is None:
        return numbered
    ids = [str(basin) for basin in cells.frame[named]]
    for number, basin in enumerate(ids, 1):
        if not basin:
            problems.add(item=f"feature {number}", found="a blank id", expected="an id for every basin", column=named)
        elif basin == UNION:
            problems.add(
                item=f"feature {number}",
                found=f"the id '{UNION}', which stands for all basins together",
                expected="another id",
                remedy="rename the basin",
                column=named,
            )
    return ids


def _check_repeated(ids: Sequence[str], repeated: str, problems: Problems) -> None:
    if repeated == "merge":
        return
    features: dict[str, list[int]] = {}
    for number, basin in enumerate(ids, 1):
        features.setdefault(basin, []).append(number)
    for basin, where in features.items():
        if basin and len(where) > 1:
            problems.add(
                item=f"basin {basin}",
                found="the id on features " + ", ".join(map(str, where)),
                expected="each id once",
                remedy='correct the ids, or join the polygons of one id with repeated = "merge"',
                basin=basin,
            )


def _column_values(
    cells: DelimitedTable, column: str | None, key: str, names: Sequence[str], problems: Problems
) -> npt.NDArray[np.float64]:
    """Return a column of areas or elevations as the file has them; NaN where it has none."""
    if column is None or (named := _column(cells, column, key, problems)) is None:
        return np.full(len(names), np.nan)
    values, bad = numbers(cells, named)
    if key == "area":
        bad = bad | (values <= 0)
    for place in np.flatnonzero(bad).tolist():
        problems.add(
            item=names[place],
            found=f"'{cells.frame[named].iloc[place]}'",
            expected="an area above 0, or none" if key == "area" else "an elevation, or none",
            column=named,
        )
    return values


def _polygons(table: VectorTable, names: Sequence[str], problems: Problems) -> npt.NDArray[np.object_]:
    """Return the polygons; None in place of what is none, which is a problem."""
    polygons = table.geometry.copy()
    kinds, empty = shapely.get_type_id(polygons), shapely.is_empty(polygons)
    for place, geometry in enumerate(polygons):
        found = ""
        if geometry is None or empty[place]:
            found = "no geometry" if geometry is None else "an empty geometry"
        elif kinds[place] not in _POLYGONS:
            found = f"a {geometry.geom_type}"
        elif not np.isfinite(shapely.get_coordinates(geometry)).all():
            found = "a coordinate that is not finite"
        if found:
            problems.add(item=names[place], found=found, expected="a polygon", remedy="correct or remove it")
            polygons[place] = None
    return polygons


def _in_degrees(
    polygons: npt.NDArray[np.object_],
    table: VectorTable,
    names: Sequence[str],
    problems: Problems,
    *,
    crs_given: bool,
) -> npt.NDArray[np.object_]:
    """Return the polygons that lie on the globe and do not jump across it; None in place of the others."""
    checked = polygons.copy()
    for place, bounds in enumerate(shapely.bounds(polygons)):
        if polygons[place] is None:
            continue
        west, south, east, north = (float(value) for value in bounds)
        lon, lat = (max(pair, key=abs) for pair in ((west, east), (south, north)))
        fault = ground.degree_fault(lon, lat)
        if fault and table.assumed and not crs_given and "projected" in fault:
            problems.add(
                item=names[place],
                found=f"no CRS, and coordinates such as {lon:.10g} {lat:.10g}",
                expected="longitudes and latitudes, since the file names no other system",
                remedy='the coordinates look projected: give crs = "EPSG:...", or crs = "local"',
            )
        elif fault:
            problems.add(
                item=names[place],
                found=f"longitude {lon:.10g} and latitude {lat:.10g}",
                expected="degrees that a place can have",
                remedy=fault,
            )
        elif east - west > 180 and _longest_step(polygons[place]) > 180:
            problems.add(
                item=names[place],
                found="an edge across more than 180 degrees of longitude",
                expected="polygons cut at the antimeridian (RFC 7946, section 3.1.9)",
                remedy="cut it there, or give it in a projected system",
            )
            fault = "jump"
        if fault:
            checked[place] = None
    return checked


def _longest_step(polygon: shapely.Geometry) -> float:
    """Return the longest step in longitude along any ring."""
    rings = shapely.get_rings(shapely.get_parts(polygon))
    return max(float(np.abs(np.diff(shapely.get_coordinates(ring)[:, 0])).max()) for ring in rings)


def _repair(
    polygons: npt.NDArray[np.object_], ids: Sequence[str], names: Sequence[str], problems: Problems
) -> list[Note]:
    """Repair in place what can be repaired without a change; polygons that are None are passed over."""
    notes: list[Note] = []
    present = np.asarray([polygon is not None for polygon in polygons])
    for place in np.flatnonzero(present & ~shapely.is_valid(polygons)).tolist():
        polygon = polygons[place]
        reason = re.sub(
            r"\[(\S+) (\S+)\]",
            lambda at: f" at ({float(at[1]):.10g}, {float(at[2]):.10g})",
            shapely.is_valid_reason(polygon),
        ).lower()
        repaired = shapely.make_valid(polygon, method="structure", keep_collapsed=False)
        by_lines = shapely.make_valid(polygon, method="linework")
        if max(polygon.area, repaired.area, by_lines.area) <= 0:
            continue
        change = max(abs(other.area - polygon.area) for other in (repaired, by_lines))
        if repaired.geom_type in ("Polygon", "MultiPolygon") and change < _REPAIR_CHANGE * polygon.area:
            polygons[place] = repaired
            percent = 100 * change / polygon.area
            by = "less than 0.0001" if percent < 1e-4 else f"{percent:.4f}"
            notes.append(
                Note(
                    code="basin-repaired",
                    level="info",
                    basin=ids[place],
                    text=f"Basin {ids[place]} was repaired: {reason}; its area changed by {by} %.",
                )
            )
        else:
            problems.add(
                item=names[place],
                found=f"a polygon that cannot be repaired without changing its area: {reason}",
                expected="rings that neither cross themselves nor each other",
                remedy="correct it",
                basin=ids[place],
            )
            polygons[place] = None
    for place, polygon in enumerate(polygons):
        if polygon is not None and polygon.area <= 0:
            problems.add(
                item=names[place],
                found="a polygon that encloses no area",
                expected="a polygon with an area",
                remedy="correct or remove it",
                basin=ids[place],
            )
    return notes


def _merged(
    ids: Sequence[str],
    polygons: npt.NDArray[np.object_],
    official: npt.NDArray[np.float64],
    low: npt.NDArray[np.float64],
    high: npt.NDArray[np.float64],
) -> tuple[
    list[str],
    npt.NDArray[np.object_],
    npt.NDArray[np.float64],
    npt.NDArray[np.float64],
    npt.NDArray[np.float64],
]:
    """Return one basin an id, in the order in which the ids first stand."""
    places: dict[str, list[int]] = {}
    for place, basin in enumerate(ids):
        places.setdefault(basin, []).append(place)
    merged = np.empty(len(places), dtype=object)
    areas, lowest, highest = np.empty((3, len(places)))
    for row, where in enumerate(places.values()):
        merged[row] = shapely.union_all(polygons[where])
        values = official[where]
        areas[row] = values[0] if (values == values[0]).all() else values.sum()
        lowest[row], highest[row] = low[where].min(), high[where].max()
    return list(places), merged, areas, lowest, highest

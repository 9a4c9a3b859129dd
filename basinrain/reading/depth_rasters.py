"""Rasters of depths, one for every duration and frequency, to the depths of the cells over the basins."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.basins import Basins
from basinrain.designstorm.cell_weights import CellGrid, CellWeights, cell_weights
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import UNITS, depth_words, duration_text, in_mm
from basinrain.designstorm.point_depths import PointDepths
from basinrain.designstorm.reach import SLACK
from basinrain.errors import JobError, Problems, ReadError
from basinrain.reading.options import option_problems
from basinrain.reading.raster_files import read_cells, read_grid
from basinrain.weights import WeightTable

__all__ = ["RasterFile", "read_depth_rasters"]

Floats = npt.NDArray[np.float64]

_TABLE: Final = "[[design.depths.raster]]"

_NEAR: Final = 1e-4
"""Corners of one grid may differ by this share of a cell, as headers with rounded numbers have it."""

_SLIVER: Final = 1e-6
"""A basin may have so small a share of its area in cells without data; its other cells stand for it."""


@dataclass(frozen=True)
class RasterFile:
    """A raster of the depths of one duration and frequency.

    Parameters
    ----------
    path : Path
        An ESRI ASCII grid (``.asc``) or a GeoTIFF (``.tif``).
    minutes : float
        The duration in minutes.
    frequency : Frequency
        How often the depths are exceeded.
    """

    path: Path
    minutes: float
    frequency: Frequency

    @property
    def words(self) -> str:
        """Duration and frequency, for messages."""
        return f"{duration_text(self.minutes)}, {self.frequency.label}"


def read_depth_rasters(
    files: Sequence[RasterFile], basins: Basins, *, unit: str, crs: str | None = None, source: str, date: str
) -> tuple[PointDepths, WeightTable]:
    r"""Read rasters of depths over basins.

    Parameters
    ----------
    files
        One for every one of the durations at every one of the frequencies, in any order.
    basins
        In the working plane.
    unit
        Of the values, one of :data:`~basinrain.designstorm.measures.UNITS`; per hour means intensity. Never guessed.
    crs
        The rasters' coordinate system, ``"local"`` for metres of a site grid; wins over what the files say.
    source, date
        Where the depths come from, and of when they are.

    Returns
    -------
    depths : PointDepths
        A point for every cell that holds part of a basin, named by row and column of the raster, counted from 1 from
        its first value; placed at the cell's centre.
    weights : WeightTable
        The share of every basin in these cells; ``weights @`` the depths of one duration and frequency are the means
        over the basins.

    Raises
    ------
    JobError
        The unit or ``crs`` is not known; durations and frequencies are not complete, one stands twice, or frequencies
        are counted in different series.
    ReadError
        A file is missing or no raster (all such files together); the rasters do not lie on one grid; a value is no
        depth above 0, or missing over more than a millionth of a basin; depths fall with duration or with rarity, or
        intensities rise with duration, told with the number of cells and the worst of them.
    DataError
        A basin is not covered; basins and rasters cannot be brought together.

    Examples
    --------
    >>> import tempfile, shapely
    >>> folder = Path(tempfile.mkdtemp())
    >>> head = "ncols 2\nnrows 1\nxllcorner 0\nyllcorner 0\ncellsize 1000\n"
    >>> _ = (folder / "1h.asc").write_text(head + "30 40\n"), (folder / "2h.asc").write_text(head + "36 50\n")
    >>> two = Frequency(2.0, "annual-maximum")
    >>> basins = Basins(ids=("strip",), polygons=[shapely.box(500, 0, 2000, 1000)], crs="local")
    >>> depths, weights = read_depth_rasters(
    ...     [RasterFile(folder / "1h.asc", 60.0, two), RasterFile(folder / "2h.asc", 120.0, two)],
    ...     basins,
    ...     unit="mm",
    ...     crs="local",
    ...     source="invented",
    ...     date="2031",
    ... )
    >>> depths.points, depths.positions.tolist()
    (('row 1 column 1', 'row 1 column 2'), [[500.0, 500.0], [1500.0, 500.0]])
    >>> (weights.weights @ depths.at(np.array([60.0, 120.0]), two)).round(3)  # 1/3 x 30 + 2/3 x 40, 1/3 x 36 + 2/3 x 50
    array([[36.667, 45.333]])
    """
    minutes, frequencies, places = _axes(files, unit, crs)
    found = cell_weights(basins, _one_grid(files, crs))
    depth, kept = _depths(files, places, (len(minutes), len(frequencies)), found, unit=unit)
    weights = found.table.weights[:, kept]
    table = replace(
        found.table,
        gauges=tuple(found.ids[k] for k in np.flatnonzero(kept)),
        weights=weights / weights.sum(axis=1, keepdims=True),
    )
    _require_order(files, minutes, frequencies, depth[kept], cells=table.gauges, unit=unit)
    depths = PointDepths(
        points=table.gauges,
        durations=minutes,
        return_periods=np.array([frequency.return_period for frequency in frequencies]),
        depth=depth[kept],
        series=frequencies[0].series,
        source=source,
        date=date,
        positions=found.grid.centres(found.rows[kept], found.columns[kept]),
        crs=found.grid.crs,
    )
    return depths, table


def _axes(
    files: Sequence[RasterFile], unit: str, crs: str | None
) -> tuple[Floats, list[Frequency], list[tuple[int, int]]]:
    """Return durations and frequencies, rising, and the place of every file on the two."""
    problems = Problems()
    problems.check_known("[design.depths] unit", unit, UNITS)
    with option_problems(problems, item="[design.depths] crs"):
        _ = None if crs is None else ground.parse_crs(crs)
    if not files:
        problems.add(item=_TABLE, found="none", expected="a raster for every duration and frequency")
    for file in files:
        if not (math.isfinite(file.minutes) and file.minutes > 0):
            problems.add(item=f"{_TABLE} duration", found=f"{file.minutes:g} minutes", expected="more than 0")
    series = {file.frequency.series for file in files}
    if len(series) > 1:
        problems.add(
            item=_TABLE, found="frequencies of both " + " and ".join(sorted(series)), expected="one series for all"
        )
    problems.raise_as(JobError)
    minutes = sorted({file.minutes for file in files})
    frequencies = sorted({file.frequency for file in files})
    places = [(minutes.index(file.minutes), frequencies.index(file.frequency)) for file in files]
    seen: dict[tuple[int, int], RasterFile] = {}
    for file, place in zip(files, places, strict=True):
        if place in seen:
            problems.add(
                item=f"{_TABLE} of {file.words}",
                found=f"two: {seen[place].path} and {file.path}",
                expected="one",
                remedy="remove one",
            )
        seen.setdefault(place, file)
    for d, t in sorted({(d, t) for d in range(len(minutes)) for t in range(len(frequencies))} - set(seen)):
        problems.add(
            item=f"{_TABLE} of {duration_text(minutes[d])}, {frequencies[t].label}",
            found="none",
            expected="a raster for every duration at every frequency",
            remedy="add it",
        )
    problems.raise_as(JobError)
    return np.array(minutes), frequencies, places


def _one_grid(files: Sequence[RasterFile], crs: str | None) -> CellGrid:
    """Return the grid on which all rasters lie."""
    problems = Problems()
    grids: list[tuple[Path, CellGrid]] = []
    for file in files:
        try:
            grids.append((file.path, read_grid(file.path, crs=crs)))
        except ReadError as error:
            problems.extend(error)
    for path, grid in grids[1:]:
        first = grids[0][1]
        if differing := _difference(grid, first):
            problems.add(
                item=f"the raster's {differing}",
                found=str(grid),
                expected=f"that of {grids[0][0]}: {first}",
                remedy="bring all rasters to one grid",
                file=str(path),
            )
    problems.raise_as(ReadError)
    return grids[0][1]


def _difference(grid: CellGrid, first: CellGrid) -> str:
    if not ground.same_crs(grid.crs, first.crs):
        return "coordinate system"
    rows, columns = np.array([0, 0, first.n_rows, first.n_rows]), np.array([0, first.n_columns, 0, first.n_columns])
    if (grid.n_rows, grid.n_columns) != (first.n_rows, first.n_columns):
        return "shape"
    side = min(float(np.hypot(*first.across)), float(np.hypot(*first.down)))
    far = float(np.abs(grid.at(rows, columns) - first.at(rows, columns)).max()) > _NEAR * side
    return "position" if far else ""


def _depths(
    files: Sequence[RasterFile],
    places: Sequence[tuple[int, int]],
    shape: tuple[int, int],
    found: CellWeights,
    *,
    unit: str,
) -> tuple[Floats, npt.NDArray[np.bool_]]:
    """Return depths in mm, shape (n_cells, n_durations, n_frequencies), and the cells that have them all."""
    problems = Problems()
    depth = np.full((len(found.ids), *shape), np.nan)
    rows, columns = found.block
    basins = found.table.basins
    for file, place in zip(files, places, strict=True):
        try:
            read = read_cells(file.path, rows, columns)[found.rows - rows.start, found.columns - columns.start]
        except ReadError as error:
            problems.extend(error)
            continue
        own = in_mm(read, np.array(file.minutes), unit)
        wrong = np.flatnonzero(~np.isnan(own) & ~((own > 0) & np.isfinite(own)))
        if len(wrong):
            k = wrong[np.argmin(own[wrong])]
            problems.add(
                item=f"the raster of {file.words}",
                found=f"{_cells(len(wrong))} without a depth, such as {found.ids[k]} with {read[k]:g} {unit}",
                expected="depths above 0",
                remedy="correct the raster, or mark such cells as without data",
                file=str(file.path),
            )
        absent = found.table.weights[:, np.isnan(own)].sum(axis=1)
        for k in np.flatnonzero(absent > _SLIVER):
            problems.add(
                item=f"the raster of {file.words}",
                found=f"no data over {100 * absent[k]:.3g} % of basin {basins[k]}",
                expected="depths over the whole of it",
                remedy="use rasters that cover the basin; no data is not zero",
                file=str(file.path),
                basin=basins[k],
            )
        depth[:, *place] = own
    problems.raise_as(ReadError)
    return depth, ~np.isnan(depth).any(axis=(1, 2))


def _cells(n: int) -> str:
    return f"{n:,} cell" + ("s" if n > 1 else "")


def _require_order(
    files: Sequence[RasterFile],
    minutes: Floats,
    frequencies: Sequence[Frequency],
    depth: Floats,
    *,
    cells: Sequence[str],
    unit: str,
) -> None:
    """Refuse depths that fall with duration or rarity, and intensities that rise with duration, in a line for each."""
    paths = {(file.minutes, file.frequency): str(file.path) for file in files}
    problems = Problems()
    rate = depth / minutes[:, None]
    for axis, beyond, words, expected in (
        (
            1,
            1 - depth[:, 1:] / depth[:, :-1],
            "less depth in a longer duration",
            "depths that do not fall with duration",
        ),
        (
            2,
            1 - depth[:, :, 1:] / depth[:, :, :-1],
            "less depth at a rarer frequency",
            "depths that do not fall with rarity",
        ),
        (
            1,
            rate[:, 1:] / rate[:, :-1] - 1,
            "more intensity in a longer duration",
            "intensities that do not rise with duration",
        ),
    ):
        n = int((beyond > SLACK).any(axis=(1, 2)).sum())
        if not n:
            continue
        c, d, t = (int(k) for k in np.unravel_index(np.argmax(beyond), beyond.shape))
        longer, rarer = d + (axis == 1), t + (axis == 2)
        value = depth_words(depth[c, longer, rarer], minutes[longer], unit)
        other = depth_words(depth[c, d, t], minutes[d], unit)
        than = duration_text(minutes[d]) if axis == 1 else frequencies[t].label
        problems.add(
            item="the rasters",
            found=f"{_cells(n)} of {len(cells):,} with {words}, the worst {cells[c]} at "
            f"{duration_text(minutes[longer])}, {frequencies[rarer].label}: {value}, {100 * beyond[c, d, t]:.3g} % "
            f"{words.split()[0]} than the {other} of {than}",
            expected=expected,
            remedy="correct the rasters, or leave out a duration or frequency",
            file=paths[float(minutes[longer]), frequencies[rarer]],
        )
    problems.raise_as(ReadError)

"""Thiessen polygons: every point of a basin takes the depth of the gauge nearest to it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
import shapely
from scipy.spatial import KDTree, Voronoi

from basinrain.averaging.inputs import AREA_TOLERANCE, presence, require_one_plane, union_is_sum
from basinrain.averaging.registry import Weigher
from basinrain.basins import Basins
from basinrain.errors import DataError, MethodError, Problems
from basinrain.gauges import ONE_PLACE, GaugeNetwork
from basinrain.weights import WeightTable

__all__ = [
    "ThiessenPieces",
    "clip_basins",
    "prepare_thiessen",
    "thiessen_cells",
    "thiessen_pieces",
    "thiessen_weights",
    "with_far_points",
]

_FAR_POINTS: Final = 16
_FAR_RADII: Final = 10.0
"""Far points beyond everything close the outer cells. Any distance above 3 radii leaves the cells exact where gauges
and basins are; far ones (1e6 radii) make the tessellation fail without a word."""

_SLIVER: Final = 1e-12
"""A piece under this share of its basin is rounding along a common edge, not an area."""


class ThiessenPieces(NamedTuple):
    """The parts of basins that are nearest to each gauge, one piece a row, by basin, then gauge.

    Parameters
    ----------
    basin, gauge : array of int, shape (n_pieces,)
        Which basin and which gauge, by their places in ``Basins`` and ``GaugeNetwork``.
    polygon : array of shapely Polygon or MultiPolygon, shape (n_pieces,)
    area : array of float, shape (n_pieces,)
        m²; the pieces of a basin sum to its area.
    """

    basin: npt.NDArray[np.int64]
    gauge: npt.NDArray[np.int64]
    polygon: npt.NDArray[np.object_]
    area: npt.NDArray[np.float64]


def thiessen_weights(
    network: GaugeNetwork,
    basins: Basins,
    present: Sequence[bool] | npt.NDArray[np.bool_] | None = None,
) -> WeightTable:
    """Return the Thiessen weights: the share of each basin's area that lies nearest to each gauge.

    Parameters
    ----------
    network, basins
        In one plane. Gauges outside the basins take part.
    present : array of bool, shape (n_gauges,), optional
        The gauges that count; all where not given.

    Returns
    -------
    WeightTable
        Rows sum to 1. Without any present gauge all rows are NaN, and ``covered`` is 0.

    Raises
    ------
    DataError
        Gauges and basins are not in one plane, or two present gauges stand at one place (under 0.01 m); all are named.
    MethodError
        The pieces of a basin do not sum to its area (to 1e-9 of it): a wrong tessellation is never passed on.

    Notes
    -----
    Thiessen, A. H. (1911), Precipitation averages for large areas, *Monthly Weather Review* 39, 1082-1084.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[2500.0, 7500.0, 11000.0], y=[5000.0] * 3, crs="local")
    >>> square = Basins(ids=("square",), polygons=[shapely.box(0, 0, 1e4, 1e4)], crs="local")
    >>> thiessen_weights(network, square).weights.round(12)
    array([[0.5  , 0.425, 0.075]])
    >>> thiessen_weights(network, square, [False, False, True]).weights  # one gauge is nearest everywhere
    array([[0., 0., 1.]])
    >>> thiessen_weights(network, square, [False] * 3).weights
    array([[nan, nan, nan]])
    """
    return prepare_thiessen(network, basins)(presence(network, present))


def prepare_thiessen(network: GaugeNetwork, basins: Basins) -> Weigher:
    """Check network and basins once and return what weighs any set of present gauges; see :func:`thiessen_weights`."""
    require_one_plane(network, basins)
    # Basins that do not overlap need no second clipping for their union.
    added = union_is_sum(basins)
    n_clipped = len(basins) - added

    def weigh(present: npt.NDArray[np.bool_]) -> WeightTable:
        mask = presence(network, present)
        weights = np.full((len(basins), len(network)), np.nan)
        if mask.any():
            pieces = clip_basins(network, basins, mask, n_clipped)
            weights[:] = 0.0
            weights[pieces.basin, pieces.gauge] = pieces.area
            if added:
                weights[-1] = weights[:-1].sum(axis=0)
            weights /= weights.sum(axis=1, keepdims=True)
        covered = np.full(len(basins), float(mask.any()))
        return WeightTable("thiessen", basins.ids, network.ids, weights, covered=covered)

    return weigh


def thiessen_cells(
    network: GaugeNetwork,
    present: Sequence[bool] | npt.NDArray[np.bool_] | None = None,
    *,
    around: tuple[float, float, float, float] | None = None,
) -> npt.NDArray[np.object_]:
    """Return the Thiessen cell of every gauge, shape (n_gauges,); None for a gauge that is not present.

    Parameters
    ----------
    network
        In a plane.
    present : array of bool, shape (n_gauges,), optional
        The gauges that count; all where not given.
    around : west, south, east, north, optional
        A box, such as ``basins.bounds``, in which the cells must be exact and leave nothing out. They are so in the box
        of the gauges in any case. Beyond both, the outer cells end somewhere.

    Raises
    ------
    DataError
        Two present gauges stand at one place.
    MethodError
        The tessellation left a gauge without a cell.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 10.0], y=[0.0, 0.0], crs="local")
    >>> cells = thiessen_cells(network, around=(-5.0, -5.0, 15.0, 5.0))
    >>> shapely.bounds(shapely.intersection(cells[0], shapely.box(-5, -5, 15, 5))).round(9)
    array([-5., -5.,  5.,  5.])
    """
    mask = presence(network, present)
    cells = np.full(len(network), None, dtype=object)
    at = np.flatnonzero(mask)
    if not len(at):
        return cells
    xy = np.column_stack((network.x[at], network.y[at]))
    _refuse_same_place(network, at, xy)
    points, centre, radius = with_far_points(xy, around)
    scaled = points[: len(at)]
    diagram = Voronoi(points)
    regions = [diagram.regions[k] for k in diagram.point_region[: len(at)]]
    without = Problems()
    for gauge, region in zip(at, regions, strict=True):
        if len(region) < 3 or -1 in region:
            without.add(
                item=f"gauge {network.ids[gauge]}",
                found="no Thiessen cell",
                expected="one cell for every gauge",
                remedy="check the gauge's position, and for one very near to it",
                gauge=network.ids[gauge],
            )
    without.raise_as(MethodError)
    cells[at] = _rings(diagram.vertices, regions, scaled, centre, radius)
    return cells


def thiessen_pieces(
    network: GaugeNetwork,
    basins: Basins,
    present: Sequence[bool] | npt.NDArray[np.bool_] | None = None,
) -> ThiessenPieces:
    """Return the part of every basin that is nearest to every gauge, as polygons; for maps and GeoJSON.

    Parameters and errors are those of :func:`thiessen_weights`. Without any present gauge there are no pieces. The
    union, where it is among the basins, is cut like any other row.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 10.0], y=[0.0, 0.0], crs="local")
    >>> basins = Basins(ids=("all",), polygons=[shapely.box(0, 0, 8, 1)], crs="local")
    >>> pieces = thiessen_pieces(network, basins)
    >>> [(network.ids[g], round(float(a), 9)) for g, a in zip(pieces.gauge, pieces.area)]
    [('A', 5.0), ('B', 3.0)]
    """
    require_one_plane(network, basins)
    mask = presence(network, present)
    if not mask.any():
        none = np.empty(0, dtype=np.int64)
        return ThiessenPieces(none, none, np.empty(0, dtype=object), np.empty(0))
    return clip_basins(network, basins, mask, len(basins))


def with_far_points(
    xy: npt.NDArray[np.float64], around: tuple[float, float, float, float] | None
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64], float]:
    """Return positions, shape (n, 2), and far points after them, centred and scaled; the centre; the radius in m.

    The circle of this radius about the centre holds the positions, and the box ``around`` where one is given.
    """
    corners = xy if around is None else np.vstack((xy, np.reshape(around, (2, 2))))
    low, high = corners.min(axis=0), corners.max(axis=0)
    centre = (low + high) / 2
    radius = max(float(np.hypot(*(high - low))) / 2, 1.0)
    turn = np.arange(_FAR_POINTS) * (2 * np.pi / _FAR_POINTS)
    helpers = _FAR_RADII * np.column_stack((np.cos(turn), np.sin(turn)))
    return np.vstack(((xy - centre) / radius, helpers)), centre, radius


def _refuse_same_place(network: GaugeNetwork, at: npt.NDArray[np.int64], xy: npt.NDArray[np.float64]) -> None:
    problems = Problems()
    for i, j in sorted(KDTree(xy).query_pairs(ONE_PLACE)):
        one, other = sorted((network.ids[at[i]], network.ids[at[j]]))
        problems.add(
            item=f"gauges {one} and {other}",
            found="one place for both",
            expected=f"gauges at least {ONE_PLACE} m apart",
            remedy='correct or remove one of them, or take their mean (colocated = "mean")',
            gauge=one,
        )
    problems.raise_as(DataError)


def _rings(
    vertices: npt.NDArray[np.float64],
    regions: list[list[int]],
    scaled: npt.NDArray[np.float64],
    centre: npt.NDArray[np.float64],
    radius: float,
) -> npt.NDArray[np.object_]:
    """Return the cells as polygons: vertices sorted by angle about their gauge, those that coincide taken once."""
    owner = np.repeat(np.arange(len(regions)), [len(region) for region in regions])
    xy = vertices[np.concatenate([np.asarray(region) for region in regions])]
    arm = xy - scaled[owner]
    order = np.lexsort((np.arctan2(arm[:, 1], arm[:, 0]), owner))
    owner, xy = owner[order], xy[order]
    # Gauges on a common circle give one vertex several times over, apart by rounding only and so in any order.
    first = np.searchsorted(owner, np.arange(len(regions)))
    before = np.arange(len(owner)) - 1
    before[first] = np.append(first[1:], len(owner)) - 1
    distinct = np.abs(xy - xy[before]).max(axis=1) > 1e-13
    rings = shapely.linearrings(xy[distinct] * radius + centre, indices=owner[distinct])
    return np.asarray(shapely.polygons(rings), dtype=object)


def clip_basins(network: GaugeNetwork, basins: Basins, mask: npt.NDArray[np.bool_], n_clipped: int) -> ThiessenPieces:
    """Cut the first ``n_clipped`` basins by the cells of the present gauges; prove that nothing is lost or doubled."""
    cells = thiessen_cells(network, mask, around=basins.bounds)
    polygons, areas = basins.polygons[:n_clipped], basins.areas[:n_clipped]
    if shapely.get_precision(polygons).any():
        # A polygon with a precision of its own would have the corners of its pieces rounded to it.
        polygons = np.asarray(shapely.set_precision(polygons, 0.0), dtype=object)
    at = np.flatnonzero(mask)
    nearby, basin = shapely.STRtree(polygons).query(cells[at])
    gauge = at[nearby]
    order = np.lexsort((gauge, basin))
    basin, gauge = basin[order], gauge[order]
    try:
        piece = shapely.intersection(_cut_to_boxes(polygons, cells, basin, gauge), cells[gauge])
        off = _off(basin, piece, areas)
    except shapely.GEOSException:
        piece, off = np.empty(len(basin), dtype=object), np.ones(n_clipped, dtype=bool)
    problems = Problems()
    for b in np.flatnonzero(off):
        # Without the short cut over boxes; what still fails has no answer.
        rows = slice(*np.searchsorted(basin, [b, b + 1]))
        try:
            piece[rows] = shapely.intersection(polygons[b], cells[gauge[rows]])
            found = f"pieces of {shapely.area(piece[rows]).sum():.10g} m²"
            failed = bool(_off(np.zeros(rows.stop - rows.start, dtype=np.int64), piece[rows], areas[b : b + 1])[0])
        except shapely.GEOSException as error:
            found, failed = f"no intersection with the Thiessen cells ({error})", True
        if failed:
            problems.add(
                item=f"basin {basins.ids[b]}",
                found=found,
                expected=f"pieces that sum to the basin's {areas[b]:.10g} m² (to {AREA_TOLERANCE:g} of it)",
                remedy="check the basin's polygon and the gauges' positions",
                basin=basins.ids[b],
            )
    problems.raise_as(MethodError)
    area = shapely.area(piece)
    kept = area > _SLIVER * areas[basin]
    return ThiessenPieces(basin[kept], gauge[kept], piece[kept], area[kept])


def _off(
    basin: npt.NDArray[np.int64], piece: npt.NDArray[np.object_], areas: npt.NDArray[np.float64]
) -> npt.NDArray[np.bool_]:
    """Return which basins' pieces do not sum to the basin's area."""
    total = np.bincount(basin, shapely.area(piece), minlength=len(areas))
    return np.asarray(~(np.abs(total - areas) <= AREA_TOLERANCE * areas))


def _cut_to_boxes(
    polygons: npt.NDArray[np.object_],
    cells: npt.NDArray[np.object_],
    basin: npt.NDArray[np.int64],
    gauge: npt.NDArray[np.int64],
) -> npt.NDArray[np.object_]:
    """Return the basin of every pair cut to the box of the pair's cell.

    Cutting to a box is cheap, and it spares the intersection all the vertices that are far from the cell.
    """
    cut = np.empty(len(basin), dtype=object)
    order = np.argsort(gauge, kind="stable")
    gauges, first = np.unique(gauge[order], return_index=True)
    boxes = shapely.bounds(cells[gauges])
    for box, rows in zip(boxes.tolist(), np.split(order, first[1:]), strict=True):
        cut[rows] = shapely.clip_by_rect(polygons[basin[rows]], *box)
    return cut

"""A Thiessen tessellation kept as rings: which gauge each part of the basins belongs to, and who its neighbours are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array, csr_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import Delaunay

from basinrain.averaging.thiessen import clip_basins, with_far_points
from basinrain.averaging.thiessen_clipping import Rings, join_rings, ring_areas, rings_of, share_rings, take_rings
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

__all__ = ["DEAR", "Ground", "Tessellation", "candidates_of", "edges_among", "groups_of", "whole_tessellation"]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]

DEAR: Final = 12.0
"""A burden (:meth:`Tessellation.burden_of`) above which a tessellation from the basins' outlines costs less."""


_ROUNDING: Final = 1e-9
"""How far inside a circle, as a share of the terms, a point on it may seem to be."""


@dataclass(frozen=True, eq=False)
class Ground:
    """What stays the same whichever gauges report.

    Parameters
    ----------
    x, y : array of float, shape (n_gauges,)
        Where gauges stand, in m from the middle of the basins.
    around : west, south, east, north
        The box of the basins, in the same plane.
    areas : array of float, shape (n_basins,)
        m²: what the pieces of each basin sum to.
    """

    x: Floats
    y: Floats
    around: tuple[float, float, float, float]
    areas: Floats


@dataclass(frozen=True, eq=False)
class Tessellation:
    """The parts of basins by gauge, while some gauges are absent.

    Parameters
    ----------
    ground
        Gauges and basins.
    present : array of bool, shape (n_gauges,)
        The gauges that have cells.
    rings
        The parts.
    basin, gauge : array of int, shape (n_rings,)
        What each ring is a part of, and the gauge that is nearest to it.
    area : array of float, shape (n_rings,)
        m², negative for holes.
    """

    ground: Ground
    present: Bools
    rings: Rings
    basin: Ints
    gauge: Ints
    area: Floats

    @cached_property
    def weights(self) -> csr_array:
        """Shares of the basins' areas, shape (n_basins, n_gauges)."""
        share = self.area / self.ground.areas[self.basin]
        shape = (len(self.ground.areas), len(self.present))
        return csr_array(coo_array((share, (self.basin, self.gauge)), shape=shape))

    @cached_property
    def edges(self) -> Ints:
        """Pairs of present gauges that are neighbours; see :func:`edges_among`."""
        return edges_among(self.ground, self.present)

    @cached_property
    def neighbours(self) -> list[frozenset[int]]:
        """The neighbours of every gauge; none for those that are absent."""
        near: list[set[int]] = [set() for _ in self.present]
        for one, other in self.edges.tolist():
            near[one].add(other)
            near[other].add(one)
        return [frozenset(some) for some in near]

    @cached_property
    def rings_of_gauge(self) -> tuple[Ints, Ints]:
        """The rings ordered by gauge, and where those of each gauge begin, shape (n_gauges + 1,)."""
        order = np.argsort(self.gauge, kind="stable")
        return order, np.searchsorted(self.gauge[order], np.arange(len(self.present) + 1))

    @cached_property
    def corners_of_gauge(self) -> Ints:
        """How many corners the parts of every gauge have, shape (n_gauges,)."""
        return np.bincount(self.gauge, self.rings.counts, minlength=len(self.present)).astype(np.int64)

    def parts_of(self, gauges: Sequence[int]) -> Ints:
        """Return the rings of some gauges, gauge by gauge."""
        order, first = self.rings_of_gauge
        return np.concatenate([order[first[g] : first[g + 1]] for g in gauges])

    @property
    def nbytes(self) -> int:
        """Memory in bytes of the rings and what belongs to each."""
        return 16 * len(self.rings.x) + 40 * len(self.basin)

    def burden_of(self, group: Sequence[int]) -> float:
        """Return what sharing out a group's cells costs: comparisons with a gauge, by corner of the tessellation."""
        around = frozenset().union(*(self.neighbours[g] for g in group)).difference(group)
        return float(self.corners_of_gauge[list(group)].sum()) * len(around) / max(len(self.rings.x), 1)

    def without(self, absent: Bools) -> Tessellation | None:
        """Return the tessellation with more gauges absent: their cells are shared among their neighbours.

        Parameters
        ----------
        absent : array of bool, shape (n_gauges,)
            Gauges to take out; those that are absent already do not matter.

        Returns
        -------
        Tessellation or None
            None where it would cost more than a new one, or where parts do not sum.
        """
        out = np.flatnonzero(absent & self.present)
        present = self.present & ~absent
        if not present.any():
            return None
        groups = groups_of(self.edges, out)
        if sum(map(self.burden_of, groups)) > DEAR:
            return None
        lots = [self.parts_of(group) for group in groups]
        moved = np.concatenate([np.empty(0, dtype=np.int64), *lots])
        lists = candidates_of(self.neighbours, groups)
        gauges = np.repeat(lists, [len(lot) for lot in lots], axis=0)
        shared = share_rings(
            take_rings(self.rings, moved),
            gauges,
            self.ground.x,
            self.ground.y,
            self.ground.areas[self.basin[moved]],
        )
        if shared.lost.any():
            return None
        kept = np.flatnonzero(present[self.gauge])
        return Tessellation(
            self.ground,
            present,
            join_rings([take_rings(self.rings, kept), shared.rings]),
            np.concatenate([self.basin[kept], self.basin[moved][shared.source]]),
            np.concatenate([self.gauge[kept], shared.gauge]),
            np.concatenate([self.area[kept], shared.area]),
        )


def edges_among(ground: Ground, present: Bools) -> Ints:
    """Return the pairs of present gauges that are neighbours, shape (n_edges, 2), the lower first.

    The next nearest gauge after those of a connected group, at a point of the group's cells, is a neighbour of it.
    Where the triangulation cannot be shown to be right, all gauges are neighbours: slow, and never wrong.
    """
    at = np.flatnonzero(present)
    if len(at) < 2:
        return np.empty((0, 2), dtype=np.int64)
    points, _, _ = with_far_points(np.column_stack((ground.x[at], ground.y[at])), ground.around)
    triangles = Delaunay(points)
    if not _is_delaunay(points, triangles):
        return np.column_stack([at[side] for side in np.triu_indices(len(at), 1)])
    corners = triangles.simplices.astype(np.int64)
    pairs = np.sort(np.concatenate([corners[:, [0, 1]], corners[:, [1, 2]], corners[:, [2, 0]]]), axis=1)
    pairs = np.unique(pairs[pairs[:, 1] < len(at)], axis=0)
    return np.asarray(at[pairs])


def _is_delaunay(points: Floats, triangles: Delaunay) -> bool:
    """Return whether all points are corners, and no triangle's circle holds the corner beyond any of its sides."""
    corners, beyond = triangles.simplices, triangles.neighbors
    if len(np.unique(corners)) < len(points):
        return False
    one, side = np.nonzero(beyond >= 0)
    other = beyond[one, side]
    opposite = corners[other, np.argmax(beyond[other] == one[:, None], axis=1)]
    # The determinant of Guibas and Stolfi (1985), positive inside the circle of a triangle that turns to the left.
    arm = points[corners[one]] - points[opposite][:, None, :]
    square = (arm**2).sum(axis=2)
    ahead, behind = np.roll(arm, -1, axis=1), np.roll(arm, -2, axis=1)
    plus, minus = ahead[:, :, 0] * behind[:, :, 1], ahead[:, :, 1] * behind[:, :, 0]
    inside = (square * (plus - minus)).sum(axis=1)
    first, second = points[corners[one, 1]] - points[corners[one, 0]], points[corners[one, 2]] - points[corners[one, 0]]
    turn = np.sign(first[:, 0] * second[:, 1] - first[:, 1] * second[:, 0])
    size = (square * (np.abs(plus) + np.abs(minus))).sum(axis=1)
    return bool((inside * turn <= _ROUNDING * size).all())


def groups_of(edges: Ints, gauges: Ints) -> list[list[int]]:
    """Return the connected groups of some gauges, each in rising order.

    Examples
    --------
    >>> groups_of(np.array([[0, 1], [1, 2], [2, 3]]), np.array([0, 2, 3]))
    [[0], [2, 3]]
    """
    if not len(gauges):
        return []
    place = np.full(max(int(edges.max(initial=0)), int(gauges.max())) + 1, -1)
    place[gauges] = np.arange(len(gauges))
    ends = place[edges]
    ends = ends[(ends >= 0).all(axis=1)]
    graph = coo_array((np.ones(len(ends)), (ends[:, 0], ends[:, 1])), shape=(len(gauges), len(gauges)))
    n, label = connected_components(graph, directed=False)
    return [gauges[label == k].tolist() for k in range(n)]


def candidates_of(neighbours: Sequence[frozenset[int]], groups: Sequence[Sequence[int]]) -> Ints:
    """Return the gauges next to each group in rising order, shape (n_groups, most), -1 after the last."""
    lists = [sorted(frozenset().union(*(neighbours[g] for g in group)).difference(group)) for group in groups]
    result = np.full((len(lists), max(map(len, lists), default=0)), -1, dtype=np.int64)
    for row, some in zip(result, lists, strict=True):
        row[: len(some)] = some
    return result


def whole_tessellation(
    network: GaugeNetwork, basins: Basins, present: Bools, n_clipped: int, ground: Ground | None = None
) -> Tessellation:
    """Return the tessellation of the gauges present, cut from the outlines of the first ``n_clipped`` basins.

    Raises
    ------
    DataError
        Two of the gauges stand at one place.
    MethodError
        Pieces do not sum to their basin.
    """
    pieces = clip_basins(network, basins, present, n_clipped)
    west, south, east, north = basins.bounds
    origin = (west + east) / 2, (south + north) / 2
    rings, piece = rings_of(pieces.polygon, origin)
    area = ring_areas(rings)
    basin = pieces.basin[piece]
    if ground is None:
        width, height = (east - west) / 2, (north - south) / 2
        ground = Ground(
            network.x - origin[0],
            network.y - origin[1],
            (-width, -height, width, height),
            np.bincount(basin, area, minlength=n_clipped).astype(float),
        )
    return Tessellation(ground, present, rings, basin, pieces.gauge[piece], area)

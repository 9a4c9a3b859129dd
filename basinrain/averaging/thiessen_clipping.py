"""Rings in flat arrays, shared among gauges by the bisectors between them, many rings at once."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt
import shapely

__all__ = ["Rings", "SharedRings", "join_rings", "ring_areas", "rings_of", "share_rings", "take_rings"]

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Bools = npt.NDArray[np.bool_]

_AT_ONCE: Final = 1 << 21
"""Pairs of corner and gauge that are compared at once: 16 MiB of their distances."""

SLIVER: Final = 1e-14
"""A ring under this share of its basin is rounding along a common edge."""

EXACT: Final = 1e-12
"""How far, as a share of the basin, the shares of one ring may miss its area before all gauges are asked."""


class Rings(NamedTuple):
    """Closed rings one after another, the first corner not repeated; islands turn to the left and holes to the right.

    Parameters
    ----------
    x, y : array of float, shape (n_corners,)
        m.
    first : array of int, shape (n_rings + 1,)
        Where each begins, and the end.
    """

    x: Floats
    y: Floats
    first: Ints

    @property
    def counts(self) -> Ints:
        """Corners of each."""
        return np.diff(self.first)


class SharedRings(NamedTuple):
    """The parts of rings that are nearest to each of their gauges, by ring, then by gauge's place among them.

    Parameters
    ----------
    rings
        The parts. Those of a hollow ring may be joined by lines of no width: right for areas, not for drawing.
    source, gauge : array of int, shape (n_parts,)
        The ring that each is a part of, and its gauge.
    area : array of float, shape (n_parts,)
        m², negative for parts of holes.
    lost : array of bool, shape (n_sources,)
        Rings whose parts do not sum to them.
    """

    rings: Rings
    source: Ints
    gauge: Ints
    area: Floats
    lost: Bools


def _begins(counts: Ints) -> Ints:
    first = np.zeros(len(counts) + 1, dtype=np.int64)
    np.cumsum(counts, out=first[1:])
    return first


def _corners(rings: Rings, which: Ints) -> tuple[Ints, Ints]:
    """Return the places of the corners of some rings, and where each of these begins among them."""
    counts = rings.counts[which]
    first = _begins(counts)
    return np.arange(first[-1]) + np.repeat(rings.first[which] - first[:-1], counts), first


def take_rings(rings: Rings, which: Ints) -> Rings:
    """Return some of the rings, in the order asked for."""
    at, first = _corners(rings, which)
    return Rings(rings.x[at], rings.y[at], first)


def join_rings(parts: Sequence[Rings]) -> Rings:
    """Return the rings of several lots, one after another."""
    if not parts:
        return Rings(np.empty(0), np.empty(0), np.zeros(1, dtype=np.int64))
    counts = np.concatenate([part.counts for part in parts])
    return Rings(
        np.concatenate([part.x for part in parts]), np.concatenate([part.y for part in parts]), _begins(counts)
    )


def rings_of(polygons: npt.NDArray[np.object_], origin: tuple[float, float]) -> tuple[Rings, Ints]:
    """Return the rings of polygons, measured from ``origin``, and which polygon each belongs to.

    Examples
    --------
    >>> rings, polygon = rings_of(np.array([shapely.box(1, 1, 4, 4) - shapely.box(2, 2, 3, 3)]), (0.0, 0.0))
    >>> ring_areas(rings), polygon
    (array([ 9., -1.]), array([0, 0]))
    """
    parts, whole = shapely.get_parts(polygons, return_index=True)
    areal = shapely.get_type_id(parts) == shapely.GeometryType.POLYGON
    parts, whole = parts[areal], whole[areal]
    lines, part = shapely.get_rings(parts, return_index=True)
    xy, line = shapely.get_coordinates(lines, return_index=True)
    last = np.flatnonzero(np.diff(line, append=-1))
    kept = np.ones(len(line), dtype=bool)
    kept[last] = False
    counts = np.bincount(line[kept], minlength=len(lines))
    rings = Rings(xy[kept, 0] - origin[0], xy[kept, 1] - origin[1], _begins(counts))
    outer = np.diff(part, prepend=-1) != 0
    wrong = (ring_areas(rings) > 0) != outer
    if wrong.any():
        at, first = _corners(rings, np.arange(len(lines)))
        back = first[line[kept]] + first[line[kept] + 1] - 1 - at
        order = np.where(wrong[line[kept]], back, at)
        rings = Rings(rings.x[order], rings.y[order], rings.first)
    return rings, whole[part]


def _following(first: Ints) -> Ints:
    """Return the place of the corner that follows each within its ring; no ring is empty."""
    after = np.arange(1, first[-1] + 1)
    after[first[1:] - 1] = first[:-1]
    return after


def ring_areas(rings: Rings) -> Floats:
    """Return the area of every ring in m², negative where it turns to the right."""
    if not len(rings.x):
        return np.zeros(len(rings.first) - 1)
    begin = rings.first[:-1]
    # About the first corner, so that nothing large cancels.
    x = rings.x - np.repeat(rings.x[begin], rings.counts)
    y = rings.y - np.repeat(rings.y[begin], rings.counts)
    twice = x[:-1] * y[1:] - x[1:] * y[:-1]
    # The last corner's product with the next ring's first is with nought on its own ring: never taken.
    twice = np.append(twice, 0.0)
    twice[rings.first[1:] - 1] = 0.0
    return np.asarray(np.add.reduceat(twice, begin) / 2)


def _clip(rings: Rings, inward: Floats) -> Rings:
    """Cut rings to where a linear function, given at their corners, is not negative (Sutherland and Hodgman, 1974)."""
    after = _following(rings.first)
    next_inward = inward[after]
    inside = inward >= 0
    crossing = inward * next_inward < 0
    put = np.cumsum(inside.astype(np.int64) + crossing)
    counts = np.diff(put[rings.first[1:] - 1], prepend=0)
    x, y = np.empty(put[-1]), np.empty(put[-1])
    at = put[inside] - crossing[inside] - 1
    x[at], y[at] = rings.x[inside], rings.y[inside]
    here = np.flatnonzero(crossing)
    there = after[here]
    share = inward[here] / (inward[here] - next_inward[here])
    at = put[here] - 1
    x[at] = rings.x[here] + share * (rings.x[there] - rings.x[here])
    y[at] = rings.y[here] + share * (rings.y[there] - rings.y[here])
    return Rings(x, y, _begins(counts))


class _Places(NamedTuple):
    """The gauges of every ring, shape (n_rings, most gauges): where they stand, and |place|²; inf beyond the last."""

    x: Floats
    y: Floats
    square: Floats

    def rows(self, which: Ints | slice) -> _Places:
        return _Places(self.x[which], self.y[which], self.square[which])


def _nearness(rings: Rings, places: _Places) -> Floats:
    """Return distance² less |corner|² from every corner to every gauge of its ring, shape (most gauges, n_corners)."""
    counts = rings.counts
    result = np.empty((places.x.shape[1], len(rings.x)))
    for j in range(len(result)):
        row = result[j]
        np.multiply(rings.x, np.repeat(-2.0 * places.x[:, j], counts), out=row)
        row += rings.y * np.repeat(-2.0 * places.y[:, j], counts)
        row += np.repeat(places.square[:, j], counts)
    return result


def _cut_out(rings: Rings, places: _Places, ring: Ints, own: Ints) -> tuple[Rings, Ints]:
    """Cut for every pair of ring and one of its gauges what is nearest to it; return the parts and their pairs."""
    begin = rings.first[:-1]
    # How far a ring's box reaches beyond each bisector.
    depth = places.square[ring] - places.square[ring, own][:, None]
    for corner, place in ((rings.x, places.x), (rings.y, places.y)):
        low, high = np.minimum.reduceat(corner, begin)[ring], np.maximum.reduceat(corner, begin)[ring]
        slope = 2.0 * (place[ring, own][:, None] - place[ring])
        depth += np.minimum(slope * low[:, None], slope * high[:, None])
    depth[np.arange(len(ring)), own] = 0.0
    # Only the bisectors that cut the box, those that cut deepest first; pairs with most of them first, so that the
    # ones still to be cut are always the leading ones.
    others = np.argsort(depth, axis=1, kind="stable")
    needed = (depth < 0).sum(axis=1)
    order = np.argsort(-needed, kind="stable")
    done: list[Rings] = []
    pairs: list[Ints] = []
    left = take_rings(rings, ring[order])
    for turn in range(int(needed.max(initial=0)) + 1):
        active = int((needed[order] > turn).sum())
        cut = left.first[active]
        done.append(Rings(left.x[cut:], left.y[cut:], left.first[active:] - cut))
        pairs.append(order[active:])
        order = order[:active]
        if not active:
            break
        left = Rings(left.x[:cut], left.y[:cut], left.first[: active + 1])
        row, other = ring[order], others[order, turn]
        here, there = (row, own[order]), (row, other)
        counts = left.counts
        inward = np.repeat(places.square[there] - places.square[here], counts)
        inward += left.x * np.repeat(2.0 * (places.x[here] - places.x[there]), counts)
        inward += left.y * np.repeat(2.0 * (places.y[here] - places.y[there]), counts)
        left = _clip(left, inward)
        alive = left.counts > 2
        if not alive.all():
            left, order = take_rings(left, np.flatnonzero(alive)), order[alive]
    return join_rings(done), np.concatenate(pairs)


def _share_some(rings: Rings, gauges: Ints, places: _Places, unit: Floats) -> tuple[Rings, Ints, Ints, Floats, Bools]:
    """Share one lot of rings; see :func:`share_rings`."""
    near = _nearness(rings, places)
    label = np.zeros(len(rings.x), dtype=np.int64)
    best = near[0].copy()
    for j in range(1, len(near)):
        closer = near[j] < best
        label[closer] = j
        np.minimum(best, near[j], out=best)
    lowest = np.minimum.reduceat(label, rings.first[:-1])
    highest = np.maximum.reduceat(label, rings.first[:-1])
    whole = np.flatnonzero(lowest == highest)  # cells are convex: corners in one cell, all in one cell
    crossed = np.flatnonzero(lowest != highest)
    areas = ring_areas(rings)
    lost = np.zeros(len(lowest), dtype=bool)
    lots = [take_rings(rings, whole)]
    sources, owns = [whole], [lowest[whole]]
    if len(crossed):
        at, first = _corners(rings, crossed)
        cut = Rings(rings.x[at], rings.y[at], first)
        some = places.rows(crossed)
        seen = np.zeros((len(crossed), len(near)), dtype=bool)
        seen[np.repeat(np.arange(len(crossed)), cut.counts), label[at]] = True
        # First only the gauges to which a corner is nearest: whether that was all, the sum of areas tells.
        ring, own = np.nonzero(seen)
        parts, pair = _cut_out(cut, some, ring, own)
        short = _short(ring_areas(parts), ring[pair], areas[crossed], EXACT * unit[crossed])
        if short.any():
            kept = np.flatnonzero(~short[ring[pair]])
            ring_again, own_again = np.nonzero(np.isfinite(some.square) & short[:, None])
            again, pair_again = _cut_out(cut, some, ring_again, own_again)
            parts = join_rings([take_rings(parts, kept), again])
            ring_of = np.concatenate([ring[pair[kept]], ring_again[pair_again]])
            own_of = np.concatenate([own[pair[kept]], own_again[pair_again]])
            lost[crossed] = _short(ring_areas(parts), ring_of, areas[crossed], 100 * EXACT * unit[crossed])
        else:
            ring_of, own_of = ring[pair], own[pair]
        lots.append(parts)
        sources.append(crossed[ring_of])
        owns.append(own_of)
    source, own = np.concatenate(sources), np.concatenate(owns)
    together = join_rings(lots)
    area = ring_areas(together)
    kept = np.flatnonzero(np.abs(area) > SLIVER * unit[source])
    kept = kept[np.lexsort((own[kept], source[kept]))]
    source, own = source[kept], own[kept]
    return take_rings(together, kept), source, gauges[source, own], area[kept], lost


def _short(parts: Floats, ring: Ints, areas: Floats, tolerance: Floats) -> Bools:
    """Return which rings' parts do not sum to the ring."""
    return np.asarray(~(np.abs(np.bincount(ring, parts, minlength=len(areas)) - areas) <= tolerance))


def share_rings(rings: Rings, gauges: Ints, x: Floats, y: Floats, unit: Floats) -> SharedRings:
    """Share every ring among its own gauges: to each what is nearest to it.

    Parameters
    ----------
    rings
        None of them empty.
    gauges : array of int, shape (n_rings, most)
        The gauges among which each is shared, one at least, -1 after the last.
    x, y : array of float, shape (n_gauges,)
        Where all gauges stand, in the rings' plane.
    unit : array of float, shape (n_rings,)
        The area in m² in shares of which areas count: that of the ring's basin.

    Returns
    -------
    SharedRings
        What comes of a ring does not depend on the others of the call, to the last bit.

    Examples
    --------
    >>> square, _ = rings_of(np.array([shapely.box(0, 0, 4, 4)]), (0.0, 0.0))
    >>> shared = share_rings(
    ...     square, np.array([[1, 2, -1]]), np.array([9.0, 0.0, 2.0]), np.array([9.0, 0.0, 0.0]), np.array([16.0])
    ... )
    >>> shared.gauge, shared.area, shared.lost
    (array([1, 2]), array([ 4., 12.]), array([False]))
    """
    number = (gauges >= 0).sum(axis=1)
    order = np.argsort(number, kind="stable")
    burden = np.cumsum(rings.counts[order] * number[order])
    borders = np.flatnonzero(np.diff(burden // _AT_ONCE)) + 1
    lots: list[tuple[Rings, Ints, Ints, Floats]] = []
    lost = np.zeros(len(number), dtype=bool)
    for lot in np.split(order, borders):
        if not len(lot):
            continue
        some = gauges[lot, : number[lot].max()]
        none = some < 0
        places = _Places(x[some], y[some], np.where(none, np.inf, x[some] ** 2 + y[some] ** 2))
        parts, source, gauge, area, lost[lot] = _share_some(take_rings(rings, lot), some, places, unit[lot])
        lots.append((parts, lot[source], gauge, area))
    if not lots:
        none_at_all = np.empty(0, dtype=np.int64)
        return SharedRings(join_rings([]), none_at_all, none_at_all, np.empty(0), lost)
    source = np.concatenate([lot[1] for lot in lots])
    by_source = np.argsort(source, kind="stable")
    return SharedRings(
        take_rings(join_rings([lot[0] for lot in lots]), by_source),
        source[by_source],
        np.concatenate([lot[2] for lot in lots])[by_source],
        np.concatenate([lot[3] for lot in lots])[by_source],
        lost,
    )

"""What becomes of Thiessen cells when gauges fall silent: computed once for every set of neighbours, exactly."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import pairwise
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.averaging.thiessen_clipping import Rings, SharedRings, join_rings, share_rings, take_rings
from basinrain.averaging.thiessen_tessellation import Tessellation, candidates_of

__all__ = ["Removal", "Removals"]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Key = tuple[int, ...]

_CORNERS: Final = 1 << 20
"""Corners of rings that are shared at once."""


class Removal:
    """Who takes over some part of the basins, as shares of the basins' areas.

    Parameters
    ----------
    basin, gauge : array of int, shape (n_entries,)
        By basin, then gauge.
    share : array of float, shape (n_entries,)
        The share of the basin that the gauge takes over.
    basins, gauges : array of int, shape (n_basins,) and (n_gauges,)
        Those that have entries, rising.
    place : array of int, shape (n_entries,)
        Where each entry stands in the full table of them.
    lost : bool
        Whether shares fail to sum to the part, so that the removal must not be used.
    """

    __slots__ = ("_table", "basin", "basins", "gauge", "gauges", "lost", "place", "receivers", "share")

    def __init__(
        self, entries: tuple[Ints, Ints, Floats], sides: tuple[Ints, Ints], place: Ints, *, lost: bool
    ) -> None:
        self.basin, self.gauge, self.share = entries
        self.basins, self.gauges = sides
        self.place, self.lost = place, lost
        self.receivers: Ints = np.empty(0, dtype=np.int64)
        self._table: Floats | None = None

    @property
    def table(self) -> Floats:
        """The shares as a full table, shape (n_basins, n_gauges)."""
        if self._table is None:
            flat = np.zeros(len(self.basins) * len(self.gauges))
            flat[self.place] = self.share
            self._table = flat.reshape(len(self.basins), len(self.gauges))
        return self._table


class Removals:
    """The removals of one tessellation, made when a record asks for them and kept.

    The part of the basins to which the gauges of a set S, in any order, are the nearest ones is shared among the gauges
    that come next. With missing depths set to 0, basin means are the tessellation's weights times the depths, plus for
    every such S whose gauges are all missing its shares times the depths: at a point whose nearest k gauges are missing
    the first k of these sums meet zeros, and the next one the gauge that counts. On such tessellations of higher order:
    Okabe, Boots, Sugihara and Chiu (2000), *Spatial Tessellations*, 2nd ed., Wiley, section 3.2 (from memory).

    Parameters
    ----------
    tessellation
        Of the gauges that the record has at one time or another.
    """

    def __init__(self, tessellation: Tessellation) -> None:
        self._tessellation = tessellation
        self._made: dict[Key, Removal] = {}
        self._holes: dict[Key, Removal] = {}
        # By set: the parts of the basins to which its gauges are nearest, by the set of those that are nearer still.
        self._parts: dict[Key, dict[Key, tuple[Rings, Ints]]] = {}
        self.nbytes = 0

    def asked(self, missing: npt.NDArray[np.uint8]) -> Iterator[tuple[list[Removal], npt.NDArray[np.uint8]]]:
        """Yield the removals that a record needs, by the number of gauges, with when.

        Parameters
        ----------
        missing : array of uint8, shape (n_gauges, n_bytes)
            When each gauge is missing: one bit a time, packed.

        Yields
        ------
        removals : list of Removal
            In an order that does not depend on what was made before.
        when : array of uint8, shape (n_removals, n_bytes)
            When all gauges of each are missing.
        """
        single = np.flatnonzero(missing.any(axis=1))
        keys: list[Key] = [(g,) for g in single.tolist()]
        when = missing[single]
        while keys:
            self._make(keys)
            removals = [self._made[key] for key in keys]
            yield removals, when
            parent = np.repeat(np.arange(len(keys)), [len(removal.receivers) for removal in removals])
            receiver = np.concatenate([removal.receivers for removal in removals])
            both = when[parent] & missing[receiver]
            ever = np.flatnonzero(both.any(axis=1))
            rows: dict[Key, int] = {}
            for row, above, gauge in zip(ever.tolist(), parent[ever].tolist(), receiver[ever].tolist(), strict=True):
                rows.setdefault(tuple(sorted((*keys[above], gauge))), row)
            keys, when = list(rows), both[list(rows.values())]

    def holes(self, groups: Sequence[Key]) -> list[Removal]:
        """Return the removals of whole groups of neighbours: all that is nearest to any of them, at once."""
        new = sorted({group for group in groups if group not in self._holes})
        weights = [int(self._tessellation.corners_of_gauge[list(group)].sum()) for group in new]
        for lot in _lots(weights):
            some = new[lot]
            rings = [self._tessellation.parts_of(group) for group in some]
            at = np.concatenate(rings)
            made, _, _ = self._share(
                some,
                take_rings(self._tessellation.rings, at),
                self._tessellation.basin[at],
                np.repeat(np.arange(len(some)), [len(lot) for lot in rings]),
            )
            self._holes.update(zip(some, made, strict=True))
        return [self._holes[group] for group in groups]

    def _make(self, keys: Sequence[Key]) -> None:
        new = [key for key in keys if key not in self._made]
        for key in new:
            if len(key) == 1:
                at = self._tessellation.parts_of(key)
                self._parts[key] = {(): (take_rings(self._tessellation.rings, at), self._tessellation.basin[at])}
        weights = [sum(len(rings.x) for rings, _ in self._parts[key].values()) for key in new]
        for lot in _lots(weights):
            some = new[lot]
            # In the order of the nearer sets, whenever they were made, so that sums are the same to the last bit.
            parts = [[part for _, part in sorted(self._parts.pop(key).items())] for key in some]
            flat = [part for lot in parts for part in lot]
            removal = np.repeat(np.arange(len(some)), [sum(len(basin) for _, basin in lot) for lot in parts])
            made, shared, of = self._share(
                some, join_rings([rings for rings, _ in flat]), np.concatenate([basin for _, basin in flat]), removal
            )
            self._made.update(zip(some, made, strict=True))
            self._hand_on(some, shared, of)

    def _share(
        self, keys: Sequence[Key], rings: Rings, basin: Ints, removal: Ints
    ) -> tuple[list[Removal], SharedRings, tuple[Ints, Ints]]:
        """Share rings among the neighbours of their sets; return the removals, the parts, and their sets and basins."""
        ground = self._tessellation.ground
        lists = candidates_of(self._tessellation.neighbours, keys)
        shared = share_rings(rings, lists[removal], ground.x, ground.y, ground.areas[basin])
        lost = np.zeros(len(keys), dtype=bool)
        lost[removal[shared.lost]] = True
        of, in_basin = removal[shared.source], basin[shared.source]
        n_basins, n_gauges = len(ground.areas), len(ground.x)
        entry = (of * n_basins + in_basin) * n_gauges + shared.gauge
        entries, which = np.unique(entry, return_inverse=True)
        area = np.bincount(which, shared.area, minlength=len(entries))
        row, gauge = np.divmod(entries, n_gauges)
        row, at_basin = np.divmod(row, n_basins)
        share: Floats = area / ground.areas[at_basin]
        basins, basin_place, basin_first = _sides(row * n_basins + at_basin, row, n_basins, len(keys))
        gauges, gauge_place, gauge_first = _sides(row * n_gauges + gauge, row, n_gauges, len(keys))
        place = basin_place * np.diff(gauge_first)[row] + gauge_place
        first = np.searchsorted(row, np.arange(len(keys) + 1)).tolist()
        basin_ends, gauge_ends = basin_first.tolist(), gauge_first.tolist()
        made = [
            Removal(
                (at_basin[a:b], gauge[a:b], share[a:b]),
                (basins[basin_ends[k] : basin_ends[k + 1]], gauges[gauge_ends[k] : gauge_ends[k + 1]]),
                place[a:b],
                lost=bool(lost[k]),
            )
            for k, (a, b) in enumerate(pairwise(first))
        ]
        self.nbytes += 64 * len(entries) + 1000 * len(keys)
        return made, shared, (of, in_basin)

    def _hand_on(self, keys: Sequence[Key], shared: SharedRings, of: tuple[Ints, Ints]) -> None:
        """Keep the parts of every removal by the gauge that takes them over: they are asked for when it is missing."""
        removal, basin = of
        order = np.lexsort((shared.gauge, removal))
        removal, basin, gauge = removal[order], basin[order], shared.gauge[order]
        rings = take_rings(shared.rings, order)
        begins = np.flatnonzero((np.diff(removal, prepend=-1) != 0) | (np.diff(gauge, prepend=-1) != 0))
        ends = np.append(begins[1:], len(removal))[: len(begins)]
        for a, b, k, g in zip(
            begins.tolist(), ends.tolist(), removal[begins].tolist(), gauge[begins].tolist(), strict=True
        ):
            low, high = rings.first[a], rings.first[b]
            part = Rings(rings.x[low:high], rings.y[low:high], rings.first[a : b + 1] - low)
            self._parts.setdefault(tuple(sorted((*keys[k], g))), {})[keys[k]] = (part, basin[a:b])
        receivers = gauge[begins]
        first = np.searchsorted(removal[begins], np.arange(len(keys) + 1)).tolist()
        for key, a, b in zip(keys, first, first[1:], strict=False):
            self._made[key].receivers = receivers[a:b]
        self.nbytes += 16 * len(rings.x) + 8 * len(basin) + 400 * len(begins)


def _sides(code: Ints, row: Ints, n: int, n_rows: int) -> tuple[Ints, Ints, Ints]:
    """Return the different things, below ``n``, of every row; each entry's place in its row; where rows begin."""
    different, which = np.unique(code, return_inverse=True)
    rows, things = np.divmod(different, n)
    first = np.searchsorted(rows, np.arange(n_rows + 1))
    return things, which - first[row], first


def _lots(weights: Sequence[int]) -> Iterator[slice]:
    """Yield slices of so many that their weights sum to about ``_CORNERS``."""
    if weights:
        turn = np.cumsum(weights) // _CORNERS
        borders = [0, *(np.flatnonzero(np.diff(turn)) + 1).tolist(), len(weights)]
        yield from map(slice, borders, borders[1:])

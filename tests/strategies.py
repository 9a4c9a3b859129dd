"""Hypothesis strategies for gauges, basins and rain, in one place for all tests."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt
import shapely
from hypothesis import strategies as st

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

GRAIN = 100.0
"""Positions are whole multiples of this, in m, so that no two things are nearly but not quite in one place."""

_REACH = 120

_PRECISION = 2.0**-10
"""Corners lie on a grid this fine, in m, so that outlines stay valid when they are moved or scaled."""


@st.composite
def networks(draw: st.DrawFn, *, at_least: int = 1, at_most: int = 9) -> GaugeNetwork:
    """Draw gauges at distinct places of a square of 24 km around the origin, in any order, in or out of line."""
    count = st.integers(-_REACH, _REACH)
    places = draw(st.lists(st.tuples(count, count), min_size=at_least, max_size=at_most, unique=True))
    xy = np.array(places, dtype=float) * GRAIN
    ids = draw(st.permutations([f"G{k}" for k in range(len(places))]))
    return GaugeNetwork(ids=tuple(ids), x=xy[:, 0], y=xy[:, 1], crs="local")


@st.composite
def outlines(draw: st.DrawFn) -> shapely.Polygon:
    """Draw a star-shaped outline of 3 to 12 corners, 2 to 10 km from a middle near the origin."""
    n = draw(st.integers(3, 12))
    far = np.array(draw(st.lists(st.integers(20, 100), min_size=n, max_size=n)), dtype=float) * GRAIN
    middle = np.array(draw(st.tuples(st.integers(-30, 30), st.integers(-30, 30))), dtype=float) * GRAIN
    turn = (np.arange(n) + draw(st.floats(0.0, 0.9))) * 2 * np.pi / n
    corners = middle + far[:, None] * np.column_stack((np.cos(turn), np.sin(turn)))
    return shapely.Polygon(np.round(corners / _PRECISION) * _PRECISION)


@st.composite
def divided_basins(draw: st.DrawFn) -> Basins:
    """Draw two or more adjoining basins that fill one outline: it is cut along one bent line; no union row yet."""
    outline = draw(outlines())
    west, south, east, north = outline.bounds
    heights = np.linspace(south, north, draw(st.integers(2, 5)))
    share = st.integers(2, 8)
    bends = np.array([west + draw(share) / 10 * (east - west) for _ in heights])
    line = np.column_stack((bends, heights))
    line[0, 1] -= GRAIN
    line[-1, 1] += GRAIN
    left = shapely.Polygon([*line, (west - GRAIN, line[-1, 1]), (west - GRAIN, line[0, 1])])
    parts = [outline.intersection(left), outline.difference(left)]
    kept = [shapely.set_precision(part, _PRECISION) for part in parts if part.area > 1e-6 * outline.area]
    return Basins(ids=tuple("abc"[: len(kept)]), polygons=np.array(kept, dtype=object), crs="local")


@st.composite
def overlapping_basins(draw: st.DrawFn) -> Basins:
    """Draw one to three outlines that may lie apart, touch, nest and overlap."""
    shapes = draw(st.lists(outlines(), min_size=1, max_size=3))
    return Basins(ids=tuple("abc"[: len(shapes)]), polygons=np.array(shapes, dtype=object), crs="local")


def any_basins() -> st.SearchStrategy[Basins]:
    """Basins that adjoin, or ones that may overlap, with their union's row."""
    return st.one_of(divided_basins(), overlapping_basins()).map(Basins.with_union)


class Case(NamedTuple):
    """A network, its basins, one depth a gauge, and which gauges are present (one at least)."""

    network: GaugeNetwork
    basins: Basins
    depths: npt.NDArray[np.float64]
    present: npt.NDArray[np.bool_]


@st.composite
def cases(draw: st.DrawFn, basins: st.SearchStrategy[Basins] | None = None, *, at_least: int = 1) -> Case:
    """Draw a whole case for the averaging methods."""
    network = draw(networks(at_least=at_least))
    n = len(network)
    depths = np.array(draw(st.lists(st.integers(0, 2000), min_size=n, max_size=n)), dtype=float) / 10
    present = np.array(draw(st.lists(st.booleans(), min_size=n, max_size=n)))
    present[draw(st.integers(0, n - 1))] = True
    return Case(network, draw(any_basins() if basins is None else basins), depths, present)


@st.composite
def broken_records(draw: st.DrawFn, n_gauges: int, *, at_most: int = 14) -> npt.NDArray[np.float64]:
    """Draw depths (n_steps, n_gauges) of up to 20 mm, NaN where a gauge does not report; few sets of gauges that do."""
    n_steps = draw(st.integers(0, at_most))
    one_set = st.lists(st.booleans(), min_size=n_gauges, max_size=n_gauges)
    different = draw(st.lists(one_set, min_size=1, max_size=6))
    order = draw(st.lists(st.integers(0, len(different) - 1), min_size=n_steps, max_size=n_steps))
    seed = draw(st.integers(0, 2**32 - 1))
    depth = np.random.default_rng(seed).integers(0, 201, (n_steps, n_gauges)) / 10
    depth[~np.array(different, dtype=bool)[order]] = np.nan
    return depth

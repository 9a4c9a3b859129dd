"""What every averaging method asks of a network and its basins."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain import ground
from basinrain.basins import UNION, Basins
from basinrain.errors import DataError, Problem
from basinrain.gauges import GaugeNetwork

__all__ = ["AREA_TOLERANCE", "presence", "require_one_plane", "union_is_sum"]

AREA_TOLERANCE: Final = 1e-9
"""How far, as a share of a basin's area, areas that must add up may be apart."""


def require_one_plane(network: GaugeNetwork, basins: Basins) -> None:
    """Make sure that gauges and basins lie in one plane.

    Raises
    ------
    DataError
        Their coordinate systems differ, or are longitude and latitude: areas need a plane.

    Examples
    --------
    >>> import shapely
    >>> network = GaugeNetwork(ids=("A",), x=[10.5], y=[50.5], crs="EPSG:4326")
    >>> require_one_plane(network, Basins(ids=("all",), polygons=[shapely.box(10, 50, 11, 51)], crs="EPSG:4326"))
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: coordinate reference system: found 'EPSG:4326', which is in degrees; expected a plane, \
in metres; bring gauges and basins into one plane with to_crs
    """
    if network.crs != basins.crs:
        raise DataError(
            Problem(
                item="coordinate reference systems",
                found=f"'{network.crs}' for the gauges and '{basins.crs}' for the basins",
                expected="the same plane for both",
                remedy="bring gauges and basins into one plane with to_crs",
            )
        )
    if ground.is_geographic(network.crs):
        raise DataError(
            Problem(
                item="coordinate reference system",
                found=f"'{network.crs}', which is in degrees",
                expected="a plane, in metres",
                remedy="bring gauges and basins into one plane with to_crs",
            )
        )


def presence(network: GaugeNetwork, present: Sequence[bool] | npt.NDArray[np.bool_] | None) -> npt.NDArray[np.bool_]:
    """Return the mask of present gauges, shape (n_gauges,); all of them where none is given.

    Raises
    ------
    DataError
        The mask has another length than the network.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 9.0], y=[0.0, 0.0], crs="local")
    >>> presence(network, None), presence(network, [True, False])
    (array([ True,  True]), array([ True, False]))
    """
    mask = np.ones(len(network), dtype=bool) if present is None else np.asarray(present, dtype=bool)
    if mask.shape != (len(network),):
        raise DataError(
            Problem(
                item="present gauges",
                found=f"a mask of shape {mask.shape}",
                expected=f"({len(network)},), one value a gauge",
            )
        )
    return mask


def union_is_sum(basins: Basins) -> bool:
    """Return whether the last row is the union of the others and these do not overlap, so that areas simply add up.

    Examples
    --------
    >>> import shapely
    >>> apart = Basins(ids=("a", "b"), polygons=[shapely.box(0, 0, 1, 1), shapely.box(1, 0, 2, 1)], crs="local")
    >>> lapped = Basins(ids=("a", "b"), polygons=[shapely.box(0, 0, 1, 1), shapely.box(0.5, 0, 2, 1)], crs="local")
    >>> union_is_sum(apart.with_union()), union_is_sum(lapped.with_union()), union_is_sum(apart)
    (True, False, False)
    """
    if basins.ids[-1:] != (UNION,) or len(basins) < 2:
        return False
    whole = float(basins.areas[-1])
    return bool(abs(float(basins.areas[:-1].sum()) - whole) <= AREA_TOLERANCE * whole)

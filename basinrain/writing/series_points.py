"""Where basins lie on the map, as one point each."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import shapely

from basinrain.basins import Basins
from basinrain.ground import LOCAL, LONLAT, transform

__all__ = ["points_inside"]


def points_inside(basins: Basins) -> npt.NDArray[np.float64] | None:
    """Return a point inside every basin.

    Parameters
    ----------
    basins : Basins
        In any coordinate system; a basin of several parts or with holes has its point in one of the parts.

    Returns
    -------
    array of float, shape (n_basins, 2), or None
        Longitude and latitude, degrees (WGS 84); None in local coordinates, which have no place on the map.

    Examples
    --------
    >>> basins = Basins(ids=("cell",), polygons=[shapely.box(10, 50, 11, 51)], crs="EPSG:4326")
    >>> points_inside(basins)
    array([[10.5, 50.5]])
    >>> points_inside(Basins(ids=("cell",), polygons=[shapely.box(0, 0, 9, 9)], crs="local")) is None
    True
    """
    if basins.crs == LOCAL:
        return None
    points = shapely.point_on_surface(basins.polygons)
    return np.column_stack(transform(shapely.get_x(points), shapely.get_y(points), basins.crs, LONLAT))

"""What all NetCDF files have: how they are opened and closed, columns of words, basins."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np
import numpy.typing as npt

if TYPE_CHECKING:
    import netCDF4

__all__ = ["DEFLATE", "opened", "write_basins", "write_words"]

DEFLATE: Final = 2
"""How hard numbers are compressed; higher levels take twice the time for a few percent."""


@contextmanager
def opened(path: Path) -> Iterator[netCDF4.Dataset]:
    """Make a NetCDF-4 file, and close it whatever happens."""
    import netCDF4

    file = netCDF4.Dataset(path, mode="w", format="NETCDF4")
    try:
        yield file
    except BaseException:
        # What was wrong is known; that the file cannot be closed either adds nothing.
        with suppress(RuntimeError, OSError):
            file.close()
        raise
    file.close()


def write_words(
    file: netCDF4.Dataset, dimension: str, name: str, words: Sequence[str], facts: Mapping[str, str]
) -> None:
    """Write a variable of words along a dimension."""
    variable = file.createVariable(name, str, (dimension,))
    variable.setncatts(facts)
    variable[:] = np.array(words, dtype=object)


def write_basins(
    file: netCDF4.Dataset,
    basins: Sequence[str],
    *,
    names: Sequence[str],
    areas: npt.NDArray[np.float64],
    points: npt.NDArray[np.float64] | None,
    facts: Mapping[str, str],
) -> None:
    """Write what is known of the basins along the dimension ``basin``.

    Parameters
    ----------
    file
        Has the dimension.
    basins, names
        Ids; names, or none.
    areas : array of float, shape (n_basins,)
        m².
    points : array of float, shape (n_basins, 2), optional
        Longitude and latitude (WGS 84) of a point inside each basin.
    facts
        Further attributes of the ids.
    """
    write_words(file, "basin", "basin_id", basins, {"long_name": "basin", **facts})
    if any(names):
        write_words(file, "basin", "basin_name", names, {"long_name": "name of the basin"})
    area = file.createVariable("basin_area", "f8", ("basin",))
    area.setncatts({"standard_name": "cell_area", "long_name": "area of the basin", "units": "m2"})
    area[:] = np.asarray(areas, dtype=float)
    if points is None:
        return
    file.createVariable("crs", "i4").setncatts(
        {
            "grid_mapping_name": "latitude_longitude",
            "long_name": "WGS 84",
            "semi_major_axis": 6378137.0,
            "inverse_flattening": 298.257223563,
            "longitude_of_prime_meridian": 0.0,
        }
    )
    for name, standard, units, column in (
        ("lon", "longitude", "degrees_east", 0),
        ("lat", "latitude", "degrees_north", 1),
    ):
        place = file.createVariable(name, "f8", ("basin",))
        place.setncatts(
            {"standard_name": standard, "long_name": f"{standard} of a point inside the basin", "units": units}
        )
        place[:] = points[:, column]

"""Design hyetographs as one NetCDF-4 file that follows the CF conventions, version 1.11."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np
import numpy.typing as npt

from basinrain.writing.design_content import DesignContent
from basinrain.writing.netcdf_parts import DEFLATE, opened, write_basins, write_words
from basinrain.writing.series_content import writing

if TYPE_CHECKING:
    import netCDF4

__all__ = ["NAME", "write_netcdf"]

Ints = npt.NDArray[np.int64]

NAME: Final = "design_hyetographs.nc"
"""The file's name."""

_RAGGED: Final = (
    "A case is one point of interest, frequency, duration and pattern. Steps after the end of a case's duration, and "
    "basins that are not above its point of interest, hold the missing value: it is not rain of 0."
)


def write_netcdf(folder: Path, content: DesignContent) -> None:
    """Write the hyetographs as depths by case, step and basin, with what each case is and bounds of the elapsed time.

    Parameters
    ----------
    folder
        Where ``design_hyetographs.nc`` is made.
    content
        What to write. Where a case is shorter than the longest, or has fewer basins, the rest is missing.

    Raises
    ------
    WriteError
        The file cannot be written.

    References
    ----------
    Eaton, B., and others: NetCDF Climate and Forecast (CF) Metadata Conventions, version 1.11.
    """
    # The library says RuntimeError of what happens below it, a full disk included.
    with writing(NAME, faults=(OSError, RuntimeError)), opened(folder / NAME) as file:
        file.createDimension("case", len(content.hyetographs))
        file.createDimension("step", max(one.n_steps for one in content.hyetographs))
        file.createDimension("basin", len(content.basins))
        file.createDimension("nv", 2)
        file.setncatts(_facts(content))
        named = [*_write_cases(file, content), *_write_times(file, content), "basin_id"]
        write_basins(file, content.basins, names=content.names, areas=content.areas, points=content.positions, facts={})
        if any(content.names):
            named.append("basin_name")
        _write_depths(file, content, named)


def _facts(content: DesignContent) -> dict[str, str]:
    product = f"basinrain {content.version}".strip()
    about = f" of the job {content.job}" if content.job else ""
    depths = f" from point depths: {content.source}" if content.source else ""
    return {
        "Conventions": "CF-1.11",
        "title": f"Design hyetographs{about}",
        "institution": "not stated",
        "source": f"design storms made by {product}{depths}",
        # Without the time of day: the same job gives the same file.
        "history": f"written by {product}",
        "references": "the methods' sources are listed in the documentation of basinrain",
        "comment": f"{content.caution} {_RAGGED}".strip(),
    }


def _write_cases(file: netCDF4.Dataset, content: DesignContent) -> list[str]:
    cases = content.hyetographs
    for name, words, meaning in (
        ("point", [one.point for one in cases], "point of interest"),
        ("pattern", [one.pattern for one in cases], "temporal pattern"),
        ("return_period_in", [one.frequency.series for one in cases], "series that the return period is counted in"),
    ):
        write_words(file, "case", name, words, {"long_name": meaning})
    aep = file.createVariable("aep", "f8", ("case",), fill_value=np.nan)
    aep.setncatts({"long_name": "annual exceedance probability", "units": "1"})
    aep[:] = [one.frequency.written_aep for one in cases]
    years = file.createVariable("return_period", "f8", ("case",))
    years.setncatts({"long_name": "return period", "units": "year"})
    years[:] = [one.frequency.written_years for one in cases]
    duration = file.createVariable("duration", "i4", ("case",))
    duration.setncatts({"long_name": "duration of the storm", "units": "minutes"})
    duration[:] = [one.minutes for one in cases]
    return ["point", "pattern", "aep", "return_period", "return_period_in", "duration"]


def _write_times(file: netCDF4.Dataset, content: DesignContent) -> list[str]:
    ends = max(content.hyetographs, key=lambda one: one.n_steps).elapsed
    bounds = np.column_stack([ends - content.step, ends])
    _write_time(file, "elapsed", ends, bounds, {"long_name": "time from the start of the storm to the end of the step"})
    if content.start is None:
        return ["elapsed"]
    start = str(content.start.astype("datetime64[s]")).replace("T", " ")
    _write_time(
        file,
        "time",
        ends,
        bounds,
        {
            "standard_name": "time",
            "long_name": "end of the step, counted from the storm's nominal start",
            "units": f"minutes since {start}",
            "calendar": "standard",
            "units_metadata": "leap_seconds: none",
        },
    )
    return ["elapsed", "time"]


def _write_time(file: netCDF4.Dataset, name: str, ends: Ints, bounds: Ints, facts: dict[str, str]) -> None:
    time = file.createVariable(name, "i4", ("step",))
    time.setncatts({"units": "minutes", **facts, "bounds": f"{name}_bounds"})
    time[:] = ends
    file.createVariable(f"{name}_bounds", "i4", ("step", "nv"))[:] = bounds


def _write_depths(file: netCDF4.Dataset, content: DesignContent, named: list[str]) -> None:
    n_steps, n_basins = file.dimensions["step"].size, len(content.basins)
    depth = file.createVariable(
        "depth",
        "f8",
        ("case", "step", "basin"),
        compression="zlib",
        complevel=DEFLATE,
        shuffle=True,
        # Written and compressed case by case.
        chunksizes=(1, n_steps, n_basins),
        fill_value=np.nan,
    )
    place = {"grid_mapping": "crs"} if content.positions is not None else {}
    depth.setncatts(
        {
            "standard_name": "lwe_thickness_of_precipitation_amount",
            "long_name": "depth of rain over the basin in the step",
            "units": content.depth_unit,
            "cell_methods": "step: sum area: mean",
            "cell_measures": "area: basin_area",
            "coordinates": " ".join([*(["lat", "lon"] if place else []), *named]),
            **place,
        }
    )
    column = {basin: at for at, basin in enumerate(content.basins)}
    for case, one in enumerate(content.hyetographs):
        whole = np.full((n_steps, n_basins), np.nan)
        whole[: one.n_steps, [column[basin] for basin in one.basins]] = content.depth(one).T
        depth[case] = whole

"""Basin-mean series as one NetCDF-4 file that follows the CF conventions, version 1.11."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, Literal

import numpy as np

from basinrain.series.flags import Flag
from basinrain.writing.netcdf_parts import DEFLATE, opened, write_basins
from basinrain.writing.series_content import SeriesContent, series_name, writing

if TYPE_CHECKING:
    import netCDF4

__all__ = ["NAME", "write_netcdf"]

NAME: Final = "series.nc"
"""The file's name."""

_HELD: Final = 1 << 20
"""Values of a series that are held together; about 30 MiB with shares, flags and copies."""
_PIECE: Final = 1 << 17
"""Values that are compressed together: 1 MiB of depths."""


def write_netcdf(folder: Path, content: SeriesContent) -> None:
    """Write the series as variables of basin and time, with time bounds, areas, shares and flags.

    Parameters
    ----------
    folder
        Where ``series.nc`` is made.
    content
        What to write. No more than about a million values (or the basins of one step) are held at a time. With
        ``points`` the file has the feature type ``timeSeries``; without, basins have ids, but no place on the map.

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
        file.createDimension("time", content.n_steps)
        file.createDimension("basin", len(content.basins))
        file.createDimension("nv", 2)
        file.setncatts(_facts(content))
        _write_times(file, content)
        write_basins(
            file,
            content.basins,
            names=content.names,
            areas=content.areas,
            points=content.points,
            facts={"cf_role": "timeseries_id"},
        )
        for gaps, method in content.source.series:
            _write_series(file, content, gaps, method)


def _facts(content: SeriesContent) -> dict[str, str]:
    product = f"basinrain {content.version}".strip()
    about = f" of the job {content.job}" if content.job else ""
    plane = f" Areas are those of the working plane: {content.plane}." if content.plane else ""
    clock = "" if content.zone else " The offset of the times from UTC is not known."
    facts = {
        "Conventions": "CF-1.11",
        "title": f"Basin-mean rainfall series{about}",
        "institution": content.institution or "not stated",
        "source": f"depths of rain gauges, averaged over basins by {product}",
        # Without the time of day: the same job gives the same file.
        "history": f"written by {product}",
        "references": content.references or "the methods' sources are listed in the documentation of basinrain",
        "comment": f"{content.caution}{plane}{clock}".strip(),
    }
    if content.points is not None:
        facts["featureType"] = "timeSeries"
    return {name: text for name, text in facts.items() if text}


def _write_times(file: netCDF4.Dataset, content: SeriesContent) -> None:
    starts, ends = content.starts.astype(np.int64), content.ends.astype(np.int64)
    per, unit = (1, "seconds") if ((starts % 60) | (ends % 60)).any() else (60, "minutes")
    since = content.starts[:1].astype("datetime64[D]")
    origin = since.astype("datetime64[s]").astype(np.int64)
    day = str(since[0]) if len(since) else "1970-01-01"
    clock = f" {content.zone}" if content.zone else ""
    time = file.createVariable("time", "i8", ("time",))
    time.setncatts(
        {
            "standard_name": "time",
            "long_name": "end of the interval",
            "units": f"{unit} since {day} 00:00:00{clock}",
            "calendar": "standard",
            # Days have 86,400 s in what is counted and in what is read back.
            "units_metadata": "leap_seconds: none",
            "axis": "T",
            "bounds": "time_bounds",
        }
    )
    bounds = file.createVariable("time_bounds", "i8", ("time", "nv"))
    time[:] = (ends - origin) // per
    bounds[:] = (np.column_stack([starts, ends]) - origin) // per


def _write_series(file: netCDF4.Dataset, content: SeriesContent, gaps: str, method: str) -> None:
    name = series_name(gaps, method)
    words = f"by method {method}, gaps: {gaps}"
    steps = next(content.blocks(_HELD), slice(0, 1)).stop
    # A block of steps is whole pieces, so that none is compressed twice.
    piece = max(1, min(len(content.basins), _PIECE // steps)), steps

    def variable(
        prefix: str, kind: Literal["f8", "f4", "u1"], facts: dict[str, Any], fill: float | None = None
    ) -> netCDF4.Variable[Any]:
        made = file.createVariable(
            f"{prefix}_{name}",
            kind,
            ("basin", "time"),
            compression="zlib",
            complevel=DEFLATE,
            shuffle=True,
            chunksizes=piece,
            chunk_cache=piece[0] * piece[1] * np.dtype(kind).itemsize,
            fill_value=fill,
        )
        named = ["basin_id", *(["basin_name"] if any(content.names) else [])]
        made.setncatts({**facts, "coordinates": " ".join(named)})
        if content.points is not None:
            made.setncatts({"coordinates": " ".join(["lat", "lon", *named]), "grid_mapping": "crs"})
        return made

    depth = variable(
        "depth",
        "f8",
        {
            "standard_name": "lwe_thickness_of_precipitation_amount",
            "long_name": f"basin-mean depth of rain {words}",
            "units": content.depth_unit,
            "cell_methods": "time: sum area: mean",
            "cell_measures": "area: basin_area",
            "ancillary_variables": f"observed_share_{name} flags_{name}",
        },
        np.nan,
    )
    share = variable(
        "observed_share",
        "f4",
        {"long_name": f"share of the weight on gauges that report, {words}", "units": "1"},
        np.nan,
    )
    flags = variable(
        "flags",
        "u1",
        {
            "standard_name": "status_flag",
            "long_name": f"what the basin mean rests on, {words}",
            "flag_masks": np.array(list(Flag), dtype=np.uint8),
            "flag_meanings": " ".join(flag.word for flag in Flag),
        },
    )
    for part in content.blocks(_HELD):
        block = content.block(gaps, method, part)
        depth[:, part], share[:, part], flags[:, part] = block.depth.T, block.observed_share.T, block.flags.T

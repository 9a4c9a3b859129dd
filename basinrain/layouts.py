"""The layouts of rainfall files, and which keys of a source go with which of them."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import PurePath
from types import MappingProxyType
from typing import Final

__all__ = [
    "COLUMNS",
    "FORMAT_LAYOUTS",
    "FORMAT_NAMES",
    "GHCN",
    "GHCN_UNIT",
    "LAYOUTS",
    "NETCDF_COLUMNS",
    "NOT_IN_NETCDF",
    "TAKEN_BY",
    "file_format",
    "misplaced",
]

LAYOUTS: Final = ("wide", "long", "totals", "tips", "counter", "ghcn-dly", "ghcn-csv")

GHCN: Final = ("ghcn-dly", "ghcn-csv")
"""Published daily formats, whose unit and step are part of the format."""

GHCN_UNIT: Final = "0.1 mm"

COLUMNS: Final[Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {
        "wide": ("time",),
        "long": ("gauge", "time", "depth", "flag", "steps"),
        "totals": ("gauge", "depth", "storm", "flag"),
        "tips": ("gauge", "time", "depth"),
        "counter": ("gauge", "time", "depth", "flag"),
        "ghcn-dly": (),
        "ghcn-csv": (),
    }
)
"""Which columns can be named for a layout."""

_TABLES: Final = ("wide", "long", "totals")

TAKEN_BY: Final[Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {
        "tip": ("tips",),
        "start": ("tips",),
        "end": ("tips",),
        "rollover": ("counter",),
        "jitter": ("counter",),
        "reset": ("counter",),
        "stamp": _TABLES,
        "read_hour": (*_TABLES, "counter", *GHCN),
        "date_means": (*_TABLES, "counter", *GHCN),
        "missing": (*_TABLES, "tips", "counter"),
        "trace": _TABLES,
        "flags": (*_TABLES, "counter"),
        "accumulated": _TABLES,
        "gaps": (*_TABLES, "counter"),
        "time_format": (*_TABLES, "tips", "counter"),
        "columns": (*_TABLES, "tips", "counter"),
    }
)
"""The keys that not every layout takes, each with the layouts that do."""

_SUFFIXES: Final[Mapping[str, str]] = MappingProxyType(
    {".parquet": "parquet", ".pq": "parquet", ".nc": "netcdf", ".nc4": "netcdf"}
)

FORMAT_NAMES: Final[Mapping[str, str]] = MappingProxyType({"text": "text", "parquet": "Parquet", "netcdf": "NetCDF"})
"""What messages call the formats of files."""

FORMAT_LAYOUTS: Final[Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {"text": LAYOUTS, "parquet": ("wide", "long"), "netcdf": ("wide",)}
)
"""The layouts that a file of each format can have."""

NETCDF_COLUMNS: Final = ("time", "gauge", "depth")
"""Which variables can be named for a NetCDF file."""

NOT_IN_NETCDF: Final = ("flags", "accumulated", "trace", "time_format", "read_hour", "date_means")
"""Keys that speak of the text of cells and of bare dates, which a NetCDF file does not have."""


def file_format(name: str) -> str:
    """Return the format that a file's suffix stands for: ``"parquet"``, ``"netcdf"``, else ``"text"``.

    Examples
    --------
    >>> file_format("rain.pq"), file_format("RAIN.NC"), file_format("rain.csv")
    ('parquet', 'netcdf', 'text')
    """
    return _SUFFIXES.get(PurePath(name).suffix.lower(), "text")


def misplaced(key: str, layout: str) -> str:
    """Return what is expected in place of a key that a layout does not take; ``""`` where it takes the key.

    Examples
    --------
    >>> misplaced("tip", "wide")
    "it with layout 'tips' only"
    >>> misplaced("tip", "tips"), misplaced("file", "wide")
    ('', '')
    """
    layouts = TAKEN_BY.get(key, LAYOUTS)
    if layout in layouts or layout not in LAYOUTS:
        return ""
    named = [f"'{name}'" for name in layouts]
    return "it with layout " + " or ".join([", ".join(named[:-1]), named[-1]] if named[1:] else named) + " only"

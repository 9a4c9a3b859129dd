"""The layouts of rainfall files, and which keys of a source go with which of them."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

__all__ = ["COLUMNS", "GHCN", "GHCN_UNIT", "LAYOUTS", "TAKEN_BY", "misplaced"]

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

"""Units at the edge of the package; inside it everything is mm, m, m² and m³.

The factors are exact by definition: 1 in = 25.4 mm and 1 ft = 0.3048 m (international yard and pound agreement, 1959),
1 mi = 5280 ft, 1 acre = 43 560 ft², 1 US survey foot = 1200/3937 m.
"""

from __future__ import annotations

from types import MappingProxyType
from typing import Final

from basinrain.errors import JobError, unknown

__all__ = [
    "AREA_UNITS",
    "DEPTH_UNITS",
    "LENGTH_UNITS",
    "VOLUME_UNITS",
    "area_factor",
    "depth_factor",
    "length_factor",
    "volume_factor",
    "volume_unit_for",
]

DEPTH_UNITS: Final = MappingProxyType(
    {
        "mm": 1.0,
        "cm": 10.0,
        "m": 1000.0,
        "in": 25.4,
        "0.1 mm": 0.1,
        "0.01 mm": 0.01,
        "0.1 in": 2.54,
        "0.01 in": 0.254,
        "0.001 in": 0.0254,
        "kg m-2": 1.0,
    }
)
"""Depth units and how many mm one of them is (1 kg m⁻² of water is 1 mm at 1000 kg m⁻³, WMO-No. 8)."""

LENGTH_UNITS: Final = MappingProxyType({"m": 1.0, "km": 1000.0, "ft": 0.3048, "us-ft": 1200 / 3937, "mi": 1609.344})
"""Length units and how many m one of them is."""

AREA_UNITS: Final = MappingProxyType(
    {
        "m2": 1.0,
        "km2": 1e6,
        "ha": 1e4,
        "ft2": 0.3048**2,
        "acre": 43560 * 0.3048**2,
        "mi2": 1609.344**2,
    }
)
"""Area units and how many m² one of them is."""

VOLUME_UNITS: Final = MappingProxyType({"m3": 1.0, "acre-ft": 43560 * 0.3048**3})
"""Volume units and how many m³ one of them is."""


def _factor(unit: str, table: MappingProxyType[str, float], kind: str) -> float:
    try:
        return table[unit]
    except KeyError:
        raise JobError(unknown(f"{kind} unit", unit, table)) from None


def depth_factor(unit: str) -> float:
    """Return how many mm one ``unit`` of depth is.

    Raises
    ------
    JobError
        The unit is not known; the nearest known one is named.

    Examples
    --------
    >>> depth_factor("in")
    25.4
    >>> depth_factor("inch")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: depth unit: found 'inch'; expected one of: mm, cm, m, in, 0.1 mm, 0.01 mm, 0.1 in, \
0.01 in, 0.001 in, kg m-2; did you mean 'in'?
    """
    return _factor(unit, DEPTH_UNITS, "depth")


def length_factor(unit: str) -> float:
    """Return how many m one ``unit`` of length is.

    Examples
    --------
    >>> length_factor("km")
    1000.0
    """
    return _factor(unit, LENGTH_UNITS, "length")


def area_factor(unit: str) -> float:
    """Return how many m² one ``unit`` of area is.

    Examples
    --------
    >>> round(area_factor("mi2"), 6)
    2589988.110336
    """
    return _factor(unit, AREA_UNITS, "area")


def volume_factor(unit: str) -> float:
    """Return how many m³ one ``unit`` of volume is.

    Examples
    --------
    >>> round(volume_factor("acre-ft"), 6)
    1233.481838
    """
    return _factor(unit, VOLUME_UNITS, "volume")


def volume_unit_for(depth_unit: str) -> str:
    """Return the unit in which volumes are reported beside depths in ``depth_unit``.

    Examples
    --------
    >>> volume_unit_for("mm"), volume_unit_for("in")
    ('m3', 'acre-ft')
    """
    return "acre-ft" if depth_unit == "in" else "m3"

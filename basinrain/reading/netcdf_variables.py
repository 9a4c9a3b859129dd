"""Which variables of a NetCDF file hold times, gauges and depths."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from typing import Any, Final, NamedTuple

import numpy as np

from basinrain.errors import Problems, nearest_name
from basinrain.reading.blocks import DEPTH_NAMES, GAUGE_NAMES
from basinrain.reading.columns import find_column
from basinrain.reading.depths import DepthRules

__all__ = ["Chosen", "choose_variables"]

_UNITS: Final[Mapping[str, float]] = {
    "mm": 1.0, "millimeter": 1.0, "millimeters": 1.0, "millimetre": 1.0, "millimetres": 1.0,
    "kg m-2": 1.0, "kg/m2": 1.0, "kg/m^2": 1.0, "kg m^-2": 1.0, "kg m**-2": 1.0,
    "cm": 10.0, "centimeter": 10.0, "centimeters": 10.0, "centimetre": 10.0, "centimetres": 10.0,
    "m": 1000.0, "meter": 1000.0, "meters": 1000.0, "metre": 1000.0, "metres": 1000.0,
    "in": 25.4, "inch": 25.4, "inches": 25.4, "international_inch": 25.4,
    "0.1 mm": 0.1, "0.01 mm": 0.01, "0.1 in": 2.54, "0.01 in": 0.254,
}  # fmt: skip
"""mm in the units that a depth variable may name, after UDUNITS."""

_SUMS: Final = ("precipitation_amount", "lwe_thickness_of_precipitation_amount", "thickness_of_precipitation_amount",
                "rainfall_amount", "thickness_of_rainfall_amount")  # fmt: skip
"""CF standard names of depths."""


class Chosen(NamedTuple):
    """The names of the variables of time and depth, the gauges' ids, and whether time is the first dimension."""

    time: str
    depth: str
    gauges: tuple[str, ...]
    time_first: bool


def choose_variables(
    file: Any,  # noqa: ANN401 - an open NetCDF file
    columns: Mapping[str, str],
    depths: DepthRules,
    problems: Problems,
) -> Chosen | None:
    """Return the variables that hold a file's times, gauges and depths; None where they are not there.

    Parameters
    ----------
    file
        An open NetCDF file.
    columns
        The variables that the job names: ``time``, ``gauge``, ``depth``.
    depths
        The declared unit, with which the depth's must agree.
    problems
        Takes what is wrong, by variable.
    """
    before = len(problems)
    named = {key: _named(file, columns.get(key), key, problems) for key in ("time", "gauge", "depth")}
    if len(problems) > before:
        return None
    time = named["time"] or _time(file, problems)
    if time is None:
        return None
    if len(file[time].dimensions) != 1:
        problems.add(item=f"variable {time}", found=_shape(file, time), expected="one dimension, the time")
        return None
    axis = file[time].dimensions[0]
    depth = named["depth"] or _depth(file, axis, problems)
    if depth is None:
        return None
    variable = file[depth]
    if len(variable.dimensions) != 2 or axis not in variable.dimensions or not np.issubdtype(variable.dtype, np.number):
        expected = f"numbers over two dimensions, {axis} and that of the gauges"
        problems.add(item=f"variable {depth}", found=_shape(file, depth), expected=expected)
        return None
    if not all(variable.shape):
        problems.add(item=f"variable {depth}", found="no values", expected="a time and a gauge at least")
        return None
    _check_unit(variable, depth, depths, problems)
    gauges = _gauges(file, next(d for d in variable.dimensions if d != axis), named["gauge"], depth, problems)
    return None if len(problems) > before else Chosen(time, depth, gauges, variable.dimensions[0] == axis)


def _named(file: Any, name: str | None, key: str, problems: Problems) -> str | None:  # noqa: ANN401 - a NetCDF file
    if name is None or name in file.variables:
        return name
    problems.add(
        item=f"columns.{key}",
        found=f"no variable '{name}'",
        expected="a variable of the file",
        remedy=nearest_name(name, file.variables),
    )
    return None


def _time(file: Any, problems: Problems) -> str | None:  # noqa: ANN401 - a NetCDF file
    timed = [
        name
        for name, variable in file.variables.items()
        if " since " in str(getattr(variable, "units", "")) and len(variable.dimensions) == 1
    ]
    axes = [n for n in timed if getattr(file[n], "standard_name", "") == "time" or getattr(file[n], "axis", "") == "T"]
    return _only(timed, axes, "time", "a variable of times, with units such as 'hours since 2031-05-04'", problems)


def _depth(file: Any, axis: str, problems: Problems) -> str | None:  # noqa: ANN401 - a NetCDF file
    bounds = {getattr(variable, "bounds", None) for variable in file.variables.values()}
    over = [
        name
        for name, variable in file.variables.items()
        if len(variable.dimensions) == 2
        and axis in variable.dimensions
        and name not in bounds
        and np.issubdtype(variable.dtype, np.number)
    ]
    known = [name for name in over if getattr(file[name], "standard_name", "") in _SUMS]
    if len(known) != 1:
        trade = find_column(over, DEPTH_NAMES, mapped=None, key="depth", problems=problems)
        known = known if trade is None else [trade]
    return _only(over, known, "depth", f"a variable of numbers over {axis} and gauge", problems)


def _only(found: list[str], likely: list[str], key: str, expected: str, problems: Problems) -> str | None:
    """Return the one variable there is, or the one that is likely among several; else that is a problem."""
    if len(found) == 1 or len(likely) == 1:
        return found[0] if len(found) == 1 else likely[0]
    problems.add(
        item="the variables",
        found=f"several that may be the {key}: {', '.join(found)}" if found else f"none for the {key}",
        expected=expected,
        remedy=f"name it in columns.{key}" if found else "",
    )
    return None


def _check_unit(variable: Any, name: str, depths: DepthRules, problems: Problems) -> None:  # noqa: ANN401 - NetCDF
    unit = str(getattr(variable, "units", "")).strip()
    if not unit:
        return
    factor = _UNITS.get(unit.lower())
    if factor is None or not np.isclose(factor, depths.factor, rtol=1e-12):
        problems.add(
            item=f"variable {name}",
            found=f"units '{unit}'",
            expected=f"a depth in '{depths.unit}', as unit declares",
            remedy="correct unit" if factor is not None else "give depths; a rate must be multiplied by its time",
        )


def _gauges(
    file: Any,  # noqa: ANN401 - a NetCDF file
    dimension: str,
    named: str | None,
    depth: str,
    problems: Problems,
) -> tuple[str, ...]:
    """Return the ids along a dimension."""
    name = named or _ids(file, dimension)
    if name is None or file[name].dimensions[:1] != (dimension,):
        problems.add(
            item=f"variable {depth}",
            found=f"no ids for its dimension '{dimension}'" if name is None else f"ids '{name}' over another dimension",
            expected="a variable with the cf_role 'timeseries_id', or a coordinate variable of text or whole numbers",
            remedy="name it in columns.gauge",
        )
        return ()
    ids = _texts(file[name])
    if ids is None:
        expected = "text or whole numbers, one for each gauge"
        problems.add(item=f"variable {name}", found=_shape(file, name), expected=expected)
        return ()
    for gauge, count in Counter(ids).items():
        if count > 1 or not gauge:
            problems.add(
                item=f"variable {name}",
                found=f"{count} gauges named '{gauge}'" if gauge else "a gauge without an id",
                expected="every gauge once" if gauge else "an id for every gauge",
                gauge=gauge,
            )
    return tuple(ids)


def _ids(file: Any, dimension: str) -> str | None:  # noqa: ANN401 - a NetCDF file
    along = [name for name, variable in file.variables.items() if variable.dimensions[:1] == (dimension,)]
    role = next((name for name in along if getattr(file[name], "cf_role", "") == "timeseries_id"), None)
    if role is not None or dimension in along:
        return role or dimension
    return find_column(along, GAUGE_NAMES, mapped=None, key="gauge", problems=Problems())


def _texts(variable: Any) -> list[str] | None:  # noqa: ANN401 - a NetCDF variable
    """Return text, characters or whole numbers as text; None where they are something else."""
    if variable.dtype is str and variable.ndim == 1:
        return [str(text).strip() for text in variable[:]]
    if variable.dtype == np.dtype("S1") and variable.ndim == 2:
        variable.set_auto_chartostring(False)
        rows = np.ma.filled(variable[:], b"")
        return [b"".join(row).decode("utf-8", "replace").strip("\0 ") for row in rows]
    if variable.ndim == 1 and np.issubdtype(variable.dtype, np.integer):
        return [str(number) for number in np.asarray(variable[:]).tolist()]
    return None


def _shape(file: Any, name: str) -> str:  # noqa: ANN401 - a NetCDF file
    variable = file[name]
    kind = "text" if variable.dtype in {str, np.dtype("S1")} else str(variable.dtype)
    return f"{kind} over ({', '.join(variable.dimensions)})"

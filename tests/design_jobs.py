"""Small jobs of design storms whose basins can be drawn, written with the files that they name.

``write_design_job(folder, *, squares=QUARTERS, unit="mi", depths=DEPTHS, files={}, **changes) -> Path`` of ``job.toml``
``design_tables(*, unit="mi", **changes) -> dict``, the same job as nested tables, without any file
``changes`` are what both take: keys of the job with ``__`` for the dot, so ``design__aep=0.1``,
``design__depths__unit="in"``, ``design__areal_reduction={"method": "none"}``, ``design__point=[{...}, {...}]``.
A value of None takes the key or table out; a table given whole replaces the one that was there.

The job as it is: four squares of 5 x 5 units named nw, ne, sw, se (25 mi2 or km2 each, 100 together); one point with
20, 40, 60 mm in 1, 6, 24 h at 2 years and 30, 60, 90 mm at 10 years, annual maxima; 10 years, 6 h in steps of 1 h,
uniform; United States; no areal reduction, no uplift, no points of interest.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any, Final

import shapely

QUARTERS: Final = {
    "nw": shapely.box(0, 5, 5, 10),
    "ne": shapely.box(5, 5, 10, 10),
    "sw": shapely.box(0, 0, 5, 5),
    "se": shapely.box(5, 0, 10, 5),
}
"""Four squares of 25 square units that make one of 100."""

DEPTHS: Final = """duration,return_period,depth
1h,2,20
1h,10,30
6h,2,40
6h,10,60
24h,2,60
24h,10,90
"""
"""Depths of one point, mm."""

TWO_POINTS: Final = """point,x,y,duration,return_period,depth
west,2500,5000,6h,2,40
west,2500,5000,6h,10,60
east,7500,5000,6h,2,60
east,7500,5000,6h,10,80
"""
"""Depths of two points, mm, at the middle of the left and the right half of the squares in km."""

US_REDUCTION: Final = {"method": "leclerc-schaake"}
"""The areal reduction whose region is the job's jurisdiction, with its one key."""


def design_tables(*, unit: str = "mi", **changes: Any) -> dict[str, Any]:  # noqa: ANN401 - values of a job
    """Return the job as nested tables, with changes; see the head of this module."""
    tables: dict[str, Any] = {
        "job": {"name": "Four squares", "area_unit": f"{unit}2", "output": "output"},
        "basins": {"file": "basins.geojson", "id": "basin", "crs": "local", "length_unit": unit},
        "design": {
            "return_periods": [10],
            "durations": ["6h"],
            "step": "1h",
            "jurisdiction": "United States",
            "depths": {
                "from": "table",
                "file": "depths.csv",
                "unit": "mm",
                "probability": "return-period",
                "series": "annual-maximum",
                "source": "invented table",
                "date": "2031",
            },
            "pattern": [{"shape": "uniform"}],
        },
    }
    for path, value in changes.items():
        *tops, key = path.split("__")
        place = tables
        for top in tops:
            place = place.setdefault(top, {})
        if value is None:
            place.pop(key, None)
        else:
            place[key] = value
    return tables


def write_design_job(
    folder: Path,
    *,
    squares: Mapping[str, shapely.Geometry] = QUARTERS,
    unit: str = "mi",
    depths: str = DEPTHS,
    files: Mapping[str, str] = {},
    **changes: Any,  # noqa: ANN401 - values of a job
) -> Path:
    """Write a job with its files; see the head of this module.

    Parameters
    ----------
    folder
        Where the files go; made where it is not there.
    squares
        The basins by id, drawn in ``unit``.
    unit
        Of lengths on the drawing, ``"mi"`` or ``"km"``; areas are said in its square.
    depths
        The text of ``depths.csv``.
    files
        Further files by name.
    changes
        Of the job's keys.
    """
    folder.mkdir(parents=True, exist_ok=True)
    features = [
        {"type": "Feature", "properties": {"basin": name}, "geometry": json.loads(shapely.to_geojson(square))}
        for name, square in squares.items()
    ]
    (folder / "basins.geojson").write_text(json.dumps({"type": "FeatureCollection", "features": features}))
    (folder / "depths.csv").write_text(depths)
    for name, text in files.items():
        (folder / name).write_text(text)
    job = folder / "job.toml"
    job.write_text(as_toml(design_tables(unit=unit, **changes)))
    return job


def as_toml(tables: Mapping[str, Any]) -> str:
    """Return nested tables as TOML, with a heading for every table and one key a line."""
    return "\n".join(_lines(tables, ())) + "\n"


def _lines(table: Mapping[str, Any], heads: tuple[str, ...]) -> list[str]:
    lines = [f"{key} = {_value(value)}" for key, value in table.items() if not _is_table(value)]
    for key, value in table.items():
        path = (*heads, key)
        if isinstance(value, Mapping):
            lines += [f"[{'.'.join(path)}]", *_lines(value, path)]
        elif _is_table(value):
            for each in value:
                lines += [f"[[{'.'.join(path)}]]", *_lines(each, path)]
    return lines


def _is_table(value: object) -> bool:
    return isinstance(value, Mapping) or (
        isinstance(value, list) and bool(value) and all(isinstance(each, Mapping) for each in value)
    )


def _value(value: Any) -> str:  # noqa: ANN401 - values of a job
    if isinstance(value, list | tuple):
        return f"[{', '.join(_value(each) for each in value)}]"
    if isinstance(value, float):
        return repr(value)  # inf and nan are TOML's words too
    return json.dumps(value) if isinstance(value, bool | int | str) else value.isoformat()

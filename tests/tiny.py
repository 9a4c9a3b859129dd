"""A tiny job on a basin that can be drawn: a 10 km square in two halves, three gauges on a line, four hours."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

Ring = list[list[float]]

GAUGES = """id,name,x,y,elevation,normal
A,Alder Ford,2.5,5,120,900
B,Birch Hill,7.5,5,240,1000
C,Cold Tor,11,5,300,1200
"""

# Storm totals 10, 30 and 100 mm: the square's Thiessen weights .500/.425/.075 give 25.25 mm.
RAIN = """time,A,B,C
2031-05-04T01:00,1,6,20
2031-05-04T02:00,4,9,50
2031-05-04T03:00,5,10,30
2031-05-04T04:00,0,5,0
"""

JOB = """[job]
name = "Two halves"

[gauges]
file = "gauges.csv"
crs = "local"
length_unit = "km"

[[rainfall]]
file = "rain.csv"
unit = "mm"
interval = "1h"

[basins]
file = "basins.geojson"
id = "name"
crs = "local"
length_unit = "km"

[averaging]
idw = { cell = 250 }
"""

WEST: Ring = [[0, 0], [5, 0], [5, 10], [0, 10], [0, 0]]
EAST: Ring = [[5, 0], [10, 0], [10, 10], [5, 10], [5, 0]]


def feature(ring: Ring, **properties: object) -> dict[str, Any]:
    return {"type": "Feature", "properties": properties, "geometry": {"type": "Polygon", "coordinates": [ring]}}


def geojson(*features: dict[str, Any]) -> str:
    return json.dumps({"type": "FeatureCollection", "features": list(features)})


def write_tiny(
    folder: Path,
    *,
    job: str = JOB,
    gauges: str = GAUGES,
    rain: str = RAIN,
    basins: str | None = None,
    **more: str | bytes,
) -> Path:
    """Write the files of the tiny job, any of them replaced, and return the job file."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "job.toml").write_text(job, encoding="utf-8")
    (folder / "gauges.csv").write_text(gauges, encoding="utf-8")
    (folder / "rain.csv").write_text(rain, encoding="utf-8")
    polygons = geojson(feature(WEST, name="west"), feature(EAST, name="east")) if basins is None else basins
    (folder / "basins.geojson").write_text(polygons, encoding="utf-8")
    for name, content in more.items():
        path = folder / name.replace("__", ".")
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder / "job.toml"

"""Make the demo data: an invented river, its rain gauges and two storms.

Run ``python demo_basins/make_demo.py`` to write the data files beside this script again, byte for byte the same, or
name another folder. Nothing here was measured anywhere: river, places, gauges and storms are invented.

The files are plain text from numpy and the standard library alone. The seeded generator is only asked for uniform
numbers, and all that is written is rounded, so that neither numpy's version nor the machine changes a byte.
"""

from __future__ import annotations

import csv
import io
import json
import math
import sys
from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

Points = npt.NDArray[np.float64]
Values = npt.NDArray[np.float64]

SEED: Final = 20311011

# The drawing is in km east and north of an origin near the outlet; this is where that origin is put on the map.
ORIGIN_LON: Final = 136.9
ORIGIN_LAT: Final = 46.4
WGS84_A: Final = 6378137.0
WGS84_E2: Final = 0.0066943799901413165

# Every boundary is drawn once, from node to node, and shared by the basins on its two sides: they adjoin exactly.
ARCS: Final[dict[str, list[tuple[float, float]]]] = {
    # outlet -> divide between Lower and Teskel, round the west
    "west": [(-3.0, -2.2), (-2.2, -1.2), (-2.3, 0.8), (-0.9, 2.2), (-1.6, 4.2), (-3.6, 5.9), (-2.0, 7.3), (-1.2, 8.9)],
    # round the north-west and the head of the Teskel
    "northwest": [
        *[(-1.2, 8.9), (-2.6, 9.9), (-2.2, 11.8), (-3.3, 13.6), (-1.6, 15.2), (-1.0, 16.9), (0.9, 17.3)],
        *[(1.6, 19.0), (3.6, 19.3), (4.7, 18.2), (6.8, 18.6)],
    ],
    # round the head of the Ormavel
    "north": [
        *[(6.8, 18.6), (7.8, 20.4), (9.6, 20.6), (11.0, 22.6), (13.3, 22.1), (14.4, 20.9), (16.6, 21.4)],
        *[(18.9, 20.9), (19.4, 19.2), (21.3, 17.9), (20.5, 16.4), (20.9, 14.6)],
    ],
    # round the Brunnavy
    "east": [
        *[(20.9, 14.6), (22.6, 13.6), (22.5, 12.0), (24.4, 10.6), (23.9, 8.5), (22.3, 7.3), (22.4, 5.5)],
        *[(20.6, 4.2), (20.2, 2.5), (18.0, 1.9), (16.3, 0.5), (14.7, 1.4), (12.6, 1.4)],
    ],
    # back to the outlet round the south
    "south": [
        *[(12.6, 1.4), (11.8, -0.2), (10.0, -0.5), (8.7, -2.1), (7.0, -1.9), (5.6, -3.1), (3.6, -2.3)],
        *[(2.3, -2.7), (0.2, -1.6), (-1.6, -2.3), (-3.0, -2.2)],
    ],
    # Lower | Teskel, down to the confluence at (6.5, 5.5) and up the other side
    "teskel-right": [(-1.2, 8.9), (0.5, 8.6), (1.4, 7.3), (3.3, 6.9), (4.4, 5.7), (6.5, 5.5)],
    "teskel-left": [(6.5, 5.5), (6.5, 6.7), (7.7, 7.9), (7.2, 9.4), (8.0, 11.2)],
    # Teskel | Upper
    "teskel-head": [(8.0, 11.2), (7.4, 12.7), (8.3, 14.2), (7.4, 15.9), (7.6, 17.3), (6.8, 18.6)],
    # Lower | Upper, down to the confluence at (12.5, 8.5)
    "upper-right": [(8.0, 11.2), (9.2, 11.4), (10.2, 10.1), (11.5, 9.6), (12.5, 8.5)],
    # Upper | Brunnavy
    "upper-left": [(12.5, 8.5), (13.7, 8.9), (14.4, 10.3), (16.2, 10.8), (17.3, 12.5), (19.1, 12.9), (20.9, 14.6)],
    # Brunnavy | Lower
    "brunnavy-left": [(12.5, 8.5), (12.3, 7.3), (13.3, 6.3), (12.9, 4.7), (11.7, 3.4), (12.6, 1.4)],
}

# Name, lowest and highest ground in m, and the ring: arcs in order, "-" for backwards.
BASINS: Final[dict[str, tuple[str, int, int, list[str]]]] = {
    "OV1": (
        "Upper Ormavel",
        288,
        1412,
        ["north", "-upper-left", "-upper-right", "teskel-head"],
    ),
    "OV2": (
        "Teskel",
        214,
        1036,
        ["northwest", "-teskel-head", "-teskel-left", "-teskel-right"],
    ),
    "OV3": (
        "Brunnavy",
        288,
        1127,
        ["upper-left", "east", "-brunnavy-left"],
    ),
    "OV4": (
        "Lower Ormavel",
        131,
        684,
        ["west", "teskel-right", "teskel-left", "upper-right", "brunnavy-left", "south"],
    ),
}

# id, name, km east, km north, elevation in m
GAUGES: Final[list[tuple[str, str, float, float, int]]] = [
    ("R01", "Ormavel Bridge", -1.3, -1.5, 142),
    ("R02", "Pellick Farm", 6.3, 1.2, 268),
    ("R03", "Dunmeld", 10.7, 7.4, 305),
    ("R04", "Teskel Weir", 4.7, 8.4, 351),
    ("R05", "Hostrel Fold", 1.1, 13.8, 668),
    ("R06", "Skarn Hut", 11.0, 14.6, 742),
    ("R07", "High Corvane", 15.6, 18.1, 1164),
    ("R08", "Brunnavy Fold", 17.2, 8.3, 538),
    ("R09", "Lathren Tarn", 20.9, 9.9, 905),
    ("D10", "Quernlow Mill", 14.6, 4.2, 396),
    ("R11", "Westmarrow", -6.4, 6.8, 214),
    ("R12", "Varrow Ridge", 22.9, 18.2, 1388),
]
DAILY: Final = "D10"
SILENT: Final = "R09"
CLOCK_FAULT: Final = "R04"  # a gap after the peak
BLOCKED: Final = "R06"  # a gap over the wettest hours
MONTHS: Final = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")

# Hourly record: (start, start + HOURS]; the storms as hours after the record's start.
START: Final = np.datetime64("2031-10-10T00:00", "m")
HOURS: Final = 108
MAIN_STORM: Final = (27, 63)  # 11 October 03:00 to 12 October 15:00
SECOND_STORM: Final = (82, 94)  # 13 October 10:00 to 22:00
READ_HOUR: Final = 8
TIP: Final = 0.2
MISSING_CODE: Final = "-999"


def smooth(line: Points) -> Points:
    """Return a smooth line (Catmull-Rom spline) through the points of ``line``, two pieces between every two."""
    p = np.vstack([2 * line[0] - line[1], line, 2 * line[-1] - line[-2]])
    halves = (9 * (p[1:-2] + p[2:-1]) - p[:-3] - p[3:]) / 16
    result = np.empty((2 * len(line) - 1, 2))
    result[::2] = line
    result[1::2] = halves
    return result


def wiggle(line: Points, rng: np.random.Generator, *, times: int, roughness: float) -> Points:
    """Return ``line`` with every piece halved ``times`` times, each new point moved sideways by chance."""
    for _ in range(times):
        step = np.diff(line, axis=0)
        aside = np.column_stack([-step[:, 1], step[:, 0]]) * roughness * (2 * rng.random((len(step), 1)) - 1)
        finer = np.empty((2 * len(line) - 1, 2))
        finer[::2] = line
        finer[1::2] = (line[:-1] + line[1:]) / 2 + aside
        line = finer
    return line


def to_lonlat(xy: Points) -> Points:
    """Return longitude and latitude, 5 decimals (about 1 m), of km east and north of the origin."""
    lat = math.radians(ORIGIN_LAT)
    w = 1 - WGS84_E2 * math.sin(lat) ** 2
    meridian = WGS84_A * (1 - WGS84_E2) / w**1.5
    parallel = WGS84_A / math.sqrt(w) * math.cos(lat)
    lon = ORIGIN_LON + np.degrees(xy[:, 0] * 1000 / parallel)
    return np.round(np.column_stack([lon, ORIGIN_LAT + np.degrees(xy[:, 1] * 1000 / meridian)]), 5)


def signed_area(ring: Points) -> float:
    """Return the area in km² of a closed ring of degrees on the ellipsoid; above 0 when it runs anticlockwise."""
    e = math.sqrt(WGS84_E2)
    s = np.sin(np.radians(ring[:, 1]))
    # Cylindrical equal-area coordinates of the ellipsoid (Snyder 1987, USGS Professional Paper 1395, equation 3-12).
    q = (1 - WGS84_E2) * (s / (1 - WGS84_E2 * s**2) + np.arctanh(e * s) / e)
    x, y = WGS84_A * np.radians(ring[:, 0] - ORIGIN_LON), WGS84_A * (q - q[0]) / 2
    return float(np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]) / 2 / 1e6)


def basins(rng: np.random.Generator) -> str:
    """Return the sub-basins as GeoJSON text, one feature a line."""
    arcs = {}
    for name, points in ARCS.items():
        bent = smooth(wiggle(np.array(points), rng, times=1, roughness=0.24))
        arcs[name] = to_lonlat(wiggle(bent, rng, times=2, roughness=0.24))
    features = []
    for basin, (name, lowest, highest, parts) in BASINS.items():
        pieces = [arcs[part[1:]][::-1] if part.startswith("-") else arcs[part] for part in parts]
        ring = np.vstack([pieces[0][:1], *(piece[1:] for piece in pieces)])
        area = signed_area(ring)
        feature = {
            "type": "Feature",
            "properties": {
                "basin": basin,
                "name": name,
                "area_km2": round(abs(area), 1),
                "lowest_m": lowest,
                "highest_m": highest,
            },
            "geometry": {"type": "Polygon", "coordinates": [(ring if area > 0 else ring[::-1]).tolist()]},
        }
        features.append(json.dumps(feature, separators=(",", ":")))
    return '{"type":"FeatureCollection","features":[\n' + ",\n".join(features) + "\n]}\n"


def normals(rng: np.random.Generator) -> npt.NDArray[np.int64]:
    """Return monthly normals in whole mm, gauges by months: more at height, the most in October and November."""
    elevation = np.array([gauge[4] for gauge in GAUGES], dtype=float)
    year = 760 + 0.78 * elevation + 40 * (rng.random(len(GAUGES)) - 0.5)
    month = np.arange(12)
    season = 1 + 0.42 * np.cos(2 * np.pi * (month - 9.6) / 12) + 0.10 * np.cos(4 * np.pi * (month - 7.2) / 12)
    month_mm: npt.NDArray[np.int64] = np.rint(year[:, None] * season / season.sum()).astype(np.int64)
    return month_mm


def rain(rng: np.random.Generator) -> Values:
    """Return the true hourly depths in mm, shape (HOURS, gauges), as a gauge of 0.2 mm a tip counts them.

    Bands of rain cross from west-south-west to east-north-east at 9 km/h and give more the higher the gauge.
    """
    x, y = (np.array([gauge[k] for gauge in GAUGES]) for k in (2, 3))
    elevation = np.array([gauge[4] for gauge in GAUGES], dtype=float)
    delay = ((x - 10) * math.cos(0.44) + (y - 9) * math.sin(0.44)) / 9.0
    lift = (elevation - 140) / 1250
    hour = np.arange(HOURS)[:, None] + 0.5
    # Centre (hours after the record's start), half-width in h, mm/h in the valley, how much more at the ridge.
    bands = [
        (36.0, 3.4, 0.9, 0.5),  # the steady rain ahead of the front
        (45.5, 1.9, 5.6, 0.9),  # the front
        (51.5, 1.6, 2.7, 1.3),  # the wave behind it
        (56.5, 1.2, 1.0, 1.6),  # showers on the hills
        (86.0, 1.3, 1.9, 0.7),  # the second storm
        (89.5, 1.0, 1.2, 1.1),
    ]
    depth = np.zeros((HOURS, len(GAUGES)))
    for centre, width, intensity, rise in bands:
        shape = np.exp(-0.5 * ((hour - centre - delay) / width) ** 2)
        patch = 0.88 + 0.24 * rng.random(len(GAUGES))
        depth += intensity * (1 + rise * lift) * patch * shape
    # Rain comes in bursts that neighbouring gauges share in part.
    depth *= (0.75 + 0.5 * rng.random((HOURS, 1))) * (0.7 + 0.6 * rng.random(depth.shape))
    inside = np.zeros((HOURS, 1), dtype=bool)
    for first, stop in (MAIN_STORM, SECOND_STORM):
        inside[first:stop] = True
    depth = np.where(inside & (depth > 0.03), depth, 0.0)
    tips = np.floor(np.cumsum(depth, axis=0) / TIP)
    return np.diff(tips, axis=0, prepend=0.0) * TIP


def table(rows: list[list[str]]) -> str:
    """Return rows as CSV text."""
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    return text.getvalue()


def gauge_file(rng: np.random.Generator) -> str:
    """Return the gauge list as CSV text."""
    lonlat = to_lonlat(np.array([gauge[2:4] for gauge in GAUGES]))
    rows = [["id", "name", "lon", "lat", "elevation_m", *MONTHS]]
    for (gauge, name, *_, elevation), (lon, lat), normal in zip(GAUGES, lonlat, normals(rng), strict=True):
        rows.append([gauge, name, f"{lon:.5f}", f"{lat:.5f}", str(elevation), *(str(n) for n in normal)])
    return table(rows)


def rain_files(depth: Values) -> tuple[str, str]:
    """Return the hourly and the daily file as CSV text."""
    ids = [gauge[0] for gauge in GAUGES]
    cells = np.char.mod("%.1f", depth).astype(object)
    # A blocked funnel: blank over the seven wettest hours. A logger fault: its code over nine hours after the front.
    column = ids.index(BLOCKED)
    wettest = int(np.argmax(np.convolve(depth[:, column], np.ones(7), mode="valid")))
    cells[wettest : wettest + 7, column] = ""
    cells[49:58, ids.index(CLOCK_FAULT)] = MISSING_CODE
    cells[:, ids.index(SILENT)] = ""
    hourly = [k for k, gauge in enumerate(ids) if gauge != DAILY]
    ends = START + np.arange(1, HOURS + 1) * np.timedelta64(60, "m")
    wide = [["time", *(ids[k] for k in hourly)]]
    wide += [[str(end), *cells[t, hourly]] for t, end in enumerate(ends)]
    # Read at 08:00 and dated by that morning; the first whole day ends on the second morning.
    long = [["gauge", "date", "depth"]]
    for stop in range(24 + READ_HOUR, HOURS + 1, 24):
        total = depth[stop - 24 : stop, ids.index(DAILY)].sum()
        long.append([DAILY, str((START + np.timedelta64(stop * 60, "m")).astype("datetime64[D]")), f"{total:.1f}"])
    return table(wide), table(long)


def main(folder: Path) -> None:
    """Write the data files into ``folder``."""
    rng = np.random.default_rng(SEED)
    polygons, gauges = basins(rng), gauge_file(rng)
    hourly, daily = rain_files(rain(rng))
    files = {"basins.geojson": polygons, "gauges.csv": gauges, "rain_hourly.csv": hourly, "rain_daily.csv": daily}
    for name, text in files.items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)

"""Make the invented depth-duration-frequency table of the design job: ``make_depths.py [FOLDER]``."""

from __future__ import annotations

import sys
from pathlib import Path

POINTS = {
    "Skarn Head": (137.085, 46.565, 1.14),
    "Teskel Moor": (136.925, 46.520, 1.02),
    "Brunnavy": (137.140, 46.460, 0.97),
    "Ormavel Quay": (136.950, 46.410, 0.88),
}
"""Longitude, latitude, and how wet the point is."""

DURATIONS = ("10min", "15min", "30min", "1h", "2h", "3h", "6h", "12h", "24h", "48h")
UNITS = {"min": 1, "h": 60}

DAY = {0.5: 47.0, 0.2: 62.0, 0.1: 72.0, 0.05: 82.0, 0.02: 95.0, 0.01: 105.0}
"""mm in 24 h at a point of wetness 1, by annual exceedance probability."""


def minutes_of(word: str) -> int:
    """Return the minutes of a duration."""
    unit = "min" if word.endswith("min") else "h"
    return int(word.removesuffix(unit)) * UNITS[unit]


def growth(minutes: int) -> float:
    """Return the depth of a duration over that of a day, by an intensity of the form c / (t^e + f)."""
    return float(minutes / (minutes**0.72 + 8.0) / (1440 / (1440**0.72 + 8.0)))


def main(folder: Path) -> None:
    """Write the table into a folder."""
    lines = ["point,lon,lat,duration,aep,depth_mm"]
    for point, (lon, lat, wetness) in POINTS.items():
        for word in DURATIONS:
            for aep, day in DAY.items():
                depth = day * wetness * growth(minutes_of(word))
                lines.append(f"{point},{lon},{lat},{word},{aep},{depth:.1f}")
    (folder / "depths.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "design")

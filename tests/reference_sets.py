"""The real networks of tests/data, each with results that were computed independently of this package.

Rules, sources and licences stand in the README of every folder. Gauges' x, y and the polygon are used as they are, in
their own plane: nothing is projected.
"""

from __future__ import annotations

import csv
import json
import os
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
import shapely

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork

DATA = Path(__file__).parent / "data"
PLANES = {"oahu": "EPSG:26904", "nyc_hourly": "EPSG:26918", "co_platte": "EPSG:5070"}
VARIABLE = "BASINRAIN_CO_PLATTE"

elsewhere = pytest.param(
    "co_platte",
    marks=[
        pytest.mark.open_data,
        pytest.mark.skipif(VARIABLE not in os.environ, reason=f"{VARIABLE} does not name the folder of co_platte"),
    ],
)
every_set = pytest.mark.parametrize("name", ["oahu", "nyc_hourly", elsewhere])


def rows(file: Path) -> list[dict[str, str]]:
    with file.open(encoding="utf-8", newline="") as opened:
        return list(csv.DictReader(opened))


class Reference:
    """A data set's network and basin in their plane, its record, and the reference weights and series."""

    def __init__(self, name: str) -> None:
        folder = Path(os.environ[VARIABLE]) if name == "co_platte" else DATA / name
        gauges = rows(folder / "gauges.csv")
        outline = json.loads((folder / "basin_xy.geojson").read_text(encoding="utf-8"))["features"][0]["geometry"]
        self.network = GaugeNetwork(
            ids=tuple(row["id"] for row in gauges),
            x=np.array([float(row["x"]) for row in gauges]),
            y=np.array([float(row["y"]) for row in gauges]),
            crs=PLANES[name],
        )
        polygons = np.array([shapely.from_geojson(json.dumps(outline))], dtype=object)
        self.basins = Basins(ids=(name,), polygons=polygons, crs=PLANES[name])
        self._folder = folder
        self._weights = {row["id"]: row for row in rows(folder / "ref_weights.csv")}

    @property
    def cell(self) -> float:
        """The side of the reference's cells, m."""
        return float(json.loads((self._folder / "reference.json").read_text(encoding="utf-8"))["cell_m"])

    @property
    def depth(self) -> npt.NDArray[np.float64]:
        """The record, shape (n_steps, n_gauges), mm, NaN where it is missing."""
        return np.array([[float(row[g] or "nan") for g in self.network.ids] for row in rows(self._folder / "rain.csv")])

    def series(self, column: str) -> npt.NDArray[np.float64]:
        """Return a column of the reference's basin means, mm, NaN where it has none."""
        return np.array([float(row[column] or "nan") for row in rows(self._folder / "ref_series.csv")])

    def weights(self, column: str) -> npt.NDArray[np.float64]:
        """Return a column of the reference weights in the network's order."""
        return np.array([float(self._weights[gauge][column]) for gauge in self.network.ids])

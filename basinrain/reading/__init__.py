"""Files to the three values that everything is computed from: gauges, rain record, basins."""

from basinrain.reading.basins import read_basins
from basinrain.reading.envelope import read_envelope
from basinrain.reading.gauges import read_gauges
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.settling import check_near, settle, settle_basins
from basinrain.reading.step import bring_to_step

__all__ = [
    "bring_to_step",
    "check_near",
    "read_basins",
    "read_envelope",
    "read_gauges",
    "read_rainfall",
    "settle",
    "settle_basins",
]

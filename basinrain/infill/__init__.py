"""Infilling: donor weights, the methods that make them, and the completed record of a storm."""

from basinrain.infill.completed import Completed, Estimate
from basinrain.infill.completion import complete
from basinrain.infill.inverse_distance import inverse_distance_weights
from basinrain.infill.normal_ratio import normal_ratio_weights
from basinrain.infill.options import SCALES, InfillOptions
from basinrain.infill.registry import METHODS, InfillMethod, infill_method
from basinrain.infill.station_average import station_average_weights

__all__ = [
    "METHODS",
    "SCALES",
    "Completed",
    "Estimate",
    "InfillMethod",
    "InfillOptions",
    "complete",
    "infill_method",
    "inverse_distance_weights",
    "normal_ratio_weights",
    "station_average_weights",
]

"""Infilling: donor weights, the methods that make them, and the completed record of a storm."""

from basinrain.infill.completed import Completed, Estimate
from basinrain.infill.completion import complete
from basinrain.infill.correlation_weighting import correlation_weights
from basinrain.infill.days import Days, day_totals
from basinrain.infill.four_quadrant import four_quadrant_weights
from basinrain.infill.inverse_distance import inverse_distance_weights
from basinrain.infill.inverse_distance_ratios import inverse_distance_ratio_weights
from basinrain.infill.nearest_gauge import nearest_gauge_weights
from basinrain.infill.normal_ratio import normal_ratio_weights
from basinrain.infill.normals import suspect_normal_units
from basinrain.infill.options import SCALES, InfillOptions
from basinrain.infill.ratio_regression import ratio_regression_weights
from basinrain.infill.record_filling import Filled, RecordFiller
from basinrain.infill.record_normals import NormalRatios, normals_from_record
from basinrain.infill.registry import METHODS, InfillMethod, infill_method
from basinrain.infill.regression import regression_weights
from basinrain.infill.relations import Relations, relations_of, relations_of_record
from basinrain.infill.station_average import station_average_weights
from basinrain.infill.ten_percent_rule import ten_percent_rule_weights

__all__ = [
    "METHODS",
    "SCALES",
    "Completed",
    "Days",
    "Estimate",
    "Filled",
    "InfillMethod",
    "InfillOptions",
    "NormalRatios",
    "RecordFiller",
    "Relations",
    "complete",
    "correlation_weights",
    "day_totals",
    "four_quadrant_weights",
    "infill_method",
    "inverse_distance_ratio_weights",
    "inverse_distance_weights",
    "nearest_gauge_weights",
    "normal_ratio_weights",
    "normals_from_record",
    "ratio_regression_weights",
    "regression_weights",
    "relations_of",
    "relations_of_record",
    "station_average_weights",
    "suspect_normal_units",
    "ten_percent_rule_weights",
]

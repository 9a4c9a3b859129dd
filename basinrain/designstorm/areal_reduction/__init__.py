"""Areal reduction: from depths at a point to depths over an area, one module a method, all methods in one registry."""

from basinrain.designstorm.areal_reduction.arr_2019 import REGIONS, arr_2019, arr_2019_long, arr_2019_short
from basinrain.designstorm.areal_reduction.exponential import ExponentialCoefficients, exponential
from basinrain.designstorm.areal_reduction.jurisdiction import check_jurisdiction, outside_region
from basinrain.designstorm.areal_reduction.keers_wescott import keers_wescott
from basinrain.designstorm.areal_reduction.leclerc_schaake import leclerc_schaake
from basinrain.designstorm.areal_reduction.limits import Limits
from basinrain.designstorm.areal_reduction.reduction import OUTSIDE, ArealReduction, Reduced
from basinrain.designstorm.areal_reduction.registry import REDUCTIONS, areal_reduction
from basinrain.designstorm.areal_reduction.table import ReductionTable, tabulated

__all__ = [
    "OUTSIDE",
    "REDUCTIONS",
    "REGIONS",
    "ArealReduction",
    "ExponentialCoefficients",
    "Limits",
    "Reduced",
    "ReductionTable",
    "areal_reduction",
    "arr_2019",
    "arr_2019_long",
    "arr_2019_short",
    "check_jurisdiction",
    "exponential",
    "keers_wescott",
    "leclerc_schaake",
    "outside_region",
    "tabulated",
]

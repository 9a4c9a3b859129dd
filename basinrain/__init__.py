"""Areal rainfall from rain gauges: gaps infilled, basin means three ways, the weight of every gauge shown.

Names load when they are first used, so that ``import basinrain`` is quick.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from basinrain.averaging import arithmetic_weights, idw_weights, thiessen_weights
    from basinrain.basins import Basins
    from basinrain.design_job import run_design
    from basinrain.errors import BasinRainError
    from basinrain.gauges import GaugeNetwork
    from basinrain.infill import InfillOptions, complete
    from basinrain.job import run_infill, run_screen, run_storm
    from basinrain.jobfile import DesignJob, Job, parse_design_job, parse_job, read_design_job, read_job
    from basinrain.rainfall import RainRecord, Status
    from basinrain.reading import bring_to_step, read_basins, read_gauges, read_rainfall, settle
    from basinrain.results import InfillRun, ScreenRun, StormRun
    from basinrain.results_design import DesignRun
    from basinrain.results_series import SeriesRun
    from basinrain.series_job import run_series
    from basinrain.weights import WeightTable, compare

__all__ = [
    "BasinRainError",
    "Basins",
    "DesignJob",
    "DesignRun",
    "GaugeNetwork",
    "InfillOptions",
    "InfillRun",
    "Job",
    "RainRecord",
    "ScreenRun",
    "SeriesRun",
    "Status",
    "StormRun",
    "WeightTable",
    "arithmetic_weights",
    "bring_to_step",
    "compare",
    "complete",
    "idw_weights",
    "parse_design_job",
    "parse_job",
    "read_basins",
    "read_design_job",
    "read_gauges",
    "read_job",
    "read_rainfall",
    "run_design",
    "run_infill",
    "run_screen",
    "run_series",
    "run_storm",
    "settle",
    "thiessen_weights",
]

_ROOMS = {
    "BasinRainError": "errors",
    "Basins": "basins",
    "DesignJob": "jobfile",
    "DesignRun": "results_design",
    "GaugeNetwork": "gauges",
    "InfillOptions": "infill",
    "InfillRun": "results",
    "Job": "jobfile",
    "RainRecord": "rainfall",
    "ScreenRun": "results",
    "SeriesRun": "results_series",
    "Status": "rainfall",
    "StormRun": "results",
    "WeightTable": "weights",
    "arithmetic_weights": "averaging",
    "bring_to_step": "reading",
    "compare": "weights",
    "complete": "infill",
    "idw_weights": "averaging",
    "parse_design_job": "jobfile",
    "parse_job": "jobfile",
    "read_basins": "reading",
    "read_design_job": "jobfile",
    "read_gauges": "reading",
    "read_job": "jobfile",
    "read_rainfall": "reading",
    "run_design": "design_job",
    "run_infill": "job",
    "run_screen": "job",
    "run_series": "series_job",
    "run_storm": "job",
    "settle": "reading",
    "thiessen_weights": "averaging",
}


def __getattr__(name: str) -> Any:  # noqa: ANN401 - whatever the name stands for
    if name in _ROOMS:
        return getattr(import_module(f"basinrain.{_ROOMS[name]}"), name)
    raise AttributeError(f"module 'basinrain' has no attribute {name!r}")


def __dir__() -> list[str]:
    return __all__

"""The areal reduction that a job's design asks for."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction import REDUCTIONS, ExponentialCoefficients, Reduced, areal_reduction
from basinrain.designstorm.depth_chain import Reducer
from basinrain.designstorm.exceedance import Frequency
from basinrain.errors import JobError, Problems
from basinrain.jobfile import DesignJob, Job
from basinrain.jobfile.design_tables import NO_REDUCTION, ArealReductionTable, DesignTable, minutes_of
from basinrain.reading.reduction_table import read_reduction_table
from basinrain.units import area_factor

__all__ = ["COMPARABLE", "reducer", "stated_options"]

Floats = npt.NDArray[np.float64]

COMPARABLE: Final = tuple(name for name, method in REDUCTIONS.items() if method.jurisdiction)
"""Published reductions, which can be shown beside another; the others are a job's own."""


def reducer(job: Job | DesignJob, design: DesignTable) -> Reducer | None:
    """Return the areal reduction that a job asks for; None where it asks for none."""
    table = design.areal_reduction
    if table is None or table.method == NO_REDUCTION:
        return None
    options = stated_options(table.method, table)
    if table.method == "table":
        options["table"] = read_reduction_table(
            job.path(table.file or ""), area_unit=table.area_unit or "", source=table.source
        )
    method = areal_reduction(table.method)
    method.check_options(options)

    def reduce(area: float, minutes: Floats, frequency: Frequency) -> Reduced:
        return method.reduce(area, minutes, frequency, outside=table.outside, **options)

    return reduce


def stated_options(method: str, table: ArealReductionTable) -> dict[str, Any]:
    """Return the options of a reduction that the job itself states, those of its file left out.

    Parameters
    ----------
    method
        That of the table, or one that is compared with it.
    table
        The job's table.

    Raises
    ------
    JobError
        Coefficients that cannot be; all of them.
    """
    if method == "arr-2019":
        return {"region": table.region}
    return {"coefficients": _coefficients(table)} if method == "exponential" else {}


def _coefficients(table: ArealReductionTable) -> ExponentialCoefficients:
    problems = Problems()
    for name in ("c1", "c2", "c3"):
        if name not in table.coefficients:
            problems.add(item=f"[design.areal_reduction] coefficients, {name}", found="none", expected="c1, c2 and c3")
    for name in sorted(table.coefficients.keys() - {"c1", "c2", "c3"}):
        problems.add(item=f"[design.areal_reduction] coefficients, {name}", found="it", expected="c1, c2 and c3")
    problems.raise_as(JobError)
    areas = None
    if table.valid_areas is not None:
        factor = area_factor(table.area_unit or "")
        areas = (table.valid_areas[0] * factor, table.valid_areas[1] * factor)
    minutes = None if table.valid is None else (float(minutes_of(table.valid[0])), float(minutes_of(table.valid[1])))
    return ExponentialCoefficients(
        c1=table.coefficients["c1"],
        c2=table.coefficients["c2"],
        c3=table.coefficients["c3"],
        source=table.source,
        areas=areas,
        minutes=minutes,
    )

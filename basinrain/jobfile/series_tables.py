"""The tables of a job that are about the whole record: ``[series]`` and ``[storms]``."""

from __future__ import annotations

from typing import Annotated

from pydantic import AfterValidator, BeforeValidator, Field
from pydantic_core import PydanticCustomError

from basinrain.basins import UNION
from basinrain.errors import JobError
from basinrain.intervals import FORMS, parse_interval
from basinrain.jobfile.fields import Count, Duration, NameList, Positive, Table, names, once, one_of
from basinrain.series.policies import GAPS, INFILL_THEN_REWEIGHT

__all__ = [
    "ESTIMATED_GAP",
    "FORMATS",
    "LEAST_MEMORY",
    "TOTAL",
    "AntecedentTable",
    "SeriesTable",
    "StormsTable",
]

FORMATS = ("csv", "csv-per-basin", "parquet", "netcdf")
"""Kinds of files that a series is written to."""

TOTAL = "total"
"""Written for the rank of storms that are compared by all that fell in them."""

ESTIMATED_GAP = "estimated"
"""Written for the dry gap that is to be found from the record."""

LEAST_MEMORY = 1.0
"""GiB; with less the libraries alone would leave no room for a record."""

_MONTHS = 12


def _or_interval(*words: str) -> AfterValidator:
    def check(value: str) -> str:
        if value in words:
            return value
        try:
            return parse_interval(value).label
        except JobError:
            expected = f"{' or '.join(repr(word) for word in words)}, or {FORMS}"
            raise PydanticCustomError("interval", "{expected}", {"expected": expected}) from None

    return AfterValidator(check)


class SeriesTable(Table):
    """``[series]``: the whole record, basin by basin and step by step."""

    gaps: Annotated[
        tuple[Annotated[str, one_of(GAPS)], ...], BeforeValidator(names), Field(min_length=1), AfterValidator(once)
    ] = (INFILL_THEN_REWEIGHT,)
    weigh: Annotated[str, one_of(("depths", "ratios"))] = "depths"
    step: Duration | None = None
    timezone: str | None = None
    formats: Annotated[
        tuple[Annotated[str, one_of(FORMATS)], ...], BeforeValidator(names), Field(min_length=1), AfterValidator(once)
    ] = ("csv",)
    durations: Annotated[tuple[Duration, ...], BeforeValidator(names), AfterValidator(once)] = ()
    water_year: Annotated[int, Field(ge=1, le=_MONTHS)] = 10
    complete: Annotated[float, Field(gt=0, le=1)] = 0.95
    leave_out: NameList | None = None
    memory: Annotated[float, Field(ge=LEAST_MEMORY)] = 2.0
    on: str = "here"
    workers: Count | None = None


class AntecedentTable(Table):
    """``[storms] antecedent``: the index of what fell before a storm."""

    recession: Annotated[float, Field(gt=0, lt=1)] = 0.90


class StormsTable(Table):
    """``[storms]``: storms that are found in the record."""

    choose: Annotated[str, one_of(("largest",))] = "largest"
    count: Count = 5
    dry_gap: Annotated[str, _or_interval(ESTIMATED_GAP)] = "6h"
    rank: Annotated[str, _or_interval(TOTAL)] = TOTAL
    basin: str = UNION
    wet_depth: Positive | None = None
    pattern: str = "mean"
    antecedent: AntecedentTable = AntecedentTable()

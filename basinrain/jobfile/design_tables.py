"""The tables of a job that are about design storms: ``[design]`` and those within it."""

from __future__ import annotations

from datetime import date
from typing import Annotated, Any

from pydantic import AfterValidator, BeforeValidator, Field
from pydantic_core import PydanticCustomError

from basinrain import averaging
from basinrain.designstorm.areal_reduction import OUTSIDE, REDUCTIONS
from basinrain.designstorm.design_storms import OWN_DEPTH, SAME_DEPTH
from basinrain.designstorm.equations import EQUATIONS
from basinrain.designstorm.exceedance import SERIES
from basinrain.designstorm.extreme_values import DISTRIBUTIONS
from basinrain.designstorm.interval_factors import INTERVAL_FACTORS
from basinrain.designstorm.measures import DURATION_UNITS, UNITS, duration_words
from basinrain.designstorm.patterns import PATTERNS
from basinrain.designstorm.patterns.huff import BASES
from basinrain.errors import JobError
from basinrain.intervals import parse_interval
from basinrain.jobfile.fields import Moment, NameList, Table, as_list, names, once, one_of
from basinrain.jobfile.series_tables import FORMATS
from basinrain.units import AREA_UNITS

__all__ = [
    "EQUATION",
    "NO_REDUCTION",
    "ORIGINS",
    "RASTERS",
    "RECORD",
    "TABLE",
    "ArealReductionTable",
    "DesignDepthsTable",
    "DesignTable",
    "PatternTable",
    "PointTable",
    "RarityTable",
    "RasterTable",
    "UpliftTable",
    "minutes_of",
]

TABLE, RASTERS, EQUATION, RECORD = "table", "rasters", "equation", "record"
ORIGINS = (TABLE, RASTERS, EQUATION, RECORD)
"""Where depths by duration and frequency may come from."""

_LEAST_UPLIFT, _MOST_UPLIFT = 0.5, 5.0

NO_REDUCTION = "none"
"""Written for an areal reduction that is not made."""


def minutes_of(word: str) -> int:
    """Return the minutes of a duration such as ``"6h"``.

    Examples
    --------
    >>> minutes_of("6h"), minutes_of("1d")
    (360, 1440)
    """
    return (parse_interval(word).seconds or 0) // 60


def _no_length() -> PydanticCustomError:
    expected = "a number with min, h or d, 31d at most: 10min, 6h, 1d"
    return PydanticCustomError("length", "{expected}", {"expected": expected})


def _word(value: object) -> object:
    if not isinstance(value, str):
        raise _no_length()
    return value


def _length(word: str) -> str:
    try:
        interval = parse_interval(word)
    except JobError:
        interval = None
    if interval is None or interval.seconds is None:
        raise _no_length()
    return duration_words(interval.seconds / 60)


def _words(value: object) -> object:
    return names(value) if isinstance(value, str | list | tuple) else names(_word(value))


Duration = Annotated[str, BeforeValidator(_word), AfterValidator(_length)]
"""A number with min, h or d; a month has no one length."""


def _plain_date(value: object) -> object:
    whole = isinstance(value, int) and not isinstance(value, bool)
    return value.isoformat() if isinstance(value, date) else str(value) if whole else value


def _stated(value: str) -> str:
    if not value.strip():
        raise PydanticCustomError("stated", "{expected}", {"expected": "it to be stated"})
    return value.strip()


Plain = Annotated[str, AfterValidator(str.strip)]
"""Text that may be left out; blanks alone are no text."""

Stated = Annotated[str, AfterValidator(_stated)]
SomeDurations = Annotated[tuple[Duration, ...], BeforeValidator(_words), AfterValidator(once)]
Durations = Annotated[SomeDurations, Field(min_length=1)]
Names = Annotated[NameList, AfterValidator(once)]


def _list(value: object) -> object:
    if isinstance(value, bool | str):
        raise PydanticCustomError("numbers", "{expected}", {"expected": "a number, or a list of numbers"})
    return [value] if isinstance(value, int | float) else value


def _number(value: object) -> object:
    # True is 1 to Python, but no number that anybody means.
    if isinstance(value, bool | str):
        raise PydanticCustomError("number", "{expected}", {"expected": "a number"})
    return value


Number = Annotated[float, BeforeValidator(_number)]
Area = Annotated[Number, Field(ge=0)]
Numbers = Annotated[tuple[Number, ...], BeforeValidator(_list), AfterValidator(once)]
SomeNumbers = Annotated[Numbers, Field(min_length=1)]


def _uplift(factor: float) -> float:
    # 10 or 0.1 written for ten percent would pass for a factor.
    if not _LEAST_UPLIFT <= factor <= _MOST_UPLIFT:
        expected = f"a factor from {_LEAST_UPLIFT:g} to {_MOST_UPLIFT:g}: 1.1 for 10 % more"
        raise PydanticCustomError("uplift", "{expected}", {"expected": expected})
    return factor


class RasterTable(Table):
    """``[[design.depths.raster]]``: the depths of one duration and frequency."""

    file: str
    duration: Duration
    aep: Number | None = None
    return_period: Number | None = None


class DesignDepthsTable(Table):
    """``[design.depths]``: depths by duration and frequency."""

    origin: Annotated[str, one_of(ORIGINS), Field(alias="from")]
    source: Plain = ""
    date: Annotated[Plain, BeforeValidator(_plain_date)] = ""
    series: Annotated[str, one_of(SERIES)] | None = None
    unit: Annotated[str, one_of(UNITS)] | None = None
    file: str | None = None
    layout: Annotated[str, one_of(("long", "wide"))] = "long"
    probability: Annotated[str, one_of(("aep", "aep-percent", "return-period"))] | None = None
    duration_unit: Annotated[str, one_of(DURATION_UNITS)] | None = None
    columns: dict[str, str] = Field(default={})
    crs: str | None = None
    raster: Annotated[tuple[RasterTable, ...], BeforeValidator(as_list)] = ()
    equation: Annotated[str, one_of(EQUATIONS)] | None = None
    coefficients: Annotated[tuple[dict[str, Number], ...], BeforeValidator(as_list)] = ()
    valid: tuple[Duration, Duration] | None = None
    return_periods: Numbers = ()
    convert: bool = False
    extrapolate: bool = False
    average: Annotated[str, one_of(averaging.METHODS)] = "thiessen"
    interval_factor: Annotated[str, one_of(INTERVAL_FACTORS)] | None = None
    observed_every: Duration | None = None
    durations: SomeDurations = ()
    gauges: Names = ()
    wet_season: Annotated[tuple[Annotated[int, Field(ge=1, le=12)], ...], AfterValidator(once)] = ()
    distribution: Annotated[str, one_of(DISTRIBUTIONS)] | None = None
    beyond_record: bool = False


class UpliftTable(Table):
    """``[design.uplift]``: a factor for climate to come, with where it is from and for when."""

    factor: Annotated[Number, AfterValidator(_uplift)]
    source: Stated
    horizon: Annotated[str, BeforeValidator(_plain_date), AfterValidator(_stated)]


class ArealReductionTable(Table):
    """``[design.areal_reduction]``: from a point's depth to that of an area."""

    method: Annotated[str, one_of((*REDUCTIONS, NO_REDUCTION))]
    region: str | None = None
    coefficients: dict[str, Number] = Field(default={})
    source: Plain = ""
    file: str | None = None
    area_unit: Annotated[str, one_of(AREA_UNITS)] | None = None
    valid: tuple[Duration, Duration] | None = None
    valid_areas: tuple[Area, Area] | None = None
    area: Annotated[str, one_of(("to-point", "own"))] = "to-point"
    outside: Annotated[str, one_of(OUTSIDE)] = "refuse"
    compare: Annotated[
        tuple[Annotated[str, one_of(REDUCTIONS)], ...], BeforeValidator(names), AfterValidator(once)
    ] = ()


class PointTable(Table):
    """``[[design.point]]``: a point of interest and the basins above it."""

    name: Stated
    basins: Annotated[tuple[str, ...], BeforeValidator(names), Field(min_length=1), AfterValidator(once)]


class PatternTable(Table):
    """``[[design.pattern]]``: how a depth falls in time."""

    name: Stated | None = None
    shape: Annotated[str, one_of(PATTERNS)]
    durations: SomeDurations = ()
    peak: str | float | None = None
    basis: Annotated[str, one_of(BASES)] | None = None
    smooth: bool = False
    file: str | None = None
    percent: bool = False
    columns: dict[str, str] = Field(default={})
    storm: str | None = None

    @property
    def label(self) -> str:
        """What results call it."""
        return self.name or self.shape


class RarityTable(Table):
    """``[design.rarity]``: how rare storms of the record were over the areas of the design."""

    storms: Names = ()
    average: Annotated[str, one_of(averaging.METHODS)] = "thiessen"
    durations: SomeDurations = ()


class DesignTable(Table):
    """``[design]``: the depths that are wanted, and how they fall in time."""

    aep: SomeNumbers | None = None
    return_periods: SomeNumbers | None = None
    durations: Durations
    step: Duration
    jurisdiction: Plain = ""
    sub_basins: Annotated[str, one_of((SAME_DEPTH, OWN_DEPTH))] = SAME_DEPTH
    start: Moment | None = None
    formats: Annotated[
        tuple[Annotated[str, one_of(FORMATS)], ...], BeforeValidator(names), Field(min_length=1), AfterValidator(once)
    ] = ("csv",)
    depths: DesignDepthsTable
    uplift: UpliftTable | None = None
    areal_reduction: ArealReductionTable | None = None
    point: Annotated[tuple[PointTable, ...], BeforeValidator(as_list)] = ()
    pattern: Annotated[tuple[PatternTable, ...], BeforeValidator(as_list), Field(min_length=1)]
    rarity: RarityTable | None = None

    @property
    def own_area(self) -> bool:
        """Whether each basin's depth is reduced by its own area, not by that of all basins above the point."""
        return self.areal_reduction is not None and self.areal_reduction.area == "own"

    @property
    def input_names(self) -> tuple[str, ...]:
        """The files that the design reads, as they are named."""
        reduction = None if self.areal_reduction is None else self.areal_reduction.file
        files: list[Any] = [self.depths.file, *(raster.file for raster in self.depths.raster), reduction]
        files += [pattern.file for pattern in self.pattern]
        return tuple(file for file in files if file is not None)

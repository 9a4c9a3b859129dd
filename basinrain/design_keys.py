"""Which keys of a design's tables go together."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Final

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION
from basinrain.designstorm.patterns import PATTERNS
from basinrain.errors import Problems
from basinrain.jobfile.design_tables import (
    EQUATION,
    NO_REDUCTION,
    RASTERS,
    RECORD,
    TABLE,
    ArealReductionTable,
    DesignDepthsTable,
    PatternTable,
    minutes_of,
)
from basinrain.jobfile.fields import Table

__all__ = ["check_depth_keys", "check_one_of", "check_pattern_keys", "check_reduction_keys"]

_NEEDED: Final[Mapping[str, tuple[str, ...]]] = {
    TABLE: ("file", "unit", "probability", "series", "source", "date"),
    RASTERS: ("raster", "unit", "series", "source", "date"),
    EQUATION: (
        "equation",
        "coefficients",
        "return_periods",
        "valid",
        "unit",
        "duration_unit",
        "series",
        "source",
        "date",
    ),
    RECORD: (),
}
"""The keys of ``[design.depths]`` without which depths of an origin cannot be had."""

_TAKEN: Final[Mapping[str, tuple[str, ...]]] = {
    TABLE: ("layout", "duration_unit", "columns", "crs", "convert", "extrapolate", "interval_factor", "average"),
    RASTERS: ("crs", "convert", "extrapolate", "interval_factor"),
    EQUATION: ("convert", "extrapolate", "interval_factor"),
    RECORD: (
        "durations",
        "gauges",
        "wet_season",
        "distribution",
        "beyond_record",
        "extrapolate",
        "interval_factor",
        "average",
    ),
}
"""The further keys that depths of an origin take."""

_WORDS: Final = {
    "source": "where the depths come from: publication, volume, edition",
    "date": "when they were published or read",
    "series": f"'{ANNUAL_MAXIMUM}' or '{PARTIAL_DURATION}', as the source has it",
    "unit": "that of the depths, such as 'mm', or of intensities, such as 'mm/h'",
    "probability": "what the column holds: 'aep', 'aep-percent' or 'return-period'",
    "file": "the file of depths",
    "raster": "one table [[design.depths.raster]] for every duration and frequency",
    "equation": "its name",
    "coefficients": "those of the equation: one set with an x, or one for every return period",
    "return_periods": "that of every set of coefficients, or the least and the greatest of a set with an x",
    "duration_unit": "that of the durations in the equation: 'min' or 'h'",
    "valid": "the shortest and the longest duration for which the equation holds",
}


_REGIONAL: Final = "arr-2019"

_OF_REDUCTION: Final[Mapping[str, tuple[tuple[str, ...], tuple[str, ...]]]] = {
    _REGIONAL: (("region",), ()),
    "exponential": (("coefficients", "source"), ("valid", "valid_areas", "area_unit")),
    "table": (("file", "source", "area_unit"), ()),
}
"""The keys that a method of areal reduction needs, and those that it takes besides."""


def check_depth_keys(table: DesignDepthsTable, problems: Problems) -> None:
    """Tell which keys of ``[design.depths]`` are lacking, and which do not go with where the depths come from."""
    needed = _NEEDED[table.origin]
    for key in needed:
        if not getattr(table, key):
            problems.add(item=f"[design.depths] {key}", found="nothing", expected=_WORDS[key], remedy="state it")
    taken = {"origin", *needed, *_TAKEN[table.origin]}
    if table.interval_factor is not None and table.origin != RECORD:
        taken.add("observed_every")
    words = "what goes with that: " + ", ".join(sorted(taken - {"origin"}))
    _refuse("[design.depths]", table, taken, f"from = '{table.origin}'", problems, words=words)
    if table.convert and table.series == ANNUAL_MAXIMUM:
        problems.add(
            item="[design.depths] convert",
            found=f"it beside series = '{ANNUAL_MAXIMUM}'",
            expected=f"it with depths of a {PARTIAL_DURATION} series, which it brings to probabilities",
            remedy="remove it",
        )
    if table.interval_factor is not None and table.observed_every is None and table.origin != RECORD:
        problems.add(
            item="[design.depths] observed_every",
            found="nothing",
            expected="the fixed interval at which the depths were read, which interval_factor needs",
            remedy="state it, or take interval_factor out",
        )
    for number, raster in enumerate(table.raster, start=1):
        both = (raster.aep is not None, raster.return_period is not None)
        check_one_of(f"[[design.depths.raster]] no. {number}", ("aep", "return_period"), both, problems)
    _check_order("[design.depths] valid", table.valid, problems)


def check_reduction_keys(table: ArealReductionTable, problems: Problems) -> None:
    """Tell which keys of ``[design.areal_reduction]`` are lacking, and which do not go with its method."""
    needed, taken = _OF_REDUCTION.get(table.method, ((), ()))
    own, own_words, regional_words = needed, f"method = '{table.method}'", f"compare = '{_REGIONAL}'"
    if _REGIONAL in table.compare and table.method != _REGIONAL:
        needed = (*needed, "region")
    common = ("method", "compare") if table.method == NO_REDUCTION else ("method", "area", "outside", "compare")
    for key in needed:
        if not getattr(table, key):
            problems.add(
                item=f"[design.areal_reduction] {key}",
                found="nothing",
                expected=f"it, which {own_words if key in own else regional_words} needs",
                remedy="state it",
            )
    keys = (*common, *needed, *taken)
    beside = f"method = '{table.method}'"
    _refuse("[design.areal_reduction]", table, keys, beside, problems, words=", ".join(keys))
    if "valid_areas" in taken and (table.valid_areas is None) != (table.area_unit is None):
        lacking, other = ("area_unit", "valid_areas") if table.area_unit is None else ("valid_areas", "area_unit")
        problems.add(
            item=f"[design.areal_reduction] {lacking}",
            found=f"nothing beside {other}",
            expected="the least and the greatest area" if lacking == "valid_areas" else "the unit of valid_areas",
            remedy="give both, or neither",
        )
    _check_order("[design.areal_reduction] valid", table.valid, problems)


def check_pattern_keys(item: str, table: PatternTable, problems: Problems) -> None:
    """Tell which keys of a ``[[design.pattern]]`` are lacking, and which its shape does not take."""
    files = {"table": ("file", "percent", "columns"), "observed": ("storm",)}.get(table.shape, ())
    options = (*files, *(option for option in PATTERNS[table.shape].options if option != "ordinates"))
    beside = f"shape = '{table.shape}'"
    taken = ("name", "shape", "durations", *options)
    _refuse(item, table, taken, beside, problems, words=", ".join(options) or "no options")
    for key in files[:1]:
        if not getattr(table, key):
            words = "the file of the pattern" if key == "file" else "the name of a [[storm]] of the job"
            problems.add(item=f"{item} {key}", found="nothing", expected=words, remedy="name it")


def check_one_of(item: str, keys: tuple[str, str], given: tuple[bool, bool], problems: Problems) -> None:
    """Tell where both of two keys are given, or neither."""
    if given[0] == given[1]:
        found = f"{'both' if given[0] else 'neither'} of {keys[0]} and {keys[1]}"
        remedy = "take one of the two out" if given[0] else "give one of the two"
        problems.add(item=item, found=found, expected="one of them", remedy=remedy)


def _check_order(item: str, valid: tuple[str, str] | None, problems: Problems) -> None:
    if valid is not None and minutes_of(valid[0]) >= minutes_of(valid[1]):
        problems.add(item=item, found=f"{valid[0]} to {valid[1]}", expected="the shorter duration first")


def _refuse(item: str, table: Table, taken: Iterable[str], beside: str, problems: Problems, *, words: str) -> None:
    """Tell which keys have a value although they are not taken."""
    for key, info in type(table).model_fields.items():
        if key not in taken and getattr(table, key) != info.default:
            problems.add(item=f"{item} {key}", found=f"it beside {beside}", expected=words, remedy="remove it")

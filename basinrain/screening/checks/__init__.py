"""The checks of a record, one module a family."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from basinrain.screening.checks.accumulations import unflagged_accumulations
from basinrain.screening.checks.check import (
    Check,
    needs_cases,
    needs_days,
    needs_gauges,
    needs_neighbours,
    needs_times,
)
from basinrain.screening.checks.copies import duplicated_stretches, shared_records
from basinrain.screening.checks.depths import greatest_depths_found
from basinrain.screening.checks.fitness import cold_seasons, needs_a_year, needs_unheated, short_records
from basinrain.screening.checks.neighbours import dry_among_wet, far_from_neighbours, long_dry_runs
from basinrain.screening.checks.reading_hours import reading_hours
from basinrain.screening.checks.timing import shifted_records
from basinrain.screening.checks.units import unit_mixups
from basinrain.screening.checks.values import missing_codes, stuck_values

__all__ = ["CHECKS", "Check"]

_AMONG_FOUR: Final = (needs_gauges(4), needs_neighbours(3))
_AMONG_THREE: Final = (needs_gauges(3), needs_neighbours(2))

_ALL: Final = (
    Check(
        "missing-code",
        "Codes of missing values, such as 999, that were read as depths.",
        missing_codes,
    ),
    Check(
        "greatest-depths",
        "Depths over the greatest known in the world for their duration, or over the region's limit.",
        greatest_depths_found,
        (needs_times,),
    ),
    Check(
        "stuck-values",
        "One depth above zero that stands at more steps on end than the gauge's habit explains.",
        stuck_values,
        (needs_times,),
    ),
    Check(
        "spatial-outlier",
        "Days on which a gauge has far more rain than its neighbours.",
        far_from_neighbours,
        (needs_times, *_AMONG_FOUR),
    ),
    Check(
        "zero-among-wet",
        "Days without rain at a gauge while all its neighbours were wet.",
        dry_among_wet,
        (needs_times, *_AMONG_FOUR),
    ),
    Check(
        "zero-run",
        "Long runs without rain while the neighbours had much.",
        long_dry_runs,
        (needs_times, *_AMONG_THREE, needs_cases(5)),
    ),
    Check(
        "unflagged-accumulation",
        "Readings that are as much as the neighbours had over the days before, on which the gauge has none.",
        unflagged_accumulations,
        (needs_times, needs_days, *_AMONG_THREE, needs_cases(30)),
    ),
    Check(
        "unit-mixup",
        "Records, or months of them, in another unit than the one declared.",
        unit_mixups,
        (needs_times, *_AMONG_THREE, needs_cases(5)),
    ),
    Check(
        "shifted-record",
        "Records, or seasons of them, that run hours or days early or late against their neighbours.",
        shifted_records,
        (needs_times, needs_days, *_AMONG_THREE, needs_cases(30)),
    ),
    Check(
        "reading-hours",
        "Daily gauges that are read at another hour than most, as stated or as their neighbours let it seem.",
        reading_hours,
        (needs_times, needs_days),
    ),
    Check(
        "duplicated-stretch",
        "Stretches of a gauge's record that stand in it a second time.",
        duplicated_stretches,
        (needs_times,),
    ),
    Check(
        "one-record-two-gauges",
        "Two gauges with the same wet values at the same times.",
        shared_records,
        (needs_times, needs_gauges(2)),
    ),
    Check(
        "short-record",
        "Gauges whose complete years are too few for normals.",
        short_records,
        (needs_a_year,),
    ),
    Check(
        "cold-season",
        "Gauges without heating that have values in cold months.",
        cold_seasons,
        (needs_times, needs_unheated),
    ),
)

CHECKS: Final[Mapping[str, Check]] = MappingProxyType({check.name: check for check in _ALL})
"""Every check by name, in the order in which findings are listed."""

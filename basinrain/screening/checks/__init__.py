"""The checks of a record, one module a family."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from basinrain.screening.checks.accumulations import ACCUMULATION_LIMITS, unflagged_accumulations
from basinrain.screening.checks.check import (
    Check,
    needs_cases,
    needs_days,
    needs_gauges,
    needs_neighbours,
    needs_times,
)
from basinrain.screening.checks.copies import COPY_LIMITS, TWIN_LIMITS, duplicated_stretches, shared_records
from basinrain.screening.checks.depths import DEPTH_LIMITS, greatest_depths_found
from basinrain.screening.checks.fitness import (
    COLD_LIMITS,
    YEAR_LIMITS,
    cold_seasons,
    needs_a_year,
    needs_unheated,
    short_records,
)
from basinrain.screening.checks.neighbours import (
    OUTLIER_LIMITS,
    RUN_LIMITS,
    ZERO_LIMITS,
    dry_among_wet,
    far_from_neighbours,
    long_dry_runs,
)
from basinrain.screening.checks.reading_hours import HOUR_LIMITS, reading_hours
from basinrain.screening.checks.timing import SHIFT_LIMITS, shifted_records
from basinrain.screening.checks.units import UNIT_LIMITS, unit_mixups
from basinrain.screening.checks.values import CODE_LIMITS, STUCK_LIMITS, missing_codes, stuck_values

__all__ = ["CHECKS", "Check"]

_AMONG_FOUR: Final = (needs_gauges(4), needs_neighbours(3))
_AMONG_THREE: Final = (needs_gauges(3), needs_neighbours(2))

_ALL: Final = (
    Check(
        "missing-code",
        "Codes of missing values, such as 999, that were read as depths.",
        missing_codes,
        CODE_LIMITS,
    ),
    Check(
        "greatest-depths",
        "Depths over the greatest known in the world for their duration, or over the region's limit.",
        greatest_depths_found,
        DEPTH_LIMITS,
        (needs_times,),
    ),
    Check(
        "stuck-values",
        "One depth above zero that stands at more steps on end than the gauge's habit explains.",
        stuck_values,
        STUCK_LIMITS,
        (needs_times,),
    ),
    Check(
        "spatial-outlier",
        "Days on which a gauge has far more rain than its neighbours.",
        far_from_neighbours,
        OUTLIER_LIMITS,
        (needs_times, *_AMONG_FOUR),
    ),
    Check(
        "zero-among-wet",
        "Days without rain at a gauge while all its neighbours were wet.",
        dry_among_wet,
        ZERO_LIMITS,
        (needs_times, *_AMONG_FOUR),
    ),
    Check(
        "zero-run",
        "Long runs without rain while the neighbours had much.",
        long_dry_runs,
        RUN_LIMITS,
        (needs_times, *_AMONG_THREE, needs_cases(5)),
    ),
    Check(
        "unflagged-accumulation",
        "Readings that are as much as the neighbours had over the days before, on which the gauge has none.",
        unflagged_accumulations,
        ACCUMULATION_LIMITS,
        (needs_times, needs_days, *_AMONG_THREE, needs_cases(30)),
    ),
    Check(
        "unit-mixup",
        "Records, or months of them, in another unit than the one declared.",
        unit_mixups,
        UNIT_LIMITS,
        (needs_times, *_AMONG_THREE, needs_cases(5)),
    ),
    Check(
        "shifted-record",
        "Records, or seasons of them, that run hours or days early or late against their neighbours.",
        shifted_records,
        SHIFT_LIMITS,
        (needs_times, needs_days, *_AMONG_THREE, needs_cases(30)),
    ),
    Check(
        "reading-hours",
        "Daily gauges that are read at another hour than most, as stated or as their neighbours let it seem.",
        reading_hours,
        HOUR_LIMITS,
        (needs_times, needs_days),
    ),
    Check(
        "duplicated-stretch",
        "Stretches of a gauge's record that stand in it a second time.",
        duplicated_stretches,
        COPY_LIMITS,
        (needs_times,),
    ),
    Check(
        "one-record-two-gauges",
        "Two gauges with the same wet values at the same times.",
        shared_records,
        TWIN_LIMITS,
        (needs_times, needs_gauges(2)),
    ),
    Check(
        "short-record",
        "Gauges whose complete years are too few for normals.",
        short_records,
        YEAR_LIMITS,
        (needs_a_year,),
    ),
    Check(
        "cold-season",
        "Gauges without heating that have values in cold months.",
        cold_seasons,
        COLD_LIMITS,
        (needs_times, needs_unheated),
    ),
)

CHECKS: Final[Mapping[str, Check]] = MappingProxyType({check.name: check for check in _ALL})
"""Every check by name, in the order in which findings are listed."""

"""The tables of a comparison of infill methods and of a completed record, as data frames in the job's units.

Columns and their order are those of the CSV files; ``docs/outputs.md`` describes each.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from basinrain.rainfall import RainRecord, Status
from basinrain.tables import time_text
from basinrain.units import depth_factor

if TYPE_CHECKING:
    import pandas as pd

    from basinrain.infill.leave_one_out import Comparison

__all__ = ["completed_depths", "completed_status", "infill_cases", "infill_differences", "infill_scores"]

_SCORES = (
    "scale", "gauge", "infill_method", "cases", "rmse", "mae", "bias", "depth_unit", "correlation", "hits", "misses",
    "false_alarms", "dry_hits", "top20_ratio", "chosen",
)  # fmt: skip
_DIFFERENCES = "infill_method best difference low high depth_unit distinguishable chosen skipped_because"


def infill_scores(comparison: Comparison | None, depth_unit: str) -> pd.DataFrame:
    """Return ``infill_scores``: one row per scale, gauge (blank for all of them) and method; none without a comparison.

    A score without cases is NaN.
    """
    import pandas as pd

    mm = depth_factor(depth_unit)
    return pd.DataFrame(
        [
            (
                score.scale,
                score.gauge,
                score.candidate,
                score.n,
                score.rmse / mm,
                score.mae / mm,
                score.bias / mm,
                depth_unit,
                score.correlation,
                score.hits,
                score.misses,
                score.false_alarms,
                score.dry_hits,
                score.top20_ratio,
                score.candidate == comparison.chosen,
            )
            for score in comparison.scores
        ]
        if comparison is not None
        else [],
        columns=list(_SCORES),
    )


def infill_differences(comparison: Comparison | None, depth_unit: str) -> pd.DataFrame:
    """Return ``infill_differences``: one row per method compared, and one per method that could not be, with why.

    None without a comparison.

    ``difference`` is the method's root-mean-square error less the best one's, ``low`` to ``high`` its 95 % bootstrap
    interval; NaN for a method that was skipped.
    """
    import pandas as pd

    columns = _DIFFERENCES.split()
    if comparison is None:
        return pd.DataFrame(columns=columns)
    mm = depth_factor(depth_unit)
    rows: list[tuple[Any, ...]] = [
        (
            found.candidate,
            found.best,
            found.difference / mm,
            found.low / mm,
            found.high / mm,
            depth_unit,
            found.distinguishable,
            found.candidate == comparison.chosen,
            "",
        )
        for found in comparison.differences
    ]
    rows += [
        (label, comparison.best, np.nan, np.nan, np.nan, depth_unit, None, False, reason)
        for label, reason in comparison.skipped.items()
    ]
    return pd.DataFrame(rows, columns=columns)


def infill_cases(comparison: Comparison, zone: str, depth_unit: str) -> pd.DataFrame:
    """Return ``infill_cases``: one row per gauge and case, with what the chosen method makes of it from the others.

    Storm totals have their storm in place of the time.
    """
    import pandas as pd

    mm = depth_factor(depth_unit)
    names = comparison.storms or [time_text(end, zone) for end in comparison.ends]
    frames = []
    for g, gauge in enumerate(comparison.gauges):
        rows = np.flatnonzero(~np.isnan(comparison.observed[:, g]))
        frames.append(
            pd.DataFrame(
                {
                    "gauge": gauge,
                    "storm" if comparison.storms else "time": [names[row] for row in rows],
                    "observed": comparison.observed[rows, g] / mm,
                    "estimated": comparison.estimated[rows, g] / mm,
                    "depth_unit": depth_unit,
                    "infill_method": comparison.chosen,
                }
            )
        )
    return pd.concat(frames, ignore_index=True)


def completed_depths(record: RainRecord, depth_unit: str) -> pd.DataFrame:
    """Return ``completed_<unit>``: a row per time and a column per gauge, NaN where nothing is known even now.

    It is a table that the layout ``wide`` reads. A record of storm totals has a row per storm, by its name.
    """
    import pandas as pd

    frame = pd.DataFrame(record.depth / depth_factor(depth_unit), columns=list(record.gauges))
    frame.insert(0, *_row_names(record))
    return frame


def completed_status(record: RainRecord) -> pd.DataFrame:
    """Return ``completed_status``: where every value of the completed record comes from, in the same shape."""
    import pandas as pd

    labels = [status.label for status in Status]
    # Categories: as text a long record would take many times its size.
    columns = {
        gauge: pd.Categorical.from_codes(record.status[:, g], categories=pd.Index(labels))
        for g, gauge in enumerate(record.gauges)
    }
    frame = pd.DataFrame(columns)
    frame.insert(0, *_row_names(record))
    return frame


def _row_names(record: RainRecord) -> tuple[str, list[str]]:
    """Return what names the rows of a record: the heading and a text a row."""
    if record.labels:
        return "storm", list(record.labels)
    return "time", [time_text(end, record.zone) for end in record.ends]

"""The tables of a record: what it holds, what screening found, what was changed; data frames in the job's units.

Columns and their order are those of the CSV files; ``docs/outputs.md`` describes each.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from basinrain.rainfall import Status
from basinrain.tables import time_text
from basinrain.units import depth_factor

if TYPE_CHECKING:
    import pandas as pd

    from basinrain.results import ScreenRun
    from basinrain.results_common import GaugedRun

__all__ = ["completeness", "double_mass", "edit_table", "findings", "homogeneity"]

_FINDINGS = "check gauge from to severity state evidence action others key"
_EDITS = "gauge from to action value reason by date steps_changed depth_before depth_after depth_unit"
_DOUBLE_MASS = (
    "gauge reference year days total cumulative reference_cumulative adjusted depth_unit break_after ratio "
    "fitted_ratio significance"
)
_HOMOGENEITY = (
    "gauge reference test years fewest_days statistic critical_5 critical_1 rejected_at change_after counted grade"
)


def findings(run: GaugedRun) -> pd.DataFrame:
    """Return ``findings``: one row per finding; times are blank where it concerns the whole record."""
    import pandas as pd

    zone = run.record.zone
    rows = [
        (
            found.check,
            found.gauge,
            time_text(found.start, zone),
            time_text(found.end, zone),
            found.severity,
            found.state,
            found.evidence,
            found.action,
            " ".join(found.others),
            found.key,
        )
        for found in run.screening.findings
    ]
    return pd.DataFrame(rows, columns=_FINDINGS.split())


def completeness(run: ScreenRun) -> pd.DataFrame:
    """Return ``completeness``: one row per gauge, before anything was rejected.

    ``first`` and ``last`` are the ends of the first and last step with a value of the gauge's own, blank without one;
    ``share`` is the steps with one over the steps in service, NaN for a gauge that was never in service.
    """
    import pandas as pd

    raw = run.raw
    own, out = raw.reporting, raw.status == Status.NOT_INSTALLED
    rows = []
    for g, gauge in enumerate(raw.gauges):
        steps = np.flatnonzero(own[:, g])
        in_service = int((~out[:, g]).sum())
        first, last = (raw.ends[steps[0]], raw.ends[steps[-1]]) if len(steps) else (np.datetime64("NaT"),) * 2
        rows.append(
            (
                gauge,
                time_text(first, raw.zone),
                time_text(last, raw.zone),
                raw.step,
                len(raw),
                in_service,
                len(steps),
                len(steps) / in_service if in_service else np.nan,
                *(int((raw.status[:, g] == status).sum()) for status in Status),
            )
        )
    names = [status.label.replace(" ", "_") for status in Status]
    columns = ["gauge", "first", "last", "step", "steps", "in_service", "with_value", "share", *names]
    return pd.DataFrame(rows, columns=columns)


def edit_table(run: GaugedRun) -> pd.DataFrame:
    """Return ``edits``: one row per edit and what it did; a depth to set, and the sums, are in the job's unit.

    ``depth_before`` and ``depth_after`` are the sums of the depths acted on, NaN where nothing is known.
    """
    import pandas as pd

    mm, zone = depth_factor(run.depth_unit), run.record.zone
    rows = []
    for row in run.edit_rows:
        value = row["value"] / mm if row["action"] == "set" else row["value"]
        before, after = (np.nan if row[key] is None else row[key] / mm for key in ("depth_before", "depth_after"))
        rows.append(
            (
                row["gauge"],
                time_text(np.datetime64(row["from"] or "NaT", "s"), zone),
                time_text(np.datetime64(row["to"] or "NaT", "s"), zone),
                row["action"],
                "" if value is None else value if isinstance(value, str) else f"{value:.12g}",
                row["reason"],
                row["by"],
                row["date"],
                row["steps_changed"],
                before,
                after,
                run.depth_unit,
            )
        )
    return pd.DataFrame(rows, columns=_EDITS.split())


def double_mass(run: ScreenRun) -> pd.DataFrame:
    """Return ``double_mass``: one row per gauge and year, with the cumulative curve and what it says of the gauge.

    Totals of the gauge and of the reference are over the ``days`` of the year that they share.
    ``adjusted`` is the year's total as the slope ratio would have it; the record is not changed by it. ``break_after``
    is blank, ``ratio`` and ``significance`` are NaN, where no break was looked for.
    """
    import pandas as pd

    mm = depth_factor(run.depth_unit)
    frames = [
        pd.DataFrame(
            {
                "gauge": curve.gauge,
                "reference": " ".join(curve.reference),
                "year": curve.years,
                "days": curve.days,
                "total": curve.totals / mm,
                "cumulative": curve.y / mm,
                "reference_cumulative": curve.x / mm,
                "adjusted": curve.adjusted / mm,
                "depth_unit": run.depth_unit,
                "break_after": "" if curve.break_after is None else str(curve.break_after),
                "ratio": curve.ratio,
                "fitted_ratio": curve.fitted_ratio,
                "significance": curve.significance,
            }
        )
        for curve in run.screening.double_mass
    ]
    return pd.concat(frames, ignore_index=True) if frames else pd.DataFrame(columns=_DOUBLE_MASS.split())


def homogeneity(run: ScreenRun) -> pd.DataFrame:
    """Return ``homogeneity``: one row per gauge and test.

    ``fewest_days`` is the least number of days that a year which took part is over. ``critical_5`` and ``critical_1``
    are NaN where the series is too short for a table; ``grade`` and ``change_after`` are the gauge's, blank where there
    is none.
    """
    import pandas as pd

    rows = [
        (
            tested.gauge,
            " ".join(tested.reference),
            test.test,
            test.n,
            int(tested.days.min()),
            test.statistic,
            test.critical.get(0.05, np.nan),
            test.critical.get(0.01, np.nan),
            "" if test.rejected_at is None else f"{100 * test.rejected_at:g} %",
            "" if test.break_after is None else str(int(tested.years[test.break_after])),
            test in tested.counted,
            tested.grade or "",
        )
        for tested in run.screening.homogeneity
        for test in tested.tests
    ]
    return pd.DataFrame(rows, columns=_HOMOGENEITY.split())

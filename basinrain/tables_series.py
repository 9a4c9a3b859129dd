"""The tables of a run over the whole record; data frames in the job's units.

Columns and their order are those of the CSV files; ``docs/outputs.md`` describes each.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from basinrain.series.flags import flag_words
from basinrain.series.steps import in_words
from basinrain.tables import time_text
from basinrain.units import area_factor, depth_factor

if TYPE_CHECKING:
    import pandas as pd

    from basinrain.results_series import SeriesRun

__all__ = [
    "greatest_depths",
    "left_out_means",
    "network_changes",
    "period_totals",
    "series",
    "series_means",
    "storms_found",
]

_MEANS = (
    "basin area area_unit method gaps depth mean_annual mean_annual_of_steps depth_unit years steps steps_missing "
    "steps_infilled steps_reweighted observed_share difference_percent"
)
_LEFT_OUT = "basin method gaps gauge mean_with mean_without depth_unit change_percent"
_CHANGES = "time gauge change gauges"
_TOTALS = "basin method gaps period name start end depth depth_present depth_unit share"
_GREATEST = (
    "basin method gaps duration sliding sliding_end aligned aligned_end depth_unit windows sliding_left_out "
    "aligned_windows aligned_left_out"
)
_STORMS = (
    "rank basin method gaps start end hours depth depth_present depth_unit ranked_by ranked_depth peak peak_end "
    "steps_missing cut before_5d before_10d before_30d antecedent_index antecedent_days"
)


def series(run: SeriesRun) -> pd.DataFrame:
    """Return ``series``: the basin means at the step and in the clock asked for."""
    import pandas as pd

    grouping, mm = run.grouping, depth_factor(run.depth_unit)
    source = grouping.source(run.store)
    times = [time_text(end, grouping.zone) for end in grouping.ends]
    whole = slice(0, len(grouping))
    frames = []
    for gaps, method in run.setup.series:
        depth, share = source.depth(gaps, method), source.observed_share(gaps, method)
        flags = source.flags(gaps, method)
        for b, basin in enumerate(run.basins.ids):
            column = slice(b, b + 1)
            frames.append(
                pd.DataFrame(
                    {
                        "basin": basin,
                        "method": method,
                        "gaps": gaps,
                        "time": times,
                        "depth": depth[whole, column].ravel() / mm,
                        "depth_unit": run.depth_unit,
                        "observed_share": share[whole, column].ravel(),
                        "flags": [flag_words(int(code)) for code in flags[whole, column].ravel()],
                    }
                )
            )
    return pd.concat(frames, ignore_index=True)


def series_means(run: SeriesRun) -> pd.DataFrame:
    """Return ``series_means``: one row per basin, method and policy; the difference is to the first policy's total.

    The difference is between means over all steps, NaN for the first policy itself.
    """
    import pandas as pd

    mm, unit_area = depth_factor(run.depth_unit), area_factor(run.area_unit)
    rows = []
    for b, basin in enumerate(run.basins.ids):
        for method in run.setup.methods:
            first = run.summaries[run.setup.gaps[0], method].terms
            for gaps in run.setup.gaps:
                found = run.summaries[gaps, method]
                terms, annual = found.terms, found.annual
                rows.append(
                    (
                        basin,
                        run.basins.areas[b] / unit_area,
                        run.area_unit,
                        method,
                        gaps,
                        terms.total[b] / mm,
                        annual.of_years[b] / mm,
                        annual.of_steps[b] / mm,
                        run.depth_unit,
                        int(annual.years[b]),
                        int(terms.steps[b]),
                        int(terms.missing[b]),
                        int(terms.infilled[b]),
                        int(terms.reweighted[b]),
                        terms.observed_share[b],
                        np.nan if terms is first else terms.percent_above(first)[b],
                    )
                )
    return pd.DataFrame(rows, columns=_MEANS.split())


def left_out_means(run: SeriesRun) -> pd.DataFrame:
    """Return ``left_out_means``: mean depth of a step with and without a gauge; one row per basin, series, gauge."""
    import pandas as pd

    mm = depth_factor(run.depth_unit)
    rows = [
        (
            basin,
            found.method,
            found.gaps,
            found.gauge,
            found.with_it[b] / mm,
            found.without[b] / mm,
            run.depth_unit,
            found.percent[b],
        )
        for b, basin in enumerate(run.basins.ids)
        for found in run.left_out
    ]
    return pd.DataFrame(rows, columns=_LEFT_OUT.split())


def network_changes(run: SeriesRun) -> pd.DataFrame:
    """Return ``network_changes``: one row per gauge that came or went."""
    import pandas as pd

    rows = [(time_text(c.time, run.record.zone), c.gauge, c.change, c.gauges) for c in run.changes]
    return pd.DataFrame(rows, columns=_CHANGES.split())


def period_totals(run: SeriesRun) -> pd.DataFrame:
    """Return ``period_totals``: by month, year and water year; one row per basin, series and period."""
    import pandas as pd

    mm, zone = depth_factor(run.depth_unit), run.record.zone
    frames = []
    for b, basin in enumerate(run.basins.ids):
        for (gaps, method), summary in run.summaries.items():
            for period, totals in (
                ("month", summary.months),
                ("year", summary.years),
                ("water-year", summary.water_years),
            ):
                frames.append(
                    pd.DataFrame(
                        {
                            "basin": basin,
                            "method": method,
                            "gaps": gaps,
                            "period": period,
                            "name": totals.names,
                            "start": [time_text(when, zone) for when in totals.starts],
                            "end": [time_text(when, zone) for when in totals.ends],
                            "depth": totals.total[:, b] / mm,
                            "depth_present": totals.present[:, b] / mm,
                            "depth_unit": run.depth_unit,
                            "share": totals.share[:, b],
                        }
                    )
                )
    return pd.concat(frames, ignore_index=True)[_TOTALS.split()]


def greatest_depths(run: SeriesRun) -> pd.DataFrame:
    """Return ``greatest_depths``: sliding and clock-aligned windows; one row per basin, series and duration."""
    import pandas as pd

    mm, zone = depth_factor(run.depth_unit), run.record.zone
    rows = []
    for b, basin in enumerate(run.basins.ids):
        for (gaps, method), summary in run.summaries.items():
            found = summary.greatest
            if found is None:
                continue
            sliding, aligned = found.sliding, found.aligned
            for d, duration in enumerate(found.durations):
                rows.append(
                    (
                        basin,
                        method,
                        gaps,
                        in_words(int(duration / np.timedelta64(1, "s"))),
                        sliding.depth[d, b] / mm,
                        time_text(sliding.ends[d, b], zone),
                        aligned.depth[d, b] / mm,
                        time_text(aligned.ends[d, b], zone),
                        run.depth_unit,
                        int(sliding.windows[d]),
                        int(sliding.left_out[d, b]),
                        int(aligned.windows[d]),
                        int(aligned.left_out[d, b]),
                    )
                )
    return pd.DataFrame(rows, columns=_GREATEST.split())


def storms_found(run: SeriesRun) -> pd.DataFrame:
    """Return ``storms_found``: the largest storms of the series of one basin, then those whose depth is not known."""
    import pandas as pd

    found, mm, zone = run.storms, depth_factor(run.depth_unit), run.record.zone
    rows = []
    for k, ranked in enumerate((*found.taken, *found.ranking.incomplete)):
        event = ranked.event
        taken = k < len(found.taken)
        before = [np.nan] * 3 if found.before is None or not taken else (found.before.depth[k] / mm).tolist()
        index = np.nan if found.index is None or not taken else found.index.from_zero[k] / mm
        days = None if found.index is None or not taken else int(found.index.days[k])
        rows.append(
            (
                ranked.rank,
                found.basin,
                found.method,
                found.gaps,
                time_text(event.start, zone),
                time_text(event.end, zone),
                event.duration / np.timedelta64(1, "h"),
                event.total / mm,
                event.present / mm,
                run.depth_unit,
                found.ranking.by,
                ranked.depth / mm,
                event.peak / mm,
                time_text(event.peak_end, zone),
                event.missing_inside + event.missing_beside,
                event.cut,
                *before,
                index,
                days,
            )
        )
    frame = pd.DataFrame(rows, columns=_STORMS.split())
    return frame.astype({"rank": "Int64", "antecedent_days": "Int64"})

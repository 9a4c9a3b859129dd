"""The tables of what infilling did, as data frames in the job's units; ``docs/outputs.md`` describes each."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from basinrain.infill_effect import InfillEffect
from basinrain.series_check import WET_DEPTH, SeriesCheck
from basinrain.units import depth_factor

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["EFFECT", "SERIES", "by_storm", "effect_frame", "effect_spread_frame", "series_frame"]

EFFECT = "storm basin method infill_method depth depth_unit difference share_infilled gaps_left"
_SPREAD = "storm basin method least greatest depth_unit spread_percent least_by greatest_by"
SERIES = "storm basin method series steps wet_share wet_from top20_mean top_n depth_unit variance variance_unit"
"""Columns of the tables, in their order."""


def by_storm(frames: Iterable[pd.DataFrame], columns: str) -> pd.DataFrame:
    """Return the tables of several storms as one; only the header where there is none."""
    import pandas as pd

    given = list(frames)
    return pd.concat(given, ignore_index=True) if given else pd.DataFrame(columns=columns.split())


def effect_frame(storm: str, basins: Sequence[str], effect: InfillEffect, depth_unit: str) -> pd.DataFrame:
    """Return ``infill_effect``: one row per basin, averaging method and infill method, of one storm.

    Parameters
    ----------
    storm
        The storm's name.
    basins
        Ids of the basins, in the order of the effect's arrays.
    effect
        What every infill method gives.
    depth_unit
        ``"mm"`` or ``"in"``.

    Returns
    -------
    pandas.DataFrame
        ``difference`` is to the job's own method, in ``depth_unit``; ``gaps_left`` are the values of gauges in service
        that the infill method leaves without a depth. ``depth``, ``difference`` and ``share_infilled`` are NaN where
        there is no number.

    Examples
    --------
    >>> import numpy as np
    >>> effect = InfillEffect(
    ...     methods=("nearest-gauge", "station-average"),
    ...     own="station-average",
    ...     totals={"thiessen": np.array([[25.4], [50.8]])},
    ...     share_infilled={"thiessen": np.array([[0.2], [0.25]])},
    ...     left=np.array([0, 0]),
    ...     skipped={},
    ...     refused={},
    ... )
    >>> effect_frame("Quill", ["all"], effect, "in")[["infill_method", "depth", "difference"]].values.tolist()
    [['nearest-gauge', 1.0, -1.0], ['station-average', 2.0, 0.0]]
    """
    import pandas as pd

    mm = depth_factor(depth_unit)
    rows = [
        (
            storm,
            basin,
            averaging,
            label,
            totals[k, b] / mm,
            depth_unit,
            effect.difference(averaging)[k, b] / mm,
            effect.share_infilled[averaging][k, b],
            int(effect.left[k]),
        )
        for b, basin in enumerate(basins)
        for averaging, totals in effect.totals.items()
        for k, label in enumerate(effect.methods)
    ]
    return pd.DataFrame(rows, columns=EFFECT.split())


def effect_spread_frame(storm: str, basins: Sequence[str], effect: InfillEffect, depth_unit: str) -> pd.DataFrame:
    """Return the least and greatest mean over the infill methods, one row per basin and averaging method.

    Parameters
    ----------
    storm, basins, effect, depth_unit
        As for :func:`effect_frame`.

    Returns
    -------
    pandas.DataFrame
        ``spread_percent`` is the difference in percent of the mean over the infill methods, NaN with fewer than two
        numbers; ``least_by`` and ``greatest_by`` are infill methods, empty without a number.

    Examples
    --------
    >>> import numpy as np
    >>> effect = InfillEffect(
    ...     methods=("nearest-gauge", "station-average"),
    ...     own="station-average",
    ...     totals={"thiessen": np.array([[9.0], [11.0]])},
    ...     share_infilled={"thiessen": np.array([[0.2], [0.25]])},
    ...     left=np.array([0, 0]),
    ...     skipped={},
    ...     refused={},
    ... )
    >>> effect_spread_frame("Quill", ["all"], effect, "mm").values.tolist()
    [['Quill', 'all', 'thiessen', 9.0, 11.0, 'mm', 20.0, 'nearest-gauge', 'station-average']]
    """
    import pandas as pd

    mm = depth_factor(depth_unit)
    spreads = {averaging: effect.spread(averaging) for averaging in effect.totals}
    rows = [
        (storm, basin, averaging, s.least / mm, s.greatest / mm, depth_unit, s.percent, s.least_by, s.greatest_by)
        for b, basin in enumerate(basins)
        for averaging, s in ((averaging, row[b]) for averaging, row in spreads.items())
    ]
    return pd.DataFrame(rows, columns=_SPREAD.split())


def series_frame(storm: str, check: SeriesCheck, depth_unit: str) -> pd.DataFrame:
    """Return ``series_check``: one row per basin, averaging method and series, of one storm or the whole record.

    Parameters
    ----------
    storm
        The storm's name.
    check
        The figures.
    depth_unit
        ``"mm"`` or ``"in"``.

    Returns
    -------
    pandas.DataFrame
        ``wet_from`` is the least depth of a wet step (0.1 mm), ``top_n`` the number of greatest depths in
        ``top20_mean``. What has no number is NaN.

    Examples
    --------
    >>> from basinrain.series_check import SeriesFigures
    >>> row = SeriesFigures(
    ...     basin="all",
    ...     method="thiessen",
    ...     series="completed",
    ...     steps=4,
    ...     wet_share=0.5,
    ...     top_mean=25.4,
    ...     top_n=4,
    ...     variance=645.16,
    ... )
    >>> frame = series_frame("Quill", SeriesCheck(figures=(row,)), "in")
    >>> frame[["wet_share", "top20_mean", "variance", "variance_unit"]].round(9).values.tolist()
    [[0.5, 1.0, 1.0, 'in2']]
    """
    import pandas as pd

    mm = depth_factor(depth_unit)
    rows = [
        (
            storm,
            row.basin,
            row.method,
            row.series,
            row.steps,
            row.wet_share,
            WET_DEPTH / mm,
            row.top_mean / mm,
            row.top_n,
            depth_unit,
            row.variance / mm**2,
            f"{depth_unit}2",
        )
        for row in check.figures
    ]
    return pd.DataFrame(rows, columns=SERIES.split())

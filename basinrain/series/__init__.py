"""Basin-mean series of a whole record, and what is read off them: totals, storms, greatest depths."""

from basinrain.series.antecedent import antecedent_depths, antecedent_index
from basinrain.series.dry_gap import estimate_dry_gap
from basinrain.series.engine import SeriesEngine, SeriesPart, SeriesSetup
from basinrain.series.events import Event, find_events, rank_events
from basinrain.series.flags import Flag
from basinrain.series.greatest_depths import annual_maxima, greatest_depths
from basinrain.series.period_totals import mean_annual, period_totals
from basinrain.series.policies import GAPS
from basinrain.series.regrouping import regroup

__all__ = [
    "GAPS",
    "Event",
    "Flag",
    "SeriesEngine",
    "SeriesPart",
    "SeriesSetup",
    "annual_maxima",
    "antecedent_depths",
    "antecedent_index",
    "estimate_dry_gap",
    "find_events",
    "greatest_depths",
    "mean_annual",
    "period_totals",
    "rank_events",
    "regroup",
]

"""Depths from the record: what they rest on, both fits, how good they are and how sure."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.clocks import MONTHS
from basinrain.design_record import SEASON_SHARE, RecordSource
from basinrain.designstorm.extreme_values import GEV, GUMBEL_RATIO
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.record_depths import YEARS_FOR_GEV
from basinrain.designstorm.record_remarks import SHORT_TITLES, TITLES
from basinrain.report import design_shown
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, counted, depth_text, number_text, percent_text, unit_word
from basinrain.results_design import DesignRun
from basinrain.units import depth_factor

__all__ = ["depths_tables", "durations_drawn", "fit_tables", "maxima_table", "record_facts"]

Floats = npt.NDArray[np.float64]

_GAUGES: Final = 40
_YEARS: Final = 60
_COLUMNS: Final = 8
_LISTED: Final = 30


def record_facts(run: DesignRun) -> list[tuple[str, str]]:
    """Return what the depths rest on, each a name and a text; nothing where they are not from the record."""
    record = run.from_record
    if record is None:
        return []
    found, table = record.depths, run.asked.design.depths
    counting = (record.season_share >= SEASON_SHARE).sum(axis=0)
    least, most = int(counting.min()), int(counting.max())
    months = table.wet_season
    season = f"the months {', '.join(MONTHS[m - 1].capitalize() for m in months)}" if months else "the whole year"
    years = f"{least}" if least == most else f"{least} to {most}, by area"
    short = _short_years(record)
    span = f"{record.years[0]} to {record.years[-1]}"
    return [
        ("Gauges", f"{design_shown.cut(record.gauges, _GAUGES)}; the same ones with the same weights at every step"),
        ("Average", f"{table.average}; gaps infilled by {design_shown.infill_words(run)}"),
        ("Record's step", duration_text(record.step)),
        ("Years", f"{len(record.years)}, {span}; {years} count"),
        ("A year counts", f"where at least {100 * SEASON_SHARE:.0f} % of the steps of {season} have a depth"),
        ("Do not count", short or "none"),
        ("Distribution", f"{TITLES[found.distribution]}, {_why(run, found.distribution)}, fitted by L-moments"),
        ("Reach", _reach(run, least)),
    ]


def _why(run: DesignRun, taken: str) -> str:
    if run.asked.design.depths.distribution is not None:
        return "as the job says"
    return f"since {'no' if taken == GEV else 'a'} series is shorter than {YEARS_FOR_GEV} years"


def _reach(run: DesignRun, least: int) -> str:
    rarest = run.asked.frequencies[-1]
    words = f"the rarest depth asked for is {rarest.label}, from {counted(least, 'year')}"
    if run.asked.design.depths.beyond_record:
        words += "; the job allows return periods beyond twice the years"
    return words


def _short_years(record: RecordSource) -> str:
    """Return the years that do not count in any area, and that there are others in some."""
    short = record.season_share < SEASON_SHARE
    everywhere = [str(year) for year in record.years[short.all(axis=1)]]
    some = [str(year) for year in record.years[short.any(axis=1) & ~short.all(axis=1)]]
    parts = [design_shown.cut(everywhere, _LISTED)] if everywhere else []
    if some:
        parts.append(f"in some areas {design_shown.cut(some, _LISTED)}")
    return "; ".join(parts)


def _places(run: DesignRun, record: RecordSource) -> list[int]:
    """Return where the durations that are shown stand among those of the record: asked ones, and of the others some."""
    asked = np.flatnonzero(np.isin(record.minutes, run.asked.minutes)).tolist()
    others = [d for d in range(len(record.minutes)) if d not in asked]
    room = _COLUMNS - len(asked)
    return sorted(design_shown.spread(asked, _COLUMNS) + (design_shown.spread(others, room) if room > 0 else []))


def durations_drawn(run: DesignRun, most: int) -> list[int]:
    """Return where the durations of a figure stand among those of the record: of those asked for some."""
    record = run.from_record
    if record is None:
        return []
    return design_shown.spread(np.flatnonzero(np.isin(record.minutes, run.asked.minutes)).tolist(), most)


def fit_tables(run: DesignRun) -> list[Table]:
    """Return a table of both distributions for every point of interest that is shown."""
    record = run.from_record
    return [] if record is None else [_fits(run, record, row) for row in _rows(run)]


def _rows(run: DesignRun) -> list[int]:
    return [point.row for point in design_shown.points(run)]


def _fits(run: DesignRun, record: RecordSource, row: int) -> Table:
    found, mm = record.depths, depth_factor(run.depth_unit)
    unit = unit_word(run.depth_unit)
    rows: list[Row] = []
    for d in _places(run, record):
        at = (row, d)
        for name in sorted(found.fits, key=lambda name: name != found.distribution):
            fit = found.fits[name]
            rows.append(
                (
                    duration_text(float(record.minutes[d])),
                    SHORT_TITLES[name] + (", taken" if name == found.distribution else ""),
                    str(int(found.n_years[at])),
                    number_text(float(fit.parameters.location[at]) / mm, 2),
                    number_text(float(fit.parameters.scale[at]) / mm, 2),
                    number_text(float(fit.parameters.shape[at]), 3) if name == GEV else "0",
                    number_text(float(fit.goodness.correlation[at]), 4),
                    number_text(float(fit.goodness.p_value[at]), 3),
                    number_text(float(found.shape_p_value[at]), 3) if name == GEV else "",
                )
            )
    return Table(
        caption=f"{run.areas.names[row]}: distributions fitted to the annual maxima",
        heads=(
            "duration",
            "distribution",
            "years",
            f"ξ, {unit}",
            f"α, {unit}",
            "κ",
            "correlation",
            "its p-value",
            "p-value of κ = 0",
        ),
        align="ttnnnnnnn",
        rows=rows,
        notes=(
            "Correlation: of the probability plot, 1 where it is a straight line.",
            "A small p-value speaks against the distribution; a large one does not prove it.",
            f"GEV: generalised extreme value. L-skewness (Gumbel's {GUMBEL_RATIO:.4f}) and all areas: record_fits.csv.",
        ),
    )


def depths_tables(run: DesignRun) -> list[Table]:
    """Return a table of depths with their intervals for every point of interest that is shown."""
    record = run.from_record
    return [] if record is None else [_depths(run, record, row) for row in _rows(run)]


def _depths(run: DesignRun, record: RecordSource, row: int) -> Table:
    found, mm = record.depths, depth_factor(run.depth_unit)
    known = list(found.depths.frequencies)
    often = design_shown.spread(run.asked.frequencies, 4)
    at = [int(np.argmin([abs(one.variate - each.variate) for one in known])) for each in often]
    rows: list[Row] = []
    for d in _places(run, record):
        cells: list[str] = []
        for f in at:
            depth, low, high = (
                depth_text(float(part[row, d, f]) / mm, run.depth_unit)
                for part in (found.fit.depth, found.lower, found.upper)
            )
            cells += [depth, f"{low} to {high}"]
        rows.append((duration_text(float(record.minutes[d])), *cells))
    left = len(run.asked.frequencies) - len(often)
    return Table(
        caption=f"{run.areas.names[row]}: areal depths from the record and their 90 % intervals, "
        f"{unit_word(run.depth_unit)}",
        heads=("duration", *(("depth", "90 % interval") * len(at))),
        over=(("", 1), *((each.label, 2) for each in often)),
        align="t" + "n" * (2 * len(at)),
        rows=rows,
        notes=(
            "The interval tells how far a record of this length may lead astray if the distribution is right.",
            "It tells nothing of what a wrong distribution adds.",
            *((f"{counted(left, 'more frequency is', 'more frequencies are')} in record_fits.csv.",) if left else ()),
        ),
    )


def maxima_table(run: DesignRun) -> Table | None:
    """Return the annual maxima of the first point of interest; None where the depths are not from the record."""
    record = run.from_record
    if record is None:
        return None
    row, mm = run.areas.points[0].row, depth_factor(run.depth_unit)
    places = _places(run, record)
    years = range(max(0, len(record.years) - _YEARS), len(record.years))
    return Table(
        caption=f"{run.areas.names[row]}: annual maxima, {unit_word(run.depth_unit)}",
        heads=("year", "season's share", *(duration_text(float(record.minutes[d])) for d in places)),
        align="nn" + "n" * len(places),
        rows=[
            (
                str(int(record.years[k])),
                percent_text(float(record.season_share[k, row])),
                *_cells(run, record.maxima[k, places, row] / mm),
            )
            for k in years
        ],
        notes=(
            f"{DASH}: the year does not count. A year is called by the one that {_year_words(run)}.",
            "Those of every area and duration are in annual_maxima.csv.",
        ),
    )


def _cells(run: DesignRun, depths: Floats) -> list[str]:
    return [depth_text(float(depth), run.depth_unit) for depth in depths.tolist()]


def _year_words(run: DesignRun) -> str:
    first = int(run.settings.get("series", {}).get("water_year", 1))
    return "it is" if first == 1 else f"it ends in, since it begins with {MONTHS[first - 1].capitalize()}"

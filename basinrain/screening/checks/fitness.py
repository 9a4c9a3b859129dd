"""What a record is not fit for: normals from few years, snow in gauges without heating."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np

from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Ints, Screened

__all__ = ["cold_seasons", "needs_a_year", "needs_unheated", "short_records"]

LEAST_YEARS: Final = 10
"""Complete years below which no normals are taken from the record (design rule of this package; WMO-No. 1203 asks ten
for provisional normals)."""

STANDARD_YEARS: Final = 30
"""Years of a climatological standard normal (WMO-No. 1203)."""

COMPLETE: Final = 0.95
"""Share of a year's days that a complete year has; the missing eighteen days may be filled (common practice)."""

_MONTHS: Final = (
    "",
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
)


def needs_a_year(view: Screened) -> str:
    """Say whether the record covers a year."""
    if not view.timed:
        return "the record is of storm totals without times"
    days = (view.record.ends[-1] - view.record.starts[0]).astype(np.int64) / DAY
    return "" if days >= 365 * COMPLETE else f"the record covers {days:.0f} days; nobody takes normals from it"


def needs_unheated(view: Screened) -> str:
    """Say whether the job names gauges without heating and cold months."""
    if not view.options.unheated:
        return "the job names no gauge as unheated"
    return "" if view.options.cold_months else "the job names no cold months"


def short_records(view: Screened) -> Iterator[Finding]:
    """Yield gauges whose complete years are fewer than normals take."""
    complete = _complete_years(view)
    for gauge, n in zip(view.network.ids, complete.tolist(), strict=True):
        if n >= STANDARD_YEARS:
            continue
        years = f"{n} complete year{'' if n == 1 else 's'}"
        yield Finding(
            check="short-record",
            gauge=gauge,
            severity="remark",
            evidence=f"It has {years} ({100 * COMPLETE:.0f} % of the days), fewer than the "
            + (f"{LEAST_YEARS} that normals take." if n < LEAST_YEARS else f"{STANDARD_YEARS} of a standard normal."),
            action="Give its normals from elsewhere, or use a method without normals."
            if n < LEAST_YEARS
            else "Say that normals from this record are of a period of its own.",
        )


def _complete_years(view: Screened) -> Ints:
    cases = view.cases
    middle = cases.starts + (cases.ends - cases.starts) // 2
    year = middle.astype("datetime64[Y]").astype(np.int64)
    days = (cases.ends - cases.starts).astype(np.int64) / DAY
    known = np.isfinite(cases.depths) * days[:, None]
    first = np.concatenate([[0], np.flatnonzero(np.diff(year)) + 1])
    in_year = np.add.reduceat(known, first, axis=0)
    years = year[first].astype("datetime64[Y]")
    length = ((years + 1).astype("datetime64[D]") - years.astype("datetime64[D]")).astype(np.int64)
    complete: Ints = (in_year >= COMPLETE * length[:, None]).sum(axis=0)
    return complete


def cold_seasons(view: Screened) -> Iterator[Finding]:
    """Yield gauges without heating that have values in cold months."""
    cold = np.isin(view.months, view.options.cold_months)
    names = ", ".join(_MONTHS[month] for month in sorted(view.options.cold_months))
    for gauge in view.options.unheated:
        if gauge not in view.network.ids:
            continue
        g = view.network.position(gauge)
        depths = view.cases.depths[:, g]
        known = np.isfinite(depths)
        if not (known & cold).any():
            continue
        total, wet = depths[known].sum(), (depths[known] > 0).sum()
        in_cold, wet_cold = depths[known & cold].sum(), (depths[known & cold] > 0).sum()
        share = 100 * in_cold / total if total > 0 else 0.0
        other = np.isfinite(view.middle[:, g]) & known & cold
        middle = view.middle[other, g].sum()
        beside = f" Its neighbours' median there is {middle:.0f} mm." if middle > 0 else ""
        yield Finding(
            check="cold-season",
            gauge=gauge,
            severity="remark",
            evidence=f"It is not heated and has values in {names}: {in_cold:.0f} of {total:.0f} mm ({share:.0f} %), "
            f"on {wet_cold} of {wet} wet {view.cases.unit}s.{beside}",
            action="Snow may be caught too little and too late there; leave the gauge out of storms in those months.",
            others=view.ids(view.neighbours[g]),
        )

"""What a record is not fit for: normals from few years, snow in gauges without heating."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np

from basinrain.clocks import MONTHS
from basinrain.screening.annual import COMPLETE, calendar_years
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Screened
from basinrain.screening.wording import depth_number

__all__ = ["COLD_LIMITS", "YEAR_LIMITS", "cold_seasons", "needs_a_year", "needs_unheated", "short_records"]

LEAST_YEARS: Final = 10
"""Complete years below which no normals are taken from the record (design rule of this package; WMO-No. 1203 asks ten
for provisional normals)."""

STANDARD_YEARS: Final = 30
"""Years of a climatological standard normal (WMO-No. 1203)."""

_LISTED: Final = 40
"""Gauges that the remark names with their years."""

_ADVICE: Final = (
    "Say that normals from this record are of a period of its own.",
    f"Say that normals from this record are of a period of its own; where years are under {LEAST_YEARS}, give others.",
    "Give normals from elsewhere, or use a method without normals.",
)


YEAR_LIMITS: Final = (
    f"{STANDARD_YEARS} calendar years with {COMPLETE:.0%} of their days, {LEAST_YEARS} for any normals."
)
COLD_LIMITS: Final = "Any value in the months that the job calls cold."


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
    """Yield one remark on all gauges whose complete years are fewer than normals take."""
    complete = dict(zip(view.network.ids, calendar_years(view.record).complete.sum(axis=0).tolist(), strict=True))
    short = sorted((n, gauge) for gauge, n in complete.items() if n < STANDARD_YEARS)
    if not short:
        return
    few = sum(n < LEAST_YEARS for n, _ in short)
    standard = f"the {STANDARD_YEARS} complete years of a standard normal"
    normals = f"the {LEAST_YEARS} complete years that normals take"
    some = f"{standard}, {few} of them fewer than {normals}" if few else standard
    what = normals if few == len(short) else some
    listed = ", ".join(f"{gauge} {n}" for n, gauge in short[:_LISTED])
    more = f" and {len(short) - _LISTED} more" if len(short) > _LISTED else ""
    yield Finding(
        check="short-record",
        gauge="",
        severity="remark",
        evidence=f"{len(short)} gauge{' has' if len(short) == 1 else 's have'} fewer than {what} "
        f"({100 * COMPLETE:.0f} % of the days of each): {listed}{more}.",
        action=_ADVICE[min(few, 1) + (few == len(short))],
        others=tuple(sorted(gauge for _, gauge in short)),
    )


def cold_seasons(view: Screened) -> Iterator[Finding]:
    """Yield gauges without heating that have values in cold months."""
    cold = np.isin(view.months, view.options.cold_months)
    names = ", ".join(MONTHS[month - 1] for month in sorted(view.options.cold_months))
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
        beside = f" Its neighbours' median there is {view.depth(middle)}." if middle > 0 else ""
        yield Finding(
            check="cold-season",
            gauge=gauge,
            severity="remark",
            evidence=f"It is not heated and has values in {names}: {depth_number(in_cold, view.depth_unit)} of "
            f"{view.depth(total)} ({share:.0f} %), "
            f"on {wet_cold} of {wet} wet {view.cases.unit}s.{beside}",
            action="Snow may be caught too little and too late there; leave the gauge out of storms in those months.",
            others=view.ids(view.neighbours[g]),
        )

"""Readings over several days that the record does not say are such."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np
from scipy.stats import binom

from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, DRY, WET_DAY, Floats, Ints, Screened

__all__ = ["ACCUMULATION_LIMITS", "unflagged_accumulations"]

LONGEST: Final = 31
"""Days over which an observer may have been away."""

MISSED: Final = 15.0
"""mm that the neighbours had over the days without a reading."""

MISSED_DAY: Final = 5.0
"""mm that they had on one of these days, each of them some: rain that the gauge cannot have missed."""

SUM_FITS: Final = 1.5
"""Standard deviations of root depths by which the reading may differ from the neighbours' sum over the stretch."""

DAY_OFF: Final = 1.5
"""Standard deviations of root depths by which the reading exceeds the neighbours' own of its day."""

ODDS: Final = 3.0
"""Natural logarithm of the odds against the days without rain, where they are not days without a reading."""

WEEKDAY_CHANCE: Final = 1e-6
"""Probability of so many dry readings on a weekday below which it is a habit."""

WEEKDAY_TIMES: Final = 2.5
"""Times the dry readings of the other weekdays that a habit must have: a weekly cycle of rain is not one."""

ADDED: Final = 1.3
"""Times the neighbours' depth on the day after, from which the days before are in it."""

WEEKDAY_LEAST: Final = 20
"""Wet days of the neighbours on a weekday that are needed."""

_WEEK: Final = ("Thursday", "Friday", "Saturday", "Sunday", "Monday", "Tuesday", "Wednesday")


ACCUMULATION_LIMITS: Final = (
    f"Up to {LONGEST} days without rain or reading while the neighbours had {MISSED:g} mm, {MISSED_DAY:g} mm on one "
    f"day; the reading within {SUM_FITS:g} standard deviations of the neighbours' sum and {DAY_OFF:g} above their day."
)


def unflagged_accumulations(view: Screened) -> Iterator[Finding]:
    """Yield readings that are as much as the neighbours had over the days before, on which the gauge has none."""
    cases = view.cases
    recorders = view.record.recorders if cases.scale == "day" else frozenset()
    for g, near in enumerate(view.neighbours):
        if view.network.ids[g] in recorders or len(near) < 2:
            continue
        habit = _weekdays(view, g)
        if habit is not None:
            yield habit
            continue
        for first, stop, missed, own_day in _stretches(view, g):
            reading = cases.depths[stop - 1, g]
            days = stop - 1 - first
            blank = np.isnan(cases.depths[first : stop - 1, g])
            what = (
                "without a reading" if blank.all() else "without rain" if not blank.any() else "without rain or reading"
            )
            start, end = cases.starts[first], cases.ends[stop - 1]
            yield Finding(
                check="unflagged-accumulation",
                gauge=view.network.ids[g],
                start=start,
                end=end,
                evidence=f"{view.depth(reading)} in {cases.words(stop - 1, stop)}, after {days} day"
                f"{'s' if days > 1 else ''} {what}; the neighbours' medians, in this gauge's climate, are "
                f"{view.depth(missed)} over {'those days' if days > 1 else 'that day'} and {view.depth(own_day)} on "
                f"the day itself. Neighbours as measured, over all of it: {view.beside(g, first, stop)}.",
                action="Declare the stretch accumulated, so that its total is spread; or reject it, the reading too.",
                others=view.ids(near),
                edit=Edit(
                    gauge=view.network.ids[g],
                    start=start,
                    end=end,
                    action="reject",
                    reason=f"{view.depth(reading)} seems to be the total of {days + 1} days",
                    by=SUGGESTED,
                ),
            )


def _stretches(view: Screened, g: int) -> Iterator[tuple[int, int, float, float]]:
    """Yield first and stop of stretches that end with their reading, the neighbours' depth before it and on its day."""
    depths, middle, scatter = view.cases.depths[:, g], np.nan_to_num(view.middle[:, g]), view.scatter[:, g]
    none = ~(depths > DRY)
    with np.errstate(invalid="ignore"):
        great = np.sqrt(depths) - np.sqrt(middle) >= DAY_OFF * scatter
    # Where the run of days without rain or reading began that ends before each day.
    days = np.arange(len(depths))
    began = np.maximum.accumulate(np.where(none, -1, days))
    for last in np.flatnonzero(great[1:] & none[:-1]).tolist():
        reading, own_day = float(depths[last + 1]), float(middle[last + 1])
        first = max(int(began[last]) + 1, last + 1 - LONGEST)
        # Days are added backwards; of the stretches that are odd enough the one that fits best is told.
        back = slice(last, first - 1 if first else None, -1)
        sums = np.cumsum(middle[back])
        apart = np.abs(np.sqrt(sums + own_day) - np.sqrt(reading))
        rain = np.logical_or.accumulate((middle[back] >= MISSED_DAY) & (view.least_measured[back, g] >= WET_DAY))
        dry = np.isfinite(depths[back])
        odd = ~np.logical_or.accumulate(dry) | (np.cumsum(view.dry_surprise[back, g] * dry) >= ODDS)
        fits = (sums >= MISSED) & (apart <= SUM_FITS * scatter[last + 1]) & rain & odd
        if fits.any():
            k = int(np.argmin(np.where(fits, apart, np.inf)))
            yield last - k, last + 2, float(sums[k]), own_day


def _weekdays(view: Screened, g: int) -> Finding | None:
    """Return the weekdays on which the gauge is seldom read, if there are such."""
    cases = view.cases
    if cases.seconds != DAY:
        return None
    with np.errstate(invalid="ignore"):
        wet = view.middle[:, g] >= 3 * WET_DAY
    none = ~(cases.depths[:, g] > DRY)
    # A day is named by its middle. The epoch was a Thursday.
    middle = (cases.starts.astype(np.int64) + DAY // 2) // DAY
    weekday: Ints = middle % 7
    total = np.bincount(weekday[wet], minlength=7)
    dry = np.bincount(weekday[wet & none], minlength=7)
    habits = []
    for day in range(7):
        others_total, others_dry = total.sum() - total[day], dry.sum() - dry[day]
        if total[day] < WEEKDAY_LEAST or others_total == 0:
            continue
        share = (others_dry + 1) / (others_total + 2)
        if dry[day] / total[day] > WEEKDAY_TIMES * share and binom.sf(dry[day] - 1, total[day], share) < WEEKDAY_CHANCE:
            habits.append(day)
    if not habits:
        return None
    # Monday first, as people list them.
    habits.sort(key=lambda day: (day - 4) % 7)
    listed = ", ".join(f"{_WEEK[day]} {dry[day]} of {total[day]}" for day in habits)
    rest = np.array([day for day in range(7) if day not in habits])
    after = _ratio(view, g, weekday, (habits[-1] + 1) % 7)
    days = ", ".join(_WEEK[day] for day in habits)
    return Finding(
        check="unflagged-accumulation",
        gauge=view.network.ids[g],
        severity="doubtful",
        evidence="It has no rain or no reading on days on which its neighbours were wet, by the weekday of the day's "
        f"middle: {listed}; on the other weekdays {int(dry[rest].sum())} of {int(total[rest].sum())}. The day after "
        f"has {after:.1f} times the neighbours' depth.",
        action=f"Ask whether it is read on {days}; if not, declare those days "
        + ("accumulated into the next reading." if after >= ADDED else "missing."),
        others=view.ids(view.neighbours[g]),
    )


def _ratio(view: Screened, g: int, weekday: Ints, day: int) -> float:
    depths: Floats = view.cases.depths[:, g]
    middle = view.middle[:, g]
    there = (weekday == day) & np.isfinite(depths) & np.isfinite(middle)
    return float(depths[there].sum() / max(middle[there].sum(), 1e-9))

"""Daily gauges whose days end at different hours."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from typing import Final

import numpy as np

from basinrain.screening.checks.timing import FURTHEST_DAYS, LEAST_WET, Lags, lags_by_gauge
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Screened

__all__ = ["HOUR_LIMITS", "reading_hours"]

PART: Final = (0.2, 0.8)
"""Share of another day's rain between which the day seems to end at another hour: below it the days are the same, above
it the record is a day off, which is another check's."""

PART_GAIN: Final = 0.04
"""By how much a mixture of two days must correlate better than the better one of them."""

LOPSIDED: Final = 2.5
"""How many times the gain on the other side it must be: neighbours that only resemble the gauge gain on both."""


HOUR_LIMITS: Final = (
    f"Any other hour than most, as stated; as it seems, {PART[0]:.0%} to {PART[1]:.0%} of another day's rain, the "
    f"correlation of root depths higher by {PART_GAIN:g}."
)


def reading_hours(view: Screened) -> Iterator[Finding]:
    """Yield daily gauges that are read at another hour than most, as stated, or as their neighbours let it seem."""
    yield from _stated(view)
    for sheet in view.sheets:
        if sheet.seconds == DAY:
            for g, lags in lags_by_gauge(view, sheet):
                if lags.wet.sum() >= 2 * LEAST_WET:
                    yield from _seeming(view, g, lags)


def _stated(view: Screened) -> Iterator[Finding]:
    hours: dict[str, Counter[int]] = {}
    for total in view.record.totals:
        if total.end - total.start == np.timedelta64(DAY, "s"):
            hours.setdefault(total.gauge, Counter())[int(total.end.astype("datetime64[s]").astype(np.int64)) % DAY] += 1
    usual = {gauge: min(count, key=lambda hour: (-count[hour], hour)) for gauge, count in hours.items()}
    if not usual:
        return
    gauges = Counter(usual.values())
    most = min(gauges, key=lambda hour: (-gauges[hour], hour))
    for gauge, count in sorted(hours.items()):
        if usual[gauge] == most and len(count) == 1:
            continue
        listed = ", ".join(f"{_hour(hour)} on {count[hour]} days" for hour in sorted(count))
        yield Finding(
            check="reading-hours",
            gauge=gauge,
            severity="remark" if len(count) == 1 else "doubtful",
            evidence=f"Its days end at {listed}; those of most daily gauges end at {_hour(most)}.",
            action="Compare and infill by days only after spreading over the pattern of recording gauges.",
            others=tuple(sorted(other for other, hour in usual.items() if hour == most and other != gauge)),
        )


def _seeming(view: Screened, g: int, lags: Lags) -> Iterator[Finding]:
    shares = np.linspace(0, 1, 21)
    zero = FURTHEST_DAYS
    own, following = float(lags.own.sum()), float(lags.following.sum())
    reference = float(lags.reference[:, zero].sum())
    cross = lags.cross.sum(axis=0)
    if own <= 0 or reference <= 0:
        return
    gains, best = {}, {}
    for lag in (1, -1):
        mixed = (1 - shares) * cross[zero] + shares * cross[zero + lag]
        square = ((1 - shares) ** 2 + shares**2) * reference + 2 * shares * (1 - shares) * following
        correlation = mixed / np.sqrt(own * np.maximum(square, 1e-12))
        best[lag] = float(shares[np.argmax(correlation)])
        gains[lag] = float(correlation.max() - max(correlation[0], correlation[-1]))
    lag = max(gains, key=lambda side: (gains[side], side))
    if not (PART[0] <= best[lag] <= PART[1] and gains[lag] >= PART_GAIN and gains[lag] >= LOPSIDED * gains[-lag]):
        return
    yield Finding(
        check="reading-hours",
        gauge=view.network.ids[g],
        severity="remark",
        evidence=f"Its days seem to end some {24 * best[lag]:.0f} h {'earlier' if lag > 0 else 'later'} than those of "
        f"its neighbours: {100 * best[lag]:.0f} % of the {'day before' if lag > 0 else 'next day'} and the rest of the "
        f"day itself fit it better than either (correlation of root depths higher by {gains[lag]:.2f}).",
        action="Ask for its hour of reading and declare read_hour; compare it with the others over several days only.",
        others=view.ids(view.neighbours[g]),
    )


def _hour(seconds: int) -> str:
    return f"{seconds // 3600:02d}:{seconds // 60 % 60:02d}"

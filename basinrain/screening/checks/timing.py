"""Records that run early or late against their neighbours."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np

from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Floats, Ints, Screened, runs_of

__all__ = ["FURTHEST_DAYS", "Lags", "lags_by_gauge", "shifted_records"]

FURTHEST: Final = 24
"""Hours by which a finer record is tried against its neighbours: any two time zones, or a day."""

FURTHEST_DAYS: Final = 2
"""Days by which a daily record is tried."""

BLOCK_DAYS: Final = 91
"""A season: the shortest stretch whose lag is asked by itself; less rain than that tells too little."""

LEAST_WET: Final = 20
"""Wet days or hours of the neighbours that a season must have; the whole record twice as many."""

CORRELATED: Final = 0.4
"""Correlation of root depths at the best lag below which neighbours are too far to tell the time by."""

GAIN: Final = 0.10
"""By how much the best lag must correlate better than none over the whole record."""

GAIN_BLOCK: Final = 0.25
"""The same over a season, where sampling alone makes 0.15 (one over the root of some 40 wet days)."""

TRAVEL: Final = 2
"""Hours that a storm may take across the neighbours; a lag up to here is weather, not a clock (common practice: storms
move at 20 to 60 km/h)."""

AGREEING: Final = 0.7
"""Share of the seasons that must agree on a lag before it is said of the whole record."""

_HOUR: Final = 3600
_LEAST: Final = 2


@dataclass(frozen=True, eq=False)
class Lags:
    """A gauge against the mean of its neighbours, season by season and lag by lag, on root depths less their means.

    Parameters
    ----------
    lags : array of int, shape (n_lags,)
        Intervals by which the gauge is late, 0 included.
    seconds
        Length of an interval.
    starts, ends : array of datetime64[s], shape (n_seasons,)
        The seasons.
    cross : array of float, shape (n_seasons, n_lags)
        Sums of products with the neighbours ``lag`` intervals before.
    own : array of float, shape (n_seasons,)
        Sums of squares of the gauge.
    reference : array of float, shape (n_seasons, n_lags)
        Sums of squares of the neighbours, by lag, over the intervals for which the gauge has a value.
    following : array of float, shape (n_seasons,)
        Sums of products of the neighbours with their next interval.
    wet : array of int, shape (n_seasons,)
        Intervals in which the neighbours were wet and the gauge had a value.
    """

    lags: Ints
    seconds: int
    starts: np.ndarray[tuple[int], np.dtype[np.datetime64]]
    ends: np.ndarray[tuple[int], np.dtype[np.datetime64]]
    cross: Floats
    own: Floats
    reference: Floats
    following: Floats
    wet: Ints

    def correlation(self, seasons: slice) -> Floats:
        """Return the correlation by lag over some seasons, shape (n_lags,); 0 where nothing varies."""
        scale = np.sqrt(self.own[seasons].sum() * self.reference[seasons].sum(axis=0))
        cross = self.cross[seasons].sum(axis=0)
        correlation: Floats = np.divide(cross, scale, out=np.zeros(len(self.lags)), where=scale > 0)
        return correlation


def lags_by_gauge(view: Screened) -> Iterator[tuple[int, Lags]]:
    """Yield every gauge that has neighbours at its own scale with its lags: hours of recorders, days of daily gauges."""
    for sheet in view.sheets:
        per = max(1, _HOUR // sheet.seconds)
        seconds = per * sheet.seconds
        furthest = FURTHEST_DAYS if seconds >= DAY else max(1, FURTHEST * _HOUR // seconds)
        n = len(sheet.ends) // per
        by_gauge = np.ascontiguousarray(sheet.depths[: n * per].T, dtype=float)
        if per > 1:
            by_gauge = by_gauge.reshape(len(by_gauge), n, per).sum(axis=2)
        if n <= 2 * furthest:
            continue
        roots = np.sqrt(by_gauge)
        known = np.isfinite(roots)
        values = np.where(known, roots, 0.0)
        place = {g: column for column, g in enumerate(sheet.gauges.tolist())}
        span = max(1, BLOCK_DAYS * DAY // seconds)
        # A rest shorter than half a season belongs to the last one.
        first = np.arange(0, max(1, n - span // 2), span)
        stop = np.append(first[1:], n)
        starts, ends = sheet.starts[first * per], sheet.ends[stop * per - 1]
        lags = np.arange(-furthest, furthest + 1)
        for g, column in place.items():
            near = [place[j] for j in view.neighbours[g] if j in place]
            if len(near) < _LEAST:
                continue
            count = known[near].sum(axis=0)
            mean = np.divide(values[near].sum(axis=0), count, out=np.zeros(n), where=count > 0)
            both = known[column] & (count > 0)
            wet = both & (mean > 0)
            if not wet.any():
                continue
            own = np.where(known[column], values[column] - values[column][both].mean(), 0.0)
            others = np.where(count > 0, mean - mean[both].mean(), 0.0)
            padded = np.concatenate([np.zeros(furthest), others, np.zeros(furthest)])
            squared = padded**2
            there = known[column].astype(float)
            moved = [slice(furthest - lag, furthest - lag + n) for lag in lags.tolist()]
            yield (
                g,
                Lags(
                    lags=lags,
                    seconds=seconds,
                    starts=starts,
                    ends=ends,
                    cross=np.stack([np.add.reduceat(own * padded[at], first) for at in moved], axis=1),
                    own=np.add.reduceat(own**2, first),
                    reference=np.stack([np.add.reduceat(there * squared[at], first) for at in moved], axis=1),
                    following=np.add.reduceat(others * padded[furthest + 1 : furthest + 1 + n], first),
                    wet=np.add.reduceat(wet.astype(np.int64), first),
                ),
            )


def shifted_records(view: Screened) -> Iterator[Finding]:
    """Yield records, or seasons of them, that fit their neighbours better some hours or days off."""
    for g, lags in lags_by_gauge(view):
        least = TRAVEL * _HOUR if lags.seconds < DAY else 0
        seasons = [_best(lags, slice(k, k + 1), LEAST_WET, GAIN_BLOCK, least) for k in range(len(lags.wet))]
        told = [lag for lag in seasons if lag is not None]
        whole = _best(lags, slice(None), 2 * LEAST_WET, GAIN, least)
        if whole and (len(seasons) == 1 or sum(lag == whole for lag in told) >= AGREEING * len(told)):
            yield _finding(view, g, lags, slice(None), whole, entire=True)
            continue
        for lag in sorted({lag for lag in told if lag}):
            # Seasons that tell nothing neither end a stretch nor begin one.
            telling = np.flatnonzero([season is not None for season in seasons])
            for a, b in runs_of(np.array([seasons[k] == lag for k in telling], dtype=bool)):
                yield _finding(view, g, lags, slice(int(telling[a]), int(telling[b - 1]) + 1), lag, entire=False)


def _best(lags: Lags, seasons: slice, wet: int, gain: float, least: int) -> int | None:
    """Return the lag that fits some seasons, 0 where none fits clearly better; None where there is too little rain."""
    if lags.wet[seasons].sum() < wet:
        return None
    correlation = lags.correlation(seasons)
    near = np.abs(lags.lags) * lags.seconds <= least
    best = int(np.argmax(correlation))
    if near[best] or correlation[best] < CORRELATED or correlation[best] - correlation[near].max() < gain:
        return 0
    return int(lags.lags[best])


def _finding(view: Screened, g: int, lags: Lags, seasons: slice, lag: int, *, entire: bool) -> Finding:
    gauge = view.network.ids[g]
    correlation = lags.correlation(seasons)
    middle = len(lags.lags) // 2
    whole = np.datetime64("NaT", "s")
    seconds = abs(lag) * lags.seconds
    length = f"{seconds // DAY}d" if lags.seconds >= DAY else f"{seconds // _HOUR}h"
    words = f"{seconds // DAY} day{'s' if seconds > DAY else ''}" if lags.seconds >= DAY else f"{seconds // _HOUR} h"
    start = whole if entire else lags.starts[seasons][0]
    end = whole if entire else lags.ends[seasons][-1]
    return Finding(
        check="shifted-record",
        gauge=gauge,
        start=start,
        end=end,
        severity="doubtful",
        evidence=f"It fits the mean of its neighbours best {words} {'late' if lag > 0 else 'early'}: correlation of root "
        f"depths {correlation[middle + lag]:.2f}, and {correlation[middle]:.2f} as it stands, over "
        f"{int(lags.wet[seasons].sum())} wet {'days' if lags.seconds >= DAY else 'intervals'}.",
        action="Ask for the clock, the time zone and what the date of a reading means; then declare it or shift the "
        "record.",
        others=view.ids(view.neighbours[g]),
        edit=Edit(
            gauge=gauge,
            start=start,
            end=end,
            action="shift",
            value=f"{'-' if lag > 0 else ''}{length}",
            reason=f"{words} {'later' if lag > 0 else 'earlier'} than its neighbours",
            by=SUGGESTED,
        ),
    )

"""Records that run early or late against their neighbours."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np

from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Bools, Floats, Ints, Screened, Sheet, Times, runs_of

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
    starts: Times
    ends: Times
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


def lags_by_gauge(view: Screened, sheet: Sheet) -> Iterator[tuple[int, Lags]]:
    """Yield every gauge of a sheet that has neighbours in it, with its lags; steps under an hour go by the hour."""
    per = max(1, _HOUR // sheet.seconds)
    seconds = per * sheet.seconds
    furthest = FURTHEST_DAYS if seconds >= DAY else max(1, FURTHEST * _HOUR // seconds)
    n = len(sheet.ends) // per
    if n <= 2 * furthest:
        return
    by_gauge = sheet.depths[: n * per].T
    if per > 1:
        by_gauge = by_gauge.reshape(len(by_gauge), n, per).sum(axis=2)
    roots = np.sqrt(by_gauge)
    known = np.isfinite(roots)
    values = np.where(known, roots, 0.0)
    place = {g: column for column, g in enumerate(sheet.gauges.tolist())}
    span = max(1, BLOCK_DAYS * DAY // seconds)
    # A rest shorter than half a season belongs to the last one.
    first = np.arange(0, max(1, n - span // 2), span)
    stop = np.append(first[1:], n)
    starts, ends = sheet.starts[first * per], sheet.ends[stop * per - 1]
    for g, column in place.items():
        near = [place[j] for j in view.neighbours[g] if j in place]
        if len(near) < _LEAST:
            continue
        count = known[near].sum(axis=0)
        mean = np.divide(values[near].sum(axis=0), count, out=np.zeros(n), where=count > 0)
        both = known[column] & (count > 0)
        wet = both & (mean > 0)
        if wet.any():
            others = np.where(count > 0, mean - mean[both].mean(), 0.0)
            sums = _sums(values[column], known[column], both, others, furthest=furthest, first=first)
            told = np.add.reduceat(wet.astype(np.int64), first)
            yield g, Lags(np.arange(-furthest, furthest + 1), seconds, starts, ends, *sums, told)


def _sums(
    values: Floats, known: Bools, both: Bools, others: Floats, *, furthest: int, first: Ints
) -> tuple[Floats, Floats, Floats, Floats]:
    """Return the sums that :class:`Lags` holds.

    Only wet and missing intervals are gone through lag by lag, which are few: a dry one adds the mean times the
    neighbours', whose sums follow from one running sum.
    """
    n, mean = len(values), values[both].mean()
    stop = np.append(first[1:], n)
    lags = np.arange(-furthest, furthest + 1)
    padded = np.concatenate([np.zeros(furthest), others, np.zeros(furthest)])

    def whole(numbers: Floats) -> Floats:
        through = np.concatenate([[0.0], np.cumsum(numbers)])
        sums: Floats = through[stop[:, None] + furthest - lags] - through[first[:, None] + furthest - lags]
        return sums

    def at(places: Ints, numbers: Floats, weights: Floats | None = None) -> Floats:
        moved = numbers[places[:, None] + furthest - lags]
        through = np.zeros((len(places) + 1, len(lags)))
        np.cumsum(moved if weights is None else moved * weights[:, None], axis=0, out=through[1:])
        sums: Floats = through[np.searchsorted(places, stop)] - through[np.searchsorted(places, first)]
        return sums

    wet, missing = np.flatnonzero(values > 0), np.flatnonzero(~known)
    squared = padded**2
    cross = at(wet, padded, values[wet]) - mean * (whole(padded) - at(missing, padded))
    reference = np.maximum(whole(squared) - at(missing, squared), 0.0)
    own = np.add.reduceat(np.where(known, (values - mean) ** 2, 0.0), first)
    following = np.add.reduceat(others * padded[furthest + 1 : furthest + 1 + n], first)
    return cross, own, reference, following


def shifted_records(view: Screened) -> Iterator[Finding]:
    """Yield records, or seasons of them, that fit their neighbours better some hours or days off."""
    for sheet in view.sheets:
        for g, lags in lags_by_gauge(view, sheet):
            yield from _shifted(view, g, lags)


def _shifted(view: Screened, g: int, lags: Lags) -> Iterator[Finding]:
    least = TRAVEL * _HOUR if lags.seconds < DAY else 0
    seasons = [_best(lags, slice(k, k + 1), LEAST_WET, GAIN_BLOCK, least) for k in range(len(lags.wet))]
    told = [lag for lag in seasons if lag is not None]
    whole = _best(lags, slice(None), 2 * LEAST_WET, GAIN, least)
    if whole and (len(seasons) == 1 or sum(lag == whole for lag in told) >= AGREEING * len(told)):
        yield _finding(view, g, lags, slice(None), whole)
        return
    # Seasons that tell nothing neither end a stretch nor begin one.
    telling = np.flatnonzero([season is not None for season in seasons])
    for lag in sorted({lag for lag in told if lag}):
        for a, b in runs_of(np.array([seasons[k] == lag for k in telling], dtype=bool)):
            yield _finding(view, g, lags, slice(int(telling[a]), int(telling[b - 1]) + 1), lag)


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


def _finding(view: Screened, g: int, lags: Lags, seasons: slice, lag: int) -> Finding:
    gauge, entire = view.network.ids[g], seasons == slice(None)
    correlation = lags.correlation(seasons)
    middle = len(lags.lags) // 2
    whole = np.datetime64("NaT", "s")
    seconds = abs(lag) * lags.seconds
    length = f"{seconds // DAY}d" if lags.seconds >= DAY else f"{seconds // _HOUR}h"
    moved = f"{'-' if lag > 0 else ''}{length}"
    words = f"{seconds // DAY} day{'s' if seconds > DAY else ''}" if lags.seconds >= DAY else f"{seconds // _HOUR} h"
    start = whole if entire else lags.starts[seasons][0]
    end = whole if entire else lags.ends[seasons][-1]
    return Finding(
        check="shifted-record",
        gauge=gauge,
        start=start,
        end=end,
        severity="doubtful",
        evidence=f"It fits the mean of its neighbours best {words} {'late' if lag > 0 else 'early'}: correlation of "
        f"root depths {correlation[middle + lag]:.2f}, and {correlation[middle]:.2f} as it stands, over "
        f"{int(lags.wet[seasons].sum())} wet {'days' if lags.seconds >= DAY else 'intervals'}.",
        action="Ask for the clock, the time zone and what a reading's date means; then declare it or shift the record."
        if entire
        else f"Ask what changed then; shift the stretch by {moved}, after rejecting what stands where it moves to.",
        others=view.ids(view.neighbours[g]),
        edit=Edit(
            gauge=gauge,
            start=start,
            end=end,
            action="shift",
            value=moved,
            reason=f"{words} {'later' if lag > 0 else 'earlier'} than its neighbours",
            by=SUGGESTED,
        )
        # The ends of a stretch would move onto values of their own, which an edit does not overwrite.
        if entire
        else None,
    )

"""Records that run early or late against their neighbours."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np

from basinrain.rainfall import Status
from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Bools, Floats, Ints, Screened, Sheet, Times, runs_of
from basinrain.screening.wording import stamp_text, steps_text

__all__ = ["FURTHEST_DAYS", "SHIFT_LIMITS", "Lags", "lags_by_gauge", "shifted_records"]

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

MOST_TOLD: Final = 3.0
"""The most, a natural logarithm, that one day or hour may say for or against the lag where the ends of a stretch are
looked for: showers are wilder than the normal law."""

DOUBT: Final = 3.0
"""Natural logarithm of how much less likely than the best one an end may be that is still told as possible: e³ is 20 to
1."""

_HOUR: Final = 3600
_LEAST: Final = 2
_LEAST_SCATTER: Final = 0.3
"""mm^½, half that of gauges side by side, since a mean of several is compared."""


SHIFT_LIMITS: Final = (
    f"Up to {FURTHEST_DAYS} days, or {FURTHEST} h of finer steps; the correlation of root depths {CORRELATED:g} or "
    f"more, and higher by {GAIN:g} over the record or by {GAIN_BLOCK:g} over {BLOCK_DAYS} days; up to {TRAVEL} h are "
    "weather."
)


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
    first : array of int, shape (n_seasons,)
        The first interval of every season.
    bounds : array of datetime64[s], shape (n_intervals + 1,)
        The beginning of every interval, and the end of the last.
    roots, reference_roots : array of float, shape (n_intervals,)
        Root depths of the gauge, and the mean ones of its neighbours; mm^½, NaN where unknown.
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
    first: Ints
    bounds: Times
    roots: Floats
    reference_roots: Floats

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
    bounds = np.append(sheet.starts[: n * per : per], sheet.ends[n * per - 1])
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
            lags = np.arange(-furthest, furthest + 1)
            both_roots = roots[column], np.where(count > 0, mean, np.nan)
            yield g, Lags(lags, seconds, starts, ends, *sums, told, first, bounds, *both_roots)


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
        yield _finding(view, g, lags, whole, None)
        return
    # A season between two of one lag that leans to it is not another stretch.
    for k in range(1, len(seasons) - 1):
        lag = seasons[k - 1]
        if seasons[k] == 0 and lag and seasons[k + 1] == lag:
            fit = lags.correlation(slice(k, k + 1))
            seasons[k] = lag if fit[lag + len(fit) // 2] > fit[len(fit) // 2] else 0
    # Seasons that tell nothing neither end a stretch nor begin one.
    telling = np.flatnonzero([season is not None for season in seasons])
    runs = sorted(
        (int(telling[a]), int(telling[b - 1]) + 1, lag)
        for lag in {lag for lag in told if lag}
        for a, b in runs_of(np.array([seasons[k] == lag for k in telling], dtype=bool))
    )
    free = 0
    for a, b, lag in runs:
        stretch = _refined(lags, slice(a, b), lag, free)
        free = stretch.stop
        yield _finding(view, g, lags, lag, stretch)


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


@dataclass(frozen=True)
class _Stretch:
    """The intervals ``first`` to ``stop`` (not included), the range of either, and the seasons it was found in."""

    seasons: slice
    first: int
    stop: int
    first_range: tuple[int, int]
    stop_range: tuple[int, int]


def _refined(lags: Lags, seasons: slice, lag: int, free: int) -> _Stretch:
    """Return the intervals that the lag explains best, looked for up to a season beyond the seasons it was found in.

    Every interval says by how much its root depth is likelier with the neighbours' of the lag than with those of its
    own time, by the normal law with the scatter of the stretch; the stretch with the greatest sum is taken. What comes
    before ``free`` belongs to another stretch.
    """
    n, bounds = len(lags.roots), np.append(lags.first, len(lags.roots))
    low, high = int(bounds[max(seasons.start - 1, 0)]), int(bounds[min(seasons.stop + 1, len(bounds) - 1)])
    low = max(low, free)
    places = np.arange(low, high)
    before = places - lag
    own, at = lags.roots[low:high], lags.reference_roots[low:high]
    moved = np.where((before >= 0) & (before < n), lags.reference_roots[np.clip(before, 0, n - 1)], np.nan)
    within = slice(int(bounds[seasons.start]) - low, int(bounds[seasons.stop]) - low)
    wet = (own > 0) | (at > 0) | (moved > 0)
    known = np.isfinite(own) & np.isfinite(at) & np.isfinite(moved) & wet
    inside = np.zeros(len(places), dtype=bool)
    inside[max(within.start, 0) : within.stop] = True
    fitted = known & inside
    slope = float((own[fitted] * moved[fitted]).sum() / max((moved[fitted] ** 2).sum(), 1e-9))
    scatter = max(float(np.sqrt(np.mean((own[fitted] - slope * moved[fitted]) ** 2))), _LEAST_SCATTER)
    gain = np.where(known, (own - slope * at) ** 2 - (own - slope * moved) ** 2, 0.0) / (2 * scatter**2)
    through = np.concatenate([[0.0], np.cumsum(np.clip(gain, -MOST_TOLD, MOST_TOLD))])
    above = through - np.minimum.accumulate(through)
    stop = int(np.argmax(above))
    # Of beginnings that are as likely the last, so that no dry day is moved without need.
    first = stop - int(np.argmin(through[stop::-1]))
    firsts = low + np.flatnonzero(through[:stop] <= through[first] + DOUBT)
    stops = low + first + 1 + np.flatnonzero(through[first + 1 :] >= through[stop] - DOUBT)
    ranges = (int(firsts[0]), int(firsts[-1])), (int(stops[0]), int(stops[-1]))
    return _Stretch(seasons, low + first, low + stop, *ranges)


def _stands(view: Screened, g: int, start: np.datetime64, end: np.datetime64) -> bool:
    """Return whether the gauge has anything of its own in ``(start, end]``, which a shift would not overwrite."""
    record = view.record
    inside = (record.starts >= start) & (record.ends <= end)
    valued = record.reporting[inside, g] | (record.status[inside, g] == Status.ACCUMULATED)
    return bool(valued.any())


def _movable(view: Screened, g: int, lags: Lags, lag: int, found: _Stretch) -> tuple[int, int, bool]:
    """Return first and stop of a stretch, and whether the gauge has nothing where it moves to.

    Where it has, the nearest of the other possible ends is taken that has nothing before or after it: whoever starts to
    write readings a day late leaves a date empty.
    """

    def free(at: int) -> bool:
        edge = lags.bounds[np.clip([at - max(lag, 0), at + max(-lag, 0)], 0, len(lags.bounds) - 1)]
        return not _stands(view, g, edge[0], edge[1])

    first, stop = found.first, found.stop
    low, high = found.first_range if lag > 0 else found.stop_range
    best = first if lag > 0 else stop
    for at in sorted(range(low, high + 1), key=lambda place: (abs(place - best), place)):
        if free(at):
            return (at, stop, True) if lag > 0 else (first, at, True)
    return first, stop, False


def _finding(view: Screened, g: int, lags: Lags, lag: int, stretch: _Stretch | None) -> Finding:
    gauge = view.network.ids[g]
    seasons = slice(None) if stretch is None else stretch.seasons
    correlation = lags.correlation(seasons)
    middle = len(lags.lags) // 2
    seconds = abs(lag) * lags.seconds
    days = lags.seconds >= DAY
    n = seconds // (DAY if days else _HOUR)
    words = f"{n} day{'s' if n > 1 else ''}" if days else f"{n} h"
    moved = f"{'-' if lag > 0 else ''}{n}{'d' if days else 'h'}"
    never = np.datetime64("NaT", "s")
    start, end, exact, mends = never, never, "", True
    action = "Ask for the clock, the time zone and what a reading's date means; then declare it or shift the record."
    if stretch is not None:
        first, stop, mends = _movable(view, g, lags, lag, stretch)
        start, end = lags.bounds[first], lags.bounds[stop]
        low, high = stretch.stop_range
        exact = (
            f" It begins with {_steps(lags, first, first + 1)}{_possible(lags, first, stretch.first_range)} and ends "
            f"with {_steps(lags, stop - 1, stop)}{_possible(lags, stop - 1, (low - 1, high - 1))}."
        )
        to = (max(first - lag, 0), first) if lag > 0 else (stop, min(stop - lag, len(lags.roots)))
        before = "" if mends else f"reject {_steps(lags, *to)} by an edit, since the shift moves there, and "
        action = f"Ask what changed then; {before}shift {_steps(lags, first, stop)} by {moved}."
    return Finding(
        check="shifted-record",
        gauge=gauge,
        start=start,
        end=end,
        severity="doubtful",
        evidence=f"It fits the mean of its neighbours best {words} {'late' if lag > 0 else 'early'}: correlation of "
        f"root depths {correlation[middle + lag]:.2f}, and {correlation[middle]:.2f} as it stands, over "
        f"{int(lags.wet[seasons].sum())} wet {'days' if lags.seconds >= DAY else 'hours'}.{exact}",
        action=action,
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
        if mends
        else None,
    )


def _steps(lags: Lags, first: int, stop: int) -> str:
    return steps_text(lags.bounds[first:stop], lags.bounds[first + 1 : stop + 1])


def _possible(lags: Lags, place: int, among: tuple[int, int]) -> str:
    """Return in brackets which other intervals are nearly as likely."""
    low, high = (stamp_text(lags.bounds[at], lags.bounds[at + 1]) for at in among)
    return "" if among == (place, place) else f" (possible: {low} to {high})"

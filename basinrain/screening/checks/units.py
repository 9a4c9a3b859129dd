"""Records in another unit than the one declared, throughout or over a stretch."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from basinrain.screening.checks.unit_days import DAY_SURE, LEAST_DAYS, days_in_unit
from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Bools, Floats, Ints, Screened, ranked_median

__all__ = ["NAME", "UNIT_LIMITS", "unit_mixups"]

NAME: Final = "unit-mixup"

FACTORS: Final = (25.4, 10.0, 2.54, 1 / 2.54, 1 / 10.0, 1 / 25.4)
"""What a depth is multiplied by when mm, tenths, inches and hundredths of an inch are taken for each other."""

_BETWEEN: Final = {25.4: "mm and inches", 10.0: "a unit and its tenths", 2.54: "tenths of mm and hundredths of an inch"}

LEAST_BLOCK: Final = 10.0
"""mm that a neighbour must have in a month before its ratio says something."""

LEAST_TOTAL: Final = 40.0
"""mm that a neighbour must have over the whole stretch."""

LEAST_MONTHS: Final = 3
"""Months on end that a stretch must have: a month of showers differs by as much as ten times now and then."""

LEAST_MONTHS_SMALL: Final = 5
"""The same for a factor of 2.54, by which a season differs in mountains."""

CLOSE: Final = 0.5
"""Natural logarithm: how near the ratio must come to the factor: about half between 10 and 25.4."""

CLOSE_SMALL: Final = 0.35
"""The same for a factor of 2.54, which dry and wet seasons come near to."""

SURE: Final = 12.0
"""Natural logarithm of how much likelier the months of a stretch are with the factor than without."""

MOST_TOLD: Final = 6.0
"""The most that one month may add to it, either way: months of showers are wilder than the normal law."""

LEAST_SCATTER: Final = 0.25
"""Natural logarithm: months of neighbours differ by as much even where a short record does not show it."""

HARD_PLACES: Final = 4.0
"""Times: mountains make neighbours differ by up to this over a whole record, so that a smaller factor over the whole of
it is no evidence of another unit."""

LEAST_SEASON: Final = 15
"""Months of one season, five years of them, from which a season has a usual ratio of its own."""

LEAST_NEIGHBOURS: Final = 2


UNIT_LIMITS: Final = (
    f"{', '.join(f'{factor:g}' for factor in FACTORS if factor > 1)} times or one in so many, within a factor of "
    f"{np.exp(CLOSE):.1f}, throughout, over {LEAST_MONTHS} months ({LEAST_MONTHS_SMALL} for 2.54) at odds of "
    f"e^{SURE:g} to 1, or over {LEAST_DAYS} wet days at e^{DAY_SURE:g} to 1 (10 and 25.4 times)."
)


@dataclass(frozen=True, eq=False)
class _Months:
    """Depths of a gauge and of each neighbour over the cases that both have, by month.

    Parameters
    ----------
    mine, theirs : array of float, shape (n_months, n_neighbours)
        mm.
    """

    mine: Floats
    theirs: Floats

    def ratio(self, least: float) -> Floats:
        """Return the logarithms of the ratios, NaN where one of the two is too dry to tell."""
        told = (self.theirs >= least) & (self.mine > 0)
        ratio: Floats = np.divide(self.mine, self.theirs, out=np.full(self.mine.shape, np.nan), where=told)
        return np.log(ratio)

    def total(self, months: slice | Ints) -> _Months:
        """Return the same over some months together, as one row."""
        return _Months(self.mine[months].sum(axis=0, keepdims=True), self.theirs[months].sum(axis=0, keepdims=True))


@dataclass(frozen=True, eq=False)
class _Calendar:
    """The calendar months of a record: their first cases, where they stop, and which are of a season.

    ``named[k]`` says which months are the calendar month ``k + 1``, ``seasons[k]`` which are it or one of those beside
    it.
    """

    first: Ints
    stop: Ints
    seasons: tuple[Bools, ...]
    named: tuple[Bools, ...]


def unit_mixups(view: Screened) -> Iterator[Finding]:
    """Yield gauges whose ratio to their neighbours is near a factor between units, throughout or over some months."""
    depths = view.cases.depths
    calendar = _calendar(view)
    known = np.isfinite(depths)
    for g, near in enumerate(view.neighbours):
        if len(near) < LEAST_NEIGHBOURS:
            continue
        both = known[:, [g]] & known[:, near]
        months = _Months(
            np.add.reduceat(np.where(both, depths[:, [g]], 0.0), calendar.first, axis=0),
            np.add.reduceat(np.where(both, depths[:, near], 0.0), calendar.first, axis=0),
        )
        found = _whole(view, g, months)
        if found is not None:
            yield found
            continue
        free: Bools = np.ones(len(depths), dtype=bool)
        for stretch in _stretches(view, g, months, calendar):
            first, stop = view.cases_of(stretch.start, stretch.end)
            free[first:stop] = False
            yield stretch
        if view.cases.seconds > DAY:
            continue
        for days in days_in_unit(view, g, [factor for factor in FACTORS if factor >= HARD_PLACES], free):
            found = _finding(view, g, days.factor, days.ratio, (days.first, days.stop, days.usual))
            yield replace(found, severity="doubtful")


def _calendar(view: Screened) -> _Calendar:
    middle = view.cases.starts + (view.cases.ends - view.cases.starts) // 2
    month = middle.astype("datetime64[M]").astype(np.int64)
    first = np.concatenate([[0], np.flatnonzero(np.diff(month)) + 1])
    # Months from the first one of 1970, a January.
    named = tuple(month[first] % 12 == k for k in range(12))
    return _Calendar(
        first=first,
        stop=np.append(first[1:], len(month)),
        seasons=tuple(named[k - 1] | named[k] | named[(k + 1) % 12] for k in range(12)),
        named=named,
    )


def _whole(view: Screened, g: int, months: _Months) -> Finding | None:
    ratios = months.total(slice(None)).ratio(LEAST_TOTAL)
    ratios = ratios[np.isfinite(ratios)]
    if len(ratios) < LEAST_NEIGHBOURS:
        return None
    ratio = float(np.median(ratios))
    factor = min(FACTORS, key=lambda f: abs(ratio - np.log(f)))
    if _small(factor) or abs(ratio - np.log(factor)) > CLOSE:
        return None
    # A gauge in another unit is far from all; among neighbours that differ as much from each other nobody can tell.
    if np.ptp(ratios) > abs(np.log(factor)) - CLOSE:
        return None
    return _finding(view, g, factor, np.exp(ratio), None)


def _stretches(view: Screened, g: int, months: _Months, calendar: _Calendar) -> Iterator[Finding]:
    by_neighbour = months.ratio(LEAST_BLOCK)
    told = np.flatnonzero(np.isfinite(by_neighbour).sum(axis=0) >= 2 * LEAST_MONTHS)
    if len(told) < LEAST_NEIGHBOURS:
        return
    # Every neighbour's ratio against its usual one: what lasting climate there is between the two does not count.
    usual = _usual_ratios(by_neighbour[:, told], calendar)
    off = by_neighbour[:, told] - usual
    telling = np.flatnonzero(np.isfinite(off).sum(axis=1) >= LEAST_NEIGHBOURS)
    if len(telling) < 2 * LEAST_MONTHS:
        return
    expected = _Months(months.mine[:, told], months.theirs[:, told] * np.exp(usual))
    away = np.nanmedian(off[telling], axis=1)
    # From month to month, so that a change of unit half way does not count as scatter.
    scatter = max(1.4826 * float(np.median(np.abs(np.diff(away)))) / np.sqrt(2), LEAST_SCATTER)
    found: list[tuple[float, int, int, float, float, float]] = []
    for factor in FACTORS:
        for a, b, sure in _segments(away, np.log(factor), scatter):
            stands = expected.total(telling[a:b]).ratio(LEAST_TOTAL)
            if np.isfinite(stands).sum() < LEAST_NEIGHBOURS:
                continue
            stand = float(np.nanmedian(stands))
            if abs(stand - np.log(factor)) <= (CLOSE_SMALL if _small(factor) else CLOSE):
                ratio = float(np.nanmedian(months.total(telling[a:b]).ratio(LEAST_BLOCK)[:, told]))
                found.append((sure, a, b, factor, ratio, stand))
    taken: Bools = np.zeros(len(away), dtype=bool)
    for _, a, b, factor, ratio, stand in sorted(found, key=lambda item: (-item[0], item[1], item[3])):
        if taken[a:b].any():
            continue
        taken[a:b] = True
        first, stop = int(calendar.first[telling[a]]), int(calendar.stop[telling[b - 1]])
        yield _finding(view, g, factor, float(np.exp(ratio)), (first, stop, float(np.exp(ratio - stand))))


def _usual_ratios(ratios: Floats, calendar: _Calendar) -> Floats:
    """Return what each ratio would usually be, by the season where the record is long enough to tell seasons apart.

    Mountains and plains differ in summer otherwise than in winter, every year.
    """
    lasting, parted = zip(*(_usual(column[np.isfinite(column)]) for column in ratios.T), strict=True)
    usual = np.tile(np.array(lasting), (len(ratios), 1))
    for season, named in zip(calendar.seasons, calendar.named, strict=True):
        ranked = np.sort(ratios[season], axis=0).T
        told = np.isfinite(ranked).sum(axis=1)
        enough = (told >= LEAST_SEASON) & ~np.array(parted)
        if enough.any():
            usual[np.ix_(named, enough)] = ranked_median(ranked, told)[enough]
    return usual


def _between(factor: float) -> str:
    return next(words for size, words in _BETWEEN.items() if np.isclose(size, max(factor, 1 / factor)))


def _small(factor: float) -> bool:
    return 1 / HARD_PLACES < factor < HARD_PLACES


def _segments(away: Floats, log: float, scatter: float) -> list[tuple[int, int, float]]:
    """Return first, stop and sureness of the stretches of months that a factor explains better than none."""
    least = LEAST_MONTHS_SMALL if _small(np.exp(log)) else LEAST_MONTHS
    gain = np.clip((away**2 - (away - log) ** 2) / (2 * scatter**2), -MOST_TOLD, MOST_TOLD)
    found: list[tuple[int, int, float]] = []
    while True:
        a, b, sure = _richest(gain)
        if sure < SURE:
            return found
        if b - a >= least:
            found.append((a, b, sure))
        gain[a:b] = -MOST_TOLD


def _richest(gain: Floats) -> tuple[int, int, float]:
    """Return first and stop of the stretch with the greatest sum, and the sum."""
    through = np.concatenate([[0.0], np.cumsum(gain)])
    above = through - np.minimum.accumulate(through)
    stop = int(np.argmax(above))
    first = int(np.argmin(through[: stop + 1]))
    return first, stop, float(above[stop])


def _usual(ratio: Floats) -> tuple[float, bool]:
    """Return the logarithm of the gauge's usual ratio, and whether the record falls into two camps.

    The median; of two camps the one nearer to 1.
    """
    ordered = np.sort(ratio)
    gap = int(np.argmax(np.diff(ordered)))
    low, high = ordered[: gap + 1], ordered[gap + 1 :]
    # Camps of nearly equal size, far apart: the unit changed half way, and the median could fall into either.
    if min(len(low), len(high)) > 0.3 * len(ratio) and np.median(high) - np.median(low) > np.log(2.0):
        return float(min(np.median(low), np.median(high), key=abs)), True
    return float(np.median(ratio)), False


def _finding(view: Screened, g: int, factor: float, ratio: float, stretch: tuple[int, int, float] | None) -> Finding:
    gauge = view.network.ids[g]
    words = f"{factor:g}" if factor > 1 else f"1/{1 / factor:g}"
    never = np.datetime64("NaT", "s")
    start, end, where, usual = never, never, "It", ""
    if stretch is not None:
        first, stop, lasting = stretch
        start, end = view.cases.starts[first], view.cases.ends[stop - 1]
        where, usual = f"In {view.cases.words(first, stop)} it", f", and {lasting:.2f} times otherwise"
    return Finding(
        check=NAME,
        gauge=gauge,
        start=start,
        end=end,
        severity="doubtful" if _small(factor) else "erroneous",
        evidence=f"{where} has {ratio:.3g} times the depth of its neighbours, by the median of them{usual}. That is "
        f"near {words}, as between {_between(factor)}.",
        action=f"Ask for the unit of the file; if it is confirmed, declare it, or multiply by {1 / factor:.4g}.",
        others=view.ids(view.neighbours[g]),
        edit=Edit(
            gauge=gauge,
            start=start,
            end=end,
            action="scale",
            value=float(1 / factor),
            reason=f"depths are {words} times what the neighbours' would make them",
            by=SUGGESTED,
        ),
    )

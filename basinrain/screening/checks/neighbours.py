"""A gauge against its neighbours, day by day: far off, or dry among wet ones."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np

from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import DRY, NORMAL, WET_DAY, Screened, runs_of

__all__ = ["OUTLIER_LIMITS", "RUN_LIMITS", "ZERO_LIMITS", "dry_among_wet", "far_from_neighbours", "long_dry_runs"]

LEAST_REPORTING: Final = 3
"""Neighbours that must report: with two, nobody can tell which of three is wrong."""

OUTLYING: Final = 4.5
"""Standard deviations, on root depths, beyond which a day is far from its neighbours. Root depths of neighbours are
near enough to normal (common practice); on clean records (docs/verification.md) a lower limit blames showers."""

TIMES_GREATEST: Final = 2.0
"""Times the greatest neighbour, in the gauge's climate, that the depth must be: a storm seldom falls into one gauge."""

LEAST_EXCESS: Final = 20.0
"""mm above the neighbours' median below which nobody would act."""

MISSING_RAIN: Final = 3.0
"""Standard deviations, on root depths, by which a dry day must be below the neighbours' median."""

LEAST_MEASURED: Final = 1.0
"""mm that even the driest neighbour must have: rain from which no gauge among them was spared."""

MIDDLE_WET: Final = 10.0
"""mm that the neighbours' median must have, in the gauge's climate."""

LONG_RUN: Final = 3
"""Days with rain at the neighbours that a dry run must span before it is more than a missed shower."""

ODDS: Final = 10.0
"""Natural logarithm of the odds against so many dry days among wet ones, after allowing for all the record's days: wet
days come in spells that miss a gauge together, so that e¹⁰ to 1, not 100 to 1, is asked."""

LOST: Final = 20.0
"""mm that the neighbours had over the run, by their medians."""


OUTLIER_LIMITS: Final = (
    f"{OUTLYING:g} standard deviations of root depths and {LEAST_EXCESS:g} mm above the neighbours' median, "
    f"{TIMES_GREATEST:g} times the greatest of {LEAST_REPORTING} or more neighbours."
)
ZERO_LIMITS: Final = (
    f"Up to {DRY:g} mm, while each of {LEAST_REPORTING} or more neighbours has {LEAST_MEASURED:g} mm and their median "
    f"{MIDDLE_WET:g} mm and {MISSING_RAIN:g} standard deviations of root depths."
)
RUN_LIMITS: Final = (
    f"{LONG_RUN} or more days on which the neighbours were wet and {LOST:g} mm by their medians, at odds of e^{ODDS:g} "
    f"to 1; erroneous above {4 * LOST:g} mm."
)


def far_from_neighbours(view: Screened) -> Iterator[Finding]:
    """Yield days far above the neighbours', in the gauge's climate."""
    cases = view.cases
    spread = np.maximum(NORMAL * view.spread, view.scatter)
    with np.errstate(invalid="ignore"):
        away = (np.sqrt(cases.depths) - np.sqrt(view.middle)) / spread
        odd = (
            (away > OUTLYING)
            & (cases.depths - view.middle > LEAST_EXCESS)
            & (cases.depths > TIMES_GREATEST * view.greatest)
            # In a great storm a dry place may have as much as its wet neighbours.
            & (cases.depths > view.greatest_measured)
            & (view.reporting >= LEAST_REPORTING)
        )
    for g in np.flatnonzero(odd.any(axis=0)).tolist():
        for first, stop in runs_of(odd[:, g]):
            depth, middle = cases.depths[first:stop, g].sum(), view.middle[first:stop, g].sum()
            yield Finding(
                check="spatial-outlier",
                gauge=view.network.ids[g],
                start=cases.starts[first],
                end=cases.ends[stop - 1],
                evidence=f"{view.depth(depth)} in {cases.words(first, stop)}, against a median of "
                f"{view.depth(middle)} at {int(view.reporting[first, g])} neighbours in this gauge's climate, "
                f"{away[first:stop, g].max():.1f} standard deviations of root depths away. Neighbours as measured: "
                f"{view.beside(g, first, stop)}.",
                action="Look at the original: a local storm, a misplaced decimal point, another day's depth.",
                others=view.ids(view.neighbours[g]),
            )


def dry_among_wet(view: Screened) -> Iterator[Finding]:
    """Yield days without rain at a gauge while every neighbour was wet."""
    cases = view.cases
    with np.errstate(invalid="ignore"):
        odd = (
            (cases.depths <= DRY)
            & (np.sqrt(view.middle) >= MISSING_RAIN * view.scatter)
            & (view.least_measured >= LEAST_MEASURED)
            & (view.middle >= MIDDLE_WET)
            & (view.reporting >= LEAST_REPORTING)
        )
    for g in np.flatnonzero(odd.any(axis=0)).tolist():
        for first, stop in runs_of(odd[:, g]):
            gauge = view.network.ids[g]
            start, end = cases.starts[first], cases.ends[stop - 1]
            yield Finding(
                check="zero-among-wet",
                gauge=gauge,
                start=start,
                end=end,
                evidence=f"No rain in {cases.words(first, stop)}. All {int(view.reporting[first, g])} neighbours were "
                f"wet: the driest had {view.depth(view.least_measured[first:stop, g].min())}, and their median is "
                f"{view.depth(view.middle[first:stop, g].sum())} in this gauge's climate. Neighbours as measured: "
                f"{view.beside(g, first, stop)}.",
                action="Reject the zero unless the observer confirms it: it may stand for a missing reading.",
                others=view.ids(view.neighbours[g]),
                edit=Edit(
                    gauge=gauge,
                    start=start,
                    end=end,
                    action="reject",
                    reason="no rain while all neighbours were wet",
                    by=SUGGESTED,
                ),
            )


def long_dry_runs(view: Screened) -> Iterator[Finding]:
    """Yield long runs without rain while the neighbours had much."""
    cases = view.cases
    for g, near in enumerate(view.neighbours):
        if len(near) < 2:
            continue
        known = np.flatnonzero(np.isfinite(cases.depths[:, g]))
        # A neighbour's caught shower does not count for more than other days: the run has to be wet on many.
        telling = (view.middle[known, g] >= WET_DAY) & (view.reporting[known, g] >= 2)
        lost = np.where(telling, view.middle[known, g], 0.0)
        sums = [np.concatenate([[0.0], np.cumsum(part)]) for part in (telling, lost, view.dry_surprise[known, g])]
        # Missing days neither end a run nor add to it.
        for a, b in runs_of(cases.depths[known, g] <= DRY):
            days, middle, odds = (float(through[b] - through[a]) for through in sums)
            if days < LONG_RUN or middle < LOST or odds - np.log(len(known)) < ODDS:
                continue
            wet = known[a:b][telling[a:b]]
            first, stop = int(wet[0]), int(wet[-1]) + 1
            gauge = view.network.ids[g]
            start, end = cases.starts[first], cases.ends[stop - 1]
            yield Finding(
                check="zero-run",
                gauge=gauge,
                start=start,
                end=end,
                severity="erroneous" if middle > 4 * LOST else "doubtful",
                evidence=f"No rain in {cases.words(first, stop)}, while the neighbours' median was "
                f"{view.depth(middle)} on {len(wet)} wet {cases.unit}s. Neighbours as measured: "
                f"{view.beside(g, first, stop)}.",
                action="Reject the run: a blocked funnel, a stopped logger, or zeros for missing values.",
                others=view.ids(near),
                edit=Edit(
                    gauge=gauge,
                    start=start,
                    end=end,
                    action="reject",
                    reason=f"no rain over {len(wet)} wet {cases.unit}s of the neighbours",
                    by=SUGGESTED,
                ),
            )

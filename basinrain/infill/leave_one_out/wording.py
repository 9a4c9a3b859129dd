"""What a comparison says in words: why its method is taken, and what the scores do not show."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from basinrain.gauges import GaugeNetwork
from basinrain.infill.leave_one_out.cases import WET_DAY, WET_STEP, Cases
from basinrain.infill.leave_one_out.comparison import Difference, Score
from basinrain.infill.leave_one_out.cross_fit import PARTS
from basinrain.infill.leave_one_out.scoring import TOP
from basinrain.notes import Note

__all__ = ["FEW_CASES", "FLAT", "notes_of", "reason_of"]

FEW_CASES: Final = 20
"""Below this a comparison says that its cases are few."""
FLAT: Final = 0.8
"""Where the largest estimates are a smaller part than this of the largest depths, storms are said to be flattened."""


def reason_of(scores: Sequence[Score], differences: Sequence[Difference], chosen: str, n: int) -> str:
    """Return why a candidate is taken, in one sentence.

    Parameters
    ----------
    scores, differences
        Of the comparison, at the scale of the score first.
    chosen
        The candidate's label.
    n
        Number of cases.

    Examples
    --------
    >>> score = Score(
    ...     candidate="a",
    ...     gauge="",
    ...     scale="day",
    ...     n=9,
    ...     rmse=2.0,
    ...     mae=1.0,
    ...     bias=0.0,
    ...     correlation=0.9,
    ...     hits=9,
    ...     misses=0,
    ...     false_alarms=0,
    ...     dry_hits=0,
    ...     top20_ratio=1.0,
    ... )
    >>> best = Difference(candidate="a", best="a", difference=0.0, low=0.0, high=0.0, distinguishable=False)
    >>> reason_of([score], [best], "a", 9)
    'a has the least RMSE, 2.00 mm over 9 cases (few), and is the only method that could be compared, so it is taken.'
    """
    best = differences[0].best
    rmse = next(score.rmse for score in scores if score.candidate == best and not score.gauge)
    few = " (few)" if n < FEW_CASES else ""
    head = f"{best} has the least RMSE, {rmse:.2f} mm over {n:,} case{'' if n == 1 else 's'}{few}"
    mine = next(found for found in differences if found.candidate == chosen)
    if chosen == best:
        if len(differences) == 1:
            return f"{head}, and is the only method that could be compared, so it is taken."
        if differences[0].candidate == best:
            return f"{head}, and none is simpler, so it is taken."
        return f"{head}, and every simpler method is distinguishably worse, so it is taken."
    if np.isnan(mine.low):
        interval = "too few weeks for an interval"
    else:
        low, high = (f"{bound:.2f}".replace("-0.00", "0.00") for bound in (mine.low, mine.high))
        interval = f"95 % interval {low} to {high} mm"
    return (
        f"{head}; {chosen} is not distinguishable from it (difference {mine.difference:.2f} mm, {interval}) and is "
        "simpler, so it is taken."
    )


def notes_of(
    cases: Cases,
    network: GaugeNetwork,
    *,
    chosen: Score,
    n: int,
    left_out: int,
    learned: bool,
    normals: bool,
    from_record: bool,
    normals_see_all: bool,
) -> tuple[Note, ...]:
    """Return what a reader of the scores must know.

    Parameters
    ----------
    cases, network
        What was compared.
    chosen
        The score of the method that is taken, over all gauges.
    n, left_out
        Number of cases, and of values that some candidate but not all could estimate.
    learned
        Whether relations between gauges were learned from the record.
    normals, from_record, normals_see_all
        Whether a candidate uses normals, whether they are the record's own, and then whether those of the whole.

    Returns
    -------
    tuple of Note
        ``gauge-sites-are-not-the-basin``, ``cases-compared``, and where they apply ``few-cases``,
        ``chosen-flattens-storms``, ``cases-left-out``, ``learned-without-the-case``, ``normals-as-given``,
        ``normals-see-the-case``.
    """
    notes = [
        Note(
            code="gauge-sites-are-not-the-basin",
            level="info",
            text="Errors are those of estimating gauges from their neighbours, the nearest of which stands "
            f"{_spacing(network):.1f} km away in the median: they show which method suits this network, not how well "
            "the basin mean is known, since gauges stand where people can reach them, mostly low and sheltered.",
        ),
        Note(code="cases-compared", level="info", text=_which(cases)),
    ]
    if n < FEW_CASES:
        notes.append(
            Note(
                code="few-cases",
                text=f"The infill methods were compared on {n} case{'' if n == 1 else 's'} only: another storm may "
                "rank them otherwise.",
            )
        )
    if chosen.top20_ratio < FLAT:
        notes.append(
            Note(
                code="chosen-flattens-storms",
                text=f"{chosen.candidate} is taken for its error, but flattens storms: its {TOP} largest estimates are "
                f"{100 * chosen.top20_ratio:.0f} % of the {TOP} largest depths observed, and its bias is "
                f"{chosen.bias:.2f} mm a case. The scores list methods that keep them better.",
            )
        )
    if left_out:
        notes.append(
            Note(
                code="cases-left-out",
                level="info",
                text=f"{left_out:,} values that some method can estimate were left out, since not all of them can.",
            )
        )
    if learned:
        notes.append(
            Note(
                code="learned-without-the-case",
                level="info",
                text=f"Correlations and slopes were learned for each of {PARTS} parts of the record from the others.",
            )
        )
    if normals and not from_record:
        notes.append(
            Note(
                code="normals-as-given",
                level="info",
                text="Normals are taken as they are given: where they are means of this very record, the methods that "
                "use them have seen the cases.",
            )
        )
    if normals and normals_see_all:
        notes.append(
            Note(
                code="normals-see-the-case",
                text="Normals from the record are those of all its years, since too few are left without a fifth of "
                "them: the methods that use them have seen the cases, and look a little better than they are.",
            )
        )
    return tuple(notes)


def _which(cases: Cases) -> str:
    if cases.scale == "day":
        return (
            f"Cases are totals of rainfall days with a mean of at least {WET_DAY:g} mm over the gauges that know "
            f"theirs; a gauge counts as wet from {WET_DAY:g} mm a day and, at shorter steps, {WET_STEP:g} mm a step."
        )
    return (
        "Cases are steps with a mean above 0 over the gauges that have a value; a gauge counts as wet from "
        f"{WET_DAY:g} mm a step."
    )


def _spacing(network: GaugeNetwork) -> float:
    """Return the median over the gauges of the distance to the nearest other, in km."""
    distances = network.distances()
    np.fill_diagonal(distances, np.inf)
    return float(np.median(distances.min(axis=1)) / 1000)

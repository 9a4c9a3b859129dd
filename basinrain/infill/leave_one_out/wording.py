"""What a comparison says in words: why its method is taken, and what the scores do not show.

Sentences go to terminals, files and reports alike: plain ASCII, with a hyphen for minus and commas between thousands.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from basinrain.gauges import GaugeNetwork
from basinrain.infill.leave_one_out.bootstrap import FEWEST, FEWEST_WEEKS, RESAMPLES
from basinrain.infill.leave_one_out.cases import WET_DAY, WET_STEP, Cases
from basinrain.infill.leave_one_out.comparison import Difference, Score
from basinrain.infill.leave_one_out.cross_fit import PARTS
from basinrain.infill.leave_one_out.scoring import TOP
from basinrain.notes import Note
from basinrain.units import depth_factor

__all__ = ["FEW_CASES", "FLAT", "notes_of", "reason_of"]

FEW_CASES: Final = 20
"""Below this a comparison says that its cases are few."""
FLAT: Final = 0.8
"""Where the largest estimates are a smaller part than this of the largest depths, storms are said to be flattened."""


def reason_of(  # noqa: PLR0917 - what a comparison found, in order
    scores: Sequence[Score],
    differences: Sequence[Difference],
    chosen: str,
    cases: Cases,
    n: int,
    drawn: str,
    *,
    depth_unit: str = "mm",
) -> str:
    """Return why a candidate is taken, in one sentence.

    Parameters
    ----------
    scores, differences
        Of the comparison, at the scale of the score first.
    chosen
        The candidate's label.
    cases
        The times compared.
    n
        Number of cases.
    drawn
        What the intervals come from, as of :func:`~basinrain.infill.leave_one_out.bootstrap.what_is_drawn`.
    depth_unit
        Of the errors that it names.

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
    >>> days = np.arange("2031-05-01", "2031-05-04", dtype="datetime64[D]").astype("datetime64[s]")
    >>> one = np.ones(3, dtype=np.int64)
    >>> cases = Cases("day", 1.0, days, one, one, one, lambda chunk: np.ones((3, 3))[chunk], 3)
    >>> reason_of([score], [best], "a", cases, 9, "case")
    'Nothing could be compared: a alone can estimate enough of the values, with an RMSE of 2.00 mm over 9 cases (few), \
and is taken for want of another.'
    """
    best = differences[0].best
    rmse = next(score.rmse for score in scores if score.candidate == best and not score.gauge)
    few = " (few)" if n < FEW_CASES else ""
    depth = _Depths(depth_unit)
    over = f"{depth.error(rmse)} over {n:,} case{'' if n == 1 else 's'}{few}"
    if len(differences) == 1:
        return (
            f"Nothing could be compared: {best} alone can estimate enough of the values, with an RMSE of {over}, and "
            "is taken for want of another."
        )
    head = f"{best} has the least RMSE, {over}"
    mine = next(found for found in differences if found.candidate == chosen)
    if chosen == best:
        if not drawn:
            return f"{head}; with fewer than {FEWEST} cases nothing can be told apart, so it is taken for that alone."
        if differences[0].candidate == best:
            return f"{head}, and none is simpler, so it is taken."
        how = _how_drawn(cases, drawn)
        return f"{head}, and every simpler method is distinguishably worse (95 % intervals, {how}), so it is taken."
    interval = f"95 % interval {depth.number(mine.low)} to {depth.error(mine.high)}, {_how_drawn(cases, drawn)}"
    return (
        f"{head}; {chosen} is not distinguishable from it (difference {depth.error(mine.difference)}, {interval}) and "
        "is simpler, so it is taken."
    )


def notes_of(
    cases: Cases,
    network: GaugeNetwork,
    *,
    chosen: Score,
    n: int,
    drawn: str,
    left_out: int,
    learned: bool,
    normals: bool,
    from_record: bool,
    normals_see_all: bool,
    depth_unit: str = "mm",
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
    drawn
        What the intervals come from.
    learned
        Whether relations between gauges were learned from the record.
    normals, from_record, normals_see_all
        Whether a candidate uses normals, whether they are the record's own, and then whether those of the whole.
    depth_unit
        Of the depths that they name.

    Returns
    -------
    tuple of Note
        ``gauge-sites-are-not-the-basin``, ``cases-compared``; one of ``intervals``, ``intervals-too-narrow`` and
        ``no-intervals``; and where they apply ``few-cases``, ``chosen-flattens-storms``, ``cases-left-out``,
        ``learned-without-the-case``, ``normals-as-given``, ``normals-see-the-case``.
    """
    depth = _Depths(depth_unit)
    notes = [
        Note(
            code="gauge-sites-are-not-the-basin",
            level="info",
            text="Errors are those of estimating gauges from their neighbours, the nearest of which stands "
            f"{_spacing(network):.1f} km away in the median: they show which method suits this network, not how well "
            "the basin mean is known, since gauges stand where people can reach them, mostly low and sheltered.",
        ),
        Note(code="cases-compared", level="info", text=_which(cases, depth)),
        _intervals(cases, n, drawn),
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
                f"{depth.error(chosen.bias)} a case. The scores list methods that keep them better.",
            )
        )
    if left_out:
        notes.append(
            Note(
                code="cases-left-out",
                level="info",
                text=f"{left_out:,} value{'s' if left_out > 1 else ''} that some method can estimate "
                f"{'were' if left_out > 1 else 'was'} left out, since not all methods can.",
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


class _Depths:
    """Depths in the unit that is read: errors with one decimal more than depths have."""

    def __init__(self, unit: str) -> None:
        self._unit, self._mm = unit, depth_factor(unit)
        self._digits = 3 if unit == "in" else 2

    def number(self, mm: float) -> str:
        text = f"{mm / self._mm:.{self._digits}f}"
        return text.removeprefix("-") if not text.strip("-0.") else text

    def error(self, mm: float) -> str:
        return f"{self.number(mm)} {self._unit}"

    def bound(self, mm: float) -> str:
        """Return a bound that is round in mm, with that number beside another unit's."""
        return f"{mm:g} mm" if self._unit == "mm" else f"{mm / self._mm:.2g} {self._unit} ({mm:g} mm)"


def _how_drawn(cases: Cases, drawn: str) -> str:
    """Return what was drawn anew for an interval, in a few words."""
    what = {"week": "weeks", "time": f"{cases.noun}s", "case": "single cases"}[drawn]
    return f"{what} drawn anew{' and so too narrow' if _narrow(cases, drawn) else ''}"


def _narrow(cases: Cases, drawn: str) -> bool:
    """Whether intervals are too narrow: what was drawn goes together, or there is little of it."""
    return drawn == "case" or (drawn == "time" and (cases.scale == "day" or len(cases) < FEWEST_WEEKS))


def _intervals(cases: Cases, n: int, drawn: str) -> Note:
    """Return the remark on what the intervals come from."""
    times = f"{len(cases)} {cases.noun}{'' if len(cases) == 1 else 's'}"
    if not drawn:
        return Note(
            code="no-intervals",
            text=f"{n} case{'' if n == 1 else 's'} on {times}: fewer than {FEWEST}, so there is no interval, and no "
            "method can be told from another.",
        )
    if not _narrow(cases, drawn):
        what = "whole weeks of cases" if drawn == "week" else f"whole {cases.noun}s, all gauges of each together,"
        return Note(
            code="intervals",
            level="info",
            text=f"Intervals come from drawing {what} anew {RESAMPLES:,} times, since errors of one storm go together.",
        )
    if drawn == "case":
        reason = (
            f"Cases lie on {times} only, fewer than {FEWEST}, so single cases, a gauge's {cases.noun} each, were drawn "
            "anew for the intervals. Errors of one storm go together"
        )
    elif cases.scale == "day":
        reason = (
            f"Cases lie on {times} of fewer than {FEWEST_WEEKS} weeks, so days were drawn anew for the intervals, not "
            "weeks. Errors of one storm go together"
        )
    else:
        reason = f"Cases lie on {times} only, which were drawn anew for the intervals"
    return Note(
        code="intervals-too-narrow",
        text=f"{reason}: the intervals are too narrow, and methods are told apart too readily.",
    )


def _which(cases: Cases, depth: _Depths) -> str:
    if cases.scale == "day":
        return (
            f"Cases are totals of rainfall days with a mean of at least {depth.bound(WET_DAY)} over the gauges that "
            f"know theirs; a gauge counts as wet from {depth.bound(WET_DAY)} a day and, at shorter steps, "
            f"{depth.bound(WET_STEP)} a step."
        )
    return (
        f"Cases are {cases.noun}s with a mean above 0 over the gauges that have a value; a gauge counts as wet from "
        f"{depth.bound(WET_DAY)} each."
    )


def _spacing(network: GaugeNetwork) -> float:
    """Return the median over the gauges of the distance to the nearest other, in km."""
    distances = network.distances()
    np.fill_diagonal(distances, np.inf)
    return float(np.median(distances.min(axis=1)) / 1000)

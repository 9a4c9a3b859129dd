"""The storms of one series: found, ranked, with what fell before them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.errors import MethodError
from basinrain.notes import Note
from basinrain.series.antecedent import AntecedentDepths, AntecedentIndex, antecedent_depths, antecedent_index
from basinrain.series.dry_gap import DryGap, estimate_dry_gap
from basinrain.series.events import TOTAL, RankedEvent, Ranking, find_events, rank_events
from basinrain.series.steps import DAY

__all__ = ["FoundStorms", "find_storms"]

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]

_EMPTY: Final = Ranking((), (), TOTAL)


@dataclass(frozen=True, eq=False, kw_only=True)
class FoundStorms:
    """The storms of the series of one basin.

    Parameters
    ----------
    basin, gaps, method
        Which series.
    count
        How many of the largest are taken.
    dry_gap
        What separates storms; NaT where none were sought.
    wet_depth
        mm; a step with at least so much is wet.
    ranking
        All storms, by size.
    test
        The test by which the dry gap was found, where it was.
    before, index
        Depths in the days before the storms that are taken, and their antecedent index; None where none were taken.
    notes
        What must be said of them.
    """

    basin: str
    gaps: str
    method: str
    count: int
    dry_gap: np.timedelta64
    wet_depth: float
    ranking: Ranking
    test: DryGap | None
    before: AntecedentDepths | None
    index: AntecedentIndex | None
    notes: tuple[Note, ...]

    @property
    def taken(self) -> tuple[RankedEvent, ...]:
        """The largest complete storms, as many as were asked for, or all there are."""
        return self.ranking.complete[: self.count]


def find_storms(
    starts: Times,
    ends: Times,
    depth: Floats,
    *,
    basin: str,
    gaps: str,
    method: str,
    count: int,
    dry_gap: np.timedelta64 | None,
    wet_depth: float,
    rank: Literal["total"] | np.timedelta64,
    recession: float,
) -> FoundStorms:
    """Return the storms of a series.

    Parameters
    ----------
    starts, ends : array of datetime64, shape (n,)
        Every step is ``(start, end]``.
    depth : array of float, shape (n,)
        mm; NaN where there is no number.
    basin, gaps, method
        What the series is, for the result.
    count
        How many of the largest are taken.
    dry_gap
        What separates storms; None to find it by the exponential-gap test.
    wet_depth, rank, recession
        As for :func:`~basinrain.series.events.find_events`, :func:`~basinrain.series.events.rank_events` and
        :func:`~basinrain.series.antecedent.antecedent_index`.

    Returns
    -------
    FoundStorms
        Without any where steps are longer than a day, or differ in length, or do not divide a day, or the test does
        not settle on a gap: a note says so.

    Raises
    ------
    BasinRainError
        As those functions.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-01", "s") + np.arange(1, 8) * np.timedelta64(86400, "s")
    >>> found = find_storms(
    ...     ends - 86400,
    ...     ends,
    ...     np.array([0.0, 4.0, 0.0, 0.0, 9.0, 6.0, 0.0]),
    ...     basin="all",
    ...     gaps="reweight",
    ...     method="thiessen",
    ...     count=1,
    ...     dry_gap=np.timedelta64(1, "D"),
    ...     wet_depth=0.1,
    ...     rank="total",
    ...     recession=0.9,
    ... )
    >>> len(found.ranking.complete), [(str(s.start), s.depth) for s in found.taken], found.before.present[0, 0]
    (2, [('2031-05-05T00:00:00', 15.0)], np.float64(4.0))
    """
    nothing = FoundStorms(
        basin=basin,
        gaps=gaps,
        method=method,
        count=count,
        dry_gap=np.timedelta64("NaT", "s") if dry_gap is None else dry_gap,
        wet_depth=wet_depth,
        ranking=_EMPTY,
        test=None,
        before=None,
        index=None,
        notes=(),
    )
    lengths = (ends - starts).astype("timedelta64[s]").astype(np.int64)
    if lengths.min() != lengths.max() or DAY % int(lengths[0]):
        text = "No storms were sought in the record: its steps are not of one length that divides a day."
        return replace(nothing, notes=(Note(code="storms-not-sought", text=text, level="info"),))
    try:
        test = estimate_dry_gap(starts, ends, depth, wet_depth=wet_depth) if dry_gap is None else None
    except MethodError as error:
        text = f"No storms were sought in the record, since no dry gap could be found: {error}"
        return replace(nothing, notes=(Note(code="storms-not-sought", text=text),))
    gap = dry_gap if test is None else test.gap
    assert gap is not None  # noqa: S101 - one of the two is there
    events = find_events(starts, ends, depth, dry_gap=gap, wet_depth=wet_depth)
    ranking = rank_events(events, starts, ends, depth, by=rank)
    found = replace(nothing, dry_gap=gap, ranking=ranking, test=test, notes=ranking.notes(count))
    at = np.array([ranked.event.start for ranked in found.taken], dtype="datetime64[s]")
    if not len(at):
        return found
    return replace(
        found,
        before=antecedent_depths(starts, ends, depth, at=at),
        index=antecedent_index(starts, ends, depth, at=at, recession=recession),
    )

"""What a leave-one-out comparison of infill methods found."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.infill.options import InfillOptions
from basinrain.notes import Note

__all__ = ["Candidate", "Comparison", "Difference", "Score"]


@dataclass(frozen=True, kw_only=True)
class Candidate:
    """One infill method with its numbers, as it takes part in the comparison.

    Parameters
    ----------
    label
        What tables call it: :attr:`~basinrain.infill.options.InfillOptions.label`, or a name of one's own.
    options
        The method and its numbers.

    Examples
    --------
    >>> Candidate(label="station-average", options=InfillOptions(method="station-average")).options.donors_wanted
    5
    """

    label: str
    options: InfillOptions


@dataclass(frozen=True, kw_only=True)
class Score:
    """How well one candidate estimated the gauges, one gauge or all of them, over the cases that all share.

    Parameters
    ----------
    candidate
        Its label.
    gauge
        The gauge's id; empty for all gauges pooled.
    scale
        ``"day"`` for rainfall-day totals, ``"step"`` for the record's own steps.
    n
        Number of cases.
    rmse, mae, bias
        mm: root of the mean square, mean absolute and mean of estimated minus observed; NaN without a case.
    correlation
        Of estimated and observed depths; NaN with fewer than two cases or where one of the two does not vary.
    hits, misses, false_alarms, dry_hits
        Cases wet in both, only as observed, only as estimated, and in neither. Wet is at least 1 mm, at steps under a
        day 0.2 mm.
    top20_ratio
        Mean of the 20 largest estimated depths over the mean of the 20 largest observed (of all of them where there
        are fewer cases); NaN where the observed are all 0. Below 1 the method flattens the storms.

    Examples
    --------
    >>> score = Score(
    ...     candidate="station-average",
    ...     gauge="",
    ...     scale="day",
    ...     n=2,
    ...     rmse=1.0,
    ...     mae=1.0,
    ...     bias=0.0,
    ...     correlation=1.0,
    ...     hits=1,
    ...     misses=0,
    ...     false_alarms=1,
    ...     dry_hits=0,
    ...     top20_ratio=0.9,
    ... )
    >>> score.hits + score.misses + score.false_alarms + score.dry_hits == score.n
    True
    """

    candidate: str
    gauge: str
    scale: str
    n: int
    rmse: float
    mae: float
    bias: float
    correlation: float
    hits: int
    misses: int
    false_alarms: int
    dry_hits: int
    top20_ratio: float


@dataclass(frozen=True, kw_only=True)
class Difference:
    """How much worse a candidate is than the best, and whether that can be told from chance.

    Parameters
    ----------
    candidate, best
        Labels.
    difference
        mm: the candidate's root-mean-square error minus the best's, never below 0.
    low, high
        mm: the 95 % bootstrap interval of it; NaN where there are too few cases for one.
    distinguishable
        Whether the interval lies above 0.

    Examples
    --------
    >>> Difference(
    ...     candidate="station-average",
    ...     best="inverse-distance (power 1)",
    ...     difference=0.03,
    ...     low=-0.02,
    ...     high=0.09,
    ...     distinguishable=False,
    ... ).distinguishable
    False
    """

    candidate: str
    best: str
    difference: float
    low: float
    high: float
    distinguishable: bool


@dataclass(frozen=True, kw_only=True, eq=False)
class Comparison:
    """Every candidate scored on the same cases, the best of them, and the one that is taken.

    Parameters
    ----------
    candidates : tuple of str
        Labels of those that were compared, from simple to complex.
    skipped : mapping of str to str
        Why each of the others could not be, in words, by label.
    scale : str
        The scale of the score: ``"day"`` where the record's step is shorter than a day, else ``"step"``.
    gauges : tuple of str
        Gauge ids, the columns.
    ends : array of datetime64[s], shape (n_cases,)
        The ends of the days or steps compared; NaT for totals without times.
    storms : tuple of str
        The storm of every case, in a record of storm totals; else empty.
    observed : array of float, shape (n_cases, n_gauges)
        mm; NaN where the gauge takes no part.
    estimated : array of float, shape (n_cases, n_gauges)
        mm by the chosen candidate, from the other gauges alone; NaN where the gauge takes no part.
    scores : tuple of Score
        By scale (that of the score first), gauge (all pooled first) and candidate.
    differences : tuple of Difference
        One a candidate, in their order; that of the best is 0.
    drawn : str
        What the intervals come from: ``"week"``, ``"time"`` or ``"case"`` drawn anew; empty where there are too few
        cases for an interval.
    best, chosen : str
        The label with the least error, and the first of the order that cannot be told from it; the best itself where
        there is no interval.
    chosen_options : InfillOptions
        Method and numbers of the chosen one, with all else as the job has it.
    reason : str
        Why it is taken, one sentence with its numbers, in plain ASCII, as ``notes`` are.
    notes : tuple of Note
        What the comparison does and does not say.

    Examples
    --------
    See :func:`basinrain.infill.leave_one_out.compare_infill`, which returns one.
    """

    candidates: tuple[str, ...]
    skipped: Mapping[str, str]
    scale: str
    gauges: tuple[str, ...]
    ends: npt.NDArray[np.datetime64]
    observed: npt.NDArray[np.float64]
    estimated: npt.NDArray[np.float64]
    scores: tuple[Score, ...]
    differences: tuple[Difference, ...]
    drawn: str
    best: str
    chosen: str
    chosen_options: InfillOptions
    reason: str
    notes: tuple[Note, ...]
    storms: tuple[str, ...] = ()

    def score(self, candidate: str, *, gauge: str = "", scale: str = "") -> Score:
        """Return one score.

        Parameters
        ----------
        candidate
            Its label.
        gauge
            The gauge's id; empty for all of them pooled.
        scale
            ``"day"`` or ``"step"``; empty for the scale of the score.

        Returns
        -------
        Score

        Raises
        ------
        KeyError
            There is none: the label, the gauge or the scale is not part of the comparison.
        """
        wanted = (candidate, gauge, scale or self.scale)
        for score in self.scores:
            if (score.candidate, score.gauge, score.scale) == wanted:
                return score
        raise KeyError(wanted)

"""How the basin means of a storm move with the infill method."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
import numpy.typing as npt

from basinrain.averager import Averager
from basinrain.averaging import Weigher
from basinrain.basin_depths import spread_across_methods
from basinrain.completed_sums import CompletedSums, average_sums
from basinrain.errors import BasinRainError, DataError, Problem
from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, Completed, InfillOptions, RecordFiller, relations_of_record
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.infill.relations import AT_LEAST
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.units import depth_factor

if TYPE_CHECKING:
    from basinrain.infill.record_normals import NormalRatios
    from basinrain.infill.relations import Relations

__all__ = ["InfillEffect", "InfillSpread", "infill_effect", "infill_spread_cautions"]

_SPREAD_PERCENT: Final = 10.0
_ROUNDING: Final = 1e-9

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class InfillSpread:
    """The least and the greatest mean of one basin, by one averaging method, over the infill methods.

    Parameters
    ----------
    least, greatest
        mm; NaN where no infill method gives a number.
    percent
        Their difference in percent of the mean over the infill methods; NaN with fewer than two numbers, 0 where all
        are 0.
    least_by, greatest_by
        Labels of the infill methods that give them, the first of equal ones; empty without a number.

    Examples
    --------
    >>> spread = InfillSpread(
    ...     least=9.0, greatest=11.0, percent=20.0, least_by="nearest-gauge", greatest_by="regression"
    ... )
    >>> spread.greatest - spread.least
    2.0
    """

    least: float
    greatest: float
    percent: float
    least_by: str
    greatest_by: str


@dataclass(frozen=True, kw_only=True, eq=False)
class InfillEffect:
    """The basin means of one storm by every averaging method, after every infill method that can run on it.

    Parameters
    ----------
    methods : tuple of str
        Labels of the infill methods, from simple to complex.
    own : str
        The label of the job's own method; one of ``methods``.
    totals : mapping of str to array of float, shape (n_methods, n_basins)
        Storm totals in mm, by averaging method; NaN where that has no number.
    share_infilled : mapping of str to array of float, shape (n_methods, n_basins)
        Share of each total that rests on infilled values, 0 to 1 (by weight where the basin stayed dry); NaN where the
        total is.
    left : array of int, shape (n_methods,)
        Values of gauges in service that have no depth even after infill. Weights are rebuilt at their steps, so a
        method with more of them is not quite comparable.
    skipped : mapping of str to str
        Why each of the other methods cannot be set beside the job's own, in words, by label: it lacks what it needs,
        infills nothing, or leaves so many gaps that its means would hardly be its own.
    refused : mapping of (str, str) to str
        Why an averaging method has no numbers after an infill method, by (averaging method, label): gauges that stayed
        without a depth left a basin out of its reach.

    Examples
    --------
    >>> effect = InfillEffect(
    ...     methods=("nearest-gauge", "station-average"),
    ...     own="station-average",
    ...     totals={"thiessen": np.array([[9.0], [11.0]])},
    ...     share_infilled={"thiessen": np.array([[0.2], [0.25]])},
    ...     left=np.array([0, 0]),
    ...     skipped={"normal-ratio": "gauges: found no normals"},
    ...     refused={},
    ... )
    >>> effect.difference("thiessen").ravel()
    array([-2.,  0.])
    >>> (spread,) = effect.spread("thiessen")
    >>> spread.percent, spread.least_by
    (20.0, 'nearest-gauge')
    """

    methods: tuple[str, ...]
    own: str
    totals: Mapping[str, Floats]
    share_infilled: Mapping[str, Floats]
    left: npt.NDArray[np.int64]
    skipped: Mapping[str, str]
    refused: Mapping[tuple[str, str], str]

    def difference(self, averaging: str) -> Floats:
        """Return how far every infill method's totals are from the job's own, shape (n_methods, n_basins), in mm.

        NaN where one of the two has no number; ``KeyError`` for an averaging method that was not run.
        """
        totals = self.totals[averaging]
        return np.asarray(totals - totals[self.methods.index(self.own)])

    def spread(self, averaging: str) -> tuple[InfillSpread, ...]:
        """Return the least and greatest mean over the infill methods, one a basin.

        ``KeyError`` for an averaging method that was not run.
        """
        spreads = []
        for totals in self.totals[averaging].T:
            least, greatest, _, percent = spread_across_methods(totals.tolist())
            known = not np.isnan(totals).all()
            spreads.append(
                InfillSpread(
                    least=least,
                    greatest=greatest,
                    percent=percent,
                    least_by=self.methods[int(np.nanargmin(totals))] if known else "",
                    greatest_by=self.methods[int(np.nanargmax(totals))] if known else "",
                )
            )
        return tuple(spreads)


def infill_effect(
    window: RainRecord,
    network: GaugeNetwork,
    completed: Completed,
    weighers: Mapping[str, Weigher | Averager],
    *,
    options: InfillOptions,
    asked: InfillOptions | None = None,
    long: npt.NDArray[np.bool_] | None = None,
    relations: Relations | None = None,
    ratios: NormalRatios | None = None,
    progress: Callable[[str], None] | None = None,
) -> InfillEffect:
    """Return the basin means of a storm after every infill method that can run on it.

    Parameters
    ----------
    window : RainRecord
        The storm's window before infill.
    network : GaugeNetwork
        The gauges, in the window's order.
    completed : Completed
        The window after the job's own infill, so that it need not be made twice.
    weighers : mapping of str to Weigher or Averager
        The averaging methods, by name; an averager is faster where the sets of gauges that have a depth are many.
    options : InfillOptions
        The job's own.
    asked : InfillOptions, optional
        What the job says, where a comparison chose its method; ``options`` where not given. The other methods share its
        scale, longest gap, radius and limit of elevation, and those that take them its power and, where given, its
        numbers of donors: the same numbers as in the comparison of the methods.
    long : array of bool, shape (n_steps, n_gauges), optional
        As for :func:`basinrain.infill.complete`.
    relations, ratios : Relations and NormalRatios, optional
        As for :func:`basinrain.infill.complete`; the methods that lack what they need are skipped.
    progress : callable, optional
        Called with the label of each method before it is run.

    Returns
    -------
    InfillEffect
        Where nothing was missing, all methods give the same totals.

    Raises
    ------
    DataError
        ``completed`` was not infilled by the options' method.
    MethodError
        An averaging method refuses every set of gauges of the storm.

    Notes
    -----
    With W the weights of the gauges that have a depth, the total is the sum over steps of ``W p``, p the completed
    depths. W changes only where the set of gauges with a depth does, so ``W Σ p`` over the steps of one set is the same
    sum with one product a set, and most storms have one set whatever the infill method.

    Examples
    --------
    The middle one of three gauges is silent for a storm in which its neighbours, 1 and 2 km away, had 6 and 12 mm.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 3e3], y=[0.0] * 3, crs="local")
    >>> ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    >>> window = RainRecord.from_depths(network.ids, ends - 3600, ends, [[6.0, np.nan, 12.0]], step="1h")
    >>> from basinrain.weights import WeightTable
    >>> def thirds(present):
    ...     return WeightTable("thirds", ("all",), network.ids, np.where(present, 1 / present.sum(), 0.0)[None, :])
    >>> from basinrain.infill import complete
    >>> own = InfillOptions(method="station-average")
    >>> effect = infill_effect(window, network, complete(window, network, own), {"thirds": thirds}, options=own)
    >>> totals = dict(zip(effect.methods, effect.totals["thirds"][:, 0].round(2).tolist(), strict=True))
    >>> totals["station-average"], totals["inverse-distance (power 2)"]  # B has 9 mm, or (4 x 6 + 12)/5 = 7.2 mm
    (9.0, 8.4)
    >>> "normal-ratio" in effect.skipped
    True
    """
    used = {estimate.method for estimate in completed.estimates}
    if not used <= {options.method}:
        found, expected = f"infilled by {', '.join(sorted(used))}", f"infilled by {options.method}, as the options say"
        raise DataError(Problem(item="completed record", found=found, expected=expected))
    gaps = gap_mask(window)
    long = longer_than(window, gaps, options.longest_gap) if long is None else long
    own, n_gaps = options.label, int(np.count_nonzero(gaps))
    mine = CompletedSums.of(completed.record)
    # Sums only: the completed records of all methods together may be far larger than the job's own.
    runs: dict[str, CompletedSums] = {}
    skipped: dict[str, str] = {}
    for method in sorted(METHODS.values(), key=lambda method: method.order):
        if method.name == options.method:
            runs[own] = mine
            continue
        candidate = (asked or options).with_method(method.name)
        label = candidate.label
        if progress is not None:
            progress(label)
        try:
            known = _relations(candidate, window, network, relations, ratios) if n_gaps else None
            filler = RecordFiller(network, candidate, relations=known, ratios=ratios)
            filled = filler.fill(window, long)
        except BasinRainError as error:
            skipped[label] = _in_short(error)
            continue
        sums = CompletedSums.of_depths(filled.depth, filled.filled, gaps)
        if reason := sums.unlike(mine, n_gaps):
            skipped[label] = reason + (_unrelated(relations) if method.needs_relations else "")
        else:
            runs[label] = sums
    totals, share, refused = {}, {}, {}
    for name, weigher in weighers.items():
        totals[name], share[name], errors = average_sums(list(runs.values()), weigher, len(window))
        refused.update({(name, label): errors[k] for k, label in enumerate(runs) if k in errors})
    return InfillEffect(
        methods=tuple(runs),
        own=own,
        totals=totals,
        share_infilled=share,
        left=np.array([sums.left for sums in runs.values()], dtype=np.int64),
        skipped=skipped,
        refused=refused,
    )


def _relations(
    options: InfillOptions,
    window: RainRecord,
    network: GaugeNetwork,
    relations: Relations | None,
    ratios: NormalRatios | None,
) -> Relations | None:
    if relations is not None or not options.chosen_method.needs_relations:
        return relations
    return relations_of_record(window, network, ratios=ratios)


def _unrelated(relations: Relations | None) -> str:
    """Return that no two gauges have enough cases in common for a correlation, where that is so."""
    if relations is None or len(relations.gauges) < 2:
        return ""
    most = int(relations.common[~np.eye(len(relations.gauges), dtype=bool)].max())
    if most >= AT_LEAST:
        return ""
    return (
        f"; a correlation needs {AT_LEAST} days, or longer steps, in common, and no two gauges have more than {most:,}"
    )


def _in_short(error: BasinRainError) -> str:
    first, more = error.problems[0], len(error.problems) - 1 + error.unlisted
    return f"{first.item}: found {first.found}; expected {first.expected}{f' (and {more:,} more)' if more else ''}"


def infill_spread_cautions(
    storm: str, basins: tuple[str, ...], effect: InfillEffect, *, depth_unit: str = "mm"
) -> Iterator[Note]:
    """Yield a warning, code ``"infill-spread"``, for every basin whose mean moves with the infill method by over 10 %.

    Parameters
    ----------
    storm, basins
        The storm's name and the ids of the basins.
    effect
        What the infill methods give for it.
    depth_unit
        Unit of the depths that the warnings name.

    Examples
    --------
    >>> effect = InfillEffect(
    ...     methods=("nearest-gauge", "station-average"),
    ...     own="station-average",
    ...     totals={"thiessen": np.array([[9.0], [11.0]]), "idw": np.array([[9.9], [10.1]])},
    ...     share_infilled={},
    ...     left=np.array([0, 0]),
    ...     skipped={},
    ...     refused={},
    ... )
    >>> [note.text for note in infill_spread_cautions("Quill", ("all",), effect)]
    ['The mean of basin all by thiessen depends on the infill method: from 9.0 mm (nearest-gauge) to 11.0 mm \
(station-average), 20 % of their mean; the job has station-average, 11.0 mm.']
    """
    mm, digits = depth_factor(depth_unit), 2 if depth_unit == "in" else 1
    own = effect.methods.index(effect.own)
    spreads = {averaging: effect.spread(averaging) for averaging in effect.totals}
    for b, basin in enumerate(basins):
        wide = {name: row[b] for name, row in spreads.items() if row[b].percent > _SPREAD_PERCENT + _ROUNDING}
        if not wide:
            continue
        name = max(wide, key=lambda name: round(wide[name].percent, 9))
        widest = wide.pop(name)
        low, high, given = (
            f"{depth / mm:.{digits}f} {depth_unit}"
            for depth in (widest.least, widest.greatest, float(effect.totals[name][own, b]))
        )
        also = "".join(f", {spread.percent:.0f} % by {other}" for other, spread in wide.items())
        yield Note(
            code="infill-spread",
            text=f"The mean of basin {basin} by {name} depends on the infill method: from {low} ({widest.least_by}) to "
            f"{high} ({widest.greatest_by}), {widest.percent:.0f} % of their mean{also}; the job has {effect.own}, "
            f"{given}.",
            storm=storm,
            basin=basin,
        )

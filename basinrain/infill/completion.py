"""Completing a storm window: every gap infilled at its scale, as far as it can be."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.completed import Completed, Estimate
from basinrain.infill.filling import GaugeFilling
from basinrain.infill.gaps import gap_mask, longer_than, over_peak
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_filling import RecordFiller, scale_of
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import Relations, relations_of_record
from basinrain.infill.window import Window
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status

__all__ = ["complete"]

_YEAR: Final = np.timedelta64(365, "D")


def complete(
    record: RainRecord,
    network: GaugeNetwork,
    options: InfillOptions,
    *,
    long: npt.NDArray[np.bool_] | None = None,
    relations: Relations | None = None,
    ratios: NormalRatios | None = None,
    trace: bool = True,
) -> Completed:
    """Infill the gaps of a storm window.

    Parameters
    ----------
    record : RainRecord
        The window, its columns in the network's order. It is not changed.
    network : GaugeNetwork
        The gauges, with their normals where the method needs them.
    options : InfillOptions
        Method, scale and limits.
    long : array of bool, shape (n_steps, n_gauges), optional
        The gaps that are too long to be infilled. A gap may begin before the window and end after it, so whoever has
        the whole record gives them (:func:`basinrain.infill.gaps.longer_than`); where not given, what is seen of a gap
        in this record is its length.
    relations : Relations, optional
        Relations between the gauges, for methods that need them. Whoever has the whole record gives its
        (:func:`basinrain.infill.relations_of_record`), since a storm has too few days; where not given, they are those
        of this record.
    ratios : NormalRatios, optional
        Normals from the whole record (:func:`basinrain.infill.normals_from_record`), used instead of the network's.
    trace : bool
        Whether to keep how every estimate came about. Without, the record is the same, in a small part of the time;
        estimates and notes are empty.

    Returns
    -------
    Completed
        The completed record, every estimate with its donor weights, and notes: ``not-infilled`` (which gauge stays
        without a depth, where and why), ``total-raised``, ``infill-beyond-donors`` (over twice
        what its greatest donor had), ``spread-evenly``, ``gap-over-peak``, ``annual-normals``.

    Raises
    ------
    DataError
        The columns are not the network's gauges, the record was infilled before; normals are missing or not above 0, or
        elevations missing, at a gauge that takes part and needs them; all such problems together, before anything is
        computed.

    See Also
    --------
    basinrain.infill.RecordFiller : The same depths for one stretch of a record after the other.

    Notes
    -----
    Donors are values that a gauge measured itself, never infilled ones. At the scale ``"step"`` every
    missing step is the weighted sum of the donors measured at that step. At ``"day"`` and ``"storm"`` a span of steps
    (the rainfall day within the window, or the window; where a gauge was in service for part of it, that part) is
    looked at as a whole:

    - at least half of its steps have the gauge's own value: the missing steps are infilled step by step;
    - fewer: the span's total is the weighted sum of the totals of donors that have their own values at all of its
      steps. A gauge is no donor where part of a total in ``record.totals`` fell outside the span (a daily reading that
      began before the storm), since what fell inside is known from the pattern of others alone. What the gauge did
      observe is kept, and the rest of the total goes to the missing steps in the pattern of the nearest recording gauge
      that is complete over the span and wet in those steps; evenly, with a note, where there is none;
    - but where that total is below what was observed, only the missing steps are infilled, step by step, with a note.

    A total without times is a span of its own. Normals are those of the month that holds the middle of the step, day or
    storm. Gauges not in service, and gaps longer than ``longest_gap``, are left alone.

    Examples
    --------
    B misses two hours of four. At least half is there, so each is the mean of A and C.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "2031-05-04T03", "2031-05-04T04"], dtype="datetime64[s]")
    >>> depths = [[5.0, 6.0, 4.0], [10.0, np.nan, 8.0], [5.0, np.nan, 6.0], [0.0, 1.0, 2.0]]
    >>> record = RainRecord.from_depths(("A", "B", "C"), ends - 3600, ends, depths, step="1h")
    >>> completed = complete(record, network, InfillOptions(method="station-average"))
    >>> completed.record.depth[:, 1]
    array([6. , 9. , 5.5, 1. ])
    >>> completed.estimates[0].donors
    {'A': 0.5, 'C': 0.5}
    >>> [note.code for note in completed.notes]
    ['gap-over-peak']
    """
    gaps = gap_mask(record)
    long = longer_than(record, gaps, options.longest_gap) if long is None else gaps & long
    fillable = gaps & ~long
    if relations is None and options.chosen_method.needs_relations and record.gauges == network.ids and fillable.any():
        relations = relations_of_record(record, network, ratios=ratios)
    filler = RecordFiller(network, options, relations=relations, ratios=ratios)
    filled = filler.fill(record, long, trace=trace)
    status = record.status.copy()
    status[filled.filled] = Status.INFILLED
    completed = replace(record, depth=filled.depth, status=status)
    if filled.spans is None:
        return Completed(completed, (), ())
    window = Window(record, network, options, scale_of(record, options), fillable, relations, ratios)
    estimates: list[Estimate] = []
    notes: list[Note] = []
    for g in np.flatnonzero(gaps.any(axis=0)).tolist():
        told = GaugeFilling(window, g, long[:, g], filled.depth[:, g], filled.spans.of_gauge(g))
        estimates += told.estimates
        notes += told.notes()
    notes = [*over_peak(record, gaps, filled.depth), *notes, *_annual_normals(window, estimates)]
    return Completed(completed, tuple(estimates), tuple(notes))


def _annual_normals(window: Window, estimates: list[Estimate]) -> list[Note]:
    used = window.options.chosen_method.needs_normals and window.ratios is None
    if not estimates or not used or window.network.normals is None:
        return []
    record = window.record
    undated = bool(np.isnat(record.ends).any())
    annual = window.network.normals.shape[1] == 1
    if not undated and not (
        annual and any(record.ends[e.stop - 1] - record.starts[e.first] < _YEAR for e in estimates)
    ):
        return []
    why = "the network has no monthly ones" if annual else "the totals have no dates"
    return [
        Note(
            code="annual-normals",
            text=f"Normals of the year are used for depths over less than a year, because {why}: the ratio between "
            "gauges in the season of the storm may be another.",
            method=window.options.method,
        )
    ]

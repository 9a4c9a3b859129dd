"""Spreading depths that are known over several steps: daily readings, accumulations, storm totals.

A total over an interval is given to the steps of that interval in the proportions in which the recording gauges near it
caught their rain, its own amount kept. The pattern is the weighted mean depth of the donors, step by step; their
weights are the inverse squared distances (common practice in disaggregating daily readings).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import ONE_PLACE, GaugeNetwork
from basinrain.notes import Note
from basinrain.rainfall import KnownTotal, RainRecord, Status

__all__ = ["NEAREST", "share_out", "spread_totals"]

NEAREST: Final = 5
"""How many recording gauges make a pattern."""

_LISTED: Final = 3
_NONE_COMPLETE: Final = "no recording gauge is complete over it"
_ALL_DRY: Final = "none of the recording gauges near it has rain"


def share_out(totals: npt.NDArray[np.float64], shares: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return totals given to steps by shares, the sums kept: rounding goes to the last step of the largest share.

    Parameters
    ----------
    totals : array of float, shape (n,)
        mm, 0 or more.
    shares : array of float, shape (n_steps, n)
        0 or more, each column summing to 1.

    Returns
    -------
    array of float, shape (n_steps, n)

    Examples
    --------
    >>> share_out(np.array([48.0]), np.array([[1 / 3], [2 / 3]]))
    array([[16.],
           [32.]])
    """
    parts = shares * totals
    # The last of the largest: it is wet, and large enough never to be pushed below zero by rounding.
    largest = len(shares) - 1 - shares[::-1].argmax(axis=0)
    each = np.arange(len(totals))
    parts[largest, each] += totals - parts.sum(axis=0)
    return parts


def spread_totals(
    record: RainRecord, network: GaugeNetwork, totals: Sequence[KnownTotal]
) -> tuple[RainRecord, tuple[Note, ...]]:
    """Return the record with ``totals`` spread over its steps in the pattern of the recording gauges.

    The donors of a total are the :data:`NEAREST` nearest of ``record.recorders`` that are measured at every step of its
    interval, weighted by the inverse squared distance; equal distances go by gauge id. A recorder at the gauge's own
    place counts as 0.01 m away, which leaves next to nothing to the others as long as it is wet. Where none is
    complete, or none of them has rain, the total is spread evenly and a note says so.

    Parameters
    ----------
    record : RainRecord
        Columns in the network's order.
    network : GaugeNetwork
        Gives the distances.
    totals : sequence of KnownTotal
        Each begins and ends on bounds of the record's steps; intervals of one gauge do not overlap. Whatever the record
        holds for the gauge in those steps is replaced.

    Returns
    -------
    record : RainRecord
        The totals' steps have status SPREAD, or ZERO where the total is 0; ``totals`` holds them beside earlier ones.
    notes : tuple of Note
        One ``spread-evenly`` for every gauge and reason.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1000.0], y=[0.0, 0.0], crs="local")
    >>> ends = np.array(["2031-05-04", "2031-05-05", "2031-05-06"], dtype="datetime64[s]") + np.timedelta64(1, "D")
    >>> depths = [[10.0, np.nan], [0.0, np.nan], [20.0, np.nan]]
    >>> record = RainRecord.from_depths(("A", "B"), ends - np.timedelta64(1, "D"), ends, depths, step="1d")
    >>> spread, notes = spread_totals(record, network, [KnownTotal("B", record.starts[0], record.ends[2], 45.0)])
    >>> spread.depth[:, 1], notes
    (array([15.,  0., 30.]), ())
    """
    depth, status = record.depth.copy(), record.status.copy()
    donors = np.array([g for g, gauge in enumerate(record.gauges) if gauge in record.recorders], dtype=np.int64)
    near, squared = _by_distance(network, donors)
    measured = record.measured[:, donors]
    column = {gauge: g for g, gauge in enumerate(record.gauges)}
    evenly: dict[tuple[str, str], list[KnownTotal]] = {}
    for (first, stop), group in _by_interval(record, totals).items():
        targets = np.array([column[total.gauge] for total in group], dtype=np.int64)
        amounts = np.array([total.depth for total in group])
        weights = _weights(near[targets], squared[targets], np.asarray(measured[first:stop].all(axis=0)))
        mixed = np.where(measured[first:stop], record.depth[first:stop, donors], 0.0) @ weights.T
        caught = mixed.sum(axis=0)
        even = caught == 0
        shares = np.where(even, 1 / (stop - first), mixed / np.where(even, 1.0, caught))
        depth[first:stop, targets] = share_out(amounts, shares)
        status[first:stop, targets] = np.where(amounts == 0, Status.ZERO, Status.SPREAD)
        for k in np.flatnonzero(even & (amounts > 0)):
            reason = _ALL_DRY if weights[k].any() else _NONE_COMPLETE
            evenly.setdefault((group[k].gauge, reason), []).append(group[k])
    notes = [_evenly_note(gauge, reason, where) for (gauge, reason), where in evenly.items()]
    notes.sort(key=lambda note: (column[note.gauge], note.text))
    return replace(record, depth=depth, status=status, totals=(*record.totals, *totals)), tuple(notes)


def _by_distance(
    network: GaugeNetwork, donors: npt.NDArray[np.int64]
) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.float64]]:
    """Return for every gauge the places in ``donors`` by distance, itself left out last, and the squared distances."""
    distance = network.distances()[:, donors]
    distance[donors, np.arange(len(donors))] = np.inf
    order = network.nearest_first(distance, donors)
    return order, np.take_along_axis(distance, order, axis=1) ** 2


def _by_interval(record: RainRecord, totals: Sequence[KnownTotal]) -> dict[tuple[int, int], list[KnownTotal]]:
    firsts, stops = record.steps_of(totals)
    groups: dict[tuple[int, int], list[KnownTotal]] = {}
    for first, stop, total in zip(firsts.tolist(), stops.tolist(), totals, strict=True):
        groups.setdefault((first, stop), []).append(total)
    return groups


def _weights(
    near: npt.NDArray[np.int64], squared: npt.NDArray[np.float64], complete: npt.NDArray[np.bool_]
) -> npt.NDArray[np.float64]:
    """Return the weights (n_targets, n_donors) of the nearest complete donors; a row of zeros where there is none."""
    usable = complete[near] & np.isfinite(squared)
    chosen = usable & (np.cumsum(usable, axis=1) <= NEAREST)
    weights = np.zeros(near.shape)
    # Scaled by the nearest one's, so that metres squared do not lose digits.
    inverse = np.divide(1.0, np.maximum(squared, ONE_PLACE**2), out=np.zeros(near.shape), where=chosen)
    np.put_along_axis(
        weights, near, inverse / np.where(chosen.any(axis=1), inverse.max(axis=1, initial=0), 1)[:, None], 1
    )
    return weights


def _evenly_note(gauge: str, reason: str, where: list[KnownTotal]) -> Note:
    listed = ", ".join(f"{t.depth:g} mm over {t.start} to {t.end}" for t in where[:_LISTED])
    more = f" and {len(where) - _LISTED} more" if len(where) > _LISTED else ""
    return Note(
        code="spread-evenly",
        text=f"Gauge {gauge}: {listed}{more} spread evenly over the steps, because {reason}.",
        gauge=gauge,
    )

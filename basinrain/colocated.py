"""Gauges at one place, merged into one where the job says so."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork, colocated_groups
from basinrain.notes import Note
from basinrain.rainfall import KnownTotal, RainRecord, Status

__all__ = ["merge_colocated"]


def merge_colocated(network: GaugeNetwork, record: RainRecord) -> tuple[GaugeNetwork, RainRecord, tuple[Note, ...]]:
    """Merge gauges at one place into one gauge, whose depth is the mean of those that report.

    Parameters
    ----------
    network, record
        Gauges and their record, in the same order.

    Returns
    -------
    network, record, notes
        The first gauge's place and elevation stand for the group; its id joins the group's ids with ``+``; known
        normals are averaged; service is from the earliest opening to the latest closing. Where one of the group reports
        its value is taken as it is. A mean that holds a spread value is spread itself, over the same interval.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 0.0, 500.0], y=[0.0, 0.0, 0.0], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(
    ...     network.ids, ends - 3600, ends, [[4.0, 6.0, 1.0], [np.nan, 2.0, 1.0]], step="1h"
    ... )
    >>> merged, rain, notes = merge_colocated(network, record)
    >>> merged.ids, rain.depth.tolist()
    (('A+B', 'C'), [[5.0, 1.0], [2.0, 1.0]])
    >>> notes[0].text
    'Gauges A and B stand at one place; their mean stands for both as gauge A+B.'
    """
    groups = colocated_groups(network)
    if not groups:
        return network, record, ()
    depth, status = record.depth.copy(), record.status.copy()
    ids = list(network.ids)
    normals = None if network.normals is None else network.normals.copy()
    opened, closed = network.opened.copy(), network.closed.copy()
    keep = np.ones(len(network), dtype=bool)
    recorders = set(record.recorders)
    for group in groups:
        columns = [network.position(gauge) for gauge in group]
        first = columns[0]
        reporting = record.reporting[:, columns]
        count = reporting.sum(axis=1)
        mean = np.where(reporting, record.depth[:, columns], 0.0).sum(axis=1) / np.maximum(count, 1)
        # The status is that of the first member that reports; where none does, that of the first member.
        chosen = np.where(count > 0, np.argmax(reporting, axis=1), 0)
        picked = record.status[:, columns][np.arange(len(record)), chosen]
        picked = np.where((picked == Status.ZERO) & (mean > 0), Status.OBSERVED, picked)
        own = record.status[:, columns]
        # A mean that holds a spread value was not measured at the step; a gap is one while any of them is in service.
        spread = (own == Status.SPREAD).any(axis=1)
        gap = (count == 0) & (picked == Status.NOT_INSTALLED) & (own != Status.NOT_INSTALLED).any(axis=1)
        status[:, first] = np.where(spread, Status.SPREAD, np.where(gap, Status.MISSING, picked))
        depth[:, first] = np.where(count > 0, mean, np.nan)
        ids[first] = "+".join(group)
        keep[columns[1:]] = False
        if normals is not None and network.normals is not None:
            normals[first] = _mean_of_known(network.normals[columns])
        # NaT, for no limit, wins.
        opened[first], closed[first] = network.opened[columns].min(), network.closed[columns].max()
        if recorders & set(group):
            recorders = (recorders - set(group)) | {ids[first]}
    merged = replace(network, ids=tuple(ids), normals=normals, opened=opened, closed=closed).subset(keep)
    notes = tuple(
        Note(
            code="colocated-merged",
            text=f"Gauges {', '.join(group[:-1])} and {group[-1]} stand at one place; their mean stands for "
            f"{'both' if len(group) == 2 else 'all'} as gauge {'+'.join(group)}.",
            level="info",
            gauge="+".join(group),
        )
        for group in groups
    )
    rain = replace(record, gauges=tuple(ids), depth=depth, status=status, recorders=frozenset(recorders))
    stands_for = {gauge: "+".join(group) for group in groups for gauge in group}
    rain = replace(rain, totals=_merged_totals(rain, stands_for))
    return merged, rain.ordered(merged.ids), notes


def _mean_of_known(normals: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return the mean (n_months,) of the gauges (n_gauges, n_months) that know it; NaN where none does."""
    known = ~np.isnan(normals)
    count = known.sum(axis=0)
    total = np.where(known, normals, 0.0).sum(axis=0)
    return np.where(count > 0, total / np.maximum(count, 1), np.nan)


def _merged_totals(rain: RainRecord, stands_for: Mapping[str, str]) -> tuple[KnownTotal, ...]:
    """Return the totals of gauges left alone as they are; over those of others the merged gauge knows only its own."""
    totals: dict[tuple[str, np.datetime64, np.datetime64], KnownTotal] = {}
    for total, first, stop in zip(rain.totals, *rain.steps_of(rain.totals), strict=True):
        kept = total
        if total.gauge in stands_for:
            gauge = stands_for[total.gauge]
            kept = replace(total, gauge=gauge, depth=float(rain.depth[first:stop, rain.gauges.index(gauge)].sum()))
        totals[kept.gauge, kept.start, kept.end] = kept
    return tuple(totals.values())
